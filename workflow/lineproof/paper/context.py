"""What the paper is printed from."""

from __future__ import annotations

import re
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import pandas as pd

from lineproof.addresses import is_spread
from lineproof.frequency import Frequency
from lineproof.paper.book import Book

MONTHS = [
    "January",
    "February",
    "March",
    "April",
    "May",
    "June",
    "July",
    "August",
    "September",
    "October",
    "November",
    "December",
]


@dataclass(frozen=True)
class Subperiod:
    """A stretch of months; `first` and `last` as "1955-01"."""

    name: str
    title: str
    first: str
    last: str

    @property
    def dates(self) -> str:
        """First and last month in words."""
        return f"{month(self.first)} to {month(self.last)}"


def month(text: str) -> str:
    """ "1955-01" as "January 1955"."""
    year, number = text.split("-")
    return f"{MONTHS[int(number) - 1]} {year}"


@dataclass(frozen=True)
class Context:
    """Everything a table, a figure or the report is made from.

    Attributes:
        estimates: one row a number, as `book.Book` reads it.
        subperiods: dictionaries with name, title, first, last ("1955-01") and n_periods.
        facts: what `lineproof.facts.facts` says of the study.
        intake: labels of the data's faults and screens, under "faults" and "screens".
    """

    estimates: pd.DataFrame
    subperiods: list[dict[str, Any]]
    facts: dict[str, Any]
    intake: dict[str, Any]

    @cached_property
    def book(self) -> Book:
        """The estimates by address."""
        return Book(self.estimates)

    @cached_property
    def periods(self) -> list[Subperiod]:
        """The study's subperiods, in order."""
        keys = ("name", "title", "first", "last")
        return [Subperiod(**{key: each[key] for key in keys}) for each in self.subperiods]

    @property
    def main_period(self) -> Subperiod:
        """The subperiod of the tables that show only one.

        A stretch the study cuts into parts is no subperiod itself: its first part stands for it.
        """
        wanted = self.facts["paper"]["main_subperiod"]
        exact = [each for each in self.periods if each.name == wanted]
        parts = [each for each in self.periods if each.name.startswith(f"{wanted}-")]
        return (exact or parts or self.periods)[0]

    @property
    def period(self) -> Frequency:
        """What a period of the study is called, and how what it earns is printed."""
        return Frequency(**self.facts["period"])

    @property
    def level(self) -> float:
        """Level of the tests."""
        return self.facts["level"]

    @property
    def sorts(self) -> list[str]:
        """Names of the sets of test assets, the main one first."""
        main = self.facts["paper"]["main"]
        return [main, *(name for name in self.facts["sorts"] if name != main)]

    def ranked(self, sort: str) -> bool:
        """Whether the assets of a sort are groups ranked on beta, not supplied series."""
        return self.facts["sorts"][sort]["design"] != "supplied"

    def title(self, sort: str) -> str:
        """Name of a set of test assets for readers."""
        return self.facts["sorts"][sort]["title"]

    def assets(self, sort: str) -> list[str]:
        """Test assets that a sort has in any subperiod."""
        found = (name for each in self.periods for name in self.book.assets(sort, each.name))
        return list(dict.fromkeys(found))

    def groups(self, sort: str) -> list[int]:
        """Number of groups by variable; none where the assets are supplied."""
        return self.facts["sorts"][sort].get("groups", [])

    def variables(self, sort: str) -> list[str]:
        """What each variable that a sort ranks on is called."""
        return self.facts["sorts"][sort]["variables"]

    def group_assets(self, sort: str) -> list[str]:
        """Those test assets of a sort that are groups."""
        return [asset for asset in self.assets(sort) if self.group(sort, asset)]

    def group(self, sort: str, asset: str) -> tuple[int, ...]:
        """The number of a group by variable, from 1: `p02-05` is (2, 5); empty for what is no group."""
        found = re.fullmatch(r"p(\d+)(?:-(\d+))?", asset) if self.ranked(sort) else None
        return tuple(int(part) for part in found.groups() if part) if found else ()

    def label(self, sort: str, asset: str) -> str:
        """An asset's name for readers: groups of one variable Low, 2, …, High, of two 1 / 1 to 5 / 5."""
        numbers = self.group(sort, asset)
        if len(numbers) == 1:
            return group_name(numbers[0], self.groups(sort)[0])
        if numbers:
            return " / ".join(map(str, numbers))
        return HIGH_LOW if self.ranked(sort) and is_spread(asset) else asset

    def spreads(self, sort: str) -> list[str]:
        """Differences of groups that a sort has in any subperiod, the overall one first."""
        found = (name for each in self.periods for name in self.book.spreads(sort, each.name))
        return list(dict.fromkeys(found))


HIGH_LOW = "High − low"


def group_name(number: int, count: int) -> str:
    """The name of a group among so many, from the lowest on."""
    return {1: "Low", count: "High"}.get(number, str(number))
