"""How quantities of test assets are laid out: a row an asset, or a grid where assets are ranked on two variables."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from typing import NamedTuple

from lineproof.paper.context import HIGH_LOW, Context, group_name
from lineproof.paper.specification import EMPTY, Cell, Column, Panel, Row
from lineproof.paper.symbols import Phrase, said

MOST_SIDE_BY_SIDE = 12  # columns of numbers on a page


class Quantity(NamedTuple):
    """One number of each asset.

    Attributes:
        key: ASCII name.
        heading, spanner: over its column, and over several, where assets have a row each.
        name: what it is called where it has a grid of its own.
        cell: its cell of an asset, empty where there is no such number.
    """

    key: str
    heading: Phrase
    spanner: Phrase
    name: Phrase
    cell: Callable[[str], Cell]


def panels(
    context: Context,
    sort: str,
    quantities: list[Quantity],
    assets: list[str],
    beside: list[tuple[str, Phrase]],
) -> tuple[Panel, ...]:
    """Panels of the quantities; none where there is nothing to show.

    `beside` has further rows of a list, as name and label, each set apart: a grid has no place for them.
    """
    if not (quantities and assets):
        return ()
    counts = context.groups(sort)
    if len(counts) == 2 and counts[1] + 1 <= MOST_SIDE_BY_SIDE:
        return tuple(_grids(context, sort, quantities))
    rows = [(asset, Phrase([context.label(sort, asset)]), False) for asset in assets]
    rows += [(asset, label, True) for asset, label in beside]
    columns = tuple(Column(q.key, q.heading, q.spanner) for q in quantities)
    stub = said("Group" if context.ranked(sort) else "Asset")
    made = [
        Row(asset, (label,), tuple(q.cell(asset) for q in quantities), gap)
        for asset, label, gap in rows
    ]
    return (Panel("assets", Phrase(), (stub,), columns, tuple(made)),)


def _grids(context: Context, sort: str, quantities: list[Quantity]) -> Iterator[Panel]:
    """Groups of the first variable down, those of the second across; as many quantities side by side as fit."""
    first = context.groups(sort)[0]
    grids = [_Grid(quantity, context, sort) for quantity in quantities]
    widest = max(len(grid.columns()) for grid in grids)
    abreast = max(MOST_SIDE_BY_SIDE // widest, 1)
    outer, _ = context.variables(sort)
    for shown in _shared_out(grids, abreast):
        rows = [
            Row(
                f"{number:02d}",
                (Phrase([group_name(number, first)]),),
                tuple(cell for grid in shown for cell in grid.row(number)),
            )
            for number in range(1, first + 1)
        ]
        if any(grid.has_spread for grid in shown):
            means = tuple(cell for grid in shown for cell in grid.mean_row())
            rows.append(Row("mean", (said("Mean"),), means, gap=True))
        yield Panel(
            "-".join(grid.quantity.key for grid in shown),
            Phrase(),
            (Phrase([capitalised(outer)]),),
            tuple(column for grid in shown for column in grid.columns()),
            tuple(rows),
        )


def _shared_out(grids: list[_Grid], most: int) -> Iterator[list[_Grid]]:
    """Grids in lists of at most so many that differ by one at most."""
    n_lists = -(-len(grids) // most)
    size, left = divmod(len(grids), n_lists)
    start = 0
    for place in range(n_lists):
        end = start + size + (place < left)
        yield grids[start:end]
        start = end


class _Grid:
    """One quantity of all groups of a sort on two variables, with the differences in each first group if it has any."""

    def __init__(self, quantity: Quantity, context: Context, sort: str) -> None:
        self.quantity = quantity
        self.count = context.groups(sort)[1]
        self._name = said(
            "{name}, by {inner}", name=quantity.name, inner=context.variables(sort)[1]
        )
        self._groups = {context.group(sort, asset): asset for asset in context.assets(sort)}
        overall, *self._spreads = context.spreads(sort) or [None]
        self._overall = EMPTY if overall is None else quantity.cell(overall)
        self.has_spread = self._overall is not EMPTY

    def columns(self) -> list[Column]:
        names = [group_name(number, self.count) for number in range(1, self.count + 1)]
        found = [
            Column(f"{self.quantity.key}:{place:02d}", Phrase([name]), self._name)
            for place, name in enumerate(names, start=1)
        ]
        if self.has_spread:
            found.append(Column(f"{self.quantity.key}:spread", Phrase([HIGH_LOW]), self._name))
        return found

    def row(self, number: int) -> list[Cell]:
        """Cells of one group of the first variable; empty for a group that never has a return."""
        assets = (self._groups.get((number, inner)) for inner in range(1, self.count + 1))
        cells = [EMPTY if asset is None else self.quantity.cell(asset) for asset in assets]
        return [*cells, self.quantity.cell(self._spreads[number - 1])] if self.has_spread else cells

    def mean_row(self) -> list[Cell]:
        cells = [EMPTY] * self.count
        return [*cells, self._overall] if self.has_spread else cells


def lettered(place: int, title: Phrase) -> Phrase:
    """The title of one of several panels, by its place from 0: A to Z, then AA, AB, …"""
    letters = ""
    place += 1
    while place:
        place, letter = divmod(place - 1, 26)
        letters = chr(ord("A") + letter) + letters
    return said("Panel {letters}: {title}", letters=letters, title=title)


def capitalised(name: str) -> str:
    """A variable's name at the head of a column."""
    return name[:1].upper() + name[1:]
