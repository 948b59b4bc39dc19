"""Read a series with one value a month (the market, the riskless rate) or one an asset and month."""

from __future__ import annotations

from typing import Any

import pandas as pd

from lineproof.addresses import refused_asset_names
from lineproof.calendar import month_name, month_number
from lineproof.intake.reading import read_text
from lineproof.intake.values import to_months, to_numbers
from lineproof.problems import KnownProblem, Problem

_HEADLINE = "The raw data cannot be used; nothing was written."
_MOST_PLAUSIBLE_RATE = 0.03  # riskless return of one month


def read_series(file: str, reading: dict[str, Any], value: str) -> pd.DataFrame:
    """`date` (month end) and `value` (decimal), sorted; with `asset` where the columns name one.

    Every row must be sound: a series has no spare months, so a fault stops the run.

    Raises KnownProblem listing the rows whose date or value cannot be read, months that stand twice and months
    missing inside the series.
    """
    table = read_text(file, reading)
    rows, label = table.rows, reading["label"]
    date = to_months(rows["date"], reading["dates"])
    numbers = to_numbers(rows[value], reading["missing"])
    problems = [
        Problem(
            f"{label}, line {r.line}",
            f"its fields do not fit the header: {r.reason}",
            "mend the row",
        )
        for r in table.rejects.itertuples()
    ]
    problems += [
        Problem(
            f"{label}, line {line}",
            f"{text!r} is not a date of the form {reading['dates']}",
            "set dates:",
        )
        for line, text in rows.loc[date.isna(), ["line", "date"]].itertuples(index=False)
    ]
    unreadable = numbers.is_text | numbers.is_not_finite
    problems += [
        Problem(
            f"{label}, line {line}",
            f"{text!r} is not a number",
            "mend it, or list it under missing:",
        )
        for line, text in rows.loc[unreadable, ["line", value]].itertuples(index=False)
    ]
    if problems:
        raise KnownProblem(_HEADLINE, problems[:20])
    scale = 0.01 if reading["unit"] == "percent" else 1.0
    series = pd.DataFrame({"date": date, value: numbers.value * scale})
    keys = ["date"]
    if "asset" in rows:
        keys = ["asset", "date"]
        series.insert(0, "asset", rows["asset"])
        _check_names(rows["asset"].unique().tolist(), label)
    series = series[series[value].notna()]
    _check_months(series, keys, label)
    return series.sort_values(keys, ignore_index=True)


def _check_names(names: list[str], label: str) -> None:
    refused = refused_asset_names(names)
    if refused:
        found = f"test assets may not be called {', '.join(map(repr, refused))}"
        change = (
            "these names stand for other rows of the estimates, and / parts an address: rename them"
        )
        raise KnownProblem(_HEADLINE, [Problem(label, found, change)])


def _check_months(series: pd.DataFrame, keys: list[str], label: str) -> None:
    if series.empty:
        raise KnownProblem(_HEADLINE, [Problem(label, "no row has both a date and a value", "")])
    twice = series[series.duplicated(keys)]
    if len(twice):
        shown = ", ".join(
            " ".join([*map(str, r[:-1]), month_name(r[-1])]) for r in twice[keys].values[:12]
        )
        raise KnownProblem(
            _HEADLINE, [Problem(label, f"months that stand twice: {shown}", "keep one row a month")]
        )
    if keys == ["date"]:
        present = set(month_number(series["date"]))
        absent = [m for m in range(min(present), max(present)) if m not in present]
        if absent:
            shown = ", ".join(f"{m // 12}-{m % 12 + 1:02d}" for m in absent[:12])
            found = f"{len(absent)} months are missing inside the series: {shown}"
            raise KnownProblem(
                _HEADLINE, [Problem(label, found, "deliver them, or shorten the study")]
            )


def riskless_return(rate: pd.Series, quoted: str) -> pd.Series:
    """Riskless return of one month from the rate as quoted (decimal).

    A compound annual yield y gives (1 + y)^(1/12) − 1; a period return is taken as it is.
    """
    return (1 + rate) ** (1 / 12) - 1 if quoted == "annual_yield" else rate


def check_riskless(series: pd.DataFrame, label: str, quoted: str) -> None:
    """Stop when a month's riskless return is beyond what any rate so quoted could be."""
    high = series[series["riskless"].abs() > _MOST_PLAUSIBLE_RATE]
    if len(high):
        worst = high.loc[high["riskless"].abs().idxmax()]
        found = (
            f"{len(high)} months have a riskless return over 3 % a month when read as {quoted}: "
            f"{worst['riskless']:.4g} in {month_name(worst['date'])}"
        )
        raise KnownProblem(_HEADLINE, [Problem(label, found, "check unit: and quoted:")])
