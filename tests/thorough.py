"""How hard properties are tried."""

from __future__ import annotations

import os

_MORE = 6


def examples(n: int) -> int:
    """So many examples, or six times as many before a release (LINEPROOF_THOROUGH=1)."""
    return _MORE * n if os.environ.get("LINEPROOF_THOROUGH") else n
