"""Tables of one set of test assets: what they are, and their alphas and betas."""

from __future__ import annotations

from functools import partial
from typing import NamedTuple

from lineproof.paper import layout, notes
from lineproof.paper.context import HIGH_LOW, Context, Subperiod, group_name
from lineproof.paper.specification import EMPTY, Cell, Column, Panel, Row, Table, cell
from lineproof.paper.symbols import Phrase, said

MOST_COLUMNS = 10
# Of one line of a printed page, measured in characters of its text.
PAGE_CHARACTERS, STATISTIC_CHARACTERS, GAP_CHARACTERS = 101, 5, 1.5
LABEL_CHARACTERS, NARROWEST, WIDEST = 34, 5.5, 12

_RETURN, _REGRESSION, _AVERAGE = "Excess return", "Market model", "On average"


class _Spec(NamedTuple):
    """One column: how it is called, and where in the estimates it stands; the format "mean" is that of the study's
    mean returns, and `kind` "*" the chosen standard errors."""

    key: str
    heading: str
    spanner: str
    name: str  # alone, over a grid
    analysis: str
    term: str
    kind: str = "-"
    column: str = "estimate"
    format: str = "number"

    @property
    def variant(self) -> str:
        return "market" if self.analysis == "time_series" else "-"


_RANKED = (
    _Spec("mean", "Mean", _RETURN, "Mean excess return", "describe", "mean", format="mean"),
    _Spec("sd", "SD", _RETURN, "SD", "describe", "sd", format="percent"),
    _Spec("beta", "{beta}", _REGRESSION, "{beta}", "time_series", "beta", "*"),
    _Spec(
        *("alpha", "{alpha}", _REGRESSION, "{alpha}", "time_series", "alpha", "*"), format="mean"
    ),
    _Spec(
        *("t_alpha", "{t}({alpha})", _REGRESSION, "{t}({alpha})", "time_series", "alpha", "*"),
        column="statistic",
    ),
    _Spec("r2", "{r2}", _REGRESSION, "{r2}", "time_series", "r2"),
    _Spec("rho", "{rho}", _REGRESSION, "{rho}", "time_series", "residual_ac1"),
    _Spec("correlation", "Corr.", _REGRESSION, "Corr.", "time_series", "correlation"),
    _Spec("members", "Members", _AVERAGE, "Members", "describe", "n_members", format="average"),
    _Spec("ante_beta", "Prior {beta}", _AVERAGE, "Prior {beta}", "describe", "ante_beta"),
)


def ranked_portfolios(context: Context, sort: str) -> Table:
    """Returns, market model and make-up of each test asset over the main subperiod."""
    period = context.main_period
    assets = context.book.assets(sort, period.name)
    wanted = [spec for spec in _RANKED if _is_reported(context, sort, period, spec, assets)]
    quantities = [
        layout.Quantity(
            spec.key,
            said(spec.heading),
            said(spec.spanner),
            said(spec.name),
            partial(_ranked_cell, context, sort, period, spec),
        )
        for spec in wanted
    ]
    spreads = context.book.spreads(sort, period.name)
    beside = [(asset, Phrase([context.label(sort, asset)])) for asset in spreads]
    heading = "The ranked portfolios" if context.ranked(sort) else "The test assets"
    return Table(
        name="ranked_portfolios",
        title=said(
            "{heading}: {title}, {period}",
            heading=heading,
            title=context.title(sort),
            period=period.title,
        ),
        panels=layout.panels(
            context, sort, quantities, assets, [*beside, ("market", said("Market"))]
        ),
        notes=_ranked_notes(context, sort, period, [spec.key for spec in wanted]),
    )


def _ranked_notes(
    context: Context, sort: str, period: Subperiod, shown: list[str]
) -> tuple[Phrase, ...]:
    found = [
        notes.months(period),
        notes.formation(context, sort),
        *notes.groups(context, sort),
        notes.excess_units(context),
    ]
    if "beta" in shown:
        found.append(notes.alpha_errors(context))
        found.append(said("{rho}: first-order autocorrelation of residuals."))
        found.append(said("Corr.: correlation with the market."))
    else:
        found.append(notes.not_run("time_series"))
    if "mean" not in shown:
        found.append(notes.not_run("describe"))
    if "ante_beta" in shown:
        found.append(notes.prior_betas(context, sort))
    return tuple(found)


def _keys(
    context: Context, sort: str, period: Subperiod, asset: str, spec: _Spec
) -> tuple[str, ...]:
    kind = context.facts["paper"]["alpha_errors"] if spec.kind == "*" else spec.kind
    return (sort, period.name, spec.analysis, spec.variant, asset, spec.term, kind)


def _is_reported(
    context: Context, sort: str, period: Subperiod, spec: _Spec, assets: list[str]
) -> bool:
    """Whether any asset has it: supplied series have no members, and an analysis may not be run."""
    return any(context.book.has(*_keys(context, sort, period, asset, spec)) for asset in assets)


def _ranked_cell(context: Context, sort: str, period: Subperiod, spec: _Spec, asset: str) -> Cell:
    keys = _keys(context, sort, period, asset, spec)
    if not context.book.has(*keys):  # the market is not regressed on itself
        return EMPTY
    form = context.period.mean_format if spec.format == "mean" else spec.format
    return cell(context.book.at(*keys), form, spec.column)


def alphas_betas(context: Context, sort: str) -> Table:
    """Alpha, its t statistic and beta of each asset and subperiod, in blocks of columns."""
    periods = [p for p in context.periods if context.book.ran(sort, p.name, "time_series")]
    longest = max((len(each.title) for each in periods), default=0)
    room = PAGE_CHARACTERS - STATISTIC_CHARACTERS - min(longest, LABEL_CHARACTERS)
    blocks = _blocks(_together(context, sort), room)
    panels = [
        _block_panel(context, sort, periods, block, place if len(blocks) > 1 else None)
        for place, block in enumerate(blocks)
        if periods
    ]
    return Table(
        name="alphas_betas",
        title=said("Alphas and betas by subperiod: {title}", title=context.title(sort)),
        panels=tuple(panels),
        notes=(
            notes.formation(context, sort),
            *notes.groups(context, sort),
            said(
                "{alpha} in per cent a {noun}, its {t} statistic in parentheses, and {beta}.",
                noun=context.period.noun,
            ),
            notes.alpha_errors(context),
            *notes.without_assets(context, sort, context.periods),
            *([] if periods else [notes.not_run("time_series")]),
        ),
    )


class _Head(NamedTuple):
    """The head of an asset's column."""

    asset: str
    label: str
    spanner: Phrase


def _together(context: Context, sort: str) -> list[list[_Head]]:
    """Heads of a sort's assets and then of its spreads, in lists that are not parted: the groups of one group of the
    first variable, or each asset by itself."""
    counts = context.groups(sort)
    spreads = context.spreads(sort)
    if len(counts) < 2:
        spanner = said("Group") if context.ranked(sort) else Phrase()
        alone = [(asset, spanner) for asset in context.assets(sort)]
        alone += [(asset, Phrase()) for asset in spreads]
        return [[_Head(asset, context.label(sort, asset), over)] for asset, over in alone]
    found: dict[int, list[_Head]] = {}
    (first, second), variables = counts, context.variables(sort)
    for asset in context.assets(sort):
        outer, inner = context.group(sort, asset)
        spanner = said(
            "{name}: {group}", name=layout.capitalised(variables[0]), group=group_name(outer, first)
        )
        found.setdefault(outer, []).append(_Head(asset, group_name(inner, second), spanner))
    for group, asset in zip(found.values(), spreads[1:], strict=bool(spreads)):
        group.append(_Head(asset, HIGH_LOW, group[0].spanner))
    mean = [[_Head(asset, HIGH_LOW, said("Mean"))] for asset in spreads[:1]]
    return [*found.values(), *mean]


def _blocks(together: list[list[_Head]], room: float) -> list[list[_Head]]:
    """Heads in blocks that fit `room` characters side by side; lists stay together that fit a block by themselves."""
    blocks: list[list[_Head]] = []
    used = room
    for part in together:
        width = sum(map(_width, part))
        fits = width <= room and len(part) <= MOST_COLUMNS
        for piece in [part] if fits else [[head] for head in part]:
            width = sum(map(_width, piece))
            full = not blocks or len(blocks[-1]) + len(piece) > MOST_COLUMNS or used + width > room
            if full or (not fits and piece[0] is part[0]):
                blocks.append([])
                used = 0.0
            blocks[-1] += piece
            used += width
    return blocks


def _width(head: _Head) -> float:
    return min(max(len(head.label), NARROWEST), WIDEST) + GAP_CHARACTERS


def _block_panel(
    context: Context,
    sort: str,
    periods: list[Subperiod],
    block: list[_Head],
    place: int | None,
) -> Panel:
    columns = tuple(Column(head.asset, Phrase([head.label]), head.spanner) for head in block)
    title = Phrase()
    if place is not None:
        title = layout.lettered(place, _block_title(context, sort, block))
    rows = [
        row
        for period in periods
        for row in _period_rows(context, sort, period, [head.asset for head in block])
    ]
    key = f"{block[0].asset}-{block[-1].asset}"
    return Panel(key, title, (said("Subperiod"), Phrase()), columns, tuple(rows))


def _block_title(context: Context, sort: str, block: list[_Head]) -> Phrase:
    """From which group to which: by the first of two variables."""
    groups = [head.asset for head in block if context.group(sort, head.asset)]
    counts = context.groups(sort)
    if len(counts) == 2 and groups:
        outer, inner = context.variables(sort)
        numbers = [context.group(sort, asset)[0] for asset in (groups[0], groups[-1])]
        ends = dict.fromkeys(group_name(number, counts[0]) for number in numbers)
        return said("{outer} {ends}, by {inner}", outer=outer, ends=" to ".join(ends), inner=inner)
    named = groups or [head.asset for head in block]
    ends = dict.fromkeys(context.label(sort, asset) for asset in (named[0], named[-1]))
    noun = "" if not groups else "group " if len(ends) == 1 else "groups "
    return said("{noun}{ends}", noun=noun, ends=" to ".join(ends))


def _period_rows(context: Context, sort: str, period: Subperiod, assets: list[str]) -> list[Row]:
    kind = context.facts["paper"]["alpha_errors"]
    book = context.book
    there = {*book.assets(sort, period.name), *book.spreads(sort, period.name)}

    def cells(
        term: str, form: str, column: str = "estimate", brackets: str = "plain"
    ) -> tuple[Cell, ...]:
        found = {
            asset: context.book.at(sort, period.name, "time_series", "market", asset, term, kind)
            for asset in assets
            if asset in there
        }
        return tuple(
            cell(found[a], form, column, brackets) if a in found else EMPTY for a in assets
        )

    return [
        Row(
            f"{period.name}:alpha",
            (Phrase([period.title]), said("{alpha}")),
            cells("alpha", context.period.mean_format),
            gap=True,
        ),
        Row(
            f"{period.name}:t",
            (Phrase(), said("{t}({alpha})")),
            cells("alpha", "number", "statistic", "round"),
        ),
        Row(f"{period.name}:beta", (Phrase(), said("{beta}")), cells("beta", "number")),
    ]
