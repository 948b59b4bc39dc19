"""Settings of the process that numbers must not depend on, put in one place."""

from __future__ import annotations

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
    environ.setdefault("NUMBA_CACHE_DIR", str(_WORKFLOW.parent / ".venv" / "numba"))
