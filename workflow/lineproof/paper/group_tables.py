"""Tables of ranked groups: what they are when they are formed, and where their members go."""

from __future__ import annotations

from functools import partial

from lineproof.addresses import NEW, OUT
from lineproof.paper import layout, notes
from lineproof.paper.context import Context
from lineproof.paper.specification import EMPTY, Cell, Column, Panel, Row, Table, cell
from lineproof.paper.symbols import Phrase, said

_MEMBERS = "Members"
_GROUPS = (
    # term, heading, spanner, alone over a grid, format
    ("n_members", "Mean", _MEMBERS, "Members", "average"),
    ("min_members", "Fewest", _MEMBERS, "Fewest members", "count"),
    ("max_members", "Most", _MEMBERS, "Most members", "count"),
    ("mean_size", "Mean size", "", "Mean size", "average"),
    ("ante_beta", "Prior {beta}", "", "Prior {beta}", "number"),
    ("beta", "{beta}", "", "{beta}", "number"),
    ("turnover", "Turnover", "", "Turnover", "share"),
    ("exit_share", "Leave", "", "Leave", "share"),
)


def groups_at_formation(context: Context, sort: str) -> Table:
    """Number and size of members, betas before and after, turnover and leavers: means over all formations."""
    assets = context.group_assets(sort)
    quantities = [
        layout.Quantity(
            term,
            said(heading),
            said(spanner),
            said(name),
            partial(_cell, context, sort, term, form),
        )
        for term, heading, spanner, name, form in _GROUPS
        if any(_number_there(context, sort, asset, term) for asset in assets)
    ]
    return Table(
        name="groups_at_formation",
        title=said("Groups at formation: {title}", title=context.title(sort)),
        panels=layout.panels(context, sort, quantities, assets, []),
        notes=_notes(context, sort, [quantity.key for quantity in quantities]),
    )


def _keys(context: Context, sort: str, asset: str, term: str) -> tuple[str, ...]:
    if term != "beta":
        return (sort, "-", "formations", "-", asset, term, "-")
    errors = context.facts["paper"]["alpha_errors"]
    return (sort, context.main_period.name, "time_series", "market", asset, term, errors)


def _number_there(context: Context, sort: str, asset: str, term: str) -> bool:
    """Whether there is such a number: where no member of any group has a size, its column is left out."""
    keys = _keys(context, sort, asset, term)
    optional = term in ("mean_size", "ante_beta")
    return context.book.has(*keys) and (context.book.at(*keys).defined or not optional)


def _cell(context: Context, sort: str, term: str, form: str, asset: str) -> Cell:
    """Empty for a difference of groups, which has a beta and is nothing that is formed."""
    keys = _keys(context, sort, asset, term)
    there = context.group(sort, asset) and context.book.has(*keys)
    return cell(context.book.at(*keys), form) if there else EMPTY


def _notes(context: Context, sort: str, shown: list[str]) -> tuple[Phrase, ...]:
    found = [
        _formations(context, sort),
        notes.formation(context, sort),
        *notes.low_and_high(context, sort),
    ]
    if "mean_size" in shown:
        found.append(said("Mean size: of the members with a size."))
    if "ante_beta" in shown:
        found.append(notes.prior_betas(context, sort))
    if "beta" in shown:
        found.append(said("{beta}: of the returns in {period}.", period=context.main_period.title))
    found.append(
        said(
            "Turnover: half the sum of the absolute changes of weights at a formation, in per cent. "
            "Leave: per cent of the members whose returns end before the hold does."
        )
    )
    return tuple(found)


def _formations(context: Context, sort: str) -> Phrase:
    number = context.book.at(sort, "-", "formations", "-", "all", "n_formations", "-")
    return said("Means over {n} formations.", n=cell(number, "count"))


def group_moves(context: Context, sort: str) -> Table:
    """The shares of each group's members by their group at the next formation."""
    panels = _kept(context, sort) if len(context.groups(sort)) == 2 else _matrix(context, sort)
    return Table(
        name="group_moves",
        title=said("Where members go by the next formation: {title}", title=context.title(sort)),
        panels=panels,
        notes=(
            said("Per cent of the members of a group, mean over formations."),
            *_outside(context, sort),
            notes.formation(context, sort),
            *notes.low_and_high(context, sort),
        ),
    )


def _outside(context: Context, sort: str) -> list[Phrase]:
    out = said("Out: in no group at the next formation.")
    if len(context.groups(sort)) == 2:
        return [said("A row and a column are a group before; same: at the next formation."), out]
    new = "New: in no group at the formation before; per cent of those by the group they come to."
    return [out, said(new)]


def _matrix(context: Context, sort: str) -> tuple[Panel, ...]:
    """Groups before down and after across, in as many panels as a page asks for."""
    groups = context.group_assets(sort)
    before = [(asset, Phrase([context.label(sort, asset)])) for asset in groups]
    after = [(asset, context.label(sort, asset)) for asset in groups] + [(OUT, "Out")]
    count = -(-len(after) // layout.MOST_SIDE_BY_SIDE)
    most = -(-len(after) // count)
    blocks = [after[start : start + most] for start in range(0, len(after), most)]
    return tuple(
        Panel(
            f"{block[0][0]}-{block[-1][0]}",
            _to(place, block) if count > 1 else Phrase(),
            (said("Group before"),),
            tuple(
                Column(name, Phrase([label]), said("Group after") if name != OUT else Phrase())
                for name, label in block
            ),
            tuple(
                Row(
                    name,
                    (label,),
                    tuple(_share(context, sort, name, to) for to, _ in block),
                    gap=name == NEW,
                )
                for name, label in [*before, (NEW, said("New"))]
            ),
        )
        for place, block in enumerate(blocks)
    )


def _to(place: int, block: list[tuple[str, str]]) -> Phrase:
    ends = dict.fromkeys((block[0][1], block[-1][1]))
    return layout.lettered(place, said("to {ends}", ends=" to ".join(ends)))


def _share(context: Context, sort: str, before: str, after: str) -> Cell:
    keys = (sort, "-", "transitions", "-", before, after, "-")
    return cell(context.book.at(*keys), "share") if context.book.has(*keys) else EMPTY


def _kept(context: Context, sort: str) -> tuple[Panel, ...]:
    """Of groups by two variables, which part stays in its group, in that of either variable, and leaves."""
    outer, inner = context.variables(sort)
    terms = (
        ("same", "Same group"),
        ("same_first", f"Same {outer} group"),
        ("same_second", f"Same {inner} group"),
        (OUT, "Out"),
    )

    def share(term: str, asset: str) -> Cell:
        return _share(context, sort, asset, asset if term == "same" else term)

    quantities = [
        layout.Quantity(term, Phrase([name]), Phrase(), Phrase([name]), partial(share, term))
        for term, name in terms
    ]
    return layout.panels(context, sort, quantities, context.group_assets(sort), [])
