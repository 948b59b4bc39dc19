"""The commands: `study`, `check`, `test`, `lint`, `bench`, `docs`."""

from __future__ import annotations

import argparse
import contextlib
import io
import os
import subprocess
import sys
import time
from pathlib import Path

from lineproof.environment import settle
from lineproof.problems import KnownProblem
from lineproof.provenance import WORKFLOW

ROOT = WORKFLOW.parent


def main(words: list[str] | None = None) -> int:
    """Run one command; returns the exit status: 0 done, 1 a failure while running, 2 nothing was run."""
    settle(os.environ)
    parser = _parser()
    if not (sys.argv[1:] if words is None else words):
        parser.print_help()
        return 0
    given, rest = parser.parse_known_args(words)
    if given.command in _DEVELOPING:
        return _develop(given.command, rest)
    if rest:
        parser.error(f"unknown words: {' '.join(rest)}")
    if given.command == "compile":
        from lineproof import sorting
        from lineproof.intake import warm_up
        from lineproof.stats import windows

        warm_up.warm_up()
        windows.warm_up()
        sorting.warm_up()
        return 0
    try:
        return _run(given)
    except KnownProblem as problem:
        print(problem, file=sys.stderr)
        return 2


def _parser() -> argparse.ArgumentParser:
    about = "Is beta priced? From raw returns to a printed study."
    parser = argparse.ArgumentParser(prog="lineproof", description=about)
    commands = parser.add_subparsers(dest="command", required=True, metavar="command")
    studying = {
        "study": "run a study, or what of it is out of date",
        "check": "check a study file and its data only",
    }
    for name, said in studying.items():
        command = commands.add_parser(name, help=said)
        command.add_argument(
            "file", nargs="?", default=str(ROOT / "config" / "kestrel.yaml"), help="the study file"
        )
        command.add_argument(
            "--cores", type=int, default=os.cpu_count(), help="processor cores to use (all)"
        )
        command.add_argument(
            "--profile", default="local", help="profile under workflow/profiles (local)"
        )
    for name, (said, _) in _DEVELOPING.items():
        commands.add_parser(name, help=said, add_help=False)
    commands.add_parser("compile", help="compile the numeric kernels, as the set-up does")
    return parser


_DEVELOPING = {
    "test": (
        "run the tests",
        [["-m", "pytest", "-q", "-n", "2", "--dist", "loadfile", "--ignore=tests/bench", "tests"]],
    ),
    "lint": (
        "check style",
        [
            ["-m", "ruff", "check", "."],
            ["-m", "ruff", "format", "--check", "."],
            ["-m", "snakefmt", "--check", "Snakefile", "workflow/rules"],
        ],
    ),
    "bench": (
        "measure speed as ratios",
        [["-m", "pytest", "-q", "-s", "tests/bench"]],
    ),
    "docs": ("write config/README.md anew from the schema", [["-m", "lineproof.documenting"]]),
}


def _develop(name: str, more: list[str]) -> int:
    os.chdir(ROOT)
    for command in _DEVELOPING[name][1]:
        status = subprocess.run([sys.executable, *command, *more], check=False).returncode
        if status:
            return status
    return 0


def _run(given: argparse.Namespace) -> int:
    from lineproof.extracts import fetch_extracts
    from lineproof.locking import only_run_of
    from lineproof.study import load_study

    path = Path(given.file).resolve()
    os.chdir(ROOT)
    study = load_study(path.relative_to(ROOT) if path.is_relative_to(ROOT) else path)
    began = time.monotonic()
    with only_run_of(study.folder):
        fetch_extracts(study)
        status, steps = _snakemake(
            given, study.path, "study" if given.command == "study" else "data"
        )
    if status:
        return status
    if given.command == "check":
        from lineproof.checking import summary

        print(summary(study))
    elif steps:
        print(f"{steps} steps in {time.monotonic() - began:.0f} s: {study.folder}/report.html")
    else:
        print(f"{study.name} is up to date, nothing to do: {study.folder}/report.html")
    return 0


def _snakemake(given: argparse.Namespace, study: Path, target: str) -> tuple[int, int]:
    """Run Snakemake in this process; returns its exit status and the number of steps done."""
    from snakemake.cli import main as snakemake

    from lineproof.progress import CURRENT

    arguments = [
        target,
        *("--snakefile", str(ROOT / "Snakefile"), "--directory", str(ROOT)),
        *("--profile", str(WORKFLOW / "profiles" / given.profile)),
        *("--cores", str(given.cores), "--config", f"study={study}"),
        *("--logger", "lineproof", "--nolock"),
    ]
    status, aside = 0, io.StringIO()
    with contextlib.redirect_stderr(
        aside
    ):  # what is worth showing comes through the logger plug-in
        try:
            snakemake(arguments)
        except SystemExit as end:
            status = end.code if isinstance(end.code, int) else int(bool(end.code))
    if not CURRENT.end() and status:
        print(aside.getvalue().strip(), file=sys.stderr)
    return status, CURRENT.done


if __name__ == "__main__":
    sys.exit(main())
