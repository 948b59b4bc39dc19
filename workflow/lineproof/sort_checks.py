"""What the schema cannot see of an entry under `portfolios`: options of another design, references, lengths."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

from lineproof.designs import FORM_EACH, HOLD_BLOCKS
from lineproof.schema import Finding, nearest
from lineproof.yamlfile import Place, YamlFile

_ONLY_SUPPLIED = (
    *("file", "columns", "is", "unit", "missing", "dates", "separator"),
    *("decimal", "encoding", "sheet", "layout", "leave_out"),
)
_RANKED = (
    *("rank_on", "groups", "rule", "breakpoints", "ante_betas", "weights", "form_month"),
    *("first_formation", "hold", "spread", "assign_betas"),
)
_OF_DESIGN = {
    "single_window": ("form_each", "overlap"),
    "double_sort": ("form_each", "overlap", "dependent"),
    "three_windows": ("estimation",),
}
_NEEDED = {
    "supplied": ("file", "columns"),
    "single_window": ("rank_on",),
    "double_sort": ("rank_on", "groups"),
    "three_windows": ("rank_on", "ante_betas"),
}
_OF_BETAS = ("beta", "alpha", "se_beta", "r2", "residual_sd")
_NO_NUMBERS = ("security", "date", "return", "final_return", "exit_reason")


def sort_findings(content: dict[str, Any], file: YamlFile) -> list[Finding]:
    """Every way in which entries under `portfolios` do not fit their designs, or what else the study declares."""
    found: list[Finding] = []
    for name, options in content["portfolios"].items():
        place: Place = ("portfolios", name)
        given = file.content["portfolios"][name]
        design = options["design"]
        own = _OF_DESIGN.get(design, ())
        used = _ONLY_SUPPLIED if design == "supplied" else (*_RANKED, *own)
        every = {*_ONLY_SUPPLIED, *_RANKED, *(key for of in _OF_DESIGN.values() for key in of)}
        found += [
            (place, f"the key {key!r} is missing", f"design {design} needs it")
            for key in _NEEDED[design]
            if key not in (given if key == "groups" else options)
        ]
        found += [
            ((*place, key), f"design {design} does not use {key!r}", _OTHER_DESIGN)
            for key in given
            if key in every and key not in used
        ]
        if design != "supplied":
            found += _lengths(place, options, given)
            found += _references(place, options, content)
            found += _holding(place, options, given)
    return found


_OTHER_DESIGN = "remove it, or change the design"


def _lengths(place: Place, options: dict[str, Any], given: dict[str, Any]) -> Iterator[Finding]:
    """A double sort takes two of each, any other design one."""
    double = options["design"] == "double_sort"
    for key in ("rank_on", "groups"):
        if key in given and isinstance(options[key], list) != double:
            said = f"design {options['design']} takes {'a list of two' if double else 'one'} here"
            change = "give a list of two" if double else "give one, or use design: double_sort"
            yield (*place, key), said, change


def _references(
    place: Place, options: dict[str, Any], content: dict[str, Any]
) -> Iterator[Finding]:
    betas, columns = list(content["betas"]), list(content["data"]["returns"]["columns"])
    numbers = [column for column in columns if column not in _NO_NUMBERS]
    for asked in _listed(options.get("rank_on", [])):
        table, _, column = asked.partition(".")
        if table in betas and column not in ("", *_OF_BETAS):
            said = f"betas have no column {column!r}"
            yield (*place, "rank_on"), said, nearest(column, list(_OF_BETAS))
        elif table not in betas and asked not in numbers:
            said = f"{asked!r} is neither among betas nor a column of numbers"
            known = [*betas, *numbers]
            yield (
                (*place, "rank_on"),
                said,
                nearest(asked, known) if betas else "declare it under betas",
            )
    yield from _unclear(place, options, betas, columns)
    for asked in _listed(options.get("ante_betas", [])):
        if asked not in betas:
            said = f"{asked!r} is not declared under betas"
            yield (
                (*place, "ante_betas"),
                said,
                nearest(asked, betas) if betas else "declare it under betas",
            )
    if options["weights"] == "size" and not has_size(content):
        said = "weights by size need a size column, and data.returns.columns has none"
        change = "add size under data.returns.columns, or use weights: equal"
        yield (*place, "weights"), said, change
    of = options.get("breakpoints", {}).get("column")
    if of is not None and (of not in columns or of in ("date", "final_return")):
        said = f"{of!r} is not a column that a condition can be put on"
        yield (*place, "breakpoints", "column"), said, nearest(of, numbers)
    if options["rule"] == "equal_counts" and "breakpoints" in options:
        said = "equal counts have no breakpoints"
        yield (*place, "breakpoints"), said, "remove it, or use rule: quantiles"
    ranked_on = [each.partition(".")[0] for each in _listed(options.get("rank_on", []))]
    no_betas = "ante_betas" not in options and not set(ranked_on) & set(betas)
    if options["assign_betas"] == "ex_ante" and no_betas:
        said = "groups have no ex-ante betas"
        yield (*place, "assign_betas"), said, "name some under ante_betas"


def _unclear(
    place: Place, options: dict[str, Any], betas: list[str], columns: list[str]
) -> Iterator[Finding]:
    """Names that stand for two things, and two names that stand for one."""
    ranked_on = _listed(options.get("rank_on", []))
    for asked in ranked_on:
        if asked in columns and asked.partition(".")[0] in betas:
            said = f"{asked!r} is a column of the returns, and of betas too"
            yield (*place, "rank_on"), said, "rename the entry under betas"
    meant = [asked.removesuffix(".beta") for asked in ranked_on]
    if len(set(meant)) < len(meant):
        yield (*place, "rank_on"), f"{meant[0]!r} stands twice", "name two variables"


def _holding(place: Place, options: dict[str, Any], given: dict[str, Any]) -> Iterator[Finding]:
    step = FORM_EACH[options["form_each"]]
    hold = options.get("hold", HOLD_BLOCKS if options["design"] == "three_windows" else step)
    if options["form_each"] == "month" and "form_month" in given:
        said = "groups that are formed each month have no form_month"
        yield (*place, "form_month"), said, "remove it, or set form_each: quarter or year"
    n_betas, years = len(_listed(options.get("ante_betas", []))), max(-(-hold // 12), 1)
    if n_betas > years:
        said = f"{n_betas} ex-ante betas by year, for a hold of {hold} months"
        yield (*place, "ante_betas"), said, f"give at most {years}"
    if options["design"] == "three_windows":
        if hold % 12:
            yield (*place, "hold"), f"{hold} months are no whole years", "give a multiple of 12"
    elif hold > step and not options["overlap"]:
        said = f"held for {hold} months, and formed anew after {step}"
        yield (*place, "hold"), said, f"give at most {step}, or set overlap: yes"


def _listed(value: str | list[str]) -> list[str]:
    return value if isinstance(value, list) else [value]


def has_size(content: dict[str, Any]) -> bool:
    """Whether the returns come with a size."""
    return "size" in content["data"]["returns"]["columns"]
