"""Raw files of any size for the benchmarks, by date and then security, as vendors deliver them."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import numpy as np
import pyarrow as pa
import pyarrow.csv
import pyarrow.parquet as pq

PERIODS_AT_ONCE = 40


def write_returns(path: Path, n_securities: int, dates: np.ndarray, seed: int = 1) -> int:
    """Write `security,date,return,size` as CSV or Parquet, by the ending; returns the number of rows.

    Securities enter and leave; one return in 100,000 is no number in the CSV and impossible in Parquet.
    """
    rows, writer = 0, None
    for table in _pieces(n_securities, dates, seed, as_text=path.suffix == ".csv"):
        if writer is None:
            make = pyarrow.csv.CSVWriter if path.suffix == ".csv" else pq.ParquetWriter
            writer = make(path, table.schema)
        writer.write_table(table)
        rows += len(table)
    assert writer is not None
    writer.close()
    return rows


def write_series(path: Path, dates: np.ndarray, name: str, level: float) -> None:
    """Write a series with one value a date as CSV."""
    rng = np.random.default_rng(2)
    values = level + 0.01 * rng.standard_normal(len(dates)) * (name == "market")
    lines = [f"{date},{value:.6f}\n" for date, value in zip(dates, values, strict=True)]
    path.write_text(f"date,{name}\n" + "".join(lines), encoding="ascii")


def _pieces(
    n_securities: int, dates: np.ndarray, seed: int, *, as_text: bool
) -> Iterator[pa.Table]:
    rng = np.random.default_rng(seed)
    names = pa.array([f"K{number:06d}" for number in rng.permutation(n_securities)])
    first = rng.integers(0, len(dates) // 2, n_securities)
    last = first + rng.integers(len(dates) // 4, len(dates), n_securities)
    for start in range(0, len(dates), PERIODS_AT_ONCE):
        at = np.arange(start, min(start + PERIODS_AT_ONCE, len(dates)))[:, None]
        period, owner = np.nonzero((at >= first) & (at < last))
        n = len(period)
        returns = np.round(rng.standard_t(5, n) * 0.02, 6).clip(-0.9, 3.0)
        bad = rng.random(n) < 1e-5
        if as_text:
            column = pa.array(returns).cast(pa.string())
            column = pa.compute.if_else(pa.array(bad), "halted", column)
        else:
            column = pa.array(np.where(bad, -5.0, returns))
        yield pa.table(
            {
                "security": names.take(pa.array(owner)),
                "date": pa.array(dates[start + period].astype("datetime64[D]")),
                "return": column,
                "size": np.round(rng.lognormal(5.0, 1.5, n), 2),
            }
        )
