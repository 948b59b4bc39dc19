"""Start Lineproof with nothing but Python: `python3 workflow/run.py study` sets up its environment and runs.

Standard library only, since it runs before anything is installed. The environment lies in `.venv` of the project and
is made anew, from nothing, when the pins change.
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
    # The tests' environment also runs studies.
    if _is_current("test") or (kind == "run" and _is_current("run")):
        return ""
    print(
        f"Setting up the environment in {ENVIRONMENT.name}; this is done once and takes a few minutes.",
        file=sys.stderr,
    )
    try:
        # Packages for tests come on top of those of a run; anything else is cleared away first.
        on_top = any(_is_current(name) for name in PINS)
        venv.EnvBuilder(with_pip=True, clear=not on_top).create(ENVIRONMENT)
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
        return _said(error)
    _stamp(kind).write_text(_digest(kind), encoding="utf-8")
    return ""


def _said(error: subprocess.CalledProcessError | OSError) -> str:
    """What went wrong, and what to do where that is known; venv leaves the words of pip in `output`."""
    words = [getattr(error, name, None) for name in ("stderr", "output")]
    texts = [w.decode(errors="replace") if isinstance(w, bytes) else w for w in words if w]
    lines = [line for text in texts for line in text.strip().splitlines()[-3:]] or [str(error)]
    if "ensurepip" in f"{error}{texts}":
        lines.append(
            "→ Python lacks what makes environments. On Debian and Ubuntu: apt install python3-venv"
        )
    return "The environment could not be set up:\n  " + "\n  ".join(lines)


def _stamp(kind: str) -> Path:
    return ENVIRONMENT / f"set-up-{kind}"


def _digest(kind: str) -> str:
    """Of all pins an environment of this kind rests on: the tests' own are compiled on those of a run."""
    rests_on = [PINS["run"], PINS["test"]] if kind == "test" else [PINS["run"]]
    pins = b"".join(path.read_bytes() for path in rests_on)
    return hashlib.sha256(pins + sys.version.encode()).hexdigest()


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
