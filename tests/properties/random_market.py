"""A small random market with all that is awkward: late entries, leavers, holes and unknown sizes."""

from __future__ import annotations

import numpy as np
import pandas as pd

MONTHS = pd.date_range("1990-01-31", periods=66, freq="ME", unit="ms")
WINDOW = {"window": 24, "min_obs": 8}


def draw_market(seed: int) -> tuple[pd.DataFrame, pd.DataFrame]:
    """Panel, sorted by security and date, and market of a few dozen securities; decimal returns."""
    rng = np.random.default_rng(seed)
    market = pd.DataFrame(
        {
            "date": MONTHS,
            "market_excess": rng.normal(0.005, 0.045, len(MONTHS)),
            "riskless": rng.uniform(0.001, 0.006, len(MONTHS)),
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
