"""Securities as whole numbers: no text is built for the rows of a large panel."""

from __future__ import annotations

import numpy as np
import pandas as pd


def coded(security: pd.Series) -> tuple[np.ndarray, pd.Index]:
    """A code for each row, int (n_rows,), and the names the codes stand for.

    A categorical column gives the codes it has; text is numbered in order of appearance.
    """
    if isinstance(security.dtype, pd.CategoricalDtype):
        return security.cat.codes.to_numpy(), security.cat.categories
    codes, names = pd.factorize(security)
    return codes, pd.Index(names)


def starts_of(codes: np.ndarray) -> np.ndarray:
    """Row at which each run of one code begins, and the number of rows at the end: int64.

    In a table sorted by security this is one run a security.
    """
    changes = np.flatnonzero(codes[1:] != codes[:-1]) + 1
    first = [0] if len(codes) else []
    return np.concatenate([first, changes, [len(codes)]]).astype(np.int64)
