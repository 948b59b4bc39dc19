"""What the schema cannot see of the raw data: files that are not there, and options that do not go together."""

from __future__ import annotations

import re
from pathlib import Path
from typing import Any

from lineproof import demo_files
from lineproof.intake.formats import given_files, is_pattern, kind_of, members
from lineproof.problems import KnownProblem
from lineproof.schema import Finding, nearest
from lineproof.yamlfile import Place, YamlFile

_VARIABLE = re.compile(r"[A-Za-z_][A-Za-z0-9_]*")
_ONLY_TEXT = ("separator", "encoding")


def results_folder(name: str) -> str:
    """Folder of a study's results, relative to the working folder."""
    return f"results/{name}"


def source_findings(content: dict[str, Any], file: YamlFile) -> list[Finding]:
    """What is wrong with the sources under `data`, and those of supplied portfolios."""
    made_in = (
        Path(results_folder(content["study"]["name"])).resolve() / "raw"
        if "demo" in content
        else None
    )
    sources: list[tuple[Place, dict[str, Any], str]] = [
        (("data", name), options, "security" if name == "returns" else "")
        for name, options in content["data"].items()
        if "build" not in options and "columns" in options
    ]
    sources += [
        (("portfolios", name), options, "asset")
        for name, options in content["portfolios"].items()
        if options["design"] == "supplied" and "file" in options and "columns" in options
    ]
    found: list[Finding] = []
    for place, options, names in sources:
        found += _origin_findings(place, options)
        if "file" in options and "query" not in options:
            found += _file_findings(place, options["file"], file.path.parent, made_in)
        found += _format_findings(place, options, file.path.parent)
        found += _layout_findings(place, options, names)
    return found + _series_among_securities(content["data"])


def _origin_findings(place: Place, options: dict[str, Any]) -> list[Finding]:
    """File or query; what `connection` holds is never shown, since it may be a password by mistake."""
    has = {key for key in ("file", "query", "connection") if key in options}
    found: list[Finding] = []
    if {"file", "query"} <= has:
        found.append((place, "has both file and query", "keep one of the two"))
    if not has & {"file", "query"}:
        change = "add it, or query: with connection:"
        if place == ("data", "market"):
            change += ", or build: equal or size to make the market from the returns"
        found.append((place, "the key 'file' is missing", change))
    if "query" in has and "connection" not in has:
        change = "add it: the name of the environment variable that holds how to connect"
        found.append((place, "the key 'connection' is missing", change))
    if "connection" in has and "query" not in has:
        found.append(((*place, "connection"), "it is for a query, and there is none", "remove it"))
    if "connection" in has and not _VARIABLE.fullmatch(options["connection"]):
        said = "what stands here is not the name of an environment variable"
        change = "set a variable to how to connect, and give its name; no password belongs here"
        found.append(((*place, "connection"), said, change))
    return found


def _file_findings(
    place: Place, given: str | list[str], folder: Path, made_in: Path | None
) -> list[Finding]:
    found: list[Finding] = []
    labels = given_files(given)
    at = (*place, "file")
    seen: set[Path] = set()
    for number, label in enumerate(labels):
        here = at if isinstance(given, str) else (*at, number)
        path = (folder / label).resolve()
        if path.parent == made_in:
            if path.name not in demo_files.RAW:
                found.append(
                    (here, f"there is no file {label}", nearest(path.name, demo_files.RAW))
                )
            continue
        inside = [file.resolve() for file, _ in members(folder.resolve() / label, label)]
        there = [file for file in inside if file.is_file()]
        if not there:
            found.append((here, *_absent(path, label)))
        elif seen & set(there):
            found.append((here, f"{label} stands twice", "keep one of the two"))
        seen.update(there)
        try:
            kind_of(Path(label), label)
        except KnownProblem as problem:
            found += [(here, f"{p.where}: {p.found}", p.change) for p in problem.problems]
    return found


def _absent(path: Path, label: str) -> tuple[str, str]:
    """What was found where no file is, and what to change."""
    if path.is_dir():
        change = f"for files of another format give a pattern, as in {label.rstrip('/')}/*.csv"
        return f"the folder {label} holds no Parquet file", change
    if is_pattern(label):
        return f"no file fits the pattern {label}", "check the pattern and its folder"
    names = sorted(p.name for p in path.parent.iterdir()) if path.parent.is_dir() else []
    empty = f"the folder {Path(label).parent} is empty or absent"
    return f"there is no file {label}", nearest(path.name, names) if names else empty


def _format_findings(place: Place, options: dict[str, Any], folder: Path) -> list[Finding]:
    """Options that the format does not use."""
    found: list[Finding] = []
    kinds = _kinds(options, folder)
    if "sheet" in options and kinds - {"excel"}:
        said = "only an Excel workbook (.xlsx) has sheets"
        found.append(((*place, "sheet"), said, "remove it, or name the workbook under file:"))
    for key in _ONLY_TEXT:
        if key in options and kinds and "text" not in kinds:
            said = f"only a text file, such as CSV, has {'an' if key[0] == 'e' else 'a'} {key}"
            found.append(((*place, key), said, "remove it"))
    encoding = options.get("encoding")
    if encoding is not None:
        try:
            "".encode(encoding)
        except LookupError:
            said = f"no encoding is called {encoding!r}"
            found.append(((*place, "encoding"), said, "as in latin-1, cp1252 or utf-16"))
    return found


def _kinds(options: dict[str, Any], folder: Path) -> set[str]:
    """The formats of a source; that of the result of a query is none of those that have options."""
    if "query" in options:
        return {"query"}
    kinds = set()
    for label in given_files(options.get("file", [])):
        try:
            is_folder = (folder / label).is_dir()
            kinds.add("parquet" if is_folder else kind_of(Path(label), label))
        except KnownProblem:
            continue
    return kinds


def _layout_findings(place: Place, options: dict[str, Any], names: str) -> list[Finding]:
    """Columns that the layout needs or cannot have; `names` is what a column of a wide file is called."""
    columns, found = options["columns"], []
    at = (*place, "columns")
    if options.get("layout") == "wide":
        found += [
            ((*at, key), f"a wide file has no column for {key!r}", "remove it, or use layout: long")
            for key, theirs in columns.items()
            if key != "date" and not (key == "return" and isinstance(theirs, dict))
        ]
    elif names:
        found += [
            (at, f"the key {key!r} is missing", "add it, or set layout: wide")
            for key in (names, "return")
            if key not in columns
        ]
    if options.get("leave_out") and options.get("layout") != "wide":
        said = "only a wide file has columns to leave out"
        found.append(((*place, "leave_out"), said, "remove it, or set layout: wide"))
    return found


def _series_among_securities(data: dict[str, Any]) -> list[Finding]:
    """Columns of the market or the riskless rate in a wide file of returns, where each other column is a security."""
    returns, found = data["returns"], []
    if returns.get("layout") != "wide" or "file" not in returns:
        return []
    for name in ("market", "riskless"):
        options = data.get(name, {})
        if set(given_files(options.get("file", []))) & set(given_files(returns["file"])):
            apart = {*returns.get("leave_out", ()), returns["columns"]["date"]}
            found += [
                (
                    ("data", "returns"),
                    f"column {column!r} of {name} would be read as a security",
                    "add it under leave_out",
                )
                for column in options.get("columns", {}).values()
                if isinstance(column, str) and column not in apart
            ]
    return found
