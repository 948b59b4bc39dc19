"""Settings of the process that numbers must not depend on, put in one place."""

from __future__ import annotations

import hashlib
from collections.abc import MutableMapping
from pathlib import Path

_WORKFLOW = Path(__file__).parent.parent

# One thread in linear algebra: sums are then taken in the same order whatever the cores, and
# jobs run side by side anyway.
_FIXED = {
    "OPENBLAS_NUM_THREADS": "1",
    "OMP_NUM_THREADS": "1",
    "MKL_NUM_THREADS": "1",
    "TZ": "UTC",
    "LC_ALL": "C.UTF-8",
    "MPLBACKEND": "Agg",
}


def settle(environ: MutableMapping[str, str]) -> None:
    """Set in `environ` what every job inherits; the package becomes importable and bytecode is kept."""
    environ.update(_FIXED)
    known = environ.get("PYTHONPATH", "").split(":")
    if str(_WORKFLOW) not in known:
        environ["PYTHONPATH"] = ":".join([str(_WORKFLOW), *filter(None, known)])
    environ.pop("PYTHONDONTWRITEBYTECODE", None)
    if "NUMBA_CACHE_DIR" not in environ:
        folder = _WORKFLOW.parent / ".venv" / "numba" / kernels_digest(_WORKFLOW / "lineproof")
        environ["NUMBA_CACHE_DIR"] = str(folder)


def kernels_digest(package: Path) -> str:
    """A short digest of every module that may hold compiled code.

    A compiled function is kept by the state of its own module only, but has those of others that it calls built in:
    were its folder not named by them all, a kernel could outlive the code it was made of.
    """
    digest = hashlib.sha256()
    for folder in ("stats", "intake"):
        for file in sorted((package / folder).rglob("*.py")):
            digest.update(f"{file.relative_to(package)}\0".encode() + file.read_bytes())
    return digest.hexdigest()[:16]
