"""Snakemake's own checks of the workflow."""

from __future__ import annotations

import os
import subprocess
import sys

from lineproof.provenance import WORKFLOW

# The whole project has one environment, pinned with hashes, which every rule that computes takes as an input.
NOT_MEANT_FOR_US = "Specify a conda environment or container for each rule.:"


def test_the_workflow_passes_snakemakes_lint() -> None:
    done = subprocess.run(
        [sys.executable, "-m", "snakemake", "--lint"],
        cwd=WORKFLOW.parent,
        env={**os.environ, "PYTHONPATH": str(WORKFLOW)},
        capture_output=True,
        text=True,
        check=False,
    )
    said = done.stdout + done.stderr
    found = {
        line.strip().removeprefix("* ") for line in said.splitlines() if line.startswith("    * ")
    }
    assert found == {NOT_MEANT_FOR_US}, said
