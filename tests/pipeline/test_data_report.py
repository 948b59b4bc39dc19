"""The data report in a run: part of a study, made by `check` from the intake alone."""

from __future__ import annotations

import json
from pathlib import Path

import pytest
from tests.pipeline.conftest import LAST_OF_FIRST_DELIVERY, Project, copy_program, deliver


@pytest.mark.thorough
def test_check_writes_the_data_report_and_no_more(tmp_path: Path) -> None:
    project = copy_program(tmp_path / "project")
    deliver(project, LAST_OF_FIRST_DELIVERY)
    result = project.lineproof("check", "small.yaml")
    assert result.status == 0, result.text
    assert result.steps == ["validate returns", "write data report"]
    assert result.text.rstrip().endswith("results/small/data_report.html")
    page = (project.results / "data_report.html").read_text(encoding="utf-8")
    intake = json.loads((project.results / "data" / "intake.json").read_text(encoding="utf-8"))
    assert f'title="/rows_kept">{intake["rows_kept"]:,}</span>' in page
    assert (project.results / "data" / "set_aside.csv").exists()
    assert not (project.results / "report.html").exists()


def test_a_lost_data_report_is_made_again_alone(project: Project) -> None:
    report = project.results / "data_report.html"
    before = report.read_bytes()
    report.unlink()
    assert project.run().steps == ["write data report"]
    assert report.read_bytes() == before
