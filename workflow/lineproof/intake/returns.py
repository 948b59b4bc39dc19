"""Clean the returns of single securities: every row is kept, set aside with its reason, or an exact duplicate."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd

from lineproof.calendar import month_number
from lineproof.intake.faults import Tally
from lineproof.intake.flags import flag_rows, flag_sizes, name_rows
from lineproof.intake.plausible import check_decimal_comma, check_frequency, check_unit
from lineproof.intake.reading import TextTable
from lineproof.intake.setting_aside import FirstFault, count_set_aside
from lineproof.intake.stopping import stop
from lineproof.intake.values import (
    as_decimal,
    check_date_format,
    missing_codes,
    to_months,
    to_numbers,
    without_codes,
)

_NUMERIC = ("return", "final_return", "size", "price")
_WITH_THOUSANDS = ("size", "price")
_OURS = {"line", "code", "return_", "total_return", "excess_return", "eligible", "leaves"}
_UNDECLARED_CODES = (-66.0, -77.0, -88.0, -99.0, -999.0)


@dataclass(frozen=True)
class Cleaned:
    """`rows`: one a security and month, sorted; `set_aside`: line, fault, reason; and the counts.

    `place` is what `line` counts, "line" or "row"; `last_seen` is the last month of each security
    in the file, that of rows set aside included; `n_before` and `n_after` count the rows dated
    before and after the months of the market.
    """

    rows: pd.DataFrame
    set_aside: pd.DataFrame
    place: str
    n_read: int
    n_duplicates: int
    last_seen: pd.Series
    n_before: int
    n_after: int
    tally: Tally


def clean_returns(
    table: TextTable, reading: dict[str, Any], same_month_rows: str, months: pd.Series
) -> Cleaned:
    """Parse and check a table of raw returns; `months` are the month ends that the market has.

    `rows` gets security, date (month end), return_, final_return, size, price (decimal; NaN where missing), and any
    further columns as text.

    Raises KnownProblem when the file as a whole does not fit what the study file says of it.
    """
    _check_names(reading)
    check_date_format(reading)
    check_decimal_comma(table.rows["return"], reading)
    tally = Tally()
    tally.add(7, table.n_trimmed)
    faults = FirstFault(table.rows["line"])
    rows = _parsed(table.rows, reading, tally, faults)
    check_unit(rows["return_"].to_numpy(), reading)
    check_frequency(rows["security"], rows["date"], table.rows["date"], reading)
    seen = rows.loc[rows["date"].notna(), ["security", "date"]]
    before, after = rows["date"] < months.min(), rows["date"] > months.max()
    faults.note(before | after, 28, table.rows["date"])
    kept, n_duplicates = _one_row_a_month(rows, same_month_rows, faults)
    set_aside = faults.table(table.rejects)
    count_set_aside(set_aside, table.place, tally)
    return Cleaned(
        rows=_flagged(kept, reading, tally),
        set_aside=set_aside,
        place=table.place,
        n_read=table.n_read,
        n_duplicates=n_duplicates,
        last_seen=seen.groupby("security", sort=False)["date"].max(),
        n_before=int(before.sum()),
        n_after=int(after.sum()),
        tally=tally,
    )


def _flagged(rows: pd.DataFrame, reading: dict[str, Any], tally: Tally) -> pd.DataFrame:
    """The rows after flags are counted, with sizes that are none made missing."""
    flag_rows(rows, tally, missing_codes(reading["missing"]))
    if "size" in reading["columns"]:
        flag_sizes(rows, tally)
    return rows.assign(size=rows["size"].where(rows["size"] > 0)).drop(columns="code")


def _check_names(reading: dict[str, Any]) -> None:
    taken = sorted(_OURS & set(reading["columns"]))
    if taken:
        found = f"our own tables have a column {taken[0]!r} already"
        raise stop(f"{reading['label']}, columns.{taken[0]}", found, "give it another name")


def _parsed(
    text: pd.DataFrame, reading: dict[str, Any], tally: Tally, faults: FirstFault
) -> pd.DataFrame:
    """Every row as values, with `code`, the position of the code for a missing return, or -1."""
    missing, theirs = reading["missing"], reading["columns"]
    security = text["security"].str.strip("\"'").str.strip()
    tally.add(7, (security != text["security"]).sum())
    date = to_months(text["date"], reading["dates"])
    faults.note(security == "", 23)
    faults.note(date.isna(), 8, text["date"], "{!r}")
    columns: dict[str, Any] = {"security": security, "date": date}
    for name in _NUMERIC:
        ours = "return_" if name == "return" else name
        if name not in theirs:
            columns[ours] = np.full(len(text), np.nan)
            continue
        numbers = to_numbers(text[name], missing, thousands=name in _WITH_THOUSANDS)
        said = theirs[name].replace("{", "{{").replace("}", "}}") + " is {!r}"
        faults.note(numbers.is_text, 13, text[name], said)
        faults.note(numbers.is_not_finite, 14, text[name], said)
        tally.add(7, numbers.had_thousands.sum())
        columns[ours] = numbers.value
        if name.endswith("return"):
            columns[ours] = as_decimal(numbers.value, reading["unit"])
            _note_below_all(columns[ours], numbers.value, text[name], said, faults)
        if name == "return":
            columns["code"] = numbers.code
    further = [c for c in text if c not in (*columns, *_NUMERIC, "line")]
    return pd.DataFrame({**columns, **{c: without_codes(text[c], missing) for c in further}})


def _note_below_all(
    decimal: np.ndarray, written: np.ndarray, text: pd.Series, said: str, faults: FirstFault
) -> None:
    """Set aside returns below −100 %, naming those that look like a code nobody declared."""
    below = decimal < -1
    coded = np.isin(written, _UNDECLARED_CODES)
    hint = ", which often stands for a missing value; if so, add it to missing:"
    faults.note(below & coded, 15, text, said + hint)
    faults.note(below, 15, text, said)


def _one_row_a_month(rows: pd.DataFrame, keep: str, faults: FirstFault) -> tuple[pd.DataFrame, int]:
    """Sound rows, one a security and month, sorted; and the number of exact duplicates dropped.

    Different rows of one month are treated as `keep` says: "set_aside", or "first" or "last" in
    the order of the file.
    """
    sound = np.flatnonzero(~faults.found)
    security = pd.factorize(rows["security"], sort=True)[0][sound]
    month = month_number(rows["date"].iloc[sound])
    order = np.lexsort((month, security))
    sound, security, month = sound[order], security[order], month[order]
    tied = (np.diff(security, prepend=-1) == 0) & (np.diff(month, prepend=-1) == 0)
    tied |= np.append(tied[1:], False)
    several = rows.iloc[np.sort(sound[tied])]
    exact = several[several.duplicated(keep="last" if keep == "last" else "first")].index
    different = several.drop(exact)
    losing = different.duplicated(["security", "date"], keep=False if keep == "set_aside" else keep)
    aside = different.index[losing]
    named = pd.Series(name_rows(rows.loc[aside]), index=aside, dtype=str)
    faults.note(rows.index.isin(aside), 19, named)
    kept = sound[~rows.index.isin(aside.union(exact))[sound]]
    return rows.iloc[kept].reset_index(drop=True), len(exact)
