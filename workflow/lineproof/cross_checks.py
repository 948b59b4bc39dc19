"""What the schema of a study file cannot see: references, orders, files, options that exclude one another."""

from __future__ import annotations

from pathlib import Path
from typing import Any

from lineproof import demo_files
from lineproof.schema import Finding, nearest
from lineproof.yamlfile import Place, YamlFile


def results_folder(name: str) -> str:
    """Folder of a study's results, relative to the working folder."""
    return f"results/{name}"


def _beta_findings(content: dict[str, Any], _: YamlFile) -> list[Finding]:
    return [
        (
            ("betas", name, "min"),
            f"min {options['min']} is longer than the window of {options['window']} months",
            "lower min or lengthen window",
        )
        for name, options in content["betas"].items()
        if options["min"] > options["window"]
    ]


_ONLY_SUPPLIED = ("file", "columns", "is", "unit", "missing", "dates", "separator")
_ONLY_RANKED = ("rank_on", "groups", "weights", "form_each", "form_month", "hold")


def _sort_findings(content: dict[str, Any], file: YamlFile) -> list[Finding]:
    found: list[Finding] = []
    for name, options in content["portfolios"].items():
        place: Place = ("portfolios", name)
        design, supplied = options["design"], options["design"] == "supplied"
        for key in ("file", "columns") if supplied else ("rank_on",):
            if key not in options:
                found.append((place, f"the key {key!r} is missing", f"design {design} needs it"))
        for key in _ONLY_RANKED if supplied else _ONLY_SUPPLIED:
            if key in file.content["portfolios"][name]:
                said = f"design {design} does not use {key!r}"
                found.append(((*place, key), said, "remove it, or change the design"))
        ranked_on = options.get("rank_on")
        if not supplied and ranked_on is not None and ranked_on not in content["betas"]:
            said = f"{ranked_on!r} is not declared under betas"
            known = list(content["betas"])
            change = nearest(ranked_on, known) if known else "declare it there"
            found.append(((*place, "rank_on"), said, change))
        if not supplied and options["weights"] == "size" and not _has_size(content):
            said = "weights by size need a size column, and data.returns.columns has none"
            change = "add size under data.returns.columns, or use weights: equal"
            found.append(((*place, "weights"), said, change))
    return found


def _has_size(content: dict[str, Any]) -> bool:
    return "size" in content["data"]["returns"]["columns"]


_OURS = (
    *("security", "date", "return", "size", "price", "final_return", "exit_reason"),
    *("rate", "asset"),
)


def _column_findings(content: dict[str, Any], _: YamlFile) -> list[Finding]:
    """Two of our names for one column of a file; names of the user's own, for screens, may share one."""
    mapped = {("data", name): options for name, options in content["data"].items()}
    mapped |= {("portfolios", name): options for name, options in content["portfolios"].items()}
    found: list[Finding] = []
    for place, options in mapped.items():
        taken: dict[str, str] = {}
        for name, column in options.get("columns", {}).items():
            if name not in _OURS or not isinstance(column, str):
                continue
            if taken.setdefault(column, name) != name:
                said = f"{column!r} is the column of {taken[column]!r} already"
                change = "one column cannot be both: change one of the two"
                found.append(((*place, "columns", name), said, change))
    return found


def _subperiod_findings(content: dict[str, Any], _: YamlFile) -> list[Finding]:
    found: list[Finding] = []
    for name, options in content["subperiods"].items():
        first, last = options["from"], options["to"]
        if first != "first" and last != "last" and first > last:
            said = f"runs backwards, from {first} to {last}"
            found.append((("subperiods", name), said, "swap from and to"))
        if "split" in options and "every" in options:
            found.append((("subperiods", name), "has both split and every", "keep one of the two"))
    return found


def _screen_findings(content: dict[str, Any], _: YamlFile) -> list[Finding]:
    known = list(content["data"]["returns"]["columns"])
    return [
        (
            ("intake", "screens", index, "column"),
            f"{screen['column']!r} is not among data.returns.columns",
            nearest(screen["column"], known),
        )
        for index, screen in enumerate(content["intake"]["screens"])
        if screen["column"] not in known
    ]


def _paper_findings(content: dict[str, Any], _: YamlFile) -> list[Finding]:
    paper = content["paper"]
    return [
        (
            ("paper", key),
            f"{paper[key]!r} is not declared under {among}",
            nearest(paper[key], list(content[among])),
        )
        for key, among in (("main", "portfolios"), ("main_subperiod", "subperiods"))
        if paper.get(key) is not None and paper[key] not in content[among]
    ]


def _file_findings(content: dict[str, Any], file: YamlFile) -> list[Finding]:
    made_in = Path(results_folder(content["study"]["name"])).resolve() / "raw"
    made = {made_in / name for name in demo_files.RAW} if "demo" in content else set()
    named: list[tuple[Place, str]] = [
        (("data", name), content["data"][name]["file"]) for name in content["data"]
    ]
    named += [
        (("portfolios", name), options["file"])
        for name, options in content["portfolios"].items()
        if "file" in options
    ]
    found: list[Finding] = []
    for place, label in named:
        path = (file.path.parent / label).resolve()
        if path in made or (path.is_file() and not (made and path.parent == made_in)):
            continue
        names = sorted(p.name for p in path.parent.iterdir()) if path.parent.is_dir() else []
        if made and path.parent == made_in:
            names = list(demo_files.RAW)
        change = (
            nearest(path.name, names)
            if names
            else f"the folder {Path(label).parent} is empty or absent"
        )
        found.append(((*place, "file"), f"there is no file {label}", change))
    return found


def _demo_findings(content: dict[str, Any], _: YamlFile) -> list[Finding]:
    """A span that runs backwards, or is too short for a market of several eras."""
    demo = content.get("demo")
    if demo is None:
        return []
    first, last = demo["first"], demo["last"]
    months = _count(last) - _count(first) + 1
    if months < 1:
        said, change = f"runs backwards, from {first} to {last}", "swap first and last"
    elif months < demo_files.SHORTEST:
        said = f"{first} to {last} is {months} months"
        change = f"give a span of at least {demo_files.SHORTEST} months"
    else:
        return []
    return [(("demo",), said, change)]


def _count(month: str) -> int:
    year, number = month.split("-")
    return 12 * int(year) + int(number)


# What the schema cannot see; a check runs when the sections it reads are sound.
CHECKS = (
    ({"betas"}, _beta_findings),
    ({"portfolios", "betas", "data"}, _sort_findings),
    ({"subperiods"}, _subperiod_findings),
    ({"intake", "data"}, _screen_findings),
    ({"paper", "portfolios", "subperiods"}, _paper_findings),
    ({"study", "demo", "data", "portfolios"}, _file_findings),
    ({"data", "portfolios"}, _column_findings),
    ({"demo"}, _demo_findings),
)
