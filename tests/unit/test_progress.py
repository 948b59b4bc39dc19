"""What a run shows on the terminal."""

from __future__ import annotations

import io
from pathlib import Path

from lineproof.planning import Most
from lineproof.progress import Progress


class Terminal(io.StringIO):
    """A stream that can rewrite its line."""

    def isatty(self) -> bool:
        return True


def test_each_step_is_a_line_with_steps_done_of_steps_to_do() -> None:
    stream = io.StringIO()
    progress = Progress(stream)
    progress.planned({"estimate_betas": 1, "price_subperiod": 9, "study": 1, "total": 11})
    progress.started(1, "estimate_betas", {"estimate": "monthly60"})
    progress.finished(1)
    progress.started(2, "price_subperiod", {"subperiod": "full"})
    progress.started(0, "study", {})
    assert stream.getvalue() == "[ 1/10] estimate betas monthly60\n[ 2/10] price subperiod full\n"


def test_the_count_grows_when_more_steps_become_known() -> None:
    progress = Progress(io.StringIO())
    progress.planned({"validate_returns": 1, "study": 1, "total": 2})
    progress.started(1, "validate_returns", {})
    progress.finished(1)
    progress.counted(1, 8)  # seven jobs are left, one of which is the target
    assert (progress.done, progress.total) == (1, 7)


def test_before_the_subperiods_are_cut_the_most_there_can_be_is_said() -> None:
    """The denominator never grows: it is a bound at first, and the scheduler's count once that is complete."""
    stream = io.StringIO()
    progress = Progress(stream)
    progress.most = Most(6, sure=True)
    progress.planned({"validate_returns": 1, "study": 1})
    steps = ["validate_returns", "cut_subperiods", "price_subperiod", "gather_estimates"]
    for job, (step, total) in enumerate(zip(steps, (3, 3, 5, 5), strict=True), start=1):
        progress.started(job, step, {})
        progress.finished(job)
        progress.counted(job, total)
    assert stream.getvalue().splitlines() == [
        "[1/at most 6] validate returns",
        "[2/at most 6] cut subperiods",
        "[3/at most 6] price subperiod",
        "[4/4] gather estimates",
    ]


def test_a_bound_that_is_not_sure_is_about() -> None:
    stream = io.StringIO()
    progress = Progress(stream)
    progress.most = Most(6, sure=False)
    progress.planned({"cut_subperiods": 1, "study": 1})
    progress.started(1, "cut_subperiods", {})
    assert stream.getvalue() == "[1/about 6] cut subperiods\n"


def test_without_a_checkpoint_ahead_the_count_is_exact() -> None:
    stream = io.StringIO()
    progress = Progress(stream)
    progress.most = Most(6, sure=True)
    progress.planned({"write_tables": 1, "write_report": 1, "study": 1})
    progress.started(1, "write_tables", {})
    assert stream.getvalue() == "[1/2] write tables\n"


def test_a_check_ends_at_its_checkpoint() -> None:
    stream = io.StringIO()
    progress = Progress(stream)
    progress.most = Most(6, sure=True)
    progress.planned({"validate_returns": 1, "data": 1})
    progress.started(1, "validate_returns", {})
    assert stream.getvalue() == "[1/1] validate returns\n"


def test_a_terminal_shows_one_line_that_is_rewritten_and_cleared() -> None:
    stream = Terminal()
    progress = Progress(stream)
    progress.planned({"validate_returns": 1})
    progress.started(1, "validate_returns", {})
    progress.finished(1)
    progress.end()
    assert "\n" not in stream.getvalue()
    assert stream.getvalue().endswith("\r\033[K")


def test_a_failure_shows_the_message_and_where_the_log_is(tmp_path: Path) -> None:
    log = tmp_path / "validate_returns.log"
    log.with_suffix(".message").write_text(
        "The raw data cannot be used.\n  returns.csv: empty\n", encoding="utf-8"
    )
    stream = io.StringIO()
    progress = Progress(stream)
    progress.failed("validate_returns", [str(log)])
    progress.said("Exiting because a job execution failed.")
    assert progress.end()
    assert stream.getvalue() == (
        f"The raw data cannot be used.\n  returns.csv: empty\n  (step: validate returns; log: {log})\n"
    )


def test_another_error_of_the_scheduler_is_shown() -> None:
    stream = io.StringIO()
    progress = Progress(stream)
    progress.said("MissingInputException: raw.csv")
    assert progress.end()
    assert stream.getvalue() == "MissingInputException: raw.csv\n"


def test_nothing_to_say_says_so() -> None:
    assert not Progress(io.StringIO()).end()
