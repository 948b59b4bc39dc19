"""Whole runs of a small study, each in a folder of its own with a copy of the program."""

from __future__ import annotations

import hashlib
import os
import re
import shutil
import signal
import subprocess
import sys
import textwrap
from dataclasses import dataclass
from pathlib import Path

import pytest

from lineproof.demo import make_demo

ROOT = Path(__file__).parents[2]
HANG = 6 * 3600  # seconds; no measure of speed, only the end of a run that hangs
LAST_OF_FIRST_DELIVERY = "2003-11"

STUDY = textwrap.dedent(
    """\
    study: {name: small, title: A small study, market_name: a small invented market, level: 0.05}
    data:
      returns:
        file: raw/returns.csv
        columns: {security: security, date: date, return: ret, size: size, price: price,
                  final_return: final_ret, sector: sector}
        missing: ["", "NA", "-99"]
      market: {file: raw/market.csv, columns: {date: month, return: total_return}, unit: percent, dates: "%Y-%m"}
      riskless:
        {file: raw/riskless.csv, columns: {date: month, rate: annual_yield}, quoted: annual_yield, unit: percent,
         dates: "%Y-%m"}
    intake:
      screens: [{column: price, at_least: 1}]
    betas:
      monthly36: {window: 36, min: 24}
    portfolios:
      five: {rank_on: monthly36, groups: 5}
      five_size: {rank_on: monthly36, groups: 5, weights: size}
      sectors:
        {design: supplied, file: raw/sector_indices.csv, columns: {asset: asset, date: month, return: ret},
         unit: percent, dates: "%Y-%m"}
    subperiods:
      full: {}
      early: {to: 1997-12}
      late: {from: 1998-01}
    """
)


@dataclass
class Run:
    """How one command ended, and the steps it ran in its order, as in `price subperiod late`."""

    status: int
    text: str

    @property
    def steps(self) -> list[str]:
        return re.findall(
            r"^\[\s*\d+/(?:at most |about )?\d+\] (.+)$", self.text, flags=re.MULTILINE
        )

    @property
    def rules(self) -> set[str]:
        """The steps without their wildcards."""
        return {" ".join(step.split()[:2]) for step in self.steps}


class Project:
    """A copy of the program with a small study."""

    def __init__(self, folder: Path) -> None:
        self.folder = folder

    @property
    def study(self) -> Path:
        return self.folder / "small.yaml"

    @property
    def results(self) -> Path:
        return self.folder / "results" / "small"

    def lineproof(self, *words: str, cores: int = 2, **environ: str) -> Run:
        """Run one command of the program, as `make` would."""
        known = {k: v for k, v in os.environ.items() if k not in ("PYTHONPATH", "NUMBA_CACHE_DIR")}
        env = {**known, "PYTHONPATH": str(self.folder / "workflow"), **environ}
        extra = ["--cores", str(cores)] if words[0] in ("study", "check") else []
        with subprocess.Popen(
            [sys.executable, "-m", "lineproof", *words, *extra],
            cwd=self.folder,
            env=env,
            stdout=subprocess.PIPE,
            stderr=subprocess.PIPE,
            text=True,
            start_new_session=True,
        ) as running:
            try:
                out, err = running.communicate(timeout=HANG)
            except subprocess.TimeoutExpired:
                os.killpg(running.pid, signal.SIGKILL)
                raise
        return Run(running.returncode, err + out)

    def run(self, **options: object) -> Run:
        """Run the study; it must succeed."""
        result = self.lineproof("study", "small.yaml", **options)
        assert result.status == 0, result.text
        return result

    def edit(self, file: str, old: str, new: str) -> None:
        """Replace text that must be there."""
        path = self.folder / file
        text = path.read_text(encoding="utf-8")
        assert old in text, f"{old!r} is not in {file}"
        path.write_text(text.replace(old, new), encoding="utf-8")

    def append(self, file: str, text: str) -> None:
        """Add text to the end of a file."""
        path = self.folder / file
        path.write_text(path.read_text(encoding="utf-8") + text, encoding="utf-8")

    def hashes(self, *parts: str) -> dict[str, str]:
        """SHA-256 of every file below parts of the results."""
        return {
            str(file.relative_to(self.results)): hashlib.sha256(file.read_bytes()).hexdigest()
            for file in self.files(*parts)
        }

    def files(self, *parts: str) -> list[Path]:
        """Every file below parts of the results, each a file or a folder."""
        found = [
            f for part in parts for f in (self.results / part, *(self.results / part).rglob("*"))
        ]
        return sorted(file for file in found if file.is_file())


def deliver(project: Project, last: str | None) -> None:
    """Write the raw files, with nothing later than the month `last`."""
    raw = project.folder / "raw"
    raw.mkdir(exist_ok=True)
    for name, text in make_demo(n_securities=60, first="1990-01", last="2003-12", seed=7).items():
        if isinstance(text, str):
            lines = text.splitlines(keepends=True)
            kept = [line for line in lines[1:] if last is None or not _after(line, last)]
            (raw / name).write_text("".join([lines[0], *kept]), encoding="utf-8")


def _after(line: str, last: str) -> bool:
    month = re.search(r"\b(?:19|20)\d\d-\d\d\b", line)
    return month is not None and month[0] > last


def copy_program(folder: Path, study: str = STUDY) -> Project:
    """The program without results, with a small study's file; kernels come compiled, as after set-up."""
    ignored = shutil.ignore_patterns("*.pyc")
    shutil.copytree(ROOT / "workflow", folder / "workflow", ignore=ignored)
    shutil.copy2(ROOT / "Snakefile", folder / "Snakefile")
    project = Project(folder)
    project.study.write_text(study, encoding="utf-8")
    return project


@pytest.fixture(scope="session")
def finished(tmp_path_factory: pytest.TempPathFactory) -> Project:
    """The small study on its first delivery, run once; not to be changed."""
    project = copy_program(tmp_path_factory.mktemp("finished") / "project")
    deliver(project, LAST_OF_FIRST_DELIVERY)
    project.run()
    return project


@pytest.fixture
def project(finished: Project, tmp_path: Path) -> Project:
    """A copy of the finished study, file times included, for a test to change."""
    shutil.copytree(finished.folder, tmp_path / "project", symlinks=True)
    return Project(tmp_path / "project")
