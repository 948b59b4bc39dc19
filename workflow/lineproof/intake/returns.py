"""Clean the returns of single securities: every row is kept, set aside with its reason, or an exact duplicate."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np
import pandas as pd

from lineproof.calendar import month_name, month_number
from lineproof.intake.faults import FAULTS, Tally
from lineproof.intake.reading import TextTable
from lineproof.intake.values import Numbers, to_months, to_numbers
from lineproof.problems import KnownProblem, Problem

_NUMERIC = ("return", "final_return", "size", "price")
_UNDECLARED_CODES = (-66.0, -77.0, -88.0, -99.0, -999.0)
_STALE_RUN = 3  # months
_JUMP, _AFTER_REVERSAL = 3.0, 0.5  # Ince and Porter 2006
_SHARE_OF_DAILY = 0.2


@dataclass
class Cleaned:
    """`rows`: one a security and month, sorted; `set_aside`: line, fault, reason; and the counts."""

    rows: pd.DataFrame
    set_aside: pd.DataFrame
    n_read: int
    n_duplicates: int
    tally: Tally = field(default_factory=Tally)


def clean_returns(table: TextTable, reading: dict[str, Any], same_month_rows: str) -> Cleaned:
    """Parse and check a table of raw returns.

    `rows` gets security, date (month end), return_, final_return, size, price (decimal; NaN where missing), line,
    and any further columns as text.

    Raises KnownProblem when the file as a whole does not fit what the study file says of it.
    """
    tally = Tally()
    tally.add(7, table.n_trimmed)
    rejected = table.rejects.assign(
        fault=5, reason=FAULTS[5].label + ": " + table.rejects["reason"]
    )
    aside = [rejected[["line", "fault", "reason"]]]
    rows, bad = _parsed(table, reading, tally)
    aside.append(bad)
    _check_unit(rows, reading)
    _check_frequency(rows, reading)
    rows, bad, n_duplicates = _one_row_a_month(rows, same_month_rows)
    aside.append(bad)
    set_aside = pd.concat(aside, ignore_index=True).sort_values("line", ignore_index=True)
    set_aside = set_aside.astype({"line": "int64", "fault": "int64", "reason": str})
    for number, part in set_aside.groupby("fault"):
        tally.add(int(number), len(part), [f"line {line}" for line in part["line"].head(3)])
    rows = rows.sort_values(["security", "date"], ignore_index=True)
    _flag(rows, tally)
    return Cleaned(rows, set_aside, table.n_read, n_duplicates, tally)


def _parsed(
    table: TextTable, reading: dict[str, Any], tally: Tally
) -> tuple[pd.DataFrame, pd.DataFrame]:
    """Rows as values, and the rows with a value that cannot be read or cannot be true."""
    text, missing = table.rows, reading["missing"]
    scale = 0.01 if reading["unit"] == "percent" else 1.0
    security = text["security"].str.strip("\"'").str.strip()
    date = to_months(text["date"], reading["dates"])
    faults = _FirstFault(text["line"])
    faults.note(security == "", 23, FAULTS[23].label)
    faults.note(date.isna(), 8, FAULTS[8].label + ": " + text["date"])
    values: dict[str, np.ndarray] = {}
    for column in (c for c in _NUMERIC if c in text):
        numbers = to_numbers(text[column], missing)
        said = column.replace("_", " ") + " is " + text[column]
        faults.note(numbers.is_text, 13, FAULTS[13].label + ": " + said)
        faults.note(numbers.is_not_finite, 14, FAULTS[14].label + ": " + said)
        values[column] = numbers.value
        if column.endswith("return"):
            values[column] = numbers.value * scale
            faults.note(values[column] < -1, 15, _below_all(numbers, said))
            tally.add(16, (values[column] == -1).sum(), _lines(text, values[column] == -1))
        tally.add(7, numbers.n_thousands)
        if column == "return":
            coded = numbers.is_missing
            tally.add(12, coded.sum(), _lines(text, coded))
    rows = pd.DataFrame({"security": security, "date": date, "line": text["line"]})
    for column in _NUMERIC:
        rows[column.replace("return", "return_") if column == "return" else column] = values.get(
            column, np.full(len(rows), np.nan)
        )
    extra = [c for c in text if c not in (*_NUMERIC, "security", "date", "line")]
    rows = pd.concat([rows, text[extra]], axis=1)
    return rows[~faults.found].reset_index(drop=True), faults.table()


def _lines(text: pd.DataFrame, mask: np.ndarray) -> list[str]:
    return [f"line {line}" for line in text["line"][np.asarray(mask)].head(3)]


def _below_all(numbers: Numbers, said: pd.Series) -> pd.Series:
    code = np.isin(numbers.value, _UNDECLARED_CODES)
    note = np.where(
        code, " (looks like a code for missing that the study file does not declare)", ""
    )
    return FAULTS[15].label + ": " + said + note


class _FirstFault:
    """The first fault of each row, so that a row is set aside once."""

    def __init__(self, line: pd.Series) -> None:
        self.line = line
        self.found = np.zeros(len(line), bool)
        self._parts: list[pd.DataFrame] = []

    def note(self, mask: pd.Series | np.ndarray, fault: int, reason: str | pd.Series) -> None:
        new = np.asarray(mask, bool) & ~self.found
        self.found |= new
        said = reason[new] if isinstance(reason, pd.Series) else reason
        part = pd.DataFrame({"line": self.line[new], "fault": fault})
        self._parts.append(part.assign(reason=said))

    def table(self) -> pd.DataFrame:
        return pd.concat(self._parts, ignore_index=True)


def _check_unit(rows: pd.DataFrame, reading: dict[str, Any]) -> None:
    """Stop when the typical size of returns says that the unit is the other one."""
    size = rows["return_"].abs()
    size = size[size > 0]
    if len(size) < 30:
        return
    middle, high = size.quantile(0.5), size.quantile(0.95)
    said = f"half of all returns exceed {middle:.4g} and 5 % exceed {high:.4g} in size, read as {reading['unit']}"
    if middle > 0.5:
        advice = (
            "set unit: percent" if reading["unit"] == "decimal" else "does the column hold prices?"
        )
    elif high < 0.005 and reading["unit"] == "percent":
        advice = "set unit: decimal"
    else:
        return
    where = f"{reading['label']}, column {reading['columns']['return']}"
    raise KnownProblem(
        "The raw data cannot be used; nothing was written.", [Problem(where, said, advice)]
    )


def _check_frequency(rows: pd.DataFrame, reading: dict[str, Any]) -> None:
    """Stop when securities typically have several rows a month."""
    per_month = rows.groupby(["security", "date"], sort=False).size()
    if len(per_month) and (per_month > 2).mean() > _SHARE_OF_DAILY:
        said = f"{len(rows):,} rows for {len(per_month):,} securities and months: daily or weekly data?"
        where = reading["label"]
        change = "this study is monthly: compound the returns to months first"
        raise KnownProblem(
            "The raw data cannot be used; nothing was written.", [Problem(where, said, change)]
        )


def _one_row_a_month(rows: pd.DataFrame, keep: str) -> tuple[pd.DataFrame, pd.DataFrame, int]:
    """Drop rows that repeat another exactly; treat different rows of one month as the study says."""
    exact = rows.duplicated([c for c in rows if c != "line"], keep="first")
    rows = rows[~exact]
    same_month = rows.duplicated(["security", "date"], keep=False if keep == "set_aside" else keep)
    bad = rows.loc[same_month, ["line"]].assign(fault=19)
    reason = FAULTS[19].label + ": " + rows["security"] + " in " + rows["date"].dt.strftime("%Y-%m")
    return rows[~same_month], bad.assign(reason=reason[same_month]), int(exact.sum())


def _flag(rows: pd.DataFrame, tally: Tally) -> None:
    """Count what is kept but should be seen; invalid sizes become missing."""
    bad_size = ~(rows["size"] > 0)
    if rows["size"].notna().any():
        tally.add(24, bad_size.sum(), _named(rows, bad_size))
    rows["size"] = rows["size"].where(~bad_size)
    same = rows["security"].eq(rows["security"].shift())
    gap = np.diff(month_number(rows["date"]), prepend=0) - 1
    hole = same & (gap > 0)
    tally.add(20, int(gap[hole].sum()), _named(rows, hole))
    zero = rows["return_"].eq(0)
    run = (zero & ~(zero.shift(fill_value=False) & same)).cumsum()
    run_length = run[zero].map(run[zero].value_counts())
    stale = run_length[run_length >= _STALE_RUN].index
    tally.add(21, run[stale].nunique(), _named(rows, rows.index.isin(stale)))
    before = rows["return_"].shift().where(same & (gap == 0))
    reversal = (before > _JUMP) & ((1 + before) * (1 + rows["return_"]) - 1 < _AFTER_REVERSAL)
    tally.add(22, reversal.sum(), _named(rows, reversal))


def _named(rows: pd.DataFrame, mask: pd.Series | np.ndarray) -> list[str]:
    few = rows[mask].head(3)
    return [f"{s} in {month_name(d)}" for s, d in zip(few["security"], few["date"], strict=True)]
