"""Find the plain numbers in a column of text, compiled: `12`, `-0.5`, `.5`, `1e-3`, and nothing else."""

from __future__ import annotations

import numpy as np
import pyarrow as pa
from numba import njit

_ZERO, _NINE = ord("0"), ord("9")
_PLUS, _MINUS, _POINT, _SMALL_E, _LARGE_E = (ord(c) for c in "+-.eE")


def find_plain(array: pa.Array) -> np.ndarray:
    """Which texts are numbers in ASCII digits, with at most a sign, a point and an exponent: bool (n,).

    `array` is string or large_string without nulls.
    """
    _, offsets, data = array.buffers()
    wide = np.int64 if pa.types.is_large_string(array.type) else np.int32
    if len(array) == 0 or data is None:
        return np.zeros(len(array), bool)
    edges = np.frombuffer(offsets, wide)[array.offset : array.offset + len(array) + 1]
    return _find_plain(np.frombuffer(data, np.uint8), edges)


@njit(cache=True, nogil=True)
def _find_plain(text: np.ndarray, edges: np.ndarray) -> np.ndarray:
    found = np.empty(len(edges) - 1, np.bool_)
    for row in range(len(found)):
        at, end = edges[row], edges[row + 1]
        if at < end and (text[at] == _PLUS or text[at] == _MINUS):
            at += 1
        n_digits, at = _skip_digits(text, at, end)
        if at < end and text[at] == _POINT:
            n_more, at = _skip_digits(text, at + 1, end)
            n_digits += n_more
        sound = n_digits > 0
        if sound and at < end and (text[at] == _SMALL_E or text[at] == _LARGE_E):
            at += 1
            if at < end and (text[at] == _PLUS or text[at] == _MINUS):
                at += 1
            n_exponent, at = _skip_digits(text, at, end)
            sound = n_exponent > 0
        found[row] = sound and at == end
    return found


@njit(cache=True, nogil=True)
def _skip_digits(text: np.ndarray, at: int, end: int) -> tuple[int, int]:
    start = at
    while at < end and _ZERO <= text[at] <= _NINE:
        at += 1
    return at - start, at
