"""Chunks of the panel as the rows that are written to disk."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
import pandas as pd
import pyarrow as pa

from lineproof.intake.chunk import Chunk
from lineproof.periods import Periods


def panel_frame(
    chunk: Chunk,
    periods: Periods,
    excess: np.ndarray,
    eligible: np.ndarray,
    leaves: np.ndarray,
    more: Mapping[str, np.ndarray],
) -> pd.DataFrame:
    """The rows of a chunk as a piece of the panel: see `frames`. The arrays are (n_rows,); `more` has further ones."""
    n = len(chunk)
    size = chunk.values.get("size", np.full(n, np.nan))
    columns = {
        "security": _texts(chunk.owner, chunk.names.tolist()),
        "date": periods.date(chunk.period).astype("datetime64[ms]"),
        "total_return": chunk.values["total_return"],
        "excess_return": excess,
        "size": np.where(size > 0, size, np.nan),
        "price": chunk.values.get("price", np.full(n, np.nan)),
        "eligible": eligible,
        "leaves": leaves,
    }
    further = {name: _texts(*of) for name, of in chunk.texts.items()}
    every = {**columns, **more, **further}
    table = pa.table({name: _array(values) for name, values in every.items()})
    return table.to_pandas()


def _texts(codes: np.ndarray, texts: list[str]) -> pa.Array:
    return pa.DictionaryArray.from_arrays(codes, pa.array(texts, pa.string())).cast(pa.string())


def _array(values: np.ndarray | pa.Array) -> pa.Array:
    """Without nulls: a missing number stays NaN."""
    return values if isinstance(values, pa.Array) else pa.array(values, from_pandas=False)
