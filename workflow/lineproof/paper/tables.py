"""All tables of a study, in every format."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

from lineproof import catalog
from lineproof.paper import csv_table, exhibits, html_table, latex
from lineproof.paper.context import Context
from lineproof.paper.specification import Table, explained

RENDERERS: dict[str, Callable[[Table], str]] = {
    "tex": latex.render,
    "html": html_table.document,
    "csv": csv_table.render,
}


def build(context: Context) -> dict[str, Table]:
    """The study's tables by stem of file name, numbered, and with every dash explained."""
    found = {}
    for exhibit in exhibits.tables(context.facts):
        table = catalog.load(exhibit.entry)(context, exhibit.sort)
        found[exhibit.stem] = explained(replace(table, number=exhibit.number, name=exhibit.stem))
    return found


def write_tables(context: Context) -> dict[str, str]:
    """File name → text of every table: the names that `exhibits.table_files` lists."""
    return {
        f"{stem}.{ending}": RENDERERS[ending](table)
        for stem, table in build(context).items()
        for ending in exhibits.TABLE_FORMATS
    }
