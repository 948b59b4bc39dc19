"""What rolling betas cost, against general libraries on the same arrays in the same run. Prints; asserts no time.

LINEPROOF_BENCH_SECURITIES sets the number of securities with monthly returns (25,000 by default, about 4.7 million
rows), and LINEPROOF_BENCH_ROWS that of daily rows of the whole stage (100 million by default; a quarter of it for the
comparison in memory).
"""

from __future__ import annotations

import os
import time
from collections.abc import Callable
from pathlib import Path

import bottleneck
import duckdb
import numpy as np
import pandas as pd
import polars as pl
import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from statsmodels.regression.rolling import RollingOLS
from tests.bench.test_intake import measured

from lineproof.stats.betas import rolling_lagged, rolling_ols
from lineproof.stats.windows import Sample

N_SECURITIES = int(os.environ.get("LINEPROOF_BENCH_SECURITIES", "25000"))
DAILY_ROWS = int(os.environ.get("LINEPROOF_BENCH_ROWS", "100000000"))
N_MONTHS, N_DAYS = 1150, 7500
SUBSET = 20  # securities that statsmodels gets
ROUNDS = 3
STAGE = """
import sys
from lineproof import store
from lineproof.estimation import estimate_betas
folder = sys.argv[1]
panels = store.read_securities(f"{folder}/panel.parquet", ["security", "date", "excess_return"])
pieces = estimate_betas(panels, store.read_table(f"{folder}/market.parquet"), name="bench", estimator="lagged",
                            window=252, min_obs=120, returns="daily", dated="daily", own={"lags": 1, "leads": 1})
store.write_together(pieces, {"betas": f"{folder}/betas.parquet"}, "daily")
"""


def draw(n_securities: int, n_periods: int, least: int) -> Sample:
    """Unbalanced and without holes, since the general libraries count rows."""
    rng = np.random.default_rng(1)
    first = rng.integers(0, n_periods - least, n_securities)
    life = least + rng.integers(0, n_periods // 3, n_securities)
    life = np.minimum(life, n_periods - first)
    starts = np.concatenate([[0], np.cumsum(life)])
    period = np.arange(starts[-1]) - np.repeat(starts[:-1] - first, life)
    market = rng.normal(0.005, 0.045, n_periods)
    excess = 1.1 * market[period] + rng.normal(0.0, 0.1, len(period))
    return Sample(starts, period, excess, market[:, None])


def seconds(run: Callable[[], object]) -> float:
    began = time.perf_counter()
    run()
    return time.perf_counter() - began


def report(title: str, runs: dict[str, Callable[[], object]], scale: dict[str, float]) -> None:
    """Medians of interleaved rounds, as multiples of the first; the first run of each compiles and does not count."""
    for run in runs.values():
        run()
    taken = {name: [] for name in runs}
    for _ in range(ROUNDS):
        for name, run in runs.items():
            taken[name].append(seconds(run) * scale.get(name, 1.0))
    middle = {name: float(np.median(times)) for name, times in taken.items()}
    ours = next(iter(middle.values()))
    print(f"\n{title}: {ours:.2f} s")
    for name, took in list(middle.items())[1:]:
        print(f"  {name}: {took / ours:.2f} × ours")


def with_polars(frame: pl.DataFrame, window: int, least: int) -> pl.DataFrame:
    x, y = pl.col("x"), pl.col("y")
    terms = {"n": pl.lit(1.0) + 0 * x, "sx": x, "sy": y, "sxx": x * x, "sxy": x * y, "syy": y * y}
    return frame.with_columns(
        **{
            name: term.rolling_sum(window, min_samples=least).over("security")
            for name, term in terms.items()
        }
    ).select(*_finished(*(pl.col(name) for name in terms)))


def _finished(n, sx, sy, sxx, sxy, syy):
    """beta, alpha, standard error, R² and residual variance from sums, in any library's terms."""
    cxx, cxy, cyy = sxx - sx * sx / n, sxy - sx * sy / n, syy - sy * sy / n
    beta = cxy / cxx
    variance = (cyy - beta * cxy) / (n - 2)
    found = (beta, sy / n - beta * sx / n, (variance / cxx) ** 0.5, beta * cxy / cyy, variance)
    if not isinstance(n, pl.Expr):
        return found
    return [e.alias(name) for name, e in zip(("b", "a", "se", "r2", "v"), found, strict=True)]


def with_duckdb(frame: pl.DataFrame, window: int) -> object:
    over = f"(PARTITION BY security ORDER BY period ROWS {window - 1} PRECEDING)"
    names = ("regr_slope(y, x)", "regr_intercept(y, x)", "regr_r2(y, x)", "regr_syy(y, x)")
    columns = ", ".join(f"{name} OVER {over}" for name in (*names, "regr_sxx(y, x)"))
    with duckdb.connect(config={"threads": 2}) as base:
        base.register("frame", frame.to_arrow())
        return base.sql(f"SELECT {columns} FROM frame").fetchnumpy()


def with_pandas(frame: pd.DataFrame, window: int, least: int) -> object:
    rolled = frame.groupby("security", sort=False)[["x", "y"]].rolling(window, least)
    mean, var = rolled.mean(), rolled.var()
    cov = rolled.cov(pairwise=True).xs("x", level=-1)["y"]
    beta = cov / var["x"]
    return beta, mean["y"] - beta * mean["x"], var["y"] - beta * cov


def with_bottleneck(dense: np.ndarray, market: np.ndarray, window: int, least: int) -> object:
    with np.errstate(all="ignore"):
        known = ~np.isnan(dense)
        x = np.where(known, market, np.nan)
        terms = (known.astype(float), x, dense, x * x, x * dense, dense * dense)
        return _finished(*(bottleneck.move_sum(term, window, least, axis=1) for term in terms))


def with_statsmodels(sample: Sample, window: int) -> None:
    for first, last in zip(sample.starts[:SUBSET], sample.starts[1 : SUBSET + 1], strict=True):
        x = sample.factors[sample.period[first:last], 0]
        design = np.column_stack([np.ones(last - first), x])
        fitted = RollingOLS(sample.excess[first:last], design, window=window).fit()
        _ = fitted.params, fitted.bse, fitted.rsquared, fitted.mse_resid


def one_pass(sample: Sample, out: np.ndarray) -> None:
    """Read what is needed and write what is wanted, and nothing else."""
    np.copyto(out, sample.excess)
    sample.period.sum()


def as_frame(sample: Sample) -> pl.DataFrame:
    owner = np.repeat(np.arange(len(sample.starts) - 1), np.diff(sample.starts))
    x = sample.factors[sample.period, 0]
    columns = {"security": owner, "period": sample.period, "x": x, "y": sample.excess}
    return pl.DataFrame(columns)


@pytest.mark.filterwarnings("ignore::RuntimeWarning")
def test_months() -> None:
    window, least = 60, 60
    sample = draw(N_SECURITIES, N_MONTHS, least)
    n, frame = len(sample.excess), as_frame(sample)
    plain, out = frame.to_pandas(), np.empty((6, n))
    dense = np.full((N_SECURITIES, N_MONTHS), np.nan)
    dense[plain["security"], plain["period"]] = sample.excess
    share = n / sample.starts[SUBSET]
    report(
        f"{n:,} months, window {window}",
        {
            "ours": lambda: rolling_ols(sample, window=window, min_obs=least),
            "one pass in memory": lambda: one_pass(sample, out),
            "polars": lambda: with_polars(frame, window, least),
            "duckdb": lambda: with_duckdb(frame, window),
            "bottleneck, dense": lambda: with_bottleneck(
                dense, sample.factors[:, 0], window, least
            ),
            "pandas": lambda: with_pandas(plain, window, least),
            "statsmodels, extrapolated": lambda: with_statsmodels(sample, window),
        },
        {"statsmodels, extrapolated": share},
    )


def test_days() -> None:
    window = 252
    n_securities = DAILY_ROWS // 4 // 3000
    sample = draw(n_securities, N_DAYS, window)
    frame = as_frame(sample)
    options = {"window": window, "min_obs": window}
    report(
        f"{len(sample.excess):,} days, window {window}, one lag and one lead",
        {
            "ours": lambda: rolling_lagged(sample, lags=1, leads=1, **options),
            "polars, without lags": lambda: with_polars(frame, window, window),
        },
        {},
    )


def write_panel(folder: Path) -> int:
    """A panel of days in row groups as the intake writes it, and the market; the number of rows."""
    days = np.arange("1990-01-01", "2030-01-01", dtype="datetime64[D]")
    days = days[np.is_busday(days)][:N_DAYS].astype("datetime64[ms]")
    rng = np.random.default_rng(3)
    market = rng.normal(0.0003, 0.01, N_DAYS)
    columns = {"date": days, "market_excess": market, "riskless": np.zeros(N_DAYS)}
    pq.write_table(pa.table(columns), folder / "market.parquet")
    rows, number, writer = 0, 0, None
    while rows < DAILY_ROWS:
        names, parts = [], []
        for _ in range(250):
            first = int(rng.integers(0, N_DAYS - 300))
            life = int(min(300 + rng.integers(0, 7000), N_DAYS - first))
            names += [f"K{number:06d}"] * life
            parts.append(np.arange(first, first + life))
            number += 1
        at = np.concatenate(parts)
        excess = market[at] + rng.normal(0.0, 0.02, len(at))
        table = pa.table({"security": names, "date": days[at], "excess_return": excess})
        writer = writer or pq.ParquetWriter(
            folder / "panel.parquet", table.schema, compression="zstd"
        )
        writer.write_table(table, row_group_size=1 << 20)
        rows += len(at)
    assert writer is not None
    writer.close()
    return rows


def test_the_whole_stage(tmp_path: Path) -> None:
    rows = write_panel(tmp_path)
    taken, memory = measured(STAGE, str(tmp_path))
    n = pq.read_metadata(tmp_path / "betas.parquet").num_rows
    print(
        f"\n{rows:,} daily rows, Parquet to Parquet, {n:,} estimates: {taken:.1f} s, peak {memory:.2f} GiB"
    )
    assert n > 0
