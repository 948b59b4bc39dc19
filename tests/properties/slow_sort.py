"""Ranked portfolios one security, period and group at a time, from dictionaries: obvious, and slow."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from functools import cached_property
from math import floor, isnan, nan, prod
from typing import Any

import pandas as pd
from tests.properties.random_market import DATES

from lineproof.designs import FORM_EACH, Design
from lineproof.periods import Periods


def number_of(month: str) -> int:
    """A month as it is numbered here, from `YYYY-MM`."""
    year, number = map(int, month.split("-"))
    return 12 * year + number - 1


@dataclass
class SlowSort:
    """What `sort_ranked` should find. A period is counted by its place in the calendar, the dates of the market."""

    panel: pd.DataFrame
    estimates: dict[str, pd.DataFrame]
    design: Design
    periods: Periods

    @cached_property
    def calendar(self) -> list[pd.Timestamp]:
        return list(DATES["daily" if self.periods.noun == "day" else "monthly"])

    @cached_property
    def places(self) -> dict[pd.Timestamp, int]:
        return {date: place for place, date in enumerate(self.calendar)}

    def month(self, place: int) -> int:
        """Months since year 0 of a place in the calendar."""
        return self.calendar[place].year * 12 + self.calendar[place].month - 1

    @cached_property
    def closing(self) -> dict[int, int]:
        """The last place of each month."""
        return {self.month(place): place for place in range(len(self.calendar))}

    @cached_property
    def rows(self) -> dict[str, dict[int, Any]]:
        """Rows of the panel by security and place, in order."""
        return self._by_security(self.panel)

    @cached_property
    def estimated(self) -> dict[str, dict[str, dict[int, Any]]]:
        return {name: self._by_security(table) for name, table in self.estimates.items()}

    def _by_security(self, table: pd.DataFrame) -> dict[str, dict[int, Any]]:
        found: dict[str, dict[int, Any]] = {}
        for row in table.itertuples(index=False):
            found.setdefault(row.security, {})[self.places[row.date]] = row
        return found

    def value(self, asked: str, security: str, place: int | None) -> float:
        """A variable of a security at a place, NaN where it has none."""
        if place not in self.rows[security]:
            return nan
        table, _, column = asked.partition(".")
        if table not in self.estimates:
            return getattr(self.rows[security][place], asked)
        row = self.estimated[table].get(security, {}).get(place)
        return nan if row is None else getattr(row, column or "beta")

    def ranked_on(self, place: int) -> dict[str, list[float]]:
        """What each security that can be ranked at a place is ranked on."""
        design, found = self.design, {}
        earlier = self.closing.get(self.month(place) - design.estimation)
        for security in sorted(self.rows):
            row = self.rows[security].get(place)
            if row is None or not row.eligible or (design.weights == "size" and isnan(row.size)):
                continue
            values = [self.value(asked, security, earlier) for asked in design.rank_on]
            if any(isnan(self.value(a, security, place)) for a in design.ante_betas[:1]):
                continue
            if not any(map(isnan, values)):
                found[security] = values
        return found

    @cached_property
    def formations(self) -> dict[int, dict[str, tuple[int, ...]]]:
        """The groups of each member, one a variable, by the place at whose end they are formed."""
        found: dict[int, dict[str, tuple[int, ...]]] = {}
        first = None
        for month, place in self.closing.items():
            if (month - self.design.form_month + 1) % FORM_EACH[self.design.form_each]:
                continue
            if self.design.first_formation and month < number_of(self.design.first_formation):
                continue
            values = self.ranked_on(place)
            if len(values) < prod(self.design.groups):
                continue
            if self.design.in_blocks and first and (month - first) % self.design.hold:
                continue
            groups = self.grouped(values)
            if groups is not None:
                first = first or month
                found[place] = groups
        return found

    def marks(self, security: str) -> bool:
        if self.design.breakpoints is None:
            return True
        row = next(iter(self.rows[security].values()))
        return row.sector in self.design.breakpoints["in"]

    def grouped(self, values: dict[str, list[float]]) -> dict[str, tuple[int, ...]] | None:
        counts = self.design.groups
        marked = sum(map(self.marks, values))
        if marked < (counts[0] if self.design.dependent else max(counts)):
            return None
        found: dict[str, tuple[int, ...]] = dict.fromkeys(values, ())
        for at, count in enumerate(counts):
            parts = set(found.values()) if self.design.dependent else {None}
            new = {}
            for part in parts:
                inside = {s: v[at] for s, v in values.items() if part is None or found[s] == part}
                if not any(map(self.marks, inside)):
                    return None
                new |= self.parted(inside, count)
            found = {s: (*found[s], new[s]) for s in values}
        return found

    def parted(self, values: dict[str, float], count: int) -> dict[str, int]:
        if self.design.rule == "equal_counts":
            order = sorted(values, key=lambda s: (values[s], s))
            each, left = divmod(len(order), count)
            sizes = [each] * count
            sizes[0] += left // 2
            sizes[-1] += left // 2 + left % 2
            groups = [group for group, size in enumerate(sizes, start=1) for _ in range(size)]
            return dict(zip(order, groups, strict=True))
        ordered = sorted(Fraction(v) for s, v in values.items() if self.marks(s))
        return {s: 1 + self.below(Fraction(v), ordered, count) for s, v in values.items()}

    @staticmethod
    def below(value: Fraction, ordered: list[Fraction], count: int) -> int:
        """How many quantiles are below a value, in exact arithmetic."""
        found = 0
        for k in range(1, count):
            position = Fraction(k * (len(ordered) - 1), count)
            low = floor(position)
            high = min(low + 1, len(ordered) - 1)
            quantile = ordered[low] + (position - low) * (ordered[high] - ordered[low])
            found += quantile < value
        return found

    @cached_property
    def lagged(self) -> dict[str, dict[int, float | None]]:
        """The last known size before each row, grown by the returns since."""
        found: dict[str, dict[int, float | None]] = {}
        for security, rows in self.rows.items():
            known = None
            for place, row in rows.items():
                found.setdefault(security, {})[place] = known
                if not isnan(row.size):
                    known = row.size
                elif known is not None and not isnan(row.total_return):
                    known *= 1 + row.total_return
        return found

    def in_force(self, place: int) -> list[int]:
        """The formations whose groups are held at a place."""
        now = self.month(place)
        return [f for f in self.formations if f < place and now - self.month(f) <= self.design.hold]

    def weight(self, security: str, formed: int, place: int) -> float:
        """What a member weighs in a period, not scaled."""
        if self.design.weights == "size":
            return self.lagged[security][place] or 0.0
        if self.design.weights == "equal":
            return 1.0
        between = [r for p, r in self.rows[security].items() if formed < p < place]
        return prod(1 + r.total_return for r in between if not isnan(r.total_return))

    def ante_beta(self, security: str, formed: int, place: int) -> float:
        """The ex-ante beta that is known before a period."""
        names = self.design.ante_betas
        if not names:
            return nan
        known = self.value(names[0], security, formed)
        years = range(1, -(-self.design.hold // 12)) if self.design.renews else ()
        for year in years:
            anew = self.closing.get(self.month(formed) + 12 * year)
            if anew is not None and anew < place:
                newer = self.value(names[min(year, len(names) - 1)], security, anew)
                known = known if isnan(newer) else newer
        return known

    def held(
        self, formed: int, place: int
    ) -> dict[tuple[int, ...], list[tuple[str, float, float, float]]]:
        """Security, weight, excess return and ex-ante beta of the members with a return, by group."""
        found: dict[tuple[int, ...], list] = {}
        for security, group in self.formations[formed].items():
            row = self.rows[security].get(place)
            if row is not None and not isnan(row.excess_return):
                weight = self.weight(security, formed, place)
                beta = self.ante_beta(security, formed, place)
                found.setdefault(group, []).append((security, weight, row.excess_return, beta))
        return found

    def returns(self, group: tuple[int, ...], place: int) -> list[float]:
        """The columns of the contract after asset and date, in their order."""
        cohorts = [self.held(formed, place).get(group, []) for formed in self.in_force(place)]
        sizes = [self.lagged[s][place] for members in cohorts for s, *_ in members]
        sizes = [size for size in sizes if size is not None]
        excess = [_mean([(w, r) for _, w, r, _ in members]) for members in cohorts]
        betas = [_mean([(w, b) for _, w, _, b in members if not isnan(b)]) for members in cohorts]
        return [
            _mean([(1, value) for value in excess if not isnan(value)]),
            sum(map(len, cohorts)),
            _mean([(1, size) for size in sizes]),
            _mean([(1, beta) for beta in betas if not isnan(beta)]),
        ]

    def turnover(self, group: tuple[int, ...], formed: int, new: dict[str, float]) -> float:
        """From the group whose hold ends at a formation, as it has drifted, to its new weights."""
        ended = self.closing.get(self.month(formed) - self.design.hold)
        if ended not in self.formations:
            return nan
        old = {
            security: weight * (1 + self.rows[security][formed].total_return)
            for security, weight, *_ in self.held(ended, formed).get(group, [])
        }
        total = sum(old.values())
        if total == 0:
            return nan
        every = {*old, *new}
        return sum(abs(new.get(s, 0.0) - old.get(s, 0.0) / total) for s in every) / 2


def _mean(weighted: list[tuple[float, float]]) -> float:
    total = sum(weight for weight, _ in weighted)
    return sum(w * v for w, v in weighted) / total if total > 0 else nan
