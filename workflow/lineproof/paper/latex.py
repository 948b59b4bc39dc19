r"""Tables as LaTeX that needs booktabs and nothing else.

A table is a float as wide as the text, or several when it is longer than a page. The digits of
numbers in brackets stay aligned because the closing bracket takes no width.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import replace

from lineproof.paper.rounding import DASH
from lineproof.paper.specification import Cell, Column, Panel, Row, Table
from lineproof.paper.symbols import Phrase, Symbol

PAGE_LINES = 58.0  # at the size of footnotes
NOTE_ROOM = 6.0  # kept for notes on a page that may be the last
_HEADING_LINES = 4.0
_GAP_LINES = 0.5
_NOTE_CHARACTERS = 105  # of one line
_SPECIAL = {
    "\\": r"\textbackslash{}",
    "{": r"\{",
    "}": r"\}",
    "$": r"\$",
    "&": r"\&",
    "#": r"\#",
    "%": r"\%",
    "_": r"\_",
    "~": r"\textasciitilde{}",
    "^": r"\textasciicircum{}",
    "<": r"\textless{}",
    ">": r"\textgreater{}",
    "|": r"\textbar{}",
    '"': r"\textquotedbl{}",
    "`": r"\textasciigrave{}",
    "[": "{[}",  # the end of a row, and rules, look for either beyond the line break
    "*": "{*}",
    "–": "--",
    "—": "---",
    "−": "$-$",
    "“": "``",
    "”": "''",
    "’": "'",
    "…": r"\dots{}",
}
_LIGATURE = re.compile(r"(?<=-)(?=-)|(?<=')(?=')|(?<=,)(?=,)")


def escape(text: str, longest: int = 30) -> str:
    """Any text as LaTeX that prints it; words of over `longest` characters may break inside."""
    kept = "".join(char if char.isprintable() else " " for char in text)
    return " ".join(_breakable(word, longest) for word in kept.split(" "))


def _breakable(word: str, longest: int) -> str:
    step = max(longest // 2, 1) if len(word) > longest else len(word) or 1
    pieces = (word[start : start + step] for start in range(0, len(word), step))
    return r"\allowbreak{}".join(_escaped(piece) for piece in pieces)


def _escaped(piece: str) -> str:
    apart = _LIGATURE.sub("\0", piece)
    return "".join(_SPECIAL.get(char, char) for char in apart).replace("\0", "{}")


def phrase(parts: Phrase, longest: int = 30) -> str:
    """A phrase as LaTeX."""
    return "".join(_part(part, longest) for part in parts)


def _part(part: str | Symbol | Cell, longest: int) -> str:
    if isinstance(part, str):
        return escape(part, longest)
    return part.tex if isinstance(part, Symbol) else number(part).replace(r"\rlap", "")


def number(cell: Cell) -> str:
    r"""A cell as LaTeX: `(2.33\rlap{)}`, `$-$0.05`, `--` for a number that is not defined."""
    text = cell.text
    if text == DASH:
        return "--"
    text = text.replace("-", "$-$").replace("<", "$<$")
    opening, closing = cell.brackets
    return f"{opening}{text}" + (rf"\rlap{{{closing}}}" if closing else "")


def render(table: Table) -> str:
    """The whole table: one float, or several of one number."""
    pages = _pages(table) or [[]]
    floats = []
    for place, panels in enumerate(pages):
        notes = table.notes if place == len(pages) - 1 else ()
        floats.append(_float(table, panels, notes, continued=place > 0))
    return "\n\\clearpage\n".join(floats)


def _float(table: Table, panels: list[Panel], notes: tuple[Phrase, ...], *, continued: bool) -> str:
    caption = phrase(table.title) + (" (continued)" if continued else "")
    label = [] if continued else [rf"\label{{tab:{table.name}}}"]
    lines = [
        "% needs \\usepackage{booktabs} and a text at least 16 cm wide",
        r"\begin{table}[tbp]",
        r"\centering",
        *([r"\addtocounter{table}{-1}"] if continued else []),
        rf"\caption{{{caption}}}",
        *label,
        r"\footnotesize",
        r"\setlength{\tabcolsep}{3pt}",
    ]
    for place, panel in enumerate(panels):
        lines += [r"\par\medskip"] if place else []
        lines += _panel(panel)
    if notes:
        lines += [
            r"\par\smallskip",
            r"\begin{minipage}{\textwidth}",
            r"\footnotesize\setlength{\parindent}{0pt}",
            " ".join(phrase(note) for note in notes),
            r"\end{minipage}",
        ]
    return "\n".join([*lines, r"\end{table}", ""])


def _panel(panel: Panel) -> Iterator[str]:
    n_stubs, n_columns = len(panel.stubs), len(panel.columns)
    spread = r"@{\extracolsep{\fill}}"
    aligned = "@{}" + "l" * n_stubs + spread + "r" * n_columns + "@{}"
    yield rf"\begin{{tabular*}}{{\textwidth}}{{{aligned}}}"
    yield r"\toprule"
    if panel.title:
        title = rf"\textit{{{phrase(panel.title)}}}"
        yield rf"\multicolumn{{{n_stubs + n_columns}}}{{@{{}}l@{{}}}}{{{title}}} \\"
        yield r"\midrule"
    if any(column.spanner for column in panel.columns):
        yield from _spanners(panel)
    headings = [phrase(stub) for stub in panel.stubs] + [_heading(each) for each in panel.columns]
    yield " & ".join(headings) + r" \\"
    yield r"\midrule"
    for place, row in enumerate(panel.rows):
        if row.gap and place:
            yield r"\addlinespace"
        yield _row(row)
    yield r"\bottomrule"
    yield r"\end{tabular*}"


def _spanners(panel: Panel) -> Iterator[str]:
    cells, rules = [""] * len(panel.stubs), []
    start = len(panel.stubs) + 1
    for spanner, width in panel.spans():
        if spanner:
            cells.append(rf"\multicolumn{{{width}}}{{c}}{{{phrase(spanner)}}}")
            rules.append(rf"\cmidrule(lr){{{start}-{start + width - 1}}}")
        else:
            cells += [""] * width
        start += width
    yield " & ".join(cells) + r" \\"
    yield " ".join(rules)


def _heading(column: Column) -> str:
    return _boxed(column.heading, 13, "5.5em", r"b", r"\raggedleft")


def _row(row: Row) -> str:
    most, width = (90, "30em") if len(row.cells) < 3 else (34, "15em")
    if len(row.cells) > 8:
        most, width = 24, "10.5em"
    labels = [_boxed(label, most, width, "t", r"\raggedright") for label in row.labels]
    return " & ".join([*labels, *(number(cell) for cell in row.cells)]) + r" \\"


def _boxed(text: Phrase, most: int, width: str, align: str, ragged: str) -> str:
    """Text longer than `most` characters is broken into lines in a box of that width."""
    if text.length <= most:
        return phrase(text)
    inside = phrase(text, longest=10)
    return rf"\parbox[{align}]{{{width}}}{{{ragged}\hspace{{0pt}}{inside}\strut}}"


def _pages(table: Table) -> list[list[Panel]]:
    """Panels page by page: all on one if they fit with their notes, else as few cuts as need be."""
    noted = sum(len(phrase(note)) for note in table.notes) / _NOTE_CHARACTERS
    if noted + sum(_lines(panel) for panel in table.panels) <= PAGE_LINES:
        return [list(table.panels)]
    pages: list[list[Panel]] = []
    left = 0.0
    for panel in (part for whole in table.panels for part in _cut(whole)):
        if not pages or _lines(panel) > left:
            pages.append([])
            left = PAGE_LINES - NOTE_ROOM
        pages[-1].append(panel)
        left -= _lines(panel)
    return pages


def _cut(panel: Panel) -> Iterator[Panel]:
    """A panel longer than a page in parts that fit, cut before rows that are set apart."""
    rows: list[Row] = []
    for block in _row_blocks(panel.rows):
        longer = replace(panel, rows=(*rows, *block))
        if rows and _lines(longer) > PAGE_LINES - NOTE_ROOM:
            yield replace(panel, rows=tuple(rows))
            rows = []
        rows += block
    yield replace(panel, rows=tuple(rows))


def _lines(panel: Panel) -> float:
    return _HEADING_LINES + len(panel.rows) + _GAP_LINES * sum(row.gap for row in panel.rows)


def _row_blocks(rows: tuple[Row, ...]) -> list[list[Row]]:
    """Rows that stay together: up to the next gap, or single rows where there are few gaps."""
    blocks: list[list[Row]] = []
    alone = sum(row.gap for row in rows) < len(rows) / 4
    for row in rows:
        if row.gap or alone or not blocks:
            blocks.append([])
        blocks[-1].append(row)
    return blocks
