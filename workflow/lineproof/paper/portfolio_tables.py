"""Tables of one set of test assets: what they are, and their alphas and betas."""

from __future__ import annotations

from lineproof.paper import notes
from lineproof.paper.context import Context, Subperiod
from lineproof.paper.specification import EMPTY, Cell, Column, Panel, Row, Table, cell
from lineproof.paper.symbols import Phrase, said

MOST_COLUMNS = 10
# Of one line of a printed page, measured in characters of its text.
PAGE_CHARACTERS, STATISTIC_CHARACTERS, GAP_CHARACTERS = 101, 5, 1.5
LABEL_CHARACTERS, NARROWEST, WIDEST = 34, 5.5, 12

_REGRESSION = "Market model"
# The format "mean" is that of the study's mean returns.
_RANKED = (
    # key, heading, spanner, analysis, variant, term, se_kind, column, format
    ("mean", "Mean", "Excess return", "describe", "-", "mean", "-", "estimate", "mean"),
    ("sd", "SD", "Excess return", "describe", "-", "sd", "-", "estimate", "percent"),
    ("beta", "{beta}", _REGRESSION, "time_series", "market", "beta", "*", "estimate", "number"),
    ("alpha", "{alpha}", _REGRESSION, "time_series", "market", "alpha", "*", "estimate", "mean"),
    (
        "t_alpha",
        "{t}({alpha})",
        _REGRESSION,
        "time_series",
        "market",
        "alpha",
        "*",
        "statistic",
        "number",
    ),
    ("r2", "{r2}", _REGRESSION, "time_series", "market", "r2", "-", "estimate", "number"),
    (
        "rho",
        "{rho}",
        _REGRESSION,
        "time_series",
        "market",
        "residual_ac1",
        "-",
        "estimate",
        "number",
    ),
    (
        "correlation",
        "Corr.",
        _REGRESSION,
        "time_series",
        "market",
        "correlation",
        "-",
        "estimate",
        "number",
    ),
    ("members", "Members", "On average", "describe", "-", "n_members", "-", "estimate", "average"),
    (
        "ante_beta",
        "Prior {beta}",
        "On average",
        "describe",
        "-",
        "ante_beta",
        "-",
        "estimate",
        "number",
    ),
)


def ranked_portfolios(context: Context, sort: str) -> Table:
    """Returns, market model and make-up of each test asset over the main subperiod."""
    period = context.main_period
    assets = context.book.assets(sort, period.name)
    wanted = [spec for spec in _RANKED if _is_reported(context, sort, period, spec, assets)]
    columns = tuple(Column(spec[0], said(spec[1]), said(spec[2])) for spec in wanted)
    rows = [
        Row(
            asset,
            (said("Market") if asset == "market" else Phrase([context.label(sort, asset)]),),
            tuple(_ranked_cell(context, sort, period, asset, spec) for spec in wanted),
            gap=asset == "market",
        )
        for asset in [*assets, "market"]
        if wanted
    ]
    stub = said("Group" if context.ranked(sort) else "Asset")
    heading = "The ranked portfolios" if context.ranked(sort) else "The test assets"
    panel = Panel("assets", Phrase(), (stub,), columns, tuple(rows))
    return Table(
        name="ranked_portfolios",
        title=said(
            "{heading}: {title}, {period}",
            heading=heading,
            title=context.title(sort),
            period=period.title,
        ),
        panels=(panel,) if rows else (),
        notes=_ranked_notes(context, sort, period, [spec[0] for spec in wanted]),
    )


def _ranked_notes(
    context: Context, sort: str, period: Subperiod, shown: list[str]
) -> tuple[Phrase, ...]:
    found = [notes.months(period), notes.formation(context, sort), notes.excess_units(context)]
    if "beta" in shown:
        found.append(notes.alpha_errors(context))
        found.append(said("{rho}: first-order autocorrelation of residuals."))
        found.append(said("Corr.: correlation with the market."))
    else:
        found.append(notes.not_run("time_series"))
    if "mean" not in shown:
        found.append(notes.not_run("describe"))
    if "ante_beta" in shown:
        window = context.facts["sorts"][sort]["window_periods"]
        found.append(said("Prior {beta}: of the {window} before formation.", window=window))
    return tuple(found)


def _keys(
    context: Context, sort: str, period: Subperiod, asset: str, spec: tuple[str, ...]
) -> tuple[str, ...]:
    _, _, _, analysis, variant, term, kind, _, _ = spec
    kind = context.facts["paper"]["alpha_errors"] if kind == "*" else kind
    return (sort, period.name, analysis, variant, asset, term, kind)


def _is_reported(
    context: Context, sort: str, period: Subperiod, spec: tuple[str, ...], assets: list[str]
) -> bool:
    """Whether any asset has it: supplied series have no members, and an analysis may not be run."""
    return any(context.book.has(*_keys(context, sort, period, asset, spec)) for asset in assets)


def _ranked_cell(
    context: Context, sort: str, period: Subperiod, asset: str, spec: tuple[str, ...]
) -> Cell:
    keys = _keys(context, sort, period, asset, spec)
    if not context.book.has(*keys):  # the market is not regressed on itself
        return EMPTY
    form = context.period.mean_format if spec[-1] == "mean" else spec[-1]
    return cell(context.book.at(*keys), form, spec[-2])


def alphas_betas(context: Context, sort: str) -> Table:
    """Alpha, its t statistic and beta of each asset and subperiod, in blocks of columns."""
    periods = [p for p in context.periods if context.book.ran(sort, p.name, "time_series")]
    longest = max((len(each.title) for each in periods), default=0)
    room = PAGE_CHARACTERS - STATISTIC_CHARACTERS - min(longest, LABEL_CHARACTERS)
    assets = [(asset, context.label(sort, asset)) for asset in context.assets(sort)]
    blocks = _blocks(assets, room)
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
            said(
                "{alpha} in per cent a {noun}, its {t} statistic in parentheses, and {beta}.",
                noun=context.period.noun,
            ),
            notes.alpha_errors(context),
            *notes.without_assets(context, sort, context.periods),
            *([] if periods else [notes.not_run("time_series")]),
        ),
    )


def _blocks(assets: list[tuple[str, str]], room: float) -> list[list[tuple[str, str]]]:
    """Assets, as name and label, in blocks whose headings fit `room` characters side by side."""
    blocks: list[list[tuple[str, str]]] = []
    used = 0.0
    for name, label in assets:
        width = min(max(len(label), NARROWEST), WIDEST) + GAP_CHARACTERS
        if not blocks or len(blocks[-1]) == MOST_COLUMNS or used + width > room:
            blocks.append([])
            used = 0.0
        blocks[-1].append((name, label))
        used += width
    return blocks


def _block_panel(
    context: Context,
    sort: str,
    periods: list[Subperiod],
    block: list[tuple[str, str]],
    place: int | None,
) -> Panel:
    spanner = said("Group") if context.ranked(sort) else Phrase()
    columns = tuple(Column(name, Phrase([label]), spanner) for name, label in block)
    title = Phrase()
    if place is not None:
        title = said(
            "Panel {letter}: {first} to {last}",
            letter=chr(ord("A") + place),
            first=f"groups {block[0][1]}" if context.ranked(sort) else block[0][1],
            last=block[-1][1],
        )
    rows = [
        row
        for period in periods
        for row in _period_rows(context, sort, period, [n for n, _ in block])
    ]
    key = f"{block[0][0]}-{block[-1][0]}"
    return Panel(key, title, (said("Subperiod"), Phrase()), columns, tuple(rows))


def _period_rows(context: Context, sort: str, period: Subperiod, assets: list[str]) -> list[Row]:
    kind = context.facts["paper"]["alpha_errors"]
    there = set(context.book.assets(sort, period.name))

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
