"""Random panels as chunks, for the tests of the intake's observers."""

from __future__ import annotations

import numpy as np
import pandas as pd

from lineproof.intake.chunk import Chunk
from lineproof.periods import Months, Periods, TradingDays

MONTHS = Months()


def draw_panel(seed: int, n_securities: int = 12, periods: Periods = MONTHS) -> pd.DataFrame:
    """Rows sorted by security and period, with holes, missing and equal values; columns as a chunk's."""
    rng = np.random.default_rng(seed)
    low, high = (1957 * 12, 1983 * 12) if periods.noun == "month" else (0, len(periods.days))
    parts = []
    for place in range(n_securities):
        begin, end = sorted(rng.integers(low, high, 2).tolist())
        numbers = np.arange(begin, end + 1)
        numbers = numbers[(rng.random(len(numbers)) < 0.9) & (numbers < high)]
        size = rng.choice([0.0003, 0.05, 2.0])
        returns = rng.choice(
            [-0.5, 0.0, 0.25, 0.1235], len(numbers)
        )  # ties and numbers binary cannot hold
        drawn = rng.random(len(numbers)) < 0.7
        returns[drawn] = size * rng.standard_t(3, drawn.sum())
        returns[rng.random(len(numbers)) < 0.1] = np.nan
        parts.append(
            pd.DataFrame(
                {
                    "security": f"S{place:03d}",
                    "period": numbers,
                    "total_return": returns,
                    "size": np.where(rng.random(len(numbers)) < 0.2, np.nan, 1.5),
                    "price": rng.uniform(1, 50, len(numbers)),
                    "sector": rng.choice(["", "mines", "banks"], len(numbers)),
                }
            )
        )
    panel = pd.concat(parts, ignore_index=True)
    return panel.assign(day=periods.date(panel["period"].to_numpy()))


def trading_days(first: str, last: str) -> TradingDays:
    """Weekdays between two dates."""
    return TradingDays(pd.bdate_range(first, last).to_numpy().astype("datetime64[D]"))


def chunk_of(panel: pd.DataFrame) -> Chunk:
    """All rows of a panel as one chunk."""
    names, owner = np.unique(panel["security"].to_numpy(str), return_inverse=True)
    texts, code = np.unique(panel["sector"].to_numpy(str), return_inverse=True)
    values = {name: panel[name].to_numpy(float) for name in ("total_return", "size", "price")}
    return Chunk(
        names=names,
        start=np.searchsorted(owner, np.arange(len(names) + 1)),
        period=panel["period"].to_numpy(np.int64),
        day=panel["day"].to_numpy().astype("datetime64[D]"),
        values={"return_": values["total_return"], **values},
        texts={"sector": (code.astype(np.int32), texts.tolist())},
        code=np.full(len(panel), -1, np.int8),
    )


def cut(panel: pd.DataFrame, at: set[int]) -> list[Chunk]:
    """The panel as chunks, cut before the securities of these positions."""
    names = panel["security"].unique()
    place = panel["security"].map({name: k for k, name in enumerate(names)}).to_numpy()
    part = np.searchsorted(sorted(at), place, side="right")
    return [chunk_of(rows) for _, rows in panel.groupby(part)]
