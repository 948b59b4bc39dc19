"""What a user sees when something is wrong, and that the same command then simply works."""

from __future__ import annotations

import fcntl
import os
import signal
import subprocess
import sys

import pytest
from tests.pipeline.conftest import Project


@pytest.mark.fault(33)
def test_an_unsound_study_file_runs_nothing(project: Project) -> None:
    project.edit("small.yaml", "groups: 5}", "grops: 5}")
    result = project.lineproof("study", "small.yaml")
    assert result.status == 2
    assert result.steps == []
    assert "portfolios.five.grops: unknown key 'grops'\n    → did you mean groups?" in result.text
    assert "Traceback" not in result.text


@pytest.mark.thorough
def test_snakemake_itself_refuses_an_unsound_study_file_too(project: Project) -> None:
    project.edit("small.yaml", "groups: 5}", "grops: 5}")
    done = subprocess.run(
        [sys.executable, "-m", "snakemake", "-n", "--config", "study=small.yaml"],
        cwd=project.folder,
        capture_output=True,
        text=True,
        check=False,
    )
    assert done.returncode != 0
    assert "did you mean groups?" in done.stdout + done.stderr


def test_unusable_raw_data_is_said_once_and_the_log_is_named(project: Project) -> None:
    project.edit("raw/market.csv", "month,total_return", "month,totl_return")
    result = project.lineproof("study", "small.yaml")
    assert result.status == 1
    assert "raw/market.csv" in result.text
    assert result.text.count("there is no column 'total_return'") == 1
    assert "did you mean totl_return?" in result.text
    assert "(step: validate returns; log: results/small/logs/validate_returns.log)" in result.text
    assert "Traceback" not in result.text
    assert "WorkflowError" not in result.text


@pytest.mark.thorough
def test_a_mended_file_makes_the_same_command_work(project: Project) -> None:
    before = project.hashes("estimates.parquet", "report.html", "data")
    project.edit("raw/market.csv", "month,total_return", "month,totl_return")
    assert project.lineproof("study", "small.yaml").status == 1
    project.edit("raw/market.csv", "month,totl_return", "month,total_return")
    project.run()
    assert project.hashes("estimates.parquet", "report.html", "data") == before


@pytest.mark.fault(33)
def test_a_subperiod_outside_the_data_is_said(project: Project) -> None:
    project.edit("small.yaml", "early: {to: 1997-12}", "early: {from: 1950-01, to: 1959-12}")
    result = project.lineproof("study", "small.yaml")
    assert result.status == 1
    assert "subperiods.early" in result.text
    assert "Traceback" not in result.text


@pytest.mark.thorough
@pytest.mark.fault(33)
def test_more_groups_than_securities_is_said(project: Project) -> None:
    project.edit("small.yaml", "groups: 5}", "groups: 90}")
    result = project.lineproof("study", "small.yaml")
    assert result.status == 1
    assert "portfolios.five.groups: 90 groups, but at most" in result.text


@pytest.mark.fault(37)
def test_a_second_run_of_a_study_leaves(project: Project) -> None:
    with (project.results / ".running").open("a") as handle:
        fcntl.flock(handle, fcntl.LOCK_EX)
        result = project.lineproof("study", "small.yaml")
    assert result.status == 2
    assert "another run of this study is going on" in result.text
    assert project.run().steps == []


def test_check_reads_the_data_and_runs_no_more(project: Project) -> None:
    project.append("raw/returns.csv", "000001,not a date,0.01,,,1,1,services\n")
    result = project.lineproof("check", "small.yaml")
    assert result.status == 0, result.text
    assert result.rules == {"validate returns", "write data"}
    assert "rows read" in result.text
    assert "a date that does not parse" in result.text


@pytest.mark.thorough
@pytest.mark.fault(36)
@pytest.mark.parametrize(
    ("step", "whole"),
    [("validate returns", False), ("price subperiod", True)],
    ids=["alone", "with its jobs"],
)
def test_a_killed_run_is_finished_by_the_same_command(
    project: Project, step: str, whole: bool
) -> None:
    """Killed without warning as a step begins, with all its jobs or the main process alone, as for want of memory.

    The bytes are those of an undisturbed run.
    """
    parts = (
        "data",
        "betas",
        "portfolios",
        "subperiods",
        "pricing",
        "estimates.parquet",
        "tables",
        "report.html",
    )
    before = project.hashes(*parts)
    for part in (
        "data/panel.parquet",
        "betas/monthly36.parquet",
        "pricing/full.parquet",
        "estimates.parquet",
        "report.html",
    ):
        (project.results / part).unlink()
    with subprocess.Popen(
        [sys.executable, "-m", "lineproof", "study", "small.yaml", "--cores", "2"],
        cwd=project.folder,
        env={**os.environ, "PYTHONPATH": str(project.folder / "workflow")},
        stderr=subprocess.PIPE,
        text=True,
        start_new_session=True,
    ) as running:
        assert running.stderr is not None
        assert any(step in line for line in running.stderr), f"{step} never began"
        os.killpg(running.pid, signal.SIGKILL) if whole else running.kill()
    project.run()
    assert project.hashes(*parts) == before
