"""A small random market with all that is awkward: late entries, leavers, holes and unknown sizes."""

from __future__ import annotations

import numpy as np
import pandas as pd

MONTHS = pd.date_range("1990-01-31", periods=66, freq="ME", unit="ms")
WINDOW = {"window": 24, "min_obs": 8}


def _trading_days() -> pd.DatetimeIndex:
    """Two years of a market that opens on Mondays and Thursdays, closed on a few of them within a month."""
    days = pd.date_range("1990-01-01", "1991-12-31", unit="ms")
    days = days[days.weekday.isin([0, 3])]
    inside = np.append(days.month[1:] == days.month[:-1], False)
    return days[~(inside & (np.arange(len(days)) % 17 == 5))]


DAYS = _trading_days()
DATES = {"monthly": MONTHS, "daily": DAYS}
WINDOWS = {"monthly": WINDOW, "daily": {"window": 40, "min_obs": 15}}


def draw_market(seed: int, frequency: str = "monthly") -> tuple[pd.DataFrame, pd.DataFrame]:
    """Panel, sorted by security and date, and market of a few dozen securities; decimal returns."""
    rng = np.random.default_rng(seed)
    dates = DATES[frequency]
    market = pd.DataFrame(
        {
            "date": dates,
            "market_excess": rng.normal(0.005, 0.045, len(dates)),
            "riskless": rng.uniform(0.001, 0.006, len(dates)),
        }
    )
    parts = [_security(f"S{k:02d}", market, rng) for k in range(int(rng.integers(15, 30)))]
    return pd.concat(parts, ignore_index=True), market


def _security(name: str, market: pd.DataFrame, rng: np.random.Generator) -> pd.DataFrame:
    n = len(market)
    first = int(rng.choice([0, 0, rng.integers(0, n // 2)]))
    last = int(rng.choice([n, n, rng.integers(n // 2, n)]))
    beta, noise = rng.uniform(0.2, 2.0), rng.normal(0.0, 0.08, n)
    total = np.maximum(market["riskless"] + beta * market["market_excess"] + noise, -0.95)
    total[rng.random(n) < 0.04] = np.nan
    size = rng.lognormal(4.0, 1.0) * np.cumprod(1 + total.fillna(0.0)) * rng.uniform(0.9, 1.1, n)
    size[rng.random(n) < 0.05] = np.nan
    frame = pd.DataFrame(
        {
            "security": name,
            "date": market["date"],
            "total_return": total,
            "excess_return": total - market["riskless"],
            "size": size,
            "price": rng.uniform(1.0, 50.0, n),
            "eligible": rng.random(n) < 0.85,
        }
    ).iloc[first:last]
    return frame[rng.random(len(frame)) > 0.03]
