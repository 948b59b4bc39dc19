"""The four eras of the demo market and the price of beta that is true in each."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pandas as pd


@dataclass(frozen=True)
class Era:
    """One stretch of months with a market line of its own.

    `ends` is the share of all months that has passed when the era ends; `intercept` and `slope`
    are the line of expected excess returns on beta, decimal a month. The market has a beta of
    one, so its expected excess return is their sum.
    """

    ends: float
    intercept: float
    slope: float

    @property
    def premium(self) -> float:
        """Expected excess return of the market, decimal a month."""
        return self.intercept + self.slope


ERAS: tuple[Era, ...] = (
    Era(ends=264 / 900, intercept=0.0000, slope=0.0070),  # the line the CAPM draws
    Era(ends=468 / 900, intercept=0.0040, slope=0.0005),  # nearly flat
    Era(ends=684 / 900, intercept=0.0055, slope=0.0025),  # a zero-beta rate far above the riskless
    Era(ends=900 / 900, intercept=0.0095, slope=-0.0035),  # more beta earns less
)


def era_of_month(n_months: int) -> np.ndarray:
    """Position in `ERAS` of each month: int array (n_months,), never decreasing."""
    ends = np.rint([era.ends * n_months for era in ERAS])
    return np.searchsorted(ends, np.arange(n_months), side="right")


def by_month(attribute: str, n_months: int) -> np.ndarray:
    """One true parameter of the eras ("intercept", "slope", "premium") for each month."""
    return np.array([getattr(era, attribute) for era in ERAS])[era_of_month(n_months)]


def era_table(months: pd.PeriodIndex) -> pd.DataFrame:
    """The truth about the eras: era (from 1), first, last (YYYY-MM), intercept, slope, premium."""
    era = era_of_month(len(months))
    text = months.strftime("%Y-%m").to_numpy()
    return pd.DataFrame(
        {
            "era": np.arange(1, len(ERAS) + 1),
            "first": [text[era == k][0] for k in range(len(ERAS))],
            "last": [text[era == k][-1] for k in range(len(ERAS))],
            "intercept": [each.intercept for each in ERAS],
            "slope": [each.slope for each in ERAS],
            "premium": [each.premium for each in ERAS],
        }
    )
