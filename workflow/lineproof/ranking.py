"""Who is ranked into which group when: formation dates, candidates and groups, from what is known at each date."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
import pandas as pd

from lineproof import catalog
from lineproof.designs import RULES, WEIGHTS, Design
from lineproof.periods import ABSENT, Periods
from lineproof.securities import coded, starts_of
from lineproof.stats.holding import Formations, in_order, matched
from lineproof.stats.sorts import sorted_cells

_NO_ROW = -1


@dataclass(frozen=True)
class PanelRows:
    """The panel as numbers: `owner` (n_rows,) is each row's security, a place in `names` and `starts`.

    `period` (n_rows,) counts from `low`, and is −1 where a row lies in no period; `month` and
    `closes` (n_periods,) say of each period which month it lies in and whether it ends it.
    """

    panel: pd.DataFrame
    names: pd.Index
    starts: np.ndarray
    owner: np.ndarray
    period: np.ndarray
    low: int
    month: np.ndarray
    closes: np.ndarray
    periods: Periods

    @classmethod
    def of(cls, panel: pd.DataFrame, periods: Periods) -> PanelRows:
        """The rows of a panel that is sorted by security and date, and has a row a period."""
        code, names = coded(panel["security"])
        starts = starts_of(code)
        owner = np.repeat(np.arange(len(starts) - 1, dtype=np.int32), np.diff(starts))
        number = periods.number(panel["date"].to_numpy())
        known = number != ABSENT
        low, high = (int(number[known].min()), int(number[known].max())) if known.any() else (0, -1)
        every = np.arange(low, high + 1)
        return cls(
            panel=panel,
            names=names[code[starts[:-1]]],
            starts=starts,
            owner=owner,
            period=np.where(known, number - low, _NO_ROW).astype(np.int32),
            low=low,
            month=periods.month(every),
            closes=periods.closes_month(every),
            periods=periods,
        )

    def dates(self, period: np.ndarray) -> np.ndarray:
        """The dates of periods that count from `low`."""
        return self.periods.date(np.asarray(period) + self.low).astype("datetime64[ms]")

    def of_estimates(self, table: pd.DataFrame, columns: Sequence[str]) -> list[np.ndarray]:
        """Columns of a table of estimates beside the rows of the panel, (n_rows,) each; NaN where there is none."""
        if not columns:
            return []
        code, names = coded(table["security"])
        starts = starts_of(code)
        place = names[code[starts[:-1]]].get_indexer(self.names)
        number = self.periods.number(table["date"].to_numpy())
        period = np.where(number == ABSENT, _NO_ROW, number - self.low).astype(np.int32)
        given = (self.starts, self.period, starts, period, place)
        return [matched(*given, table[column].to_numpy(dtype=float)) for column in columns]

    def earlier(self, row: np.ndarray, months: int) -> np.ndarray:
        """Of the security of each row, the row that closes the month so many months before; −1 where it has none."""
        if not months:
            return row
        wanted = self.closing(self.month[self.period[row]] - months)
        known = np.flatnonzero(self.period >= 0)
        span = len(self.month)
        keys = self.owner[known].astype(np.int64) * span + self.period[known]
        key = np.where(wanted < 0, -1, self.owner[row].astype(np.int64) * span + wanted)
        at = np.minimum(np.searchsorted(keys, key), len(keys) - 1)
        return np.where(keys[at] == key, known[at], _NO_ROW)

    def closing(self, month: np.ndarray) -> np.ndarray:
        """The period that closes each month, −1 where none does."""
        at = np.searchsorted(self.month, month, side="right") - 1
        closes = (at >= 0) & (self.month[at] == month) & self.closes[at]
        return np.where(closes, at, _NO_ROW)

    @cached_property
    def last(self) -> np.ndarray:
        """The last period in which each security has a row; (n_securities,)."""
        return np.maximum.reduceat(self.period, self.starts[:-1])


@dataclass(frozen=True)
class Ranked:
    """Groups at each formation; `month` (n_formations,) is that of each, `most` the most who could be ranked at one."""

    formations: Formations
    month: np.ndarray
    most: int

    @cached_property
    def formation_of(self) -> np.ndarray:
        """The formation of each member, (n_members,)."""
        starts = self.formations.starts
        return np.repeat(np.arange(len(starts) - 1), np.diff(starts))


def rank(
    rows: PanelRows,
    ranks: Sequence[np.ndarray],
    antes: Sequence[np.ndarray],
    marks: np.ndarray | None,
    design: Design,
) -> Ranked:
    """Form groups by a design.

    `ranks` are the variables to rank on, `antes` the ex-ante betas by year, `marks` whether a row
    sets breakpoints, None if every one does; all (n_rows,). Who can be ranked at the end of month s has a
    row there that passes the screens, a weight above zero, an ex-ante beta where the design asks for one, and the
    variables, dated s or as many months earlier as the design estimates anew.
    """
    can, ranked_at = _candidates(rows, ranks, antes, design)
    in_each = np.bincount(rows.period[can], minlength=len(rows.month))
    formed = np.flatnonzero(in_each)
    counts = in_each[formed]
    starts = np.cumsum(counts) - counts
    rule, kept, groups = catalog.load(RULES[design.rule]), [], []
    months = rows.month[formed].tolist()
    for place, month in enumerate(months):
        if design.in_blocks and kept and (month - months[kept[0]]) % design.hold:
            continue  # a block must end before the next begins
        part = slice(starts[place], starts[place] + counts[place])
        values = [each[ranked_at[part]] for each in ranks]
        of_part = None if marks is None else marks[can[part]]
        found = sorted_cells(values, design.groups, rule, of_part, dependent=design.dependent)
        if found is not None:
            kept.append(place)
            groups.append(found)
    if len(kept) < len(formed):
        members = [np.arange(starts[place], starts[place] + counts[place]) for place in kept]
        can = can[np.concatenate([np.empty(0, np.int64), *members])]
    of_cells = _Cells(formed[kept], counts[kept], can, np.concatenate([np.empty(0, int), *groups]))
    return Ranked(
        _formations(rows, of_cells, design), rows.month[formed[kept]], int(counts.max(initial=0))
    )


def _candidates(
    rows: PanelRows, ranks: Sequence[np.ndarray], antes: Sequence[np.ndarray], design: Design
) -> tuple[np.ndarray, np.ndarray]:
    """Rows that can be ranked, by formation and then in the panel's order, and the rows with what they rank on."""
    forms = np.append(rows.closes & design.forms(rows.month), False)  # −1 is the last
    meets = forms[rows.period] & rows.panel["eligible"].to_numpy()
    meets &= catalog.load(WEIGHTS[design.weights])(rows.panel["size"].to_numpy()) > 0
    for each in antes[:1]:
        meets &= np.isfinite(each)
    if not design.estimation:
        for each in ranks:
            meets &= np.isfinite(each)
    can = np.flatnonzero(meets)
    ranked_at = rows.earlier(can, design.estimation)
    if design.estimation:
        known = ranked_at >= 0
        for each in ranks:
            known &= np.isfinite(each[ranked_at])
        can, ranked_at = can[known], ranked_at[known]
    order = in_order(rows.period[can], len(rows.month))
    can = can[order]
    return can, ranked_at[order] if design.estimation else can


@dataclass(frozen=True)
class _Cells:
    formed: np.ndarray
    counts: np.ndarray
    row: np.ndarray
    cell: np.ndarray


def _formations(rows: PanelRows, found: _Cells, design: Design) -> Formations:
    formed = found.formed.astype(np.int64)
    month = rows.month[formed]
    years = np.arange(1, -(-design.hold // 12)) if design.renews else np.empty(0, np.int64)
    return Formations(
        starts=np.concatenate([[0], np.cumsum(found.counts)]).astype(np.int64),
        security=rows.owner[found.row],
        row=found.row,
        group=found.cell,
        formed=formed,
        last=np.searchsorted(rows.month, month + design.hold, side="right") - 1,
        renewed=rows.closing(month[:, None] + 12 * years) if len(formed) else np.empty((0, 0), int),
        n_groups=int(np.prod(design.groups)),
        n_securities=len(rows.names),
    )


def split_rank(
    asked: str, estimates: Mapping[str, object] | Sequence[str]
) -> tuple[str | None, str]:
    """Table of estimates and column that a variable names: `m60` its beta, `m60.r2` a column, else one of the panel."""
    table, _, column = asked.partition(".")
    return (table, column or "beta") if table in estimates else (None, asked)
