"""What a table says, whatever it is printed as: panels of rows of cells, and notes."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass, replace
from typing import NamedTuple

from lineproof.paper.book import Number
from lineproof.paper.rounding import printed
from lineproof.paper.symbols import Phrase, joined, said


class Cell(NamedTuple):
    """One number to print.

    Attributes:
        value: the number itself; None leaves the cell empty, NaN is undefined.
        format: name of one of `rounding.FORMATS`.
        kind: "plain"; "round" or "square" for those brackets around it.
        address: where it stands in the estimates.
        column: which column there: estimate, se, statistic, p, …
        reason: why it is undefined.
    """

    value: float | None
    format: str = "number"
    kind: str = "plain"
    address: str = ""
    column: str = "estimate"
    reason: str = ""

    @property
    def text(self) -> str:
        """As printed, without brackets and with an ASCII minus sign."""
        return printed(self.value, self.format)

    @property
    def undefined(self) -> bool:
        """Whether it prints as a dash."""
        return self.value is not None and not math.isfinite(self.value)

    @property
    def brackets(self) -> tuple[str, str]:
        """What is set around the number; a dash or nothing stands alone."""
        bare = self.value is None or self.undefined
        return {"round": ("(", ")"), "square": ("[", "]")}.get("" if bare else self.kind, ("", ""))


EMPTY = Cell(None)


def cell(number: Number, format: str, column: str = "estimate", kind: str = "plain") -> Cell:
    """A cell showing one column of a number; a column NaN in a defined number is undefined too."""
    value = getattr(number, column)
    reason = "" if math.isfinite(value) else number.reason or "the number is not finite"
    return Cell(value, format, kind, number.address, column, reason)


class Column(NamedTuple):
    """A column: an ASCII `key`, its heading, and a heading it shares with its neighbours."""

    key: str
    heading: Phrase
    spanner: Phrase = Phrase()


class Row(NamedTuple):
    """A row: an ASCII `key`, labels by stub column, cells; `gap` sets it apart from above."""

    key: str
    labels: tuple[Phrase, ...]
    cells: tuple[Cell, ...]
    gap: bool = False


@dataclass(frozen=True)
class Panel:
    """Rows under one set of columns.

    Attributes:
        key: ASCII name.
        title: printed above it; may be empty.
        stubs: headings of the columns that hold the rows' labels.

    Raises ValueError for a row with the wrong number of labels or cells.
    """

    key: str
    title: Phrase
    stubs: tuple[Phrase, ...]
    columns: tuple[Column, ...]
    rows: tuple[Row, ...]

    def __post_init__(self) -> None:
        for row in self.rows:
            shape, wanted = (len(row.labels), len(row.cells)), (len(self.stubs), len(self.columns))
            if shape != wanted:
                raise ValueError(f"row {row.key} has {shape} labels and cells, not {wanted}")

    def spans(self) -> list[tuple[Phrase, int]]:
        """Headings over neighbouring columns, each with the number of columns it covers."""
        found: list[tuple[Phrase, int]] = []
        for column in self.columns:
            if found and found[-1][0] == column.spanner:
                found[-1] = (column.spanner, found[-1][1] + 1)
            else:
                found.append((column.spanner, 1))
        return found


@dataclass(frozen=True)
class Table:
    """A whole table; `number` is what readers call it, such as "2" or "A1"."""

    name: str
    title: Phrase
    panels: tuple[Panel, ...]
    notes: tuple[Phrase, ...]
    number: str = ""

    def cells(self) -> Iterator[tuple[Panel, Row, Column, Cell]]:
        """Every cell with where it stands, in reading order."""
        for panel in self.panels:
            for row in panel.rows:
                for column, each in zip(panel.columns, row.cells, strict=True):
                    yield panel, row, column, each


def explained(table: Table) -> Table:
    """The table with the reason of every dash added to its notes."""
    where: dict[str, dict[Phrase, None]] = {}
    for panel, row, _, each in table.cells():
        if each.undefined:
            label = _first_label(panel, row)
            where.setdefault(each.reason, {})[label] = None
    notes = [
        said("{dash} not defined: {reason} ({rows}).", reason=reason, rows=_listed(list(labels)))
        for reason, labels in where.items()
    ]
    return replace(table, notes=(*table.notes, *notes))


def _first_label(panel: Panel, row: Row) -> Phrase:
    """The label of the block a row belongs to: its own, or the nearest above that is not empty."""
    label = Phrase()
    for each in panel.rows:
        label = each.labels[0] or label
        if each is row:
            break
    return label


def _listed(labels: list[Phrase]) -> Phrase:
    most = 6
    shown = joined(labels[:most], ", ")
    return shown if len(labels) <= most else shown + said(" and others")
