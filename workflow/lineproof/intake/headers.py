"""Find the columns of the study file in the header of a raw file, and say what is wrong with a header."""

from __future__ import annotations

import json
from collections import Counter
from dataclasses import dataclass
from difflib import get_close_matches
from typing import Any

from lineproof.intake.stopping import UNUSABLE, stop
from lineproof.problems import KnownProblem, Problem

_SEPARATORS = {",": "comma", ";": "semicolon", "\t": "tab", "|": "bar"}
_N_LISTED = 40  # columns named in a message


@dataclass(frozen=True)
class Mapping:
    """Where our columns stand: `ours` by position in the header; in a wide file `cells` holds the position
    and name of each security's column, and is None otherwise."""

    ours: dict[str, int]
    cells: dict[int, str] | None

    @property
    def wanted(self) -> list[int]:
        return sorted({*self.ours.values(), *(self.cells or {})})


def where_is(reading: dict[str, Any], ours: str) -> str:
    """A file and one of its columns, for messages; in a wide file returns and prices have no column of their own."""
    theirs = reading["columns"].get(ours)
    return reading["label"] if theirs is None else f"{reading['label']}, column {theirs}"


def match(header: list[str], reading: dict[str, Any], label: str) -> Mapping:
    """The position of each of our columns, after checking that every name is there, and once.

    Raises KnownProblem with every name that is absent or stands twice.
    """
    columns, left_out = reading["columns"], reading.get("leave_out", [])
    wide = reading.get("layout", "long") == "wide"
    asked = [*columns.values(), *(left_out if wide else [])]
    problems = [
        Problem(label, f"there is no column {theirs!r}", _columns_found(theirs, header))
        for theirs in dict.fromkeys(asked)
        if theirs not in header
    ]
    twice = sorted(name for name, n in Counter(header).items() if name and n > 1)
    problems += [
        Problem(label, f"two columns are called {name!r}", "rename one of them") for name in twice
    ]
    ours = {} if problems else {mine: header.index(theirs) for mine, theirs in columns.items()}
    cells = None
    if wide:
        aside = {*columns.values(), *left_out}
        cells = {place: name for place, name in enumerate(header) if name not in aside}
        if not cells and not problems:
            found = f"a wide file has one column a security, but this has only {', '.join(header)}"
            problems.append(Problem(label, found, "set layout: long, or check leave_out:"))
    if problems:
        raise KnownProblem(UNUSABLE, problems)
    return Mapping(ours, cells)


def _columns_found(absent: str, header: list[str]) -> str:
    close = get_close_matches(absent, header, n=1)
    near = f"did you mean {close[0]}? " if close else ""
    more = f" and {len(header) - _N_LISTED:,} more" if len(header) > _N_LISTED else ""
    return f"{near}The columns are: {', '.join(header[:_N_LISTED])}{more}"


def check_separator(
    label: str, separator: str, first_line: str, header: list[str], asked: set[str]
) -> None:
    """Stop when a header of one column has another separator in it, and lacks a column."""
    if len(header) > 1 or asked <= set(header):
        return
    better = max(_SEPARATORS, key=first_line.count)
    if first_line.count(better):
        name = _SEPARATORS.get(separator, repr(separator))
        found = f"its header has no {name} but a {_SEPARATORS[better]}"
        raise stop(label, found, f"set separator: {json.dumps(better)}")
