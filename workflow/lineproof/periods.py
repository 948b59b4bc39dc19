"""The periods of a study, numbered so that consecutive periods have consecutive numbers: months, or trading days."""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import cached_property
from typing import Protocol

import numpy as np

ABSENT = -1  # the number of a date that is no period of the study


class Periods(Protocol):
    """How dates become numbers and back. Days are datetime64[D] arrays (n,), numbers int64 (n,)."""

    noun: str

    def number(self, days: np.ndarray) -> np.ndarray:
        """The number of the period each day falls in, or `ABSENT`; NaT gives `ABSENT`."""

    def date(self, numbers: np.ndarray) -> np.ndarray:
        """The date that stands for each period in our tables, datetime64[D]."""

    def begins(self, number: int) -> np.datetime64:
        """The first day of a period."""

    def name(self, number: int) -> str:
        """What a reader calls the period."""


@dataclass(frozen=True)
class Months:
    """Calendar months, counted from January of year 0; a month is dated by its last day."""

    noun: str = "month"

    def number(self, days: np.ndarray) -> np.ndarray:
        months = days.astype("datetime64[M]").astype(np.int64) + 1970 * 12
        return np.where(np.isnat(days), ABSENT, months)

    def date(self, numbers: np.ndarray) -> np.ndarray:
        first = (np.asarray(numbers) + 1 - 1970 * 12).astype("datetime64[M]")
        return first.astype("datetime64[D]") - 1

    def begins(self, number: int) -> np.datetime64:
        return np.datetime64(self.name(number), "D")

    def name(self, number: int) -> str:
        return f"{number // 12}-{number % 12 + 1:02d}"


@dataclass(frozen=True)
class TradingDays:
    """The days of a calendar, ascending datetime64[D] (n_days,), numbered from 0."""

    days: np.ndarray
    noun: str = field(default="day")

    @cached_property
    def _numbers(self) -> np.ndarray:
        """The number of each calendar day from the first to the last, and `ABSENT` at the end for all others."""
        since = (self.days - self.days[0]).astype(np.int64)
        numbers = np.full(since[-1] + 2, ABSENT, np.int64)
        numbers[since] = np.arange(len(self.days))
        return numbers

    def number(self, days: np.ndarray) -> np.ndarray:
        since = (days - self.days[0]).astype(np.int64)
        others = len(self._numbers) - 1
        return self._numbers[np.where((since >= 0) & (since < others), since, others)]

    def date(self, numbers: np.ndarray) -> np.ndarray:
        return self.days[numbers]

    def begins(self, number: int) -> np.datetime64:
        return self.days[number]

    def name(self, number: int) -> str:
        return str(self.days[number])
