"""Turn text into dates and numbers, saying of each value what is wrong with it."""

from __future__ import annotations

import re
from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd
import pyarrow as pa
import pyarrow.compute as pc

from lineproof.intake.stopping import stop

_PLAIN = r"^[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?$"
_THOUSANDS = r"^[+-]?[1-9][0-9]{0,2}(?:,[0-9]{3})+(?:\.[0-9]*)?$"
_NOT_FINITE = r"^[+-]?(?i:inf|infinity|nan)$"
_DECIMAL_COMMA = r"^[+-]?[0-9]*,[0-9]+$"

YEARS = (1800, 2200)
_YEAR, _MONTH, _OTHER = frozenset("Yy"), frozenset("mbBj"), frozenset("daAHMSf%")
_WIDTH = {"%Y": 4, "%m": 2, "%d": 2}


@dataclass(frozen=True)
class Numbers:
    """A column of numbers, each array (n,).

    `value` is NaN where there is none; `code` is the position of the code for missing among those
    declared, or -1; the masks say which values are text or not finite, and which had thousands
    separators.
    """

    value: np.ndarray
    code: np.ndarray
    is_text: np.ndarray
    is_not_finite: np.ndarray
    had_thousands: np.ndarray


def missing_codes(missing: list[str]) -> list[str]:
    """The codes for a missing value, in the order of the study file; an empty field is always one."""
    return list(dict.fromkeys(["", *missing]))


def to_numbers(text: pd.Series, missing: list[str], *, thousands: bool = False) -> Numbers:
    """Parse a column of trimmed text.

    A code that is a number stands for every way to write it: with -99 declared, -99.0 is missing.
    With `thousands`, commas between groups of three digits are read; they never are in a return,
    where 0,123 is a decimal comma.
    """
    array = _as_array(text)
    plain = _matches(array, _PLAIN)
    value = np.full(len(array), np.nan)
    value[plain] = _parsed(array.filter(plain))
    rest = np.flatnonzero(~plain)
    other = array.take(rest)
    spelt = np.zeros(len(array), bool)
    spelt[rest] = _matches(other, _NOT_FINITE)
    grouped = np.zeros(len(array), bool)
    if thousands:
        grouped[rest] = _matches(other, _THOUSANDS)
        value[grouped] = _parsed(pc.replace_substring(array.filter(grouped), ",", ""))
    code = _codes(array, value, missing_codes(missing))
    is_missing = code >= 0
    too_large = np.isinf(value)
    value[is_missing | too_large] = np.nan
    return Numbers(
        value=value,
        code=code,
        is_text=~(is_missing | plain | spelt | grouped),
        is_not_finite=(spelt | too_large) & ~is_missing,
        had_thousands=grouped & ~is_missing,
    )


def _as_array(text: pd.Series) -> pa.Array:
    array = pa.array(text, pa.large_string())
    return array.combine_chunks() if isinstance(array, pa.ChunkedArray) else array


def _matches(array: pa.Array, pattern: str) -> np.ndarray:
    return pc.match_substring_regex(array, pattern).to_numpy(zero_copy_only=False)


def _parsed(array: pa.Array) -> np.ndarray:
    bare = pc.utf8_ltrim(array, "+")
    return bare.cast(pa.float64()).to_numpy(zero_copy_only=False)


def _codes(array: pa.Array, value: np.ndarray, codes: list[str]) -> np.ndarray:
    found = np.full(len(array), -1, np.int16)
    for position, code in reversed(list(enumerate(codes))):
        same = pc.equal(array, code).to_numpy(zero_copy_only=False)
        if re.match(_PLAIN, code):
            same |= value == float(code)
        found[same] = position
    return found


def as_decimal(value: np.ndarray, unit: str) -> np.ndarray:
    """Returns or rates as decimals; `unit` is "decimal" or "percent"."""
    return value / 100 if unit == "percent" else value


def without_codes(text: pd.Series, missing: list[str]) -> pd.Series:
    """A column of text in which every code for a missing value is the empty text."""
    return text.mask(text.isin(missing), "")


def share_with_decimal_comma(text: pd.Series) -> float:
    """Share of the values, blanks aside, that look like `0,015`."""
    array = _as_array(text)
    given = array.filter(pc.not_equal(array, ""))
    return float(_matches(given, _DECIMAL_COMMA).mean()) if len(given) else 0.0


def to_months(text: pd.Series, dates: str) -> pd.Series:
    """The last day of the month of each date, NaT where it does not parse or lies outside 1800–2200.

    Dates without separators, such as 20000131, must have all their digits.
    """
    coded = _as_array(text).dictionary_encode()
    distinct = coded.dictionary.to_pandas()
    parsed = pd.DatetimeIndex(pd.to_datetime(distinct, format=dates, errors="coerce", exact=True))
    parsed = parsed.as_unit("ms")
    within = (parsed.year >= YEARS[0]) & (parsed.year <= YEARS[1])
    parts = re.findall("%.", dates)
    if "".join(parts) == dates and set(parts) <= set(_WIDTH):
        within &= (distinct.str.len() == sum(_WIDTH[part] for part in parts)).to_numpy()
    ends = parsed.where(within).to_period("M").to_timestamp(how="end").normalize().as_unit("ms")
    found = ends.take(coded.indices.to_numpy(zero_copy_only=False))
    return pd.Series(found, index=text.index, name="date")


def check_date_format(reading: dict[str, Any]) -> None:
    """Stop when `dates` is no format, or gives no month.

    Raises KnownProblem.
    """
    dates, where = reading["dates"], f"{reading['label']}, dates"
    parts = [part[1:] for part in re.findall("%.?", dates.replace("%%", ""))]
    unknown = [part for part in parts if part not in _YEAR | _MONTH | _OTHER]
    twice = [part for part in dict.fromkeys(parts) if parts.count(part) > 1]
    if unknown or twice:
        wrong = f"%{unknown[0]} is not known" if unknown else f"%{twice[0]} stands twice"
        raise stop(where, f"{dates!r} is no format for dates: {wrong}", "as in %Y-%m-%d")
    if not (_YEAR & set(parts) and _MONTH & set(parts)):
        found = f"{dates!r} gives no {'month' if _YEAR & set(parts) else 'year'}"
        raise stop(where, found, "as in %Y-%m-%d")
