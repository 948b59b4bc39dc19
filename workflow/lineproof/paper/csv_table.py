"""Tables as tidy CSV: one line a number, at full precision, with its address."""

from __future__ import annotations

import csv
import io

from lineproof.paper.specification import Table
from lineproof.spreadsheet import as_text

HEADER = (
    "table",
    "panel",
    "row",
    "column",
    "quantity",
    "value",
    "format",
    "printed",
    "status",
    "address",
)


def render(table: Table) -> str:
    """The table's numbers in reading order, without empty cells; undefined values are empty."""
    sink = io.StringIO()
    writer = csv.writer(sink, lineterminator="\n")
    writer.writerow(HEADER)
    for panel, row, column, cell in table.cells():
        if cell.value is None:
            continue
        value = "" if cell.undefined else repr(float(cell.value))
        keys = [as_text(key) for key in (table.name, panel.key, row.key, column.key)]
        status = "undefined" if cell.undefined else "ok"
        shown = "" if cell.undefined else cell.text
        writer.writerow(
            [*keys, cell.column, value, cell.format, shown, status, as_text(cell.address)]
        )
    return sink.getvalue()
