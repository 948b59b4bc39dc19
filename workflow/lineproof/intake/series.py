"""Read a series with one value a month (the market, the riskless rate) or one an asset and month."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

import numpy as np
import pandas as pd

from lineproof.addresses import refused_asset_names
from lineproof.calendar import month_name, month_number
from lineproof.intake.plausible import check_unit
from lineproof.intake.reading import TextTable, read_text
from lineproof.intake.stopping import UNUSABLE, counted, stop
from lineproof.intake.values import Numbers, as_decimal, check_date_format, to_months, to_numbers
from lineproof.problems import KnownProblem, Problem

_MOST_PLAUSIBLE_RATE = 0.03  # riskless return of one month
_N_SHOWN = 12


def read_series(file: str, reading: dict[str, Any], value: str) -> pd.DataFrame:
    """`date` (month end) and `value` (decimal), sorted; with `asset` where the columns name one.

    Every row must be sound: a series has no spare months, so a fault stops the run. A row whose
    value is missing counts as absent.

    Raises KnownProblem listing the rows whose date or value cannot be read, months that stand twice and months
    missing inside the series, or when returns are in another unit than declared.
    """
    check_date_format(reading)
    table = read_text(file, reading)
    rows = table.rows
    date = to_months(rows["date"], reading["dates"])
    numbers = to_numbers(rows[value], reading["missing"])
    problems = _row_problems(table, date, numbers, reading, value)
    if problems:
        raise KnownProblem(UNUSABLE, problems)
    decimal = as_decimal(numbers.value, reading["unit"])
    if value == "return":
        check_unit(decimal, reading)
    series = pd.DataFrame({"date": date, value: decimal})
    keys = ["date"]
    if "asset" in rows:
        keys = ["asset", "date"]
        series.insert(0, "asset", rows["asset"])
        _check_names(rows["asset"].unique().tolist(), reading)
    series = series[series[value].notna()].sort_values(keys, ignore_index=True)
    _check_months(series, keys, reading["label"])
    return series


def _row_problems(
    table: TextTable, date: pd.Series, numbers: Numbers, reading: dict[str, Any], value: str
) -> list[Problem]:
    """A problem for each row that cannot be read, the first few of each kind."""
    rows, theirs = table.rows, reading["columns"]
    unreadable = numbers.is_text | numbers.is_not_finite
    kinds = (
        ("", table.rejects, "it has {}", "mend the row"),
        (
            f", column {theirs['date']}",
            rows.loc[date.isna(), ["line", "date"]],
            f"{{!r}} is not a date of the form {reading['dates']}",
            "mend it, or set dates:",
        ),
        (
            f", column {theirs[value]}",
            rows.loc[unreadable, ["line", value]],
            "{!r} is not a number",
            "mend it, or list it under missing:",
        ),
    )
    problems = []
    for column, found, said, change in kinds:
        for line, text in found.head(_N_SHOWN).itertuples(index=False):
            where = f"{table.label}, {table.place} {line}{column}"
            problems.append(Problem(where, said.format(text), change))
        if len(found) > _N_SHOWN:
            more = f"{counted(len(found) - _N_SHOWN, 'more row')} like this"
            problems.append(Problem(f"{table.label}{column}", more))
    return problems


def _check_names(names: list[str], reading: dict[str, Any]) -> None:
    refused = refused_asset_names(names)
    if refused:
        found = f"test assets may not be called {_few(map(repr, refused))}"
        change = (
            "these names stand for other rows of the estimates, and / parts an address: rename them"
        )
        raise stop(f"{reading['label']}, column {reading['columns']['asset']}", found, change)


def _check_months(series: pd.DataFrame, keys: list[str], label: str) -> None:
    """Stop at months that stand twice; and, in a series of its own, at months that are missing."""
    if series.empty:
        raise stop(label, "no row has both a date and a value", "deliver it again")
    twice = series.loc[series.duplicated(keys), keys].drop_duplicates()
    if len(twice):
        named = [" ".join([*row[:-1], month_name(row[-1])]) for row in twice.to_numpy().tolist()]
        raise stop(label, f"months that stand twice: {_few(named)}", "keep one row a month")
    if keys == ["date"]:
        present = month_number(series["date"])
        absent = np.setdiff1d(np.arange(present[0], present[-1]), present)
        if len(absent):
            named = [f"{month // 12}-{month % 12 + 1:02d}" for month in absent.tolist()]
            found = f"{counted(len(absent), 'month')} missing inside the series: {_few(named)}"
            raise stop(label, found, "deliver them, or shorten the series")


def _few(names: Iterable[str]) -> str:
    listed = list(names)
    more = f" and {len(listed) - _N_SHOWN:,} more" if len(listed) > _N_SHOWN else ""
    return ", ".join(listed[:_N_SHOWN]) + more


def riskless_return(rate: pd.Series, quoted: str) -> pd.Series:
    """Riskless return of one month from the rate as quoted, both decimal.

    A compound annual yield y gives (1 + y)^(1/12) − 1; a period return is taken as it is. A yield
    below −100 % gives NaN.
    """
    return (1 + rate) ** (1 / 12) - 1 if quoted == "annual_yield" else rate


def check_riskless(series: pd.DataFrame, reading: dict[str, Any], quoted: str) -> None:
    """Stop when a month's riskless return is beyond what any rate so quoted could be.

    `series` has date, rate and riskless, decimal. Raises KnownProblem.
    """
    beyond = series[~(series["riskless"].abs() <= _MOST_PLAUSIBLE_RATE)]
    if len(beyond):
        worst = beyond.loc[beyond["rate"].abs().idxmax()]
        found = (
            f"read as {quoted} in {reading['unit']}, {counted(len(beyond), 'month')} would earn beyond 3 % "
            f"without risk; the rate of {month_name(worst['date'])} would be {100 * worst['rate']:.4g} %"
        )
        where = f"{reading['label']}, column {reading['columns']['rate']}"
        raise stop(where, found, "check unit: and quoted:")
