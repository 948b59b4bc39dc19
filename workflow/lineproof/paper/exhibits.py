"""Which tables and figures exist, in the order of the paper, and what their files are called."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any, NamedTuple

from lineproof.catalog import Entry

TABLES: dict[str, Entry] = {
    "sample": Entry("lineproof.paper.sample_table:sample", "The sample"),
    "ranked_portfolios": Entry(
        "lineproof.paper.portfolio_tables:ranked_portfolios", "The ranked portfolios"
    ),
    "groups_at_formation": Entry(
        "lineproof.paper.group_tables:groups_at_formation", "Groups at formation"
    ),
    "group_moves": Entry(
        "lineproof.paper.group_tables:group_moves", "Where members go by the next formation"
    ),
    "alphas_betas": Entry(
        "lineproof.paper.portfolio_tables:alphas_betas", "Alphas and betas by subperiod"
    ),
    "joint_tests": Entry(
        "lineproof.paper.pricing_tables:joint_tests", "Joint tests that every alpha is zero"
    ),
    "market_line": Entry(
        "lineproof.paper.pricing_tables:market_line", "The market line by subperiod"
    ),
    "data_intake": Entry(
        "lineproof.paper.intake_table:data_intake", "The intake of the raw returns"
    ),
}
# Made once for each set of test assets; every other table shows all sets, or none.
PER_SORT = {"ranked_portfolios", "groups_at_formation", "group_moves", "alphas_betas"}
# Made of groups that are ranked, so that there is none of supplied test assets; tables and figures share no such name.
OF_RANKED = {"groups_at_formation", "group_moves", "moves", "staying"}

# The note is a template of `symbols.said` that the report fills in.
FIGURES: dict[str, Entry] = {
    "market_lines": Entry(
        "lineproof.paper.figures:market_lines",
        "Market lines by subperiod",
        "Mean excess returns of the test assets ({assets}) on their betas of the same {periods}. "
        "Solid: "
        "the line fitted by {weights}. Dashed: the line of the CAPM, through the origin and the "
        "market. All panels have the same scales.",
    ),
    "alphas": Entry(
        "lineproof.paper.figures:alphas",
        "Alphas by subperiod",
        "Alphas of the test assets ({assets}) with intervals of {confidence}{percent} from "
        "standard errors that are {alpha_errors}. Filled: zero lies outside.",
    ),
    "moves": Entry(
        "lineproof.paper.group_figures:moves",
        "Where members go by the next formation",
        "Per cent of the members of each group ({assets}) by their group at the next formation, mean "
        "over formations; out: in no group. The fuller the colour, the larger the share.",
    ),
    "staying": Entry(
        "lineproof.paper.group_figures:staying",
        "Who stays in a group",
        "At each formation ({assets}), the part of all members that are in the group they were in, and "
        "that are in no group any more; below, the fewest and most members of a group.",
    ),
    "coverage": Entry(
        "lineproof.paper.figures:coverage",
        "Coverage of the sample",
        "Securities with a row {at} each month, and those of them with an estimated beta.",
    ),
}

TABLE_FORMATS = ("tex", "html", "csv")
FIGURE_FORMATS = ("pdf", "svg", "png")


class Exhibit(NamedTuple):
    """One printed table or figure.

    `stem` is its file name without the ending, `number` what readers call it ("2", or "A1" in the
    appendix), `sort` the set of test assets it shows.
    """

    name: str
    stem: str
    number: str
    sort: str
    entry: Entry


def tables(facts: Mapping[str, Any]) -> list[Exhibit]:
    """The study's tables: those of the main test assets, then the other sorts' in an appendix."""
    main = facts["paper"]["main"]
    names = chosen(facts["paper"]["tables"], TABLES)
    found = [
        Exhibit(name, name, str(number), main, TABLES[name])
        for number, name in enumerate(_made(facts, main, names), start=1)
    ]
    appended = [
        (name, sort)
        for sort in facts["sorts"]
        if sort != main
        for name in _made(facts, sort, names)
        if name in PER_SORT
    ]
    for number, (name, sort) in enumerate(appended, start=1):
        found.append(Exhibit(name, f"{name}-{sort}", f"A{number}", sort, TABLES[name]))
    return found


def figures(facts: Mapping[str, Any]) -> list[Exhibit]:
    """The study's figures, all of the main test assets."""
    main = facts["paper"]["main"]
    names = chosen(facts["paper"]["figures"], FIGURES)
    return [
        Exhibit(name, name, str(number), main, FIGURES[name])
        for number, name in enumerate(_made(facts, main, names), start=1)
    ]


def _made(facts: Mapping[str, Any], sort: str, names: list[str]) -> list[str]:
    """Those of the names that a set of test assets has."""
    supplied = facts["sorts"][sort]["design"] == "supplied"
    return [name for name in names if not (supplied and name in OF_RANKED)]


def table_files(facts: Mapping[str, Any]) -> list[str]:
    """Names of the files that `tables.write_tables` gives."""
    return list(_files(tables(facts), TABLE_FORMATS))


def figure_files(facts: Mapping[str, Any]) -> list[str]:
    """Names of the files that `figures.draw_figures` gives."""
    return list(_files(figures(facts), FIGURE_FORMATS))


def chosen(choice: str | list[str] | tuple[str, ...], registry: Mapping[str, Entry]) -> list[str]:
    """Names of a registry that the study file asks for, each once: all of them by default."""
    return list(registry) if choice == "default" else list(dict.fromkeys(choice))


def _files(exhibits: list[Exhibit], endings: tuple[str, ...]) -> Iterator[str]:
    return (f"{exhibit.stem}.{ending}" for exhibit in exhibits for ending in endings)
