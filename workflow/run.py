"""Start Lineproof with nothing but Python: `python3 workflow/run.py study` sets up its environment and runs.

Standard library only, since it runs before anything is installed. The environment lies in `.venv` of the project and
is made again when the pins change.
"""

import hashlib
import os
import subprocess
import sys
import venv
from pathlib import Path

ROOT = Path(__file__).resolve().parent.parent
ENVIRONMENT = ROOT / ".venv"
PYTHON = ENVIRONMENT / "bin" / "python"
PINS = {
    "run": ROOT / "workflow" / "envs" / "requirements.txt",
    "test": ROOT / "workflow" / "envs" / "requirements-dev.txt",
}
OLDEST = (3, 11)


def main(words: list[str]) -> int:
    """Set up what the first word needs, then hand over."""
    if sys.version_info < OLDEST:
        found = ".".join(str(part) for part in sys.version_info[:3])
        print(
            f"Lineproof needs Python 3.11 or newer; this is {found} ({sys.executable}).",
            file=sys.stderr,
        )
        return 2
    kind = "test" if words[:1] in (["test"], ["lint"], ["bench"], ["docs"]) else "run"
    problem = set_up(kind)
    if problem:
        print(problem, file=sys.stderr)
        return 2
    here = str(ROOT / "workflow")
    known = os.environ.get("PYTHONPATH")
    os.environ["PYTHONPATH"] = os.pathsep.join([here, known] if known else [here])
    os.environ.pop("PYTHONDONTWRITEBYTECODE", None)
    os.execv(PYTHON, [str(PYTHON), "-m", "lineproof", *words])


def set_up(kind: str) -> str:
    """Make the environment unless it stands; returns what went wrong, in words, or nothing."""
    enough = (
        ("run", "test") if kind == "run" else ("test",)
    )  # the tests' environment also runs studies
    if any(_is_current(name) for name in enough):
        return ""
    print(
        f"Setting up the environment in {ENVIRONMENT.name}; this is done once and takes a minute.",
        file=sys.stderr,
    )
    try:
        venv.EnvBuilder(with_pip=True, clear=not PYTHON.exists()).create(ENVIRONMENT)
        _run(
            "-m", "pip", "install", "--quiet", "--no-compile", "--require-hashes", "-r", PINS[kind]
        )
        _run(
            "-m",
            "compileall",
            "-q",
            "-j",
            "0",
            ENVIRONMENT / "lib",
            ROOT / "workflow" / "lineproof",
            may_fail=True,
        )
        _run("-m", "lineproof", "compile")
    except (subprocess.CalledProcessError, OSError) as error:
        said = (
            error.stderr.strip().splitlines()[-3:]
            if getattr(error, "stderr", None)
            else [str(error)]
        )
        return "The environment could not be set up:\n  " + "\n  ".join(said)
    _stamp(kind).write_text(_digest(kind), encoding="utf-8")
    return ""


def _stamp(kind: str) -> Path:
    return ENVIRONMENT / f"set-up-{kind}"


def _digest(kind: str) -> str:
    return hashlib.sha256(PINS[kind].read_bytes() + sys.version.encode()).hexdigest()


def _is_current(kind: str) -> bool:
    stamp = _stamp(kind)
    return PYTHON.exists() and stamp.exists() and stamp.read_text(encoding="utf-8") == _digest(kind)


def _run(*words: object, may_fail: bool = False) -> None:
    environ = {key: value for key, value in os.environ.items() if key != "PYTHONDONTWRITEBYTECODE"}
    environ["PYTHONPATH"] = str(ROOT / "workflow")
    command = [str(PYTHON), *(str(word) for word in words)]
    subprocess.run(
        command, check=not may_fail, capture_output=True, text=True, env=environ, cwd=ROOT
    )


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
