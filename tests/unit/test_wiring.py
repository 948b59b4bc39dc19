"""Which tables a job reads, and the frequency it is told."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import pytest
import yaml
from tests import daily_market

from lineproof.study import load_study
from lineproof.wiring import Wiring


def wire(folder: Path, frequency: str) -> Wiring:
    daily_market.write_files(folder / "raw")
    content = yaml.safe_load(daily_market.STUDY)
    content["study"]["frequency"] = frequency
    if frequency == "monthly":
        content["betas"] = {"days120": {"window": 60, "min": 24}}
    (folder / "small.yaml").write_text(yaml.safe_dump(content), encoding="utf-8")
    return Wiring(load_study(folder / "small.yaml"))


@pytest.mark.parametrize("frequency", ["monthly", "daily"])
def test_every_job_is_told_the_frequency(tmp_path: Path, frequency: str) -> None:
    wiring = wire(tmp_path, frequency)
    betas = wiring.options("estimate_betas-days120")
    assert (betas["returns"], betas["dated"]) == (frequency, frequency)
    for job in ("form_portfolios-four", "cut_subperiods", "price_subperiod", "describe_sample"):
        assert wiring.options(job)["frequency"] == frequency
    noun = {"monthly": "month", "daily": "day"}[frequency]
    assert wiring.options("write_paper")["facts"]["period"]["noun"] == noun
    tables = wiring.beta_inputs("days120")
    assert [Path(p).name for p in tables.values()] == ["panel.parquet", "market.parquet"]


def test_daily_betas_of_a_monthly_study_read_the_tables_of_days(tmp_path: Path) -> None:
    study = wire(tmp_path, "monthly").study
    spec = replace(study.betas["days120"], returns="daily")
    wiring = Wiring(replace(study, betas={"days120": spec}))
    assert {key: Path(p).name for key, p in wiring.beta_inputs("days120").items()} == {
        "panel": "daily.parquet",
        "market": "market_daily.parquet",
    }
    assert wiring.options("estimate_betas-days120")["dated"] == "monthly"
