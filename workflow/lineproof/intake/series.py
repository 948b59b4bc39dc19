"""Read a series with one value a period (the market, the riskless rate) or one an asset and period."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd

from lineproof.addresses import is_spread, refused_asset_names
from lineproof.calendar import month_number
from lineproof.intake.dating import with_dates
from lineproof.intake.headers import where_is
from lineproof.intake.reading import TextTable, read_text
from lineproof.intake.series_dates import check_series_frequency
from lineproof.intake.stopping import N_SHOWN, UNUSABLE, counted, few, stop
from lineproof.intake.values import Numbers, as_decimal, to_days, to_numbers
from lineproof.periods import Months
from lineproof.problems import KnownProblem, Problem

_FEWEST = 30  # values on which to judge a unit
_RARELY_NEGATIVE = 0.01
# Half of the sizes of all returns above the first: not decimal. Not one in twenty above the second: not in per cent.
# Each is about ten times away from any market's returns, and from those in the other unit.
_SIZES = {"monthly": (0.5, 0.005), "daily": (0.1, 0.0005)}


@dataclass(frozen=True)
class FileOfSeries:
    """One file: `n_rows` in all, and `days` (n_valued,), datetime64[D], of those that have a value."""

    label: str
    n_rows: int
    days: np.ndarray


@dataclass(frozen=True)
class Series:
    """`values` has date and the value asked for, sorted; with asset where the columns name one."""

    values: pd.DataFrame
    files: list[FileOfSeries]


def read_series(
    files: str | Sequence[str], reading: dict[str, Any], value: str, frequency: str = "monthly"
) -> Series:
    """A series with its `value` decimal.

    `files` is one path, or several whose rows are one series. A date is the month's end or, where `frequency` is
    "daily", the day as delivered: the days of the market are the trading calendar of a daily study.

    Every row must be sound: a series has no spare periods, so a fault stops the run. A row whose value is missing
    counts as absent.

    Raises KnownProblem listing the rows whose date or value cannot be read, periods that stand twice (fault 31) and
    months missing inside the series (27); or when the dates are not as frequent as declared (40), or returns are in
    another unit. Which days are missing from a daily series no reader can know: see `riskless` and `trading_days`.
    """
    paths = [files] if isinstance(files, str) else list(files)
    reading = with_dates(paths, reading, daily=frequency == "daily")
    parsed = [_parsed(file, reading, value, len(paths) > 1) for file in paths]
    problems = [problem for each in parsed for problem in each.problems]
    if problems:
        raise KnownProblem(UNUSABLE, problems)
    day, decimal, asset = (
        np.concatenate([getattr(each, name) for each in parsed])
        for name in ("day", "decimal", "asset")
    )
    if value == "return":
        _check_unit(decimal, reading, frequency)
    check_series_frequency(day, pd.factorize(asset)[0], frequency, reading)
    series = pd.DataFrame({"date": _dates(day, frequency), value: decimal})
    keys = ["date"]
    if "asset" in reading["columns"] or reading.get("layout") == "wide":
        keys = ["asset", "date"]
        series.insert(0, "asset", pd.Series(asset, dtype=str))
        _check_names(series["asset"].unique().tolist(), reading)
    series = series[series[value].notna()].sort_values(keys, ignore_index=True)
    _check_periods(series, keys, reading["label"], frequency)
    return Series(series, [each.counted for each in parsed])


@dataclass(frozen=True)
class _Parsed:
    """The rows of one file, each array (n_rows,), and what is wrong with single rows."""

    label: str
    day: np.ndarray
    decimal: np.ndarray
    asset: np.ndarray
    problems: list[Problem]

    @property
    def counted(self) -> FileOfSeries:
        return FileOfSeries(self.label, len(self.day), self.day[~np.isnan(self.decimal)])


def _parsed(file: str, reading: dict[str, Any], value: str, is_one_of_several: bool) -> _Parsed:
    if is_one_of_several:  # a message about a row must name its own file
        reading = {**reading, "label": Path(file).name, "labels": None}
    table = read_text(file, reading)
    rows = table.rows
    day = to_days(rows["date"], reading["dates"])
    numbers = to_numbers(rows[value], reading["missing"])
    return _Parsed(
        label=table.label,
        day=day,
        decimal=as_decimal(numbers.value, reading["unit"]),
        asset=rows["asset"].to_numpy(object) if "asset" in rows else np.full(len(rows), ""),
        problems=_row_problems(table, np.isnat(day), numbers, reading, value),
    )


def _dates(day: np.ndarray, frequency: str) -> np.ndarray:
    months = Months()
    dates = day if frequency == "daily" else months.date(months.number(day))
    return dates.astype("datetime64[ms]")


def _check_unit(decimal: np.ndarray, reading: dict[str, Any], frequency: str) -> None:
    """Stop when the size of typical returns says that the unit is the other one. Raises KnownProblem."""
    given = np.abs(decimal[np.isfinite(decimal) & (decimal != 0)])
    if len(given) < _FEWEST:
        return
    middle, high = np.quantile(given, [0.5, 0.95])
    largest_middle, smallest_high = _SIZES[frequency]
    if middle > largest_middle:
        is_decimal = reading["unit"] == "decimal"
        change = "set unit: percent" if is_decimal else "is this the column of the returns?"
        if (decimal < 0).sum() < _RARELY_NEGATIVE * len(given):
            change = (
                "hardly any is negative: does the column hold the levels of an index? "
                "Deliver its returns, level(t)/level(t−1) − 1"
            )
    elif high < smallest_high and reading["unit"] == "percent":
        change = "set unit: decimal"
    else:
        return
    found = (
        f"read as {reading['unit']}, half of all returns exceed {100 * middle:.3g} % in size "
        f"and one in twenty exceeds {100 * high:.3g} %"
    )
    raise stop(where_is(reading, "return"), found, change)


def _row_problems(
    table: TextTable,
    undated: np.ndarray,
    numbers: Numbers,
    reading: dict[str, Any],
    value: str,
) -> list[Problem]:
    """A problem for each row that cannot be read, the first few of each kind."""
    rows = table.rows
    of_date, of_value = (
        where_is(reading, name).removeprefix(reading["label"]) for name in ("date", value)
    )
    unreadable = numbers.is_text | numbers.is_not_finite
    kinds = (
        ("", table.rejects, "it has {}", "mend the row"),
        (
            of_date,
            rows.loc[undated, ["line", "date"]],
            f"{{!r}} is not a date of the form {reading['dates']}",
            "mend it, or set dates:",
        ),
        (
            of_value,
            rows.loc[unreadable, ["line", value]],
            "{!r} is not a number",
            "mend it, or list it under missing:",
        ),
    )
    problems = []
    for column, found, said, change in kinds:
        for line, text in found.head(N_SHOWN).itertuples(index=False):
            where = f"{table.label}, {table.place} {line}{column}"
            problems.append(Problem(where, said.format(text), change))
        if len(found) > N_SHOWN:
            more = f"{counted(len(found) - N_SHOWN, 'more row')} like this"
            problems.append(Problem(f"{table.label}{column}", more))
    return problems


def _check_names(names: list[str], reading: dict[str, Any]) -> None:
    refused = [*refused_asset_names(names), *filter(is_spread, names)]
    if refused:
        found = f"test assets may not be called {few(map(repr, refused))}"
        change = "these names stand for other rows of the estimates or for spreads, and / parts an address: rename them"
        raise stop(where_is(reading, "asset"), found, change)


def _check_periods(series: pd.DataFrame, keys: list[str], label: str, frequency: str) -> None:
    """Stop at periods that stand twice; and, in a monthly series of its own, at months that are missing."""
    if series.empty:
        raise stop(label, "no row has both a date and a value", "deliver it again")
    noun, form = ("day", "%Y-%m-%d") if frequency == "daily" else ("month", "%Y-%m")
    twice = series.loc[series.duplicated(keys), keys].drop_duplicates()
    if len(twice):
        named = [" ".join([*row[:-1], row[-1].strftime(form)]) for row in twice.to_numpy().tolist()]
        raise stop(label, f"{noun}s that stand twice: {few(named)}", f"keep one row a {noun}")
    if keys == ["date"] and frequency == "monthly":
        present = month_number(series["date"])
        absent = np.setdiff1d(np.arange(present[0], present[-1]), present)
        if len(absent):
            named = [f"{month // 12}-{month % 12 + 1:02d}" for month in absent.tolist()]
            found = f"{counted(len(absent), 'month')} missing inside the series: {few(named)}"
            raise stop(label, found, "deliver them, or shorten the series")
