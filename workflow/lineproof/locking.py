"""One run of a study at a time, its jobs included; a run that was killed leaves no lock and no job behind.

The main process holds `.running`, the jobs share `.working`; the system releases both when their processes end,
in whatever way. A job looks every second whether the run that started it still holds `.running`, and ends itself if
not: outputs are renamed into place, so it may end at any moment.
"""

from __future__ import annotations

import fcntl
import os
import secrets
import signal
import socket
import sys
import threading
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import IO

from lineproof.problems import KnownProblem, Problem

_RUN = "LINEPROOF_RUN"  # of the environment: folder, host and token of the run, for its jobs
_LOOK_EACH = 1.0  # seconds
_PATIENCE = 30.0  # seconds that the jobs of a killed run get to end themselves


@contextmanager
def only_run_of(folder: str) -> Iterator[None]:
    """Hold the lock of a study's results folder, once the jobs of an earlier, killed run have ended.

    Raises KnownProblem when another run of the study holds it, jobs of an earlier one do not end, or the folder
    cannot be written.
    """
    with _opened(Path(folder)) as running:
        if not _got(running):
            found = Problem(folder, "another run of this study is going on", "wait for it to end")
            raise KnownProblem("Nothing was run.", [found])
        token = secrets.token_hex(16)
        running.truncate(0)
        running.write(token)
        running.flush()
        _wait_for_jobs(Path(folder))
        os.environ[_RUN] = "\n".join([str(Path(folder).resolve()), socket.gethostname(), token])
        try:
            yield
        finally:
            os.environ.pop(_RUN, None)


def _opened(folder: Path) -> IO[str]:
    try:
        folder.mkdir(parents=True, exist_ok=True)
        return (folder / ".running").open("a", encoding="ascii")
    except OSError as error:
        said = f"cannot be written: {error.strerror}"
        found = Problem(str(folder), said, "check its permissions and the disk")
        raise KnownProblem("The results folder cannot be used; nothing was run.", [found]) from None


def _got(running: IO[str]) -> bool:
    """Take the lock for good. A job of a killed run holds it for a moment when it looks, hence a few tries."""
    for _ in range(5):
        try:
            fcntl.flock(running, fcntl.LOCK_EX | fcntl.LOCK_NB)
            return True
        except BlockingIOError:
            time.sleep(0.05)
    return False


def _wait_for_jobs(folder: Path) -> None:
    """Wait until no job holds `.working`. New ones do not come: they would not find their run's token."""
    with (folder / ".working").open("a") as working:
        until = time.monotonic() + _PATIENCE
        while not _is_free(working, fcntl.LOCK_EX):
            if time.monotonic() > until:
                said = "steps of a run that was stopped are still at work"
                found = Problem(str(folder), said, "end them, or wait for them to end")
                raise KnownProblem("Nothing was run.", [found])
            time.sleep(0.1)


def join_run() -> IO[str] | None:
    """Called by a job before it writes anything: from then on it lives no longer than the run that started it.

    Returns the shared lock, to be kept open; None for a job outside such a run or on another machine, where a file's
    lock may not be seen.
    """
    given = os.environ.get(_RUN)
    if not given:
        return None
    folder, host, token = given.rsplit("\n", 2)
    if host != socket.gethostname():
        return None
    working = Path(folder, ".working").open("a")  # noqa: SIM115
    fcntl.flock(working, fcntl.LOCK_SH)
    # The lock first, then the look: a later run either waits for this job or has put its token there.
    if not _goes_on(Path(folder, ".running"), token):
        sys.exit("the run that started this job has ended")
    threading.Thread(target=_end_with, args=(Path(folder, ".running"), token), daemon=True).start()
    return working


def _end_with(running: Path, token: str) -> None:
    while _goes_on(running, token):
        time.sleep(_LOOK_EACH)
    os.kill(os.getpid(), signal.SIGKILL)


def _goes_on(running: Path, token: str) -> bool:
    """Whether the run of this token still holds its lock."""
    try:
        with running.open(encoding="ascii") as handle:
            return not _is_free(handle, fcntl.LOCK_SH) and handle.read() == token
    except FileNotFoundError:
        return False


def _is_free(handle: IO[str], kind: int) -> bool:
    try:
        fcntl.flock(handle, kind | fcntl.LOCK_NB)
    except BlockingIOError:
        return False
    fcntl.flock(handle, fcntl.LOCK_UN)
    return True
