"""A results folder on a disk of its own that is too small, or can only be read: whole runs."""

from __future__ import annotations

import shutil
import subprocess
from collections.abc import Iterator

import pyarrow.parquet as pq
import pytest
from tests.pipeline.conftest import Project

PARTS = ("data", "betas", "portfolios", "subperiods", "pricing", "estimates.parquet", "report.html")


def mount(*words: str) -> bool:
    """Whether `mount` could do it: that takes a system administrator, which tests in a container often run as."""
    if shutil.which("mount") is None:
        return False
    return subprocess.run(["mount", *words], capture_output=True, check=False).returncode == 0


@pytest.fixture
def on_small_disk(project: Project) -> Iterator[Project]:
    """The small study, nothing of it done yet, with its results on a disk in memory of 256 KiB."""
    shutil.rmtree(project.results)
    shutil.rmtree(project.folder / ".snakemake")
    project.results.mkdir()
    if not mount("-t", "tmpfs", "-o", "size=256k", "tmpfs", str(project.results)):
        pytest.skip("file systems cannot be mounted here")
    yield project
    subprocess.run(["umount", str(project.results)], check=True)


@pytest.mark.thorough
@pytest.mark.fault(35)
def test_a_full_disk_is_said_and_the_same_command_finishes_when_there_is_room(
    finished: Project, on_small_disk: Project
) -> None:
    project = on_small_disk
    result = project.lineproof("study", "small.yaml")
    assert result.status == 1
    assert "The disk is full.\n" in result.text
    assert "make room, then give the same command again" in result.text
    assert "Traceback" not in result.text
    assert [f.name for f in project.files(".") if f.name.endswith(".part")] == []
    for table in (f for f in project.files(".") if f.suffix == ".parquet"):
        pq.read_metadata(table)  # which stands at the end of the file
    assert mount("-o", "remount,size=256m", str(project.results))
    project.run()
    assert project.hashes(*PARTS) == finished.hashes(*PARTS)


@pytest.mark.fault(35)
def test_a_folder_that_can_only_be_read_is_said_before_anything_runs(
    on_small_disk: Project,
) -> None:
    project = on_small_disk
    assert mount("-o", "remount,ro", str(project.results))
    result = project.lineproof("study", "small.yaml")
    assert result.status == 2
    assert result.steps == []
    assert result.text == (
        "The results folder cannot be used; nothing was run.\n"
        "  results/small: cannot be written: Read-only file system\n"
        "    → check its permissions and the disk\n"
    )
