"""What runs again when something changes, read from what a run shows."""

from __future__ import annotations

import os
import shutil

from tests.pipeline.conftest import Project, deliver

PAPER = {"write tables", "draw figures", "write report", "write data report"}
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


def test_a_touched_raw_file_runs_nothing_below_validation(project: Project) -> None:
    touch(project.folder / "raw" / "returns.csv")
    assert project.run().rules <= {"validate returns"}


def test_reordered_raw_rows_run_validation_only(project: Project) -> None:
    path = project.folder / "raw" / "market.csv"
    header, *rows = path.read_text().splitlines(keepends=True)
    path.write_text("".join([header, *reversed(rows)]))
    assert project.run().rules == {"validate returns"}


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


def test_an_edit_that_leaves_the_numbers_alone_leaves_the_paper_alone(project: Project) -> None:
    """Pricing runs again, but its bytes are the same: what is below may not be rewritten with other bytes."""
    before = project.hashes("tables", "report.html", "estimates.parquet")
    project.append("workflow/lineproof/stats/market_line.py", "\n# An edit.\n")
    project.run()
    assert project.hashes("tables", "report.html", "estimates.parquet") == before


def test_an_edit_of_the_paper_runs_no_numbers(project: Project) -> None:
    project.append("workflow/lineproof/paper/latex.py", "\n# An edit.\n")
    assert project.run().rules <= PAPER


def test_touched_code_runs_nothing(project: Project) -> None:
    touch(project.folder / "workflow" / "lineproof" / "stats" / "betas.py")
    assert project.run().steps == []


def test_without_the_schedulers_memory_a_changed_option_is_still_noticed(project: Project) -> None:
    shutil.rmtree(project.folder / ".snakemake")
    assert project.run().steps == []
    shutil.rmtree(project.folder / ".snakemake")
    project.edit("small.yaml", "groups: 5}", "groups: 4}")
    steps = project.run().steps
    assert "form portfolios five" in steps
    assert not any(step.startswith("estimate betas") for step in steps)


def test_a_lost_subperiod_file_is_cut_again(project: Project) -> None:
    before = project.hashes("subperiods", "estimates.parquet")
    (project.results / "subperiods" / "late.parquet").unlink()
    project.run()
    assert project.hashes("subperiods", "estimates.parquet") == before


def test_a_subperiod_taken_out_leaves_no_file_behind(project: Project) -> None:
    project.edit("small.yaml", "  early: {to: 1997-12}\n", "")
    project.run()
    assert {p.stem for p in (project.results / "pricing").glob("*.parquet")} == {"full", "late"}
    assert {p.stem for p in (project.results / "subperiods").glob("*.parquet")} == {"full", "late"}
