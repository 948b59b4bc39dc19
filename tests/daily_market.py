"""An invented market of trading days: the raw files of a small daily study, and the tables its intake should make."""

from __future__ import annotations

import textwrap
from pathlib import Path

import numpy as np
import pandas as pd

N_SECURITIES = 40
FIRST, LAST = "2001-01-02", "2003-12-31"

STUDY = textwrap.dedent(
    """\
    study:
      {name: small, title: A small study of days, market_name: a small invented market, frequency: daily}
    data:
      returns: {file: raw/returns.csv, columns: {security: id, date: day, return: ret, size: cap, price: close}}
      market: {file: raw/market.csv, columns: {date: day, return: total_return}}
      riskless: {file: raw/riskless.csv, columns: {date: day, rate: bill}}
    betas:
      days120: {window: 120, min: 60}
    portfolios:
      four: {rank_on: days120, groups: 4}
      four_size: {rank_on: days120, groups: 4, weights: size}
    subperiods:
      full: {}
      second: {from: 2003-01}
    """
)


def draw_files(seed: int = 11) -> dict[str, pd.DataFrame]:
    """The raw tables: returns, market and riskless, by the names of the files; decimal returns."""
    rng = np.random.default_rng(seed)
    days = pd.bdate_range(FIRST, LAST, unit="ms")
    days = days[rng.random(len(days)) > 0.02]  # holidays
    riskless = np.round(rng.uniform(0.0001, 0.0002, len(days)), 6)
    market = np.round(0.0004 + 0.01 * rng.standard_normal(len(days)), 6)
    parts = [_security(f"K{k:03d}", days, market, rng) for k in range(N_SECURITIES)]
    return {
        "returns": pd.concat(parts, ignore_index=True),
        "market": pd.DataFrame({"day": days, "total_return": market}),
        "riskless": pd.DataFrame({"day": days, "bill": riskless}),
    }


def _security(
    name: str, days: pd.DatetimeIndex, market: np.ndarray, rng: np.random.Generator
) -> pd.DataFrame:
    """One security: some enter late, some leave early, and on a few days none trades."""
    beta = rng.uniform(0.3, 1.8)
    returns = np.round(beta * market + 0.015 * rng.standard_normal(len(days)), 6)
    price = np.round(20 * np.cumprod(1 + returns), 2)
    returns[rng.random(len(days)) < 0.02] = np.nan
    frame = pd.DataFrame(
        {"id": name, "day": days, "ret": returns, "cap": np.round(50 * price, 1), "close": price}
    )
    first = rng.integers(0, 300) if rng.random() < 0.3 else 0
    last = rng.integers(500, len(days)) if rng.random() < 0.2 else len(days)
    return frame.iloc[first:last]


def write_files(folder: Path, seed: int = 11) -> None:
    """Write the raw files as CSV."""
    folder.mkdir(parents=True, exist_ok=True)
    for name, frame in draw_files(seed).items():
        frame.to_csv(
            folder / f"{name}.csv", index=False, date_format="%Y-%m-%d", lineterminator="\n"
        )


def tables(seed: int = 11) -> tuple[pd.DataFrame, pd.DataFrame]:
    """Panel and market as the intake hands them on."""
    files = draw_files(seed)
    rate = files["riskless"]["bill"].to_numpy()
    market = pd.DataFrame(
        {
            "date": files["market"]["day"],
            "market_excess": files["market"]["total_return"].to_numpy() - rate,
            "riskless": rate,
        }
    )
    raw = files["returns"]
    known = raw["day"].map(pd.Series(rate, market["date"]))
    is_last = raw["id"].ne(raw["id"].shift(-1))
    panel = pd.DataFrame(
        {
            "security": raw["id"],
            "date": raw["day"],
            "total_return": raw["ret"],
            "excess_return": raw["ret"] - known,
            "size": raw["cap"],
            "price": raw["close"],
            "eligible": True,
            "leaves": is_last & (raw["day"] < market["date"].max()),
        }
    )
    return panel, market
