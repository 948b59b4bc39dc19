"""Turn text into dates and numbers, saying of each value what is wrong with it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pandas as pd
import pyarrow as pa

_PLAIN = r"[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?"
_THOUSANDS = r"[+-]?[0-9]{1,3}(?:,[0-9]{3})+(?:\.[0-9]*)?"
_NOT_FINITE = r"(?i:[+-]?(?:inf|infinity|nan))"

YEARS = (1800, 2200)


@dataclass(frozen=True)
class Numbers:
    """`value` (NaN where there is none); masks say which are missing by a code, text, or not finite."""

    value: np.ndarray
    is_missing: np.ndarray
    is_text: np.ndarray
    is_not_finite: np.ndarray
    n_thousands: int


def to_numbers(text: pd.Series, missing: list[str]) -> Numbers:
    """Parse a column of trimmed text; thousands separators are read, all else must be a plain number."""
    is_missing = text.isin(missing).to_numpy() | (text == "").to_numpy()
    thousands = text.str.fullmatch(_THOUSANDS).to_numpy(bool) & ~is_missing
    plain_text = text.where(~thousands, text.str.replace(",", "")) if thousands.any() else text
    plain = plain_text.str.fullmatch(_PLAIN).to_numpy(bool) & ~is_missing
    spelt = text.str.fullmatch(_NOT_FINITE).to_numpy(bool) & ~is_missing
    value = np.full(len(text), np.nan)
    picked = pa.array(plain_text[plain].str.lstrip("+").to_numpy(object), pa.string())
    value[plain] = picked.cast(pa.float64()).to_numpy(zero_copy_only=False)
    too_large = plain & np.isinf(value)
    value[too_large] = np.nan
    return Numbers(
        value=value,
        is_missing=is_missing,
        is_text=~(is_missing | plain | spelt),
        is_not_finite=spelt | too_large,
        n_thousands=int(thousands.sum()),
    )


def to_months(text: pd.Series, dates: str) -> pd.Series:
    """The last day of the month of each date, NaT where it does not parse or lies outside 1800–2200."""
    distinct = pd.Index(text.unique())
    parsed = pd.to_datetime(distinct, format=dates, errors="coerce", exact=True).as_unit("ms")
    within = (parsed.year >= YEARS[0]) & (parsed.year <= YEARS[1])
    ends = parsed.where(within).to_period("M").to_timestamp(how="end").normalize().as_unit("ms")
    return text.map(pd.Series(ends, index=distinct))
