"""What the schema of a study file cannot see: references, orders, files, options that exclude one another."""

from __future__ import annotations

from typing import Any

from lineproof.schema import Finding, nearest
from lineproof.source_checks import source_findings
from lineproof.yamlfile import Place, YamlFile


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


_ONLY_SUPPLIED = (
    *("file", "columns", "is", "unit", "missing", "dates", "separator"),
    *("decimal", "encoding", "sheet", "layout", "leave_out"),
)
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
            found.append(((*place, "rank_on"), said, nearest(ranked_on, list(content["betas"]))))
        if not supplied and options["weights"] == "size" and not _has_size(content):
            said = "weights by size need a size column, and data.returns.columns has none"
            change = "add size under data.returns.columns, or use weights: equal"
            found.append(((*place, "weights"), said, change))
    return found


def _has_size(content: dict[str, Any]) -> bool:
    return "size" in content["data"]["returns"]["columns"]


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


# What the schema cannot see; a check runs when the sections it reads are sound.
CHECKS = (
    ({"betas"}, _beta_findings),
    ({"portfolios", "betas", "data"}, _sort_findings),
    ({"subperiods"}, _subperiod_findings),
    ({"intake", "data"}, _screen_findings),
    ({"paper", "portfolios", "subperiods"}, _paper_findings),
    ({"study", "demo", "data", "portfolios"}, source_findings),
)
