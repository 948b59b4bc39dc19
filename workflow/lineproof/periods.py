"""The periods of a study, numbered so that consecutive periods have consecutive numbers: months, or trading days."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Protocol

import numpy as np

ABSENT = -1  # the number of a date that is no period of the study
_MANY = 10_000
_JANUARY_1970 = 1970 * 12
_RECENT = 250  # trading days that show on which weekdays the market is open


class Periods(Protocol):
    """How dates become numbers and back. Days are datetime64 arrays (n,), numbers int64 (n,)."""

    noun: str

    def number(self, days: np.ndarray) -> np.ndarray:
        """The number of the period each day falls in, or `ABSENT`; NaT gives `ABSENT`."""

    def date(self, numbers: np.ndarray) -> np.ndarray:
        """The date that stands for each period in our tables, datetime64[D]."""

    def begins(self, number: int) -> np.datetime64:
        """The first day of a period."""

    def name(self, number: int) -> str:
        """What a reader calls the period."""

    def month(self, numbers: np.ndarray) -> np.ndarray:
        """The calendar month each period lies in, as `Months` numbers it."""

    def closes_month(self, numbers: np.ndarray) -> np.ndarray:
        """Whether each period ends a calendar month, so that groups can be formed: bool (n,)."""

    def n_between(self, first: str, last: str) -> int:
        """How many periods lie in the months `first` to `last`, both included, as `YYYY-MM`."""


@dataclass(frozen=True)
class Months:
    """Calendar months, counted from January of year 0; a month is dated by its last day."""

    noun: str = "month"

    def number(self, days: np.ndarray) -> np.ndarray:
        if len(days) > _MANY and not np.isnat(days).any():  # the calendar is worked out once a day
            since = days.astype("datetime64[D]").astype(np.int64)
            low, high = int(since.min()), int(since.max())
            if high - low < len(days):
                every = np.arange(low, high + 1).astype("datetime64[D]")
                return self._of(every)[since - low]
        return np.where(np.isnat(days), ABSENT, self._of(days))

    def _of(self, days: np.ndarray) -> np.ndarray:
        return days.astype("datetime64[M]").astype(np.int64) + _JANUARY_1970

    def date(self, numbers: np.ndarray) -> np.ndarray:
        first = (np.asarray(numbers) + 1 - _JANUARY_1970).astype("datetime64[M]")
        return first.astype("datetime64[D]") - 1

    def begins(self, number: int) -> np.datetime64:
        return np.datetime64(self.name(number), "D")

    def name(self, number: int) -> str:
        return f"{number // 12}-{number % 12 + 1:02d}"

    def month(self, numbers: np.ndarray) -> np.ndarray:
        return numbers

    def closes_month(self, numbers: np.ndarray) -> np.ndarray:
        return np.ones(len(numbers), bool)

    def n_between(self, first: str, last: str) -> int:
        return _month_number(last) - _month_number(first) + 1


@dataclass(frozen=True)
class TradingDays:
    """The days of a calendar, ascending datetime64[D] (n_days,), numbered from 0."""

    days: np.ndarray
    noun: str = "day"

    def number(self, days: np.ndarray) -> np.ndarray:
        place = (days.astype("datetime64[D]") - self.days[0]).astype(np.int64)
        known = (place >= 0) & (place < len(self._number))
        return np.where(known, self._number[np.where(known, place, 0)], ABSENT)

    def date(self, numbers: np.ndarray) -> np.ndarray:
        return self.days[numbers]

    def begins(self, number: int) -> np.datetime64:
        return self.days[number]

    def name(self, number: int) -> str:
        return str(self.days[number])

    def month(self, numbers: np.ndarray) -> np.ndarray:
        return self._month[numbers]

    def closes_month(self, numbers: np.ndarray) -> np.ndarray:
        """The last trading day of a month does, unless the calendar may end before the month is over."""
        return self._closes_month[numbers]

    def n_between(self, first: str, last: str) -> int:
        low, high = _month_number(first), _month_number(last)
        return int(((self._month >= low) & (self._month <= high)).sum())

    def last_of_month(self, numbers: np.ndarray) -> np.ndarray:
        """The number of the last trading day in the month of each day."""
        return (np.searchsorted(self._month, self._month, side="right") - 1)[numbers]

    @cached_property
    def _number(self) -> np.ndarray:
        """Number of every calendar day from the first trading day to the last."""
        place = (self.days - self.days[0]).astype(np.int64)
        table = np.full(place[-1] + 1, ABSENT)
        table[place] = np.arange(len(self.days))
        return table

    @cached_property
    def _month(self) -> np.ndarray:
        return Months().number(self.days)

    @cached_property
    def _closes_month(self) -> np.ndarray:
        return np.append(self._month[1:] != self._month[:-1], self._is_over)

    @property
    def _is_over(self) -> bool:
        """Whether no day is left in the last month on whose weekday the market is usually open."""
        last = self.days[-1]
        left = np.arange(last + 1, Months().date(self._month[-1:])[0] + 1)
        return not np.isin(_weekday(left), _weekday(self.days[-_RECENT:])).any()


def periods_of(frequency: str, dates: np.ndarray) -> Periods:
    """Months for a monthly study; else the trading days among `dates` (datetime64), those of the market."""
    if frequency == "monthly":
        return Months()
    return TradingDays(np.unique(dates.astype("datetime64[D]")))


def _weekday(days: np.ndarray) -> np.ndarray:
    """0 to 6; the same number for the same weekday."""
    return days.astype("datetime64[D]").astype(np.int64) % 7


def _month_number(month: str) -> int:
    return int(np.datetime64(month, "M").astype(np.int64)) + _JANUARY_1970
