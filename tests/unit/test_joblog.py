"""What a failing job leaves for its user to read."""

from __future__ import annotations

import errno
import os
import subprocess
import sys
import textwrap
from pathlib import Path

import pytest

from lineproof import joblog, store

KEPT = "Nothing is half-written; what earlier steps wrote is whole and kept."
FULL = (
    "The disk is full.\n  {} could not be written. " + KEPT + "\n"
    "    → make room, then give the same command again"
)


@pytest.mark.fault(35)
@pytest.mark.parametrize("number", [errno.ENOSPC, errno.EDQUOT])
def test_a_full_disk(number: int) -> None:
    trouble = OSError(number, os.strerror(number), "results/mine/data/panel.parquet")
    assert joblog.file_trouble(trouble) == FULL.format("results/mine/data/panel.parquet")


@pytest.mark.fault(35)
def test_a_disk_that_can_only_be_read() -> None:
    trouble = OSError(errno.EROFS, os.strerror(errno.EROFS), "results/mine/a.csv")
    assert joblog.file_trouble(trouble) == (
        f"The disk can only be read.\n  results/mine/a.csv could not be written. {KEPT}\n"
        "    → make it writable, then give the same command again"
    )


def test_other_trouble_with_a_file() -> None:
    missing = FileNotFoundError(errno.ENOENT, "No such file or directory", "a.parquet")
    assert joblog.file_trouble(missing) == (
        "A file could not be read or written.\n  No such file or directory: a.parquet"
    )
    assert joblog.file_trouble(OSError("odd")).endswith("\n  odd")


@pytest.mark.fault(35)
def test_the_file_that_did_not_fit_is_named(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """The system names a file when it is opened, not when it is written."""

    def full(self: Path, content: bytes) -> None:
        raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))

    monkeypatch.setattr(Path, "write_bytes", full)
    with pytest.raises(OSError, match="No space left") as caught:
        store.write_text("new", tmp_path / "data" / "a.csv")
    assert joblog.file_trouble(caught.value) == FULL.format(tmp_path / "data" / "a.csv")
    assert list((tmp_path / "data").iterdir()) == []


def run(folder: Path, body: str) -> subprocess.CompletedProcess[str]:
    """Run a job with a body of its own, as a rule's script does."""
    script = textwrap.dedent(
        """\
        import errno, os
        from types import SimpleNamespace
        from lineproof import joblog
        with joblog.job(SimpleNamespace(log=["a.log"])):
        """
    ) + textwrap.indent(body, "    ")
    return subprocess.run(
        [sys.executable, "-c", script],
        cwd=folder,
        env={**os.environ, "PYTHONPATH": str(Path(joblog.__file__).parents[1])},
        capture_output=True,
        text=True,
        check=False,
    )


def test_a_job_that_fails_leaves_its_message_and_its_log(tmp_path: Path) -> None:
    (tmp_path / "a.message").write_text("of the run before")
    done = run(tmp_path, "raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC), 'x.csv')")
    assert (done.returncode, done.stdout, done.stderr) == (1, "", "")
    assert (tmp_path / "a.message").read_text() == FULL.format("x.csv") + "\n"
    assert "Traceback" in (tmp_path / "a.log").read_text()
    assert run(tmp_path, "print('so far')").returncode == 0
    assert (tmp_path / "a.log").read_text() == "so far\ndone\n"
    assert not (tmp_path / "a.message").exists()


@pytest.mark.fault(35)
def test_a_job_whose_message_cannot_be_written_ends_quietly(tmp_path: Path) -> None:
    (tmp_path / "a.message").mkdir()  # so that neither the old message goes nor a new one comes
    done = run(tmp_path, "print('never')")
    assert done.returncode == 1
    assert "never" not in done.stdout


@pytest.mark.fault(35)
def test_without_a_message_the_disk_is_looked_at(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    log = tmp_path / "a.log"
    assert (
        joblog.without_message(log)
        == "It was ended from outside, or for want of memory; the same command goes on from there."
    )
    assert (
        joblog.without_message("nowhere/a.log")
        == "It was ended from outside, or for want of memory; the same command goes on from there."
    )
    usage = type("Usage", (), {"free": 4096})()
    monkeypatch.setattr(joblog.shutil, "disk_usage", lambda folder: usage)
    assert joblog.without_message(log) == FULL.format("a file")
