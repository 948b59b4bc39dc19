"""Tables as HTML: a fragment for the report, and a document of its own."""

from __future__ import annotations

from collections.abc import Iterator
from html import escape
from pathlib import Path

from lineproof.paper.rounding import DASH
from lineproof.paper.specification import Cell, Panel, Row, Table
from lineproof.paper.symbols import SYMBOLS, Phrase, Symbol

TEMPLATES = Path(__file__).parent / "templates"
_LONG_LABEL = 26  # characters of a row's label that may be broken into lines
_KINDS = {"round": ' class="br"', "square": ' class="bs"'}


def phrase(parts: Phrase) -> str:
    """A phrase as HTML; a number in it carries its address."""
    return "".join(_part(part) for part in parts)


def _part(part: str | Symbol | Cell) -> str:
    if isinstance(part, str):
        return escape(part)
    if isinstance(part, Symbol):
        return part.html
    return f'<span class="n"{_source(part)}>{number(part)}</span>'


def number(cell: Cell) -> str:
    """A cell's text: with a proper minus sign, and an en dash if it is not defined."""
    if cell.text == DASH:
        return "–"
    opening, closing = cell.brackets
    text = escape(cell.text).replace("-", "−").replace("&lt;", "&lt;\N{NARROW NO-BREAK SPACE}")
    return f"{opening}{text}{closing}"


def _source(cell: Cell) -> str:
    """The address as a title, so that pointing at a number shows where it comes from."""
    if not cell.address:
        return ""
    column = "" if cell.column == "estimate" else f' data-column="{escape(cell.column)}"'
    return f' title="{escape(cell.address)}"{column}'


def fragment(table: Table) -> str:
    """The table with caption, panels and notes as one element; its ids derive from its name."""
    name = f"table-{table.name}"
    widths = _widths(table)
    panels = "".join(
        _panel(panel, f"{name}-{place}", widths)
        for place, panel in enumerate(table.panels, start=1)
    )
    notes = " ".join(phrase(note) for note in table.notes)
    return (
        f'<figure class="table" id="{escape(name)}">\n<figcaption id="{escape(name)}-0">'
        f"<b>Table {escape(table.number)}.</b> {phrase(table.title)}</figcaption>\n"
        f'{panels}<p class="notes">{notes}</p>\n</figure>\n'
    )


def document(table: Table) -> str:
    """A page with this table alone, which opens in a browser or a word processor."""
    style = (TEMPLATES / "table.css").read_text(encoding="utf-8")
    title = f"Table {table.number}"
    return (
        '<!DOCTYPE html>\n<html lang="en">\n<head>\n<meta charset="utf-8">\n'
        '<meta name="viewport" content="width=device-width, initial-scale=1">\n'
        f"<title>{escape(title)}</title>\n<style>\n{style}</style>\n</head>\n<body>\n"
        f"{fragment(table)}</body>\n</html>\n"
    )


def _widths(table: Table) -> list[int]:
    """Characters to keep for each column where all panels have the same ones, so that they line up; else none."""
    first, *others = table.panels or (None,)
    if not others or any((p.stubs, p.columns) != (first.stubs, first.columns) for p in others):
        return []
    rows = [row for panel in table.panels for row in panel.rows]
    labels = [
        max(min(each.length, _LONG_LABEL) * 3 // 4 for each in column)
        for column in zip(*(r.labels for r in rows), strict=True)
    ]
    cells = [
        max(len(each.text) + sum(map(len, each.brackets)) for each in column)
        for column in zip(*(r.cells for r in rows), strict=True)
    ]
    return [*labels, *cells]


def _panel(panel: Panel, name: str, widths: list[int]) -> str:
    name = escape(name)
    caption = f"{name.rsplit('-', 1)[0]}-0"
    title = f'<p class="panel" id="{name}">{phrase(panel.title)}</p>\n' if panel.title else ""
    labelled = f"{caption} {name}" if panel.title else caption
    rows = "".join(_row(row) for row in panel.rows)
    columns = len(panel.columns)
    kept = "".join(
        f'<col style="width:calc({width}ch + {0.7 if columns > 9 else 1.0}rem)">'
        for width in widths
    )
    kept = f"<colgroup>{kept}</colgroup>\n" if kept else ""
    kind = "scroll slim" if columns < 3 else "scroll wide" if columns > 9 else "scroll"
    return (
        f'{title}<div class="{kind}" tabindex="0" role="region" aria-labelledby="{labelled}">\n'
        f"<table>\n{kept}<thead>\n{''.join(_head(panel))}</thead>\n<tbody>\n{rows}</tbody>\n</table>\n</div>\n"
    )


def _head(panel: Panel) -> Iterator[str]:
    stubs = len(panel.stubs)
    if any(column.spanner for column in panel.columns):
        spans = "".join(
            f'<th colspan="{width}" scope="colgroup"><span>{phrase(spanner)}</span></th>'
            if spanner
            else f'<td colspan="{width}"></td>'
            for spanner, width in panel.spans()
        )
        yield f'<tr class="spans"><td colspan="{stubs}"></td>{spans}</tr>\n'
    headings = "".join(
        f'<th scope="col" class="stub">{phrase(stub)}</th>' if stub else "<td></td>"
        for stub in panel.stubs
    )
    headings += "".join(
        f'<th scope="col"{_long(each.heading, 14)}>{phrase(each.heading)}</th>'
        for each in panel.columns
    )
    yield f'<tr class="heads">{headings}</tr>\n'


def _long(label: Phrase, most: int) -> str:
    """Longer text than `most` characters may be broken into lines."""
    return ' class="long"' if label.length > most else ""


def _label(label: Phrase) -> str:
    """The classes of a row's label: one that is set in keeps its indent on every line."""
    under = ["under"] if label[0] is SYMBOLS["indent"] else []
    classes = " ".join([*(["long"] if label.length > _LONG_LABEL else []), *under])
    return f' class="{classes}"' if classes else ""


def _row(row: Row) -> str:
    labels = "".join(
        f'<th scope="row"{_label(label)}>{phrase(label)}</th>'
        if label
        else '<td class="stub"></td>'
        for label in row.labels
    )
    cells = "".join(
        f"<td{_KINDS.get(cell.kind, '')}{_source(cell)}>{number(cell)}</td>" for cell in row.cells
    )
    gap = ' class="gap"' if row.gap else ""
    return f"<tr{gap}>{labels}{cells}</tr>\n"
