"""What the intake did with the rows of the raw returns: sums, faults and screens."""

from __future__ import annotations

from typing import Any

from lineproof.intake.record import ANSWERS
from lineproof.paper import notes
from lineproof.paper.context import Context
from lineproof.paper.specification import Cell, Column, Panel, Row, Table, cell
from lineproof.paper.symbols import Phrase, said

_SUMS = (
    ("rows_read", "Read"),
    ("rows_kept", "Kept"),
    ("rows_set_aside", "Set aside"),
    ("exact_duplicates", "Exact duplicates"),
)
_ROWS = Column("n_rows", said("Rows"))


def data_intake(context: Context, sort: str) -> Table:
    """Panels of the rows read, of the faults met by number, and of the screens in order; empty panels are left out."""
    faults, screens = context.intake["faults"], context.intake["screens"]
    panels = [_sums_panel(context)]
    if faults:
        panels.append(_faults_panel(context, faults))
    if screens:
        panels.append(_screens_panel(context, screens))
    return Table(
        name="data_intake",
        title=said("The intake of the raw returns"),
        panels=tuple(panels),
        notes=(
            notes.data(context),
            said(
                "Rows read are rows kept, rows set aside and exact duplicates. A row is set aside for its first "
                "fault, but may be flagged for several."
            )
            if faults
            else said("No row has a fault."),
            said(
                "Rows that fail a screen are kept, but their securities are not ranked on them; each screen "
                "counts what the screens above it pass."
            )
            if screens
            else said("There are no screens."),
        ),
    )


def _sums_panel(context: Context) -> Panel:
    columns = tuple(Column(term, said(heading)) for term, heading in _SUMS)
    cells = tuple(_count(context, "rows", "all", term) for term, _ in _SUMS)
    row = Row("rows", (said("Raw returns"),), cells)
    return Panel("rows", said("Panel A: rows"), (Phrase(),), columns, (row,))


def _faults_panel(context: Context, faults: list[dict[str, Any]]) -> Panel:
    rows = []
    for fault in faults:
        key = f"fault-{fault['number']:02d}"
        labels = (
            Phrase([fault["label"]]),
            Phrase([str(fault["number"])]),
            Phrase([ANSWERS[fault["answer"]]]),
        )
        rows.append(Row(key, labels, (_count(context, "fault", key, "n_rows"),)))
    stubs = (said("Fault"), said("No."), said("What became of it"))
    return Panel("faults", said("Panel B: faults"), stubs, (_ROWS,), tuple(rows))


def _screens_panel(context: Context, screens: list[dict[str, Any]]) -> Panel:
    terms = ("n_rows", "n_securities")
    rows = [
        Row(
            f"screen-{place}",
            (Phrase([screen["label"]]),),
            tuple(_count(context, "screen", f"screen-{place}", term) for term in terms),
        )
        for place, screen in enumerate(screens, start=1)
    ]
    letter = "C" if context.intake["faults"] else "B"
    columns = (_ROWS, Column("n_securities", said("Securities")))
    return Panel(
        "screens",
        said("Panel {letter}: rows that fail a screen", letter=letter),
        (said("Screen"),),
        columns,
        tuple(rows),
    )


def _count(context: Context, variant: str, asset: str, term: str) -> Cell:
    return cell(context.book.at("-", "-", "intake", variant, asset, term, "-"), "count")
