"""Find out how the dates of a file are written, where the study file leaves `dates` out (faults 9 and 10)."""

from __future__ import annotations

import re
from collections.abc import Iterable
from datetime import datetime
from typing import Any

import pyarrow as pa
import pyarrow.compute as pc

from lineproof.intake.stopping import stop
from lineproof.intake.values import YEARS

_MOST = 200_000  # distinct dates; 1800 to 2200 has 146,097 days
_SHARE = 0.8  # of the distinct texts that must be of one form; the rest are rows to be set aside
_SEPARATED = re.compile(r"(\d{1,2})([/.-])(\d{1,2})\2(\d{4})")
_TWO_DIGIT_YEAR = re.compile(
    r"\d{1,2}([/.-])\d{1,2}\1\d{2}|\d{2}([/.-])\d{1,2}\2\d{1,2}|\d{1,2}[/.-]\d{2}"
)
_NO_DATE = re.compile(r"\d{1,5}")  # a day, a month or a year alone, or the number of a row
_SIX_DIGITS = re.compile(r"\d{6}")

# Forms that leave no doubt, by what they look like.
_CLEAR = {
    "%Y-%m-%d": r"\d{4}-\d{1,2}-\d{1,2}",
    "%Y/%m/%d": r"\d{4}/\d{1,2}/\d{1,2}",
    "%Y.%m.%d": r"\d{4}\.\d{1,2}\.\d{1,2}",
    "%Y-%m-%d %H:%M:%S": r"\d{4}-\d{1,2}-\d{1,2} \d{2}:\d{2}:\d{2}",
    "%Y-%m-%dT%H:%M:%S": r"\d{4}-\d{1,2}-\d{1,2}T\d{2}:\d{2}:\d{2}",
    "%Y%m%d": r"\d{8}",
    "%Y%m": r"\d{6}",
    "%Y-%m": r"\d{4}-\d{1,2}",
    "%Y/%m": r"\d{4}/\d{1,2}",
    "%m/%Y": r"\d{1,2}/\d{4}",
    "%m-%Y": r"\d{1,2}-\d{4}",
    "%m.%Y": r"\d{1,2}\.\d{4}",
    "%d%b%Y": r"\d{1,2}[A-Za-z]{3}\d{4}",
    "%d-%b-%Y": r"\d{1,2}-[A-Za-z]{3}-\d{4}",
    "%d %b %Y": r"\d{1,2} [A-Za-z]{3} \d{4}",
    "%d %B %Y": r"\d{1,2} [A-Za-z]+ \d{4}",
    "%b %d %Y": r"[A-Za-z]{3} \d{1,2} \d{4}",
    "%b %d, %Y": r"[A-Za-z]{3} \d{1,2}, \d{4}",
    "%B %d, %Y": r"[A-Za-z]+ \d{1,2}, \d{4}",
    "%b %Y": r"[A-Za-z]{3} \d{4}",
    "%b-%Y": r"[A-Za-z]{3}-\d{4}",
    "%B %Y": r"[A-Za-z]+ \d{4}",
}


class DateOrder:
    """Collects the distinct texts of a column of dates, block by block."""

    def __init__(self) -> None:
        self.texts: set[str] = set()
        self.is_typed = False

    def add(self, column: pa.Array | pa.ChunkedArray) -> None:
        """Take in one block: text, whole numbers such as 20000131, or dates, which need no format."""
        if pa.types.is_temporal(column.type):
            self.is_typed = True
        elif len(self.texts) <= _MOST:
            self.texts.update(_distinct(column))

    def merge(self, other: DateOrder) -> None:
        """Add what another one has seen."""
        self.texts |= other.texts
        self.is_typed |= other.is_typed

    def found(self, reading: dict[str, Any]) -> str | None:
        """The format of the dates, or None where they are typed. Raises KnownProblem as `date_format` does."""
        return None if self.is_typed and not self.texts else date_format(self.texts, reading)


def _distinct(column: pa.Array | pa.ChunkedArray) -> Iterable[str]:
    if pa.types.is_floating(column.type):  # whole numbers that missing values have turned to floats
        column = column.cast(pa.int64(), safe=False)
    return (str(value) for value in pc.unique(column).to_pylist() if value not in (None, ""))


def date_format(texts: Iterable[str], reading: dict[str, Any]) -> str:
    """The one format in which nearly all of some distinct texts (without blanks around) are dates.

    Days and months are told apart only by a day above 12. Texts that are missing by `reading["missing"]` do not count.

    Raises KnownProblem when the order stays ambiguous or contradicts itself, when years have two digits, or when no one
    form fits.
    """
    where = f"{reading['label']}, column {reading['columns']['date']}"
    given = sorted(set(texts) - set(reading["missing"]) - {""})
    if len(given) > _MOST:
        found = f"it holds more than {_MOST:,} different values, as {given[0]!r}"
        raise stop(where, found, "is this the column of the dates? If so, set dates:")
    if not given:
        raise stop(where, "no row has a date", "is this the column of the dates?")
    fits = {form: _dates(given, form, looks) for form, looks in _CLEAR.items()}
    separated = {text: m for text in given if (m := _SEPARATED.fullmatch(text))}
    best = max(fits, key=lambda form: len(fits[form]))
    if len(fits[best]) >= _SHARE * len(given):
        return best
    if len(separated) >= _SHARE * len(given):
        return _day_or_month_first(separated, where)
    raise _no_form(given, where)


def _dates(texts: list[str], form: str, looks: str) -> list[str]:
    pattern = re.compile(looks)
    return [text for text in texts if pattern.fullmatch(text) and _is_date(text, form)]


def _is_date(text: str, form: str) -> bool:
    try:
        return YEARS[0] <= datetime.strptime(text, form).year <= YEARS[1]
    except ValueError:
        return False


def _day_or_month_first(separated: dict[str, re.Match[str]], where: str) -> str:
    """`%d/%m/%Y` or `%m/%d/%Y`, with the separator that most texts have."""
    between = [match[2] for match in separated.values()]
    mark = max(sorted(set(between)), key=between.count)
    day_first, month_first = (f"%d{mark}%m{mark}%Y", f"%m{mark}%d{mark}%Y")
    written = {text: (int(m[1]), int(m[3])) for text, m in separated.items() if m[2] == mark}
    days = [text for text, (first, second) in written.items() if 12 < first <= 31 and second <= 12]
    months = [text for text, (first, second) in written.items() if first <= 12 < second <= 31]
    to_set = f'set dates: "{day_first}" or dates: "{month_first}"'
    if days and months:
        found = (
            f"its dates contradict one another: {days[0]} has the day first, {months[0]} the month"
        )
        raise stop(where, found, f"{to_set}, and the other rows are set aside")
    if days or months:
        return day_first if days else month_first
    example = next((text for text, (first, second) in written.items() if first != second), None)
    example = example or next(iter(written))
    found = f"the order of its dates is ambiguous: {example} {_both_ways(example, mark)}"
    raise stop(where, found, to_set)


def _both_ways(text: str, mark: str) -> str:
    first, second, year = text.split(mark)
    if int(first) == int(second) or not _is_date(f"{second}-{first}-{year}", "%d-%m-%Y"):
        return "does not say which is the day"
    one, other = (
        f"{int(day)} {datetime(2000, int(month), 1):%B}"
        for day, month in ((first, second), (second, first))
    )
    return f"could be {one} or {other} {year}"


def _no_form(given: list[str], where: str) -> Exception:
    short = [
        text for text in given if _TWO_DIGIT_YEAR.fullmatch(text) or _SIX_DIGITS.fullmatch(text)
    ]
    if len(short) >= _SHARE * len(given):
        found = f"its years have two digits, as in {short[0]}, which leaves the century open"
        return stop(where, found, "write years with four digits, or set dates: with %y")
    numbers = [text for text in given if _NO_DATE.fullmatch(text)]
    if len(numbers) >= _SHARE * len(given):
        found = f"it holds numbers that are no dates, as {numbers[0]} and {numbers[-1]}"
        change = (
            "name the column of the dates; of a date in parts make one column, as in 2000-01-31"
        )
        return stop(where, found, change)
    step = max(1, len(given) // 3)
    shown = ", ".join(repr(text) for text in given[::step][:3])
    return stop(where, f"its dates have no one form, as in {shown}", "set dates:, as in %Y-%m-%d")
