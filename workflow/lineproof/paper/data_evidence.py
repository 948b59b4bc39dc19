"""Rows of the tables that show what the panel holds."""

from __future__ import annotations

from typing import Any

from lineproof.paper.recorded import Record, Value, typeset
from lineproof.paper.rounding import part

_OUR_NAMES = {"final_return": "final return"}  # other columns are called as in the study file
_MOMENTS = ("mean", "sd", "min")


def coverage_table(record: Record) -> dict[str, Any] | None:
    """Share of rows with a value, by year and column; each cell with its shade, 0 to 10."""
    known = record.intake.get("evidence", {}).get("coverage")
    if not known or not known["years"]:
        return None
    columns = list(known["columns"])
    rows = []
    for place, year in enumerate(known["years"]):
        whole = ("evidence", "coverage", "n_rows", place)
        cells = []
        for name in columns:
            path = ("evidence", "coverage", "columns", name, place)
            n, n_rows = record.get(*path), record.get(*whole)
            cells.append(
                {
                    "value": record.share(path, whole),
                    "shade": 10 * n // n_rows if n_rows else 0,
                    "said": f"{n:,} of {n_rows:,} rows",
                }
            )
        rows.append({"year": year, "n": record.at(*whole), "cells": cells})
    return {"columns": [_OUR_NAMES.get(name, name) for name in columns], "rows": rows}


def distribution_rows(record: Record) -> list[dict[str, Any]]:
    """One row a decade: counts, shares, moments, extremes and quantiles in per cent."""
    rows = []
    for place, each in enumerate(record.intake.get("evidence", {}).get("distribution", [])):
        path = ("evidence", "distribution", place)
        rows_in_all = each["n"] + each["n_missing"]
        zeros = record.share((*path, "n_zero"), (*path, "n"))
        missing = Value(typeset(part(each["n_missing"], rows_in_all)), "")
        quantiles = [record.at(*path, "quantiles", key, form="digits") for key in each["quantiles"]]
        rows.append(
            {
                "decade": each["decade"],
                "n": record.at(*path, "n"),
                "zero": zeros,
                "missing": missing,
                "numbers": [
                    *(record.at(*path, key, form="digits") for key in _MOMENTS),
                    *quantiles,
                    record.at(*path, "max", form="digits"),
                ],
            }
        )
    return rows


def largest_rows(record: Record) -> list[dict[str, Any]] | None:
    """Gains and losses, each return between those of the rows before and after it."""
    known = record.intake.get("evidence", {}).get("largest")
    if not known or not any(known.values()):
        return None
    titles = {"positive": "The largest gains", "negative": "The largest losses"}
    return [
        {
            "key": key,
            "title": title,
            "priced": any("price" in each for each in known[key]),
            "rows": [_large(record, key, place) for place in range(len(known[key]))],
        }
        for key, title in titles.items()
        if known[key]
    ]


def _large(record: Record, key: str, place: int) -> dict[str, Any]:
    path = ("evidence", "largest", key, place)
    each = record.get(*path)
    return {
        "security": each["security"],
        "date": each["date"],
        "returns": _three(record, path, "return_", "percent"),
        "prices": _three(record, path, "price", "as_given") if "price" in each else None,
    }


def _three(record: Record, path: tuple[str | int, ...], key: str, form: str) -> list[Value]:
    """A number in the row before, in the row itself and in the row after; blank where there is no row."""
    found = []
    for where in ("before", "", "after"):
        if where and record.get(*path, where) is None:
            found.append(Value("", ""))
        else:
            found.append(record.at(*path, *([where] if where else []), key, form=form))
    return found
