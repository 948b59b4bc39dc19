"""What the schema of a study file cannot see: references, orders, files, options that exclude one another."""

from __future__ import annotations

from pathlib import Path
from typing import Any

from lineproof.schema import Finding, nearest
from lineproof.yamlfile import Place, YamlFile


def results_folder(name: str) -> str:
    """Folder of a study's results, relative to the working folder."""
    return f"results/{name}"


def beta_returns(options: dict[str, Any], content: dict[str, Any]) -> str:
    """The frequency of the returns that an entry under `betas` is estimated from, "monthly" or "daily"."""
    return content["study"]["frequency"] if options["returns"] == "own" else options["returns"]


def _beta_findings(content: dict[str, Any], file: YamlFile) -> list[Finding]:
    found: list[Finding] = []
    for name, options in content["betas"].items():
        place: Place = ("betas", name)
        daily = beta_returns(options, content) == "daily"
        nouns = "trading days" if daily else "months"
        if options["min"] > options["window"]:
            said = f"min {options['min']} is longer than the window of {options['window']} {nouns}"
            found.append(((*place, "min"), said, "lower min or lengthen window"))
        for key in ("window", "min"):
            if daily and key not in file.content["betas"][name]:
                said = f"the key {key!r} is missing"
                found.append((place, said, "betas from daily returns need it, in trading days"))
            elif not daily and options[key] > _MOST_MONTHS:
                said = f"{options[key]} is out of range"
                found.append(((*place, key), said, f"give at most {_MOST_MONTHS} months"))
        if daily and not _has_days(content):
            said = "daily returns are asked for, and the study has monthly ones only"
            change = (
                "declare data.returns.frequency: daily if the file has days, or use returns: own"
            )
            found.append(((*place, "returns"), said, change))
    return found


_MOST_MONTHS = 600


def _has_days(content: dict[str, Any]) -> bool:
    delivered = content["data"]["returns"].get("frequency")
    return "daily" in (content["study"]["frequency"], delivered)


def _frequency_findings(content: dict[str, Any], _: YamlFile) -> list[Finding]:
    if content["study"]["frequency"] == "daily" and "demo" in content:
        said = "the invented market has monthly returns only"
        change = "use frequency: monthly, or leave out the section demo"
        return [(("study", "frequency"), said, change)]
    return []


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


def _file_findings(content: dict[str, Any], file: YamlFile) -> list[Finding]:
    made_in = (
        Path(results_folder(content["study"]["name"])).resolve() / "raw"
        if "demo" in content
        else None
    )
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
        if path.is_file() or path.parent == made_in:
            continue
        names = sorted(p.name for p in path.parent.iterdir()) if path.parent.is_dir() else []
        change = (
            nearest(path.name, names)
            if names
            else f"the folder {Path(label).parent} is empty or absent"
        )
        found.append(((*place, "file"), f"there is no file {label}", change))
    return found


# What the schema cannot see; a check runs when the sections it reads are sound.
CHECKS = (
    ({"betas", "study", "data"}, _beta_findings),
    ({"study", "demo"}, _frequency_findings),
    ({"portfolios", "betas", "data"}, _sort_findings),
    ({"subperiods"}, _subperiod_findings),
    ({"intake", "data"}, _screen_findings),
    ({"paper", "portfolios", "subperiods"}, _paper_findings),
    ({"study", "demo", "data", "portfolios"}, _file_findings),
)
