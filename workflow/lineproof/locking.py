"""One run of a study at a time; a killed run leaves no lock behind."""

from __future__ import annotations

import fcntl
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from lineproof.problems import KnownProblem, Problem
from lineproof.study import Study


@contextmanager
def only_run_of(study: Study) -> Iterator[None]:
    """Hold the study's lock, which the system itself releases when the process ends in whatever way.

    Raises KnownProblem when another run of the study holds it, or the results folder cannot be written.
    """
    folder = Path(study.folder)
    try:
        folder.mkdir(parents=True, exist_ok=True)
        handle = (folder / ".running").open("a")
    except OSError as error:
        found = Problem(
            str(folder),
            f"cannot be written: {error.strerror}",
            "check its permissions and the disk",
        )
        raise KnownProblem("The results folder cannot be used; nothing was run.", [found]) from None
    with handle:
        try:
            fcntl.flock(handle, fcntl.LOCK_EX | fcntl.LOCK_NB)
        except BlockingIOError:
            found = Problem(
                str(folder), "another run of this study is going on", "wait for it to end"
            )
            raise KnownProblem("Nothing was run.", [found]) from None
        yield
