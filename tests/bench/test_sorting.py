"""Ranking a panel and holding its groups, against pandas and Polars in the same run. Prints; asserts no time.

All three form ten groups at the end of each month by the quantiles of beta and weigh the next month's returns by lagged
size; that all three find the same is asserted. LINEPROOF_BENCH_SECURITY_MONTHS sets the rows, 4.7 million by default.
"""

from __future__ import annotations

import os
import resource
import time
from collections.abc import Callable
from typing import Any

import numpy as np
import pandas as pd
import pytest

from lineproof import formed_tables
from lineproof.designs import Design
from lineproof.sorting import Sorted, form_groups, sort_ranked

polars = pytest.importorskip("polars")

N_ROWS = int(os.environ.get("LINEPROOF_BENCH_SECURITY_MONTHS", "4700000"))
N_MONTHS, GROUPS = 1150, 10


def made_panel(n_rows: int) -> tuple[pd.DataFrame, pd.DataFrame]:
    """Unbalanced histories of up to 352 months, as many alive in any month, and a beta for every row."""
    rng = np.random.default_rng(47)
    dates = pd.date_range("1926-01-31", periods=N_MONTHS, freq="ME", unit="ms")
    lengths = rng.integers(24, 353, n_rows // 160 + 1)
    first = rng.integers(-lengths + 1, N_MONTHS)
    lengths = np.minimum(first + lengths, N_MONTHS) - np.maximum(first, 0)
    spans = zip(np.maximum(first, 0), lengths, strict=True)
    month = np.concatenate([np.arange(a, a + n) for a, n in spans])
    names = pd.Index([f"{number:06d}" for number in range(len(lengths))], dtype=str)
    security = pd.Categorical.from_codes(np.repeat(np.arange(len(lengths)), lengths), names)
    n = len(month)
    excess = rng.normal(0.005, 0.1, n).clip(-0.9)
    panel = pd.DataFrame(
        {
            "security": security,
            "date": dates[month],
            "total_return": excess + 0.003,
            "excess_return": excess,
            "size": rng.lognormal(5, 2, n),
            "eligible": True,
        }
    )
    return panel, panel[["security", "date"]].assign(beta=rng.normal(1, 0.5, n))


DESIGN = Design(
    name="ten", rank_on=("b",), ante_betas=("b",), groups=(GROUPS,), weights="size",
    form_each="month", hold=1,
)  # fmt: skip


def everything(panel: pd.DataFrame, betas: pd.DataFrame) -> Sorted:
    """With the tables of members, formations and transitions, which the others do not make."""
    return sort_ranked(panel, {"b": betas}, DESIGN)


def ours(panel: pd.DataFrame, betas: pd.DataFrame) -> pd.DataFrame:
    returns = formed_tables.returns(form_groups(panel, {"b": betas}, DESIGN))
    return returns.pivot(index="date", columns="asset", values="excess_return")


def with_pandas(panel: pd.DataFrame, betas: pd.DataFrame) -> pd.DataFrame:
    """A function a month for the groups, and one a month and group for the return."""
    whole = panel.merge(betas, on=["security", "date"])
    whole["group"] = whole.groupby("date")["beta"].transform(
        lambda beta: pd.qcut(beta, GROUPS, labels=False)
    )
    before = whole.groupby("security", observed=True)
    whole["held"], whole["lagged"] = before["group"].shift(), before["size"].shift()
    held = whole.dropna(subset=["held", "lagged"])
    cells = held.groupby(["date", "held"])[["excess_return", "lagged"]]
    return cells.apply(lambda c: np.average(c["excess_return"], weights=c["lagged"])).unstack()


def with_polars(panel: Any, betas: Any) -> Any:
    """The same in one lazy query."""
    pl = polars
    value = pl.col("beta")
    cuts = [value.quantile(k / GROUPS, "linear") < value for k in range(1, GROUPS)]
    held = [
        pl.col(name).shift().over("security").alias(new)
        for name, new in (("group", "held"), ("size", "lagged"))
    ]
    weighed = (pl.col("excess_return") * pl.col("lagged")).sum() / pl.col("lagged").sum()
    query = panel.lazy().join(betas.lazy(), on=["security", "date"])
    query = query.with_columns(group=pl.sum_horizontal(cuts).over("date"))
    query = query.sort("security", "date").with_columns(held).drop_nulls(["held", "lagged"])
    return query.group_by("date", "held").agg(weighed.alias("r")).sort("date", "held").collect()


def best_of(times: int, function: Callable, *given: Any) -> tuple[float, Any]:
    spent = []
    for _ in range(times):
        start = time.perf_counter()
        found = function(*given)
        spent.append(time.perf_counter() - start)
    return min(spent), found


def test_sorts_and_portfolio_returns(capsys: pytest.CaptureFixture) -> None:
    everything(*made_panel(20_000))  # compiles
    panel, betas = made_panel(N_ROWS)
    low = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
    whole, _ = best_of(3, everything, panel, betas)
    mine, returns = best_of(3, ours, panel, betas)
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
    plain = [frame.assign(security=frame["security"].cat.codes) for frame in (panel, betas)]
    lazy, found = best_of(3, with_polars, *(polars.from_pandas(frame) for frame in plain))
    apply, slow = best_of(1, with_pandas, panel, betas)
    wide = found.to_pandas().pivot(index="date", columns="held", values="r")
    # Weighted means of a few hundred returns in another order.
    np.testing.assert_allclose(returns.to_numpy(), wide.to_numpy(), rtol=1e-9, atol=1e-12)
    np.testing.assert_allclose(returns.to_numpy(), slow.to_numpy(), rtol=1e-9, atol=1e-12)
    with capsys.disabled():
        print(
            f"\n{len(panel):,} security-months, {N_MONTHS} formations: ours {mine:.2f} s, {whole:.2f} s with members, "
            f"formations and transitions; Polars {lazy / mine:.1f} times that, pandas apply {apply / mine:.1f} times; "
            f"peak {peak / 2**20:.2f} GiB, of which {low / 2**20:.2f} before"
        )
