"""Read what a set of test assets is made from, and form it by its design."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import pandas as pd

from lineproof import catalog, store
from lineproof.designs import DESIGNS
from lineproof.frequency import FREQUENCIES
from lineproof.intake.series import read_series
from lineproof.periods import periods_of
from lineproof.sorting import Sorted, sort_single_window, take_supplied

_PANEL_COLUMNS = ["security", "date", "total_return", "excess_return", "size", "eligible"]


def form_portfolios(
    sources: Sequence[str], market: pd.DataFrame, *, design: str, **options: Any
) -> Sorted:
    """Test assets by one design of the registry, from its source files and its options."""
    return catalog.load(DESIGNS[design])(sources, market, **options)


def from_single_window(
    sources: Sequence[str], market: pd.DataFrame, *, frequency: str = "monthly", **options: Any
) -> Sorted:
    """Ranked on one estimate: the sources are the panel and the betas."""
    periods = periods_of(frequency, market["date"].to_numpy())
    panel = store.read_table(sources[0], _PANEL_COLUMNS)
    betas = store.read_table(sources[1], ["security", "date", "beta"])
    return sort_single_window(panel, betas, periods=periods, **options)


def from_supplied(
    sources: Sequence[str],
    market: pd.DataFrame,
    *,
    reading: dict[str, Any],
    returns_are: str,
    frequency: str = "monthly",
) -> Sorted:
    """Supplied as return series: the sources are raw files."""
    supplied = read_series(list(sources), reading, "return", frequency).values
    noun = FREQUENCIES[frequency].noun
    supplied = supplied.rename(columns={"return": "return_"})
    return take_supplied(supplied, market, returns_are=returns_are, noun=noun)
