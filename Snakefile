# Is beta priced? From raw returns to a printed study. Run it with `make study`, or see README.md.
import os
import sys
from pathlib import Path

HERE = Path(workflow.basedir)
sys.path.insert(0, str(HERE / "workflow"))

from lineproof.environment import settle
from lineproof.problems import KnownProblem
from lineproof.study import load_study
from lineproof.wiring import Wiring, subperiod_names

settle(os.environ)

try:
    study = load_study(config.get("study", HERE / "config" / "kestrel.yaml"))
    wiring = Wiring(study)
    # Once a run: what changes while jobs run must look changed at the next start.
    if workflow.is_main_process:
        wiring.keep_options()
        wiring.keep_digests()
        wiring.heal()
except KnownProblem as problem:
    raise WorkflowError(str(problem)) from None


wildcard_constraints:
    estimate="[a-z][a-z0-9_-]*",
    sort="[a-z][a-z0-9_-]*",
    subperiod="[a-z][a-z0-9_-]*",


localrules:
    study,
    data,


include: "workflow/rules/asking.smk"
include: "workflow/rules/demo.smk"
include: "workflow/rules/data.smk"
include: "workflow/rules/betas.smk"
include: "workflow/rules/portfolios.smk"
include: "workflow/rules/subperiods.smk"
include: "workflow/rules/pricing.smk"
include: "workflow/rules/paper.smk"


rule study:
    default_target: True
    input:
        after_validation(wiring.tables_between),
        priced,
        after_validation("data_report.html"),
        after_cutting("report.html"),
        after_cutting("estimates.csv"),
        after_cutting(wiring.tables),
        after_cutting(wiring.figures),


rule data:
    input:
        wiring.path("data/intake.json"),
        after_validation("data_report.html"),
