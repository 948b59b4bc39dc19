"""What a run shows on the terminal."""

from __future__ import annotations

import io
from pathlib import Path

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
