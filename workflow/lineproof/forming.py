"""Read what a set of test assets is made from, and form it by its design."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import pandas as pd

from lineproof import catalog, store
from lineproof.designs import DESIGNS, Design
from lineproof.frequency import FREQUENCIES
from lineproof.intake.series import read_series
from lineproof.periods import periods_of
from lineproof.ranking import split_rank
from lineproof.sorting import Sorted, sort_ranked, take_supplied

_PANEL_COLUMNS = ["security", "date", "total_return", "excess_return", "size", "eligible"]


def form_portfolios(
    sources: Sequence[str], market: pd.DataFrame, *, design: str, **options: Any
) -> Sorted:
    """Test assets by one design of the registry, from its source files and its options."""
    return catalog.load(DESIGNS[design])(sources, market, **options)


def from_single_window(sources: Sequence[str], market: pd.DataFrame, **options: Any) -> Sorted:
    """Ranked on one variable, such as Black, Jensen and Scholes (1972) do on beta: the sources are the panel and the
    betas named."""
    return _ranked(sources, market, **options)


def from_double_sort(sources: Sequence[str], market: pd.DataFrame, **options: Any) -> Sorted:
    """Ranked on two variables, such as Fama and French (1992) do; the sources as of a single window."""
    return _ranked(sources, market, **options)


def from_three_windows(sources: Sequence[str], market: pd.DataFrame, **options: Any) -> Sorted:
    """Ranked on the betas of one window, with ex-ante betas from the next and held for a third, in blocks that follow
    one another (Fama and MacBeth 1973); the sources as of a single window."""
    return _ranked(sources, market, **options)


def _ranked(
    sources: Sequence[str],
    market: pd.DataFrame,
    *,
    estimates: Sequence[str],
    frequency: str = "monthly",
    **options: Any,
) -> Sorted:
    plain = {key: tuple(v) if isinstance(v, list) else v for key, v in options.items()}
    design = Design(**plain)
    wanted = [split_rank(each, estimates) for each in (*design.rank_on, *design.ante_betas)]
    further = {column for table, column in wanted if table is None}
    if design.breakpoints is not None:
        further.add(design.breakpoints["column"])
    further -= {*_PANEL_COLUMNS, "return"}
    panel = store.read_table(sources[0], [*_PANEL_COLUMNS, *sorted(further)])
    tables = {
        name: store.read_table(path, _columns(name, wanted))
        for name, path in zip(estimates, sources[1:], strict=True)
    }
    periods = periods_of(frequency, market["date"].to_numpy())
    return sort_ranked(panel, tables, design, periods=periods, market=market)


def _columns(table: str, wanted: list[tuple[str | None, str]]) -> list[str]:
    found = {column for name, column in wanted if name == table}
    return ["security", "date", *sorted(found)]


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
