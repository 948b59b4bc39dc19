"""Turn columns of a raw file into days and numbers, saying of each value what is wrong with it."""

from __future__ import annotations

import re
from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd
import pyarrow as pa
import pyarrow.compute as pc

from lineproof.intake.plain import find_plain
from lineproof.intake.stopping import stop

_PLAIN = r"^[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?$"
_THOUSANDS = r"^[+-]?[1-9][0-9]{0,2}(?:,[0-9]{3})+(?:\.[0-9]*)?$"
_NOT_FINITE = r"^[+-]?(?i:inf|infinity|nan)$"

YEARS = (1800, 2200)
_YEAR, _MONTH, _DAY = frozenset("Yy"), frozenset("mbBj"), frozenset("dj")
_OTHER = frozenset("daAHMSf%")
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


def to_numbers(
    column: pd.Series | pa.Array,
    missing: list[str],
    *,
    thousands: bool = False,
    decimal: str = "point",
) -> Numbers:
    """Parse a column of trimmed text, or take one of numbers.

    A code that is a number stands for every way to write it: with -99 declared, -99.0 is missing.
    With `thousands`, separators between groups of three digits are read; they never are in a
    return, where 0,123 is a decimal comma. `decimal` is "point" or "comma".
    """
    array = _as_array(column)
    codes = missing_codes(missing)
    if not (pa.types.is_string(array.type) or pa.types.is_large_string(array.type)):
        return _typed(array, codes)
    if decimal == "comma":
        array = _with_points(array)
        codes = _with_points(pa.array(codes)).to_pylist()
    value, plain = _plain_numbers(array)
    rest = np.flatnonzero(~plain)
    other = array.take(rest)
    spelt, grouped = (np.zeros(len(array), bool) for _ in range(2))
    spelt[rest] = _matches(other, _NOT_FINITE)
    if thousands:
        grouped[rest] = _matches(other, _THOUSANDS)
        value[grouped] = _parsed(pc.replace_substring(array.filter(grouped), ",", ""))
    code = _codes(value, rest, other, codes)
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


def settled_texts(texts: list[str], missing: list[str], decimal: str) -> list[str]:
    """Texts of a further column as they are kept: nothing for a code for missing, however written, and numbers with a
    decimal point, as screens and rankings read them."""
    array = pa.array(texts, pa.large_string())
    numbers = to_numbers(array, missing, thousands=True, decimal=decimal)
    if decimal == "comma":
        is_number = ~(numbers.is_text | numbers.is_not_finite)
        array = pc.if_else(pa.array(is_number), _with_points(array), array)
    kept = array.to_pylist()
    return ["" if code >= 0 else text for text, code in zip(kept, numbers.code, strict=True)]


def _typed(array: pa.Array, codes: list[str]) -> Numbers:
    """Numbers that the file holds as numbers: null or NaN is the empty field."""
    value = array.cast(pa.float64(), safe=False).to_numpy(zero_copy_only=False).copy()
    code = _codes(value, np.array([], int), pa.array([], pa.string()), codes)
    code[np.isnan(value)] = codes.index("")
    infinite = np.isinf(value) & (code < 0)
    value[infinite | (code >= 0)] = np.nan
    none = np.zeros(len(array), bool)
    return Numbers(value, code, none, infinite, none)


def _with_points(array: pa.Array) -> pa.Array:
    """Decimal commas become points; points and blanks between thousands become commas."""
    held = pc.replace_substring_regex(array, r"[.\x{a0}\x{202f} ]", "\x00")
    return pc.replace_substring(pc.replace_substring(held, ",", "."), "\x00", ",")


def _as_array(column: pd.Series | pa.Array) -> pa.Array:
    if isinstance(column, pd.Series):
        column = pa.array(column, pa.large_string() if column.dtype != float else None)
    return column.combine_chunks() if isinstance(column, pa.ChunkedArray) else column


def _plain_numbers(array: pa.Array) -> tuple[np.ndarray, np.ndarray]:
    """Values of the texts that are plain numbers, NaN elsewhere, and which they are."""
    plain = find_plain(array)
    value = np.full(len(array), np.nan)
    if plain.all():
        return _parsed(array).copy(), plain
    value[plain] = _parsed(array.filter(plain))
    return value, plain


def _matches(array: pa.Array, pattern: str) -> np.ndarray:
    return pc.match_substring_regex(array, pattern).to_numpy(zero_copy_only=False)


def _parsed(array: pa.Array) -> np.ndarray:
    if len(array) and pc.any(pc.starts_with(array, "+")).as_py():
        array = pc.utf8_ltrim(array, "+")
    return array.cast(pa.float64()).to_numpy(zero_copy_only=False)


def _codes(value: np.ndarray, rest: np.ndarray, other: pa.Array, codes: list[str]) -> np.ndarray:
    """The position of each value's code; `other` are the texts, at `rest`, that are no plain numbers."""
    found = np.full(len(value), -1, np.int8)
    for position, code in reversed(list(enumerate(codes))):
        found[rest[pc.equal(other, code).to_numpy(zero_copy_only=False)]] = position
        if re.match(_PLAIN, code):
            found[value == float(code)] = position
    return found


def as_decimal(value: np.ndarray, unit: str) -> np.ndarray:
    """Returns or rates as decimals; `unit` is "decimal" or "percent"."""
    return value / 100 if unit == "percent" else value


def to_days(column: pd.Series | pa.Array, dates: str) -> np.ndarray:
    """The day of each date, datetime64[D], NaT where it does not parse or lies outside 1800–2200.

    A typed date is taken as it is; a number is read as its digits. A format without a day gives
    the first of the month. Dates without separators, such as 20000131, must have all their digits.
    """
    array = _as_array(column)
    if pa.types.is_temporal(array.type):
        return _within(array.to_numpy(zero_copy_only=False))
    coded = array.dictionary_encode()
    distinct = pd.Series([as_digits(value) for value in coded.dictionary.to_pylist()], dtype=str)
    parsed = pd.to_datetime(distinct, format=dates, errors="coerce", exact=True, utc="%z" in dates)
    days = _within(pd.DatetimeIndex(parsed).tz_localize(None).to_numpy())
    parts = re.findall("%.", dates)
    if "".join(parts) == dates and set(parts) <= set(_WIDTH):
        short = (distinct.str.len() != sum(_WIDTH[part] for part in parts)).to_numpy()
        days[short] = np.datetime64("NaT")
    index = pc.fill_null(coded.indices, len(days)).to_numpy(zero_copy_only=False)
    return np.append(days, np.datetime64("NaT"))[index]


def as_digits(value: Any) -> str:
    """A number as the digits it is written with: a whole one without a point, nothing for NaN or None."""
    if value is None or value != value:
        return ""
    return str(int(value)) if isinstance(value, float) and value.is_integer() else str(value)


def _within(moments: np.ndarray) -> np.ndarray:
    days = moments.astype("datetime64[D]")
    years = days.astype("datetime64[Y]").astype(np.int64) + 1970
    days[(years < YEARS[0]) | (years > YEARS[1])] = np.datetime64("NaT")
    return days


def check_date_format(reading: dict[str, Any], *, daily: bool = False) -> None:
    """Stop when `dates` is no format, or gives no month, or no day where the data are daily.

    Raises KnownProblem.
    """
    dates, where = reading["dates"], f"{reading['label']}, dates"
    parts = [part[1:] for part in re.findall("%.?", dates.replace("%%", ""))]
    unknown = [part for part in parts if part not in _YEAR | _MONTH | _OTHER]
    twice = [part for part in dict.fromkeys(parts) if parts.count(part) > 1]
    if unknown or twice:
        wrong = f"%{unknown[0]} is not known" if unknown else f"%{twice[0]} stands twice"
        raise stop(where, f"{dates!r} is no format for dates: {wrong}", "as in %Y-%m-%d")
    wanted = {"year": _YEAR, "month": _MONTH, **({"day": _DAY} if daily else {})}
    for what, found in wanted.items():
        if not found & set(parts):
            other = ", or set frequency: monthly" if what == "day" else ""
            raise stop(where, f"{dates!r} gives no {what}", f"as in %Y-%m-%d{other}")
