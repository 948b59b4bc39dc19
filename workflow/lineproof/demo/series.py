"""The demo's series of the market as a whole: calendar, riskless rate and market return."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pandas as pd

from lineproof.demo.eras import by_month, era_of_month

MARKET_SD = 0.045
TAIL_DF = 5
KEPT_MEAN_SHOCK = 0.15
LOWEST_YIELD, HIGHEST_YIELD = 0.005, 0.12


@dataclass(frozen=True)
class MarketSeries:
    """Series of the whole market, each of one number a month.

    `annual_yield` and `market` (total return a month) are decimal and rounded as the files print
    them, so whoever reads the files has exactly the numbers the securities were drawn with.
    """

    months: pd.PeriodIndex
    annual_yield: np.ndarray
    market: np.ndarray

    @property
    def riskless(self) -> np.ndarray:
        """Riskless return of each month, decimal: (1 + yearly yield)^(1/12) - 1."""
        return (1.0 + self.annual_yield) ** (1.0 / 12.0) - 1.0

    @property
    def dates(self) -> np.ndarray:
        """Last weekday of each month as ISO text (the invented exchange keeps no holidays)."""
        first_of_next = (self.months + 1).to_timestamp().to_numpy().astype("datetime64[D]")
        return np.busday_offset(first_of_next, -1, roll="forward").astype(str)


def heavy_tailed(rng: np.random.Generator, shape: tuple[int, ...]) -> np.ndarray:
    """Student t draws with `TAIL_DF` degrees of freedom, scaled to a variance of one."""
    return rng.standard_t(TAIL_DF, shape) * np.sqrt((TAIL_DF - 2) / TAIL_DF)


def mean_reverting(
    rng: np.random.Generator, shape: tuple[int, int], *, persistence: float, sd: float
) -> np.ndarray:
    """Stationary first-order autoregressions around zero, one a column: (n_months, n_paths)."""
    paths = rng.standard_normal(shape) * sd
    paths[1:] *= np.sqrt(1.0 - persistence**2)
    for month in range(1, shape[0]):
        paths[month] += persistence * paths[month - 1]
    return paths


def draw_market(rng: np.random.Generator, months: pd.PeriodIndex) -> MarketSeries:
    """Draw the riskless and the market series.

    The mean of the market's shocks within an era is cut to `KEPT_MEAN_SHOCK` of what was drawn.
    This is a choice for a demo: over twenty years the sampling error of a mean market return is
    as large as half the premium, and the stories of the eras would drown in it.
    """
    n_months = len(months)
    path = mean_reverting(rng, (n_months, 1), persistence=0.992, sd=1.2)[:, 0]
    annual_yield = LOWEST_YIELD + (HIGHEST_YIELD - LOWEST_YIELD) / (1.0 + np.exp(-path))
    annual_yield = np.round(annual_yield, 6)
    shock = MARKET_SD * heavy_tailed(rng, (n_months,))
    era = era_of_month(n_months)
    mean_shock = np.bincount(era, shock) / np.bincount(era)
    shock -= (1.0 - KEPT_MEAN_SHOCK) * mean_shock[era]
    riskless = (1.0 + annual_yield) ** (1.0 / 12.0) - 1.0
    market = np.round(riskless + by_month("premium", n_months) + shock, 6)
    return MarketSeries(months=months, annual_yield=annual_yield, market=market)
