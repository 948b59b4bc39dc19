"""What runs again when something changes, read from what a run shows."""

from __future__ import annotations

import os
import shutil

import pytest
from tests.pipeline.conftest import Project, deliver

PAPER = {"write tables", "draw figures", "write report", "write data"}
ALL = {
    "validate returns",
    "estimate betas",
    "form portfolios",
    "cut subperiods",
    "price subperiod",
    "describe sample",
    "gather estimates",
    *PAPER,
}


def touch(path) -> None:
    """Give a file the time of now."""
    os.utime(path)


def test_nothing_changed_nothing_runs(project: Project) -> None:
    result = project.run()
    assert result.steps == []
    assert "nothing to do" in result.text


def test_a_touched_raw_file_runs_nothing(project: Project) -> None:
    touch(project.folder / "raw" / "returns.csv")
    assert project.run().steps == []


@pytest.mark.thorough
@pytest.mark.parametrize(
    ("years", "forgetful"), [(-30, True), (0, False)], ids=["older, no memory", "equal"]
)
def test_other_raw_content_is_noticed_whatever_its_time(
    project: Project, years: int, forgetful: bool
) -> None:
    """As when a file is unpacked or moved in that was made before the last run; `.snakemake` may be lost as well."""
    path = project.folder / "raw" / "market.csv"
    header, *rows = path.read_text().splitlines(keepends=True)
    before = path.stat()
    path.write_text("".join([header, *reversed(rows)]))
    os.utime(path, ns=(before.st_atime_ns, before.st_mtime_ns + years * 365 * 86400 * 10**9))
    if forgetful:
        shutil.rmtree(project.folder / ".snakemake")
    assert "validate returns" in project.lineproof("check", "small.yaml").rules
    assert project.lineproof("check", "small.yaml").steps == []


@pytest.mark.thorough
def test_a_supplied_file_of_older_date_forms_its_assets_again(project: Project) -> None:
    path = project.folder / "raw" / "sector_indices.csv"
    header, *rows = path.read_text().splitlines(keepends=True)
    path.write_text("".join([header, *reversed(rows)]))
    os.utime(path, (0, 0))
    assert project.run().steps[:1] == ["form portfolios sectors"]


@pytest.mark.thorough
def test_code_of_older_date_is_noticed(project: Project) -> None:
    file = "workflow/lineproof/paper/latex.py"
    project.append(file, "\n# An edit.\n")
    os.utime(project.folder / file, (0, 0))
    assert "write tables" in project.run().rules


@pytest.mark.thorough
def test_other_pins_make_everything_anew(project: Project) -> None:
    project.append("workflow/envs/requirements.txt", "# Another pin.\n")
    assert {"validate returns", "gather estimates", *PAPER} <= project.run().rules


@pytest.mark.thorough
def test_reordered_raw_rows_run_validation_only(project: Project) -> None:
    """And the data report, which prints the sums of the raw files."""
    path = project.folder / "raw" / "market.csv"
    header, *rows = path.read_text().splitlines(keepends=True)
    path.write_text("".join([header, *reversed(rows)]))
    assert project.run().rules == {"validate returns", "write data"}


def test_an_appended_month_prices_only_the_subperiods_that_contain_it(project: Project) -> None:
    deliver(project, None)
    before = project.hashes("pricing")
    steps = project.run().steps
    priced = {step for step in steps if step.startswith("price")}
    assert priced == {"price subperiod full", "price subperiod late"}
    after = project.hashes("pricing")
    assert before["pricing/early.parquet"] == after["pricing/early.parquet"]
    assert before["pricing/late.parquet"] != after["pricing/late.parquet"]


def test_an_option_of_a_sort_leaves_betas_and_other_sorts_alone(project: Project) -> None:
    project.edit(
        "small.yaml",
        "five: {rank_on: monthly36, groups: 5}",
        "five: {rank_on: monthly36, groups: 4}",
    )
    steps = project.run().steps
    assert "form portfolios five" in steps
    assert "form portfolios five_size" not in steps
    assert not any(step.startswith(("validate", "estimate betas")) for step in steps)


def test_an_edit_of_the_market_line_runs_pricing_and_later_only(project: Project) -> None:
    project.append("workflow/lineproof/stats/market_line.py", "\n# An edit.\n")
    result = project.run()
    assert "price subperiod" in result.rules
    assert not result.rules & {
        "validate returns",
        "estimate betas",
        "form portfolios",
        "cut subperiods",
    }


@pytest.mark.thorough
def test_an_edit_that_leaves_the_numbers_alone_leaves_the_paper_alone(project: Project) -> None:
    """Pricing runs again, but its bytes are the same: what is below may not be rewritten with other bytes."""
    before = project.hashes("tables", "report.html", "estimates.parquet")
    project.append("workflow/lineproof/stats/market_line.py", "\n# An edit.\n")
    project.run()
    assert project.hashes("tables", "report.html", "estimates.parquet") == before


def test_an_edit_of_the_paper_runs_no_numbers(project: Project) -> None:
    project.append("workflow/lineproof/paper/latex.py", "\n# An edit.\n")
    assert project.run().rules <= PAPER


@pytest.mark.thorough
def test_touched_code_runs_nothing(project: Project) -> None:
    touch(project.folder / "workflow" / "lineproof" / "stats" / "betas.py")
    assert project.run().steps == []


@pytest.mark.thorough
def test_without_the_schedulers_memory_a_changed_option_is_still_noticed(project: Project) -> None:
    shutil.rmtree(project.folder / ".snakemake")
    assert project.run().steps == []
    shutil.rmtree(project.folder / ".snakemake")
    project.edit("small.yaml", "groups: 5}", "groups: 4}")
    steps = project.run().steps
    assert "form portfolios five" in steps
    assert not any(step.startswith("estimate betas") for step in steps)


@pytest.mark.thorough
def test_a_lost_subperiod_file_is_cut_again(project: Project) -> None:
    before = project.hashes("subperiods", "estimates.parquet")
    (project.results / "subperiods" / "late.parquet").unlink()
    project.run()
    assert project.hashes("subperiods", "estimates.parquet") == before


@pytest.mark.thorough
def test_a_subperiod_taken_out_leaves_no_file_behind(project: Project) -> None:
    project.edit("small.yaml", "  early: {to: 1997-12}\n", "")
    project.run()
    assert {p.stem for p in (project.results / "pricing").glob("*.parquet")} == {"full", "late"}
    assert {p.stem for p in (project.results / "subperiods").glob("*.parquet")} == {"full", "late"}
