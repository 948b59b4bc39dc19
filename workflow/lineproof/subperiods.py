"""Cut the returns of test assets into subperiods, one small table each."""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import asdict, dataclass
from itertools import pairwise
from typing import Any

import pandas as pd

from lineproof.calendar import month_name, within_months
from lineproof.periods import periods_of
from lineproof.problems import KnownProblem, Problem


@dataclass(frozen=True)
class Subperiod:
    """One stretch of months, `first` and `last` included, as `YYYY-MM`."""

    name: str
    title: str
    first: str
    last: str

    @property
    def n_months(self) -> int:
        """Calendar months from first to last."""
        return (pd.Period(self.last, "M") - pd.Period(self.first, "M")).n + 1


def resolve_subperiods(
    specs: Mapping[str, Mapping[str, Any]], first: str, last: str
) -> list[Subperiod]:
    """The subperiods meant by the study's entries, for test assets that return from first to last.

    Each entry has first and last (a month, or "first" and "last"), split, every and title. A part
    of `every` is named after the year in which it begins, a part of `split` by its number.
    Stretches are clipped to the data; the first parts of `split` get the months left over, the last
    part of `every` may be shorter.

    Raises KnownProblem when an entry lies outside the data, is too short to split, or two parts
    share a name.
    """
    found: list[Subperiod] = []
    problems: list[Problem] = []
    for name, spec in specs.items():
        start = max(first, first if spec["first"] == "first" else spec["first"])
        end = min(last, last if spec["last"] == "last" else spec["last"])
        months = pd.period_range(start, end, freq="M")
        if len(months) == 0:
            said = f"{spec['first']} to {spec['last']} lies outside the returns, {first} to {last}"
            problems.append(Problem(f"subperiods.{name}", said, "change from and to, or remove it"))
        elif len(months) < (spec["split"] or 1):
            said = f"{start} to {end} is too short to split into {spec['split']}"
            problems.append(Problem(f"subperiods.{name}", said, "use a smaller split"))
        else:
            parts = enumerate(_parts(months, spec), start=1)
            found += [_named(name, spec, index, part) for index, part in parts]
    problems += [
        Problem(f"subperiods.{name}", "two subperiods get this name", "rename one of them")
        for name, count in Counter(s.name for s in found).items()
        if count > 1
    ]
    if problems:
        raise KnownProblem("The subperiods do not fit the data.", problems)
    return found


def _parts(months: pd.PeriodIndex, spec: Mapping[str, Any]) -> list[pd.PeriodIndex]:
    if spec["split"]:
        size, left = divmod(len(months), spec["split"])
        cuts = [index * size + min(index, left) for index in range(spec["split"] + 1)]
    else:
        step = 12 * spec["every"] if spec["every"] else len(months)
        cuts = [*range(0, len(months), step), len(months)]
    return [months[a:b] for a, b in pairwise(cuts)]


def _named(name: str, spec: Mapping[str, Any], index: int, months: pd.PeriodIndex) -> Subperiod:
    first, last = months[0], months[-1]
    if spec["every"]:
        name = f"{name}-{first.year}"
    elif spec["split"]:
        name = f"{name}-{index}"
    dates = _title(first, last)
    title = f"{spec['title']}, {dates}" if spec["title"] else dates
    return Subperiod(name, title, str(first), str(last))


def _title(first: pd.Period, last: pd.Period) -> str:
    if first.month == 1 and last.month == 12:
        return f"{first.year}–{last.year}" if first.year != last.year else str(first.year)
    return f"{first.strftime('%b %Y')} – {last.strftime('%b %Y')}"


def cut_subperiods(
    sorts: Mapping[str, pd.DataFrame],
    market: pd.DataFrame,
    *,
    main: str,
    specs: Mapping[str, Mapping[str, Any]],
) -> tuple[list[Subperiod], dict[str, pd.DataFrame]]:
    """The subperiods in the study's order, and in each the returns of all test assets.

    The market's returns stand beside them. "first" and "last" are the first and last month of the
    main test assets; others may have fewer periods in a subperiod, and their results say how many.

    Raises KnownProblem as `resolve_subperiods` does, and when no test asset has a return in a
    subperiod.
    """
    months = sorts[main].loc[sorts[main]["excess_return"].notna(), "date"]
    subperiods = resolve_subperiods(specs, month_name(months.min()), month_name(months.max()))
    returns = pd.concat(
        [frame.assign(sort=name) for name, frame in sorts.items()], ignore_index=True
    )
    whole = returns.merge(market, on="date", how="left", validate="many_to_one")
    whole = whole[["sort", *(c for c in whole if c != "sort")]]
    cuts = {s.name: _between(whole, s) for s in subperiods}
    empty = [name for name, cut in cuts.items() if cut.empty]
    if empty:
        said = "no test asset has a return in it"
        problems = [Problem(f"subperiods.{name}", said, "change or remove it") for name in empty]
        raise KnownProblem("The subperiods do not fit the data.", problems)
    return subperiods, cuts


def _between(whole: pd.DataFrame, subperiod: Subperiod) -> pd.DataFrame:
    return whole[within_months(whole["date"], subperiod.first, subperiod.last)].reset_index(
        drop=True
    )


def listed(
    subperiods: Sequence[Subperiod], market: pd.DataFrame, frequency: str = "monthly"
) -> list[dict[str, Any]]:
    """The subperiods as the index of the cuts lists them, each with its number of periods."""
    periods = periods_of(frequency, market["date"].to_numpy())
    return [{**asdict(s), "n_periods": periods.n_between(s.first, s.last)} for s in subperiods]
