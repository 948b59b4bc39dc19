"""Tables of the pricing tests by subperiod, one panel for each set of test assets."""

from __future__ import annotations

from collections.abc import Callable

from lineproof.paper import layout, notes
from lineproof.paper.book import Number
from lineproof.paper.context import Context, Subperiod
from lineproof.paper.specification import EMPTY, Cell, Column, Panel, Row, Table, cell
from lineproof.paper.symbols import Phrase, said

_JOINT = (
    ("f", said("{F}"), said("Exact")),
    ("wald", said("Wald"), said("Large-sample {chi2}")),
    ("lr", said("LR"), said("Large-sample {chi2}")),
    ("lr_corrected", said("LR corr."), said("Large-sample {chi2}")),
    ("lm", said("LM"), said("Large-sample {chi2}")),
    ("hac_wald", said("Robust"), said("Large-sample {chi2}")),
)
_SIZES = (Column("periods", said("{T}")), Column("assets", said("{N}")))
_JOINT_COLUMNS = (
    *_SIZES,
    *(Column(variant, heading, spanner) for variant, heading, spanner in _JOINT),
    Column("mean_abs_alpha", said("Mean |{alpha}|")),
)
_CHOSEN, _TEXTBOOK = said("Line and market premium"), said("Textbook errors")
_LINE_COLUMNS = (
    *_SIZES,
    Column("gamma0", said("{gamma0}"), _CHOSEN),
    Column("gamma1", said("{gamma1}"), _CHOSEN),
    Column("fbar", said("{fbar}"), _CHOSEN),
    Column("difference", said("{excess_slope}"), _CHOSEN),
    Column("critical", said("Critical {t}"), _CHOSEN),
    Column("joint_p", said("Joint {p}"), _CHOSEN),
    Column("textbook_t", said("{t}({excess_slope})"), _TEXTBOOK),
    Column("textbook_critical", said("Critical {t}"), _TEXTBOOK),
    Column("r2", said("{r2}")),
)


def joint_tests(context: Context, sort: str) -> Table:
    """Tests that all alphas are zero: statistics, and p values below them."""
    panels = _panels(context, "joint_alpha", _JOINT_COLUMNS, _joint_rows)
    return Table(
        name="joint_tests",
        title=said("Joint tests that every alpha is zero"),
        panels=panels,
        notes=(
            notes.joint_hypothesis(context),
            said("Mean |{alpha}| in per cent a {noun}.", noun=context.period.noun),
            *_notes_on_sorts(context, "joint_alpha", panels),
        ),
    )


def market_line(context: Context, sort: str) -> Table:
    """Intercept and slope of the market line, and the slope against the market's mean premium."""
    panels = _panels(context, "market_line", _LINE_COLUMNS, _line_rows)
    return Table(
        name="market_line",
        title=said("The market line by subperiod"),
        panels=panels,
        notes=(
            notes.line_estimation(context),
            notes.line_hypothesis(context),
            said(
                "{gamma0}, {gamma1} and {fbar} in per cent a {noun}; {t} statistics in parentheses.",
                noun=context.period.noun,
            ),
            said("Textbook errors take betas and {fbar} as known."),
            *_notes_on_sorts(context, "market_line", panels),
        ),
    )


def _panels(
    context: Context,
    analysis: str,
    columns: tuple[Column, ...],
    rows_of: Callable[[Context, str, Subperiod], list[Row]],
) -> tuple[Panel, ...]:
    found = []
    for sort in context.sorts:
        periods = [each for each in context.periods if context.book.ran(sort, each.name, analysis)]
        rows = [row for period in periods for row in rows_of(context, sort, period)]
        if rows:
            found.append((sort, tuple(rows)))
    return tuple(
        Panel(
            sort,
            _panel_title(context, sort, place, len(found)),
            (said("Subperiod"),),
            columns,
            rows,
        )
        for place, (sort, rows) in enumerate(found)
    )


def _panel_title(context: Context, sort: str, place: int, count: int) -> Phrase:
    if count == 1:
        return Phrase([context.title(sort)])
    return layout.lettered(place, Phrase([context.title(sort)]))


def _notes_on_sorts(context: Context, analysis: str, panels: tuple[Panel, ...]) -> list[Phrase]:
    if not panels:
        return [notes.not_run(analysis)]
    shown = [panel.key for panel in panels]
    made = notes.formations(context, shown)
    if any(context.spreads(sort) for sort in shown):
        made.append(said("Differences of groups are no test assets here."))
    gone = [note for sort in shown for note in notes.without_assets(context, sort, context.periods)]
    return [*made, *gone]


def _joint_rows(context: Context, sort: str, period: Subperiod) -> list[Row]:
    def at(variant: str, term: str = "alpha") -> Number:
        return context.book.at(sort, period.name, "joint_alpha", variant, "all", term, "-")

    numbers = [at(variant) for variant, _, _ in _JOINT]
    sizes = _sizes(numbers[0])
    statistics = [cell(number, "number", "statistic") for number in numbers]
    p_values = [cell(number, "p", "p", "square") if number.defined else EMPTY for number in numbers]
    mean = cell(at("-", "mean_abs_alpha"), context.period.mean_format)
    return [
        Row(
            f"{period.name}:statistic",
            (Phrase([period.title]),),
            (*sizes, *statistics, mean),
            gap=True,
        ),
        Row(f"{period.name}:p", (Phrase(),), (EMPTY, EMPTY, *p_values, EMPTY)),
    ]


def _line_rows(context: Context, sort: str, period: Subperiod) -> list[Row]:
    paper = context.facts["paper"]
    weights, errors = paper["line_weights"], paper["line_errors"]

    def at(term: str, kind: str = errors) -> Number:
        return context.book.at(sort, period.name, "market_line", weights, "all", term, kind)

    intercept, slope, difference = (at(t) for t in ("intercept", "slope", "slope_minus_market"))
    textbook = at("slope_minus_market", "textbook")
    market = context.book.at(sort, period.name, "market_line", "-", "all", "market_mean", "-")
    form = context.period.mean_format
    premium = cell(market, form), _beneath(market)
    first = (
        *_sizes(slope),
        cell(intercept, form),
        cell(slope, form),
        premium[0],
        cell(difference, form),
        cell(difference, "number", "critical"),
        cell(at("intercept_and_slope_minus_market"), "p", "p"),
        cell(textbook, "number", "statistic"),
        cell(textbook, "number", "critical"),
        cell(at("r2", "-"), "number"),
    )
    second = (
        *(EMPTY, EMPTY, _beneath(intercept), _beneath(slope)),
        *(premium[1], _beneath(difference)),
        *[EMPTY] * 5,
    )
    return [
        Row(f"{period.name}:estimate", (Phrase([period.title]),), first, gap=True),
        Row(f"{period.name}:t", (Phrase(),), second),
    ]


def _sizes(number: Number) -> tuple[Cell, Cell]:
    return cell(number, "count", "n_periods"), cell(number, "count", "n_assets")


def _beneath(number: Number) -> Cell:
    """The t statistic below a coefficient: one dash is enough where neither is defined."""
    return cell(number, "number", "statistic", "round") if number.defined else EMPTY
