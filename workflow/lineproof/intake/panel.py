"""Chunks of the panel as the rows that are written to disk."""

from __future__ import annotations

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
    n_days: np.ndarray | None = None,
) -> pd.DataFrame:
    """The rows of a chunk as a piece of the panel: see `frames`. The arrays are (n_rows,)."""
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
    if n_days is not None:
        columns["n_days"] = n_days
    further = {name: _texts(*of) for name, of in chunk.texts.items()}
    table = pa.table({name: _array(values) for name, values in {**columns, **further}.items()})
    return table.to_pandas()


def _texts(codes: np.ndarray, texts: list[str]) -> pa.Array:
    return pa.DictionaryArray.from_arrays(codes, pa.array(texts, pa.string())).cast(pa.string())


def _array(values: np.ndarray | pa.Array) -> pa.Array:
    """Without nulls: a missing number stays NaN."""
    return values if isinstance(values, pa.Array) else pa.array(values, from_pandas=False)
