"""What runs cost, as ratios to Snakemake itself on a toy of as many jobs. Prints; asserts no time."""

from __future__ import annotations

import os
import shutil
import statistics
import subprocess
import sys
import textwrap
import time
from collections.abc import Callable
from pathlib import Path

import pytest
from tests.pipeline.conftest import ROOT, Project, copy_program

TOY = textwrap.dedent(
    """\
    rule all:
        input: expand("made/{{i}}.txt", i=range({n}))
    rule one:
        output: "made/{{i}}.txt"
        shell: "touch {{output}}"
    """
)


def seconds(run: Callable[[], object], times: int = 5) -> float:
    """Median wall time of a call."""
    taken = []
    for _ in range(times):
        began = time.perf_counter()
        run()
        taken.append(time.perf_counter() - began)
    return statistics.median(taken)


def toy(folder: Path, n_jobs: int) -> Callable[[], object]:
    """Running Snakemake on a toy workflow of `n_jobs` in two processes."""
    folder.mkdir()
    (folder / "Snakefile").write_text(TOY.format(n=n_jobs - 1), encoding="utf-8")
    command = [sys.executable, "-m", "snakemake", "-c2", "-q", "all", "--scheduler", "greedy"]
    return lambda: subprocess.run(command, cwd=folder, check=True, capture_output=True)


@pytest.fixture(scope="module")
def demo(tmp_path_factory: pytest.TempPathFactory) -> tuple[Project, int, float]:
    """The demo study run afresh, with its steps and seconds; kernels are compiled first, as by set-up."""
    project = copy_program(tmp_path_factory.mktemp("demo") / "project")
    shutil.copytree(ROOT / "config", project.folder / "config")
    (project.folder / ".venv").symlink_to(ROOT / ".venv")
    project.lineproof("compile")
    began = time.perf_counter()
    result = project.lineproof("study")
    taken = time.perf_counter() - began
    assert result.status == 0, result.text
    return project, len(result.steps), taken


def test_a_full_run_of_the_demo(demo: tuple[Project, int, float], tmp_path: Path) -> None:
    _, n_steps, taken = demo
    peer = seconds(toy(tmp_path / "toy", n_steps), times=1)
    print(
        f"\nfull demo: {n_steps} steps, {taken:.1f} s; {taken / peer:.1f} × a toy of as many jobs ({peer:.1f} s)"
    )


def test_an_idle_run_of_the_demo(demo: tuple[Project, int, float], tmp_path: Path) -> None:
    project, n_steps, _ = demo
    run_toy = toy(tmp_path / "toy", n_steps)
    run_toy()
    command = [sys.executable, str(project.folder / "workflow" / "run.py"), "study"]
    environ = {k: v for k, v in os.environ.items() if k != "PYTHONPATH"}
    idle = seconds(
        lambda: subprocess.run(
            command, cwd=project.folder, env=environ, check=True, capture_output=True
        )
    )
    peer = seconds(run_toy)
    print(
        f"\nidle demo: {idle:.2f} s; {idle / peer:.2f} × an up-to-date toy of as many jobs "
        f"({peer:.2f} s), {idle - peer:+.2f} s"
    )
