"""How hard the program is tried: quickly, or before a release with LINEPROOF_THOROUGH=1."""

from __future__ import annotations

import os

IS_THOROUGH = bool(os.environ.get("LINEPROOF_THOROUGH"))
_MORE = 6


def examples(n: int) -> int:
    """So many examples, or six times as many before a release."""
    return _MORE * n if IS_THOROUGH else n
