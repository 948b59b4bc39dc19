"""The lock of a run, seen from other processes. Limits of time only stop a test that hangs."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
from pathlib import Path

import pytest

from lineproof.locking import only_run_of
from lineproof.problems import KnownProblem
from lineproof.provenance import WORKFLOW

HANG = 3600  # seconds

RUN = """
import subprocess, sys
from lineproof.locking import only_run_of
with only_run_of(sys.argv[1]):
    job = subprocess.Popen([sys.executable, "-c", sys.argv[2]])
    print(job.pid, flush=True)
    job.wait()
"""
JOB = """
import sys, time
from lineproof.locking import join_run
lock = join_run()
print("at work", flush=True)
time.sleep(3600)
"""


def start(code: str, *words: str, **environ: str) -> subprocess.Popen:
    return subprocess.Popen(
        [sys.executable, "-c", code, *words],
        env={**os.environ, "PYTHONPATH": str(WORKFLOW), **environ},
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
    )


def test_a_second_run_is_refused_and_a_later_one_is_not(tmp_path: Path) -> None:
    with only_run_of(str(tmp_path)):
        other = start(RUN, str(tmp_path), "pass")
        assert "another run of this study is going on" in other.communicate(timeout=HANG)[1]
    with only_run_of(str(tmp_path)):
        pass


def test_a_job_ends_with_the_run_that_started_it(tmp_path: Path) -> None:
    """Only the main process is killed, as for want of memory; the next run begins when its job has gone."""
    run = start(RUN, str(tmp_path), JOB)
    assert run.stdout is not None
    job = int(run.stdout.readline())
    assert run.stdout.readline() == "at work\n"
    os.kill(run.pid, signal.SIGKILL)
    run.wait(timeout=HANG)
    with only_run_of(str(tmp_path)):
        assert not _lives(job)


def _lives(pid: int) -> bool:
    """A process that has ended but was not waited for does nothing any more."""
    try:
        return Path(f"/proc/{pid}/stat").read_text().rsplit(")", 1)[1].split()[0] not in "ZX"
    except FileNotFoundError:
        return False


def test_a_job_that_starts_after_its_run_has_gone_does_nothing(tmp_path: Path) -> None:
    with only_run_of(str(tmp_path)):
        left = os.environ["LINEPROOF_RUN"]
    late = start(JOB, LINEPROOF_RUN=left)
    assert late.communicate(timeout=HANG) == ("", "the run that started this job has ended\n")
    with only_run_of(str(tmp_path)):  # nor under a later run
        late = start(JOB, LINEPROOF_RUN=left)
        assert late.communicate(timeout=HANG)[0] == ""


def test_a_job_of_no_run_works(tmp_path: Path) -> None:
    """As when the scheduler itself is called."""
    job = start("from lineproof.locking import join_run; print(join_run())", LINEPROOF_RUN="")
    assert job.communicate(timeout=HANG)[0] == "None\n"


def test_a_folder_that_cannot_be_made_is_a_problem_of_the_user(tmp_path: Path) -> None:
    (tmp_path / "results").write_text("")
    with pytest.raises(KnownProblem, match="cannot be written"), only_run_of(f"{tmp_path}/results"):
        pass
