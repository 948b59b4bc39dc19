"""The sample: what was read and kept, and what each subperiod holds."""

from __future__ import annotations

from lineproof.paper import notes
from lineproof.paper.book import Number
from lineproof.paper.context import Context, Subperiod
from lineproof.paper.specification import EMPTY, Cell, Column, Panel, Row, Table, cell
from lineproof.paper.symbols import Phrase, said

_COUNTS = (
    ("n_periods", "{periods}", "count"),
    ("n_securities", "Securities", "count"),
    ("n_security_periods", "Security-{nouns}", "count"),
    ("n_entries", "Entries", "count"),
    ("n_exits", "Exits", "count"),
)
_ALIVE = (
    ("mean_alive", "Mean", "average"),
    ("min_alive", "Fewest", "count"),
    ("max_alive", "Most", "count"),
)


def sample(context: Context, sort: str) -> Table:
    """Panels of raw rows, of securities by subperiod, and of returns by subperiod."""
    return Table(
        name="sample",
        title=said("The sample"),
        panels=(_rows_panel(context), _securities_panel(context), _returns_panel(context, sort)),
        notes=(
            notes.data(context),
            *notes.built_market(context),
            said(
                "Rows read are rows kept, rows set aside and exact duplicates. Rows that fail a "
                "screen are kept, "
                "but their securities are not ranked on them; each screen counts what the screens "
                "above it pass."
            ),
            said(
                "Alive: securities with a row {on_the}. Entries and exits: first and last "
                "rows other than "
                "the file’s first and last {noun}. Returns in per cent a {noun}; the average "
                "security is the equally "
                "weighted mean of all.",
                on_the=context.period.on_the,
                noun=context.period.noun,
            ),
        ),
    )


def _rows_panel(context: Context) -> Panel:
    faults = context.intake["faults"]
    by_answer = {
        answer: [f for f in faults if f["answer"] == answer] for answer in ("set aside", "repair")
    }
    flagged = [f for f in faults if f["answer"] not in by_answer]
    rows = [
        _total(context, "rows_read", "Rows read", of=True),
        _total(context, "exact_duplicates", "Exact duplicates"),
        _total(context, "rows_set_aside", "Rows set aside"),
        *(_fault(context, fault) for fault in by_answer["set aside"]),
        _total(context, "rows_kept", "Rows kept"),
        *(_screen(context, place, each) for place, each in enumerate(context.intake["screens"], 1)),
        *_flags(context, "Repaired as the study file says", by_answer["repair"]),
        *_flags(context, "Kept and flagged", flagged),
    ]
    return Panel("rows", said("Panel A: rows of the raw returns"), (Phrase(),), _ROWS, tuple(rows))


_ROWS = (Column("n_rows", said("Rows")),)


def _total(context: Context, term: str, label: str, of: bool = False) -> Row:
    number = context.book.at("-", "-", "intake", "rows", "all", term, "-")
    return Row(term, (said(label),), (cell(number, "count"),), gap=not of)


def _fault(context: Context, fault: dict) -> Row:
    key = f"fault-{fault['number']:02d}"
    number = context.book.at("-", "-", "intake", "fault", key, "n_rows", "-")
    return Row(key, (said("{indent}{label}", label=fault["label"]),), (cell(number, "count"),))


def _screen(context: Context, place: int, screen: dict) -> Row:
    key = f"screen-{place}"
    number = context.book.at("-", "-", "intake", "screen", key, "n_rows", "-")
    label = said("{indent}of which fail the screen “{label}”", label=screen["label"])
    return Row(key, (label,), (cell(number, "count"),))


def _flags(context: Context, heading: str, faults: list[dict]) -> list[Row]:
    if not faults:
        return []
    key = heading.split()[0].lower()
    return [Row(key, (said(heading),), (EMPTY,), gap=True), *(_fault(context, f) for f in faults)]


def _securities_panel(context: Context) -> Panel:
    nouns = context.period.nouns
    words = {"periods": nouns.capitalize(), "nouns": nouns}
    columns = [Column(term, said(label, **words)) for term, label, _ in _COUNTS]
    alive = said("Alive {on_a}", on_a=context.period.on_a)
    columns += [Column(term, said(label), alive) for term, label, _ in _ALIVE]
    rows = [
        Row(
            period.name,
            (Phrase([period.title]),),
            tuple(cell(_panel(context, period, term), form) for term, _, form in _COUNTS + _ALIVE),
        )
        for period in context.periods
    ]
    title = said("Panel B: securities by subperiod")
    return Panel("securities", title, (Phrase(),), tuple(columns), tuple(rows))


def _returns_panel(context: Context, sort: str) -> Panel:
    columns = []
    for key, name in (
        ("security", "Average security"),
        ("market", "Market premium"),
        ("riskless", "Riskless rate"),
    ):
        columns += [
            Column(f"{key}_{term}", said(label), said(name))
            for term, label in (("mean", "Mean"), ("sd", "SD"))
        ]
        if key == "market":
            columns.append(Column("market_t", said("{t}"), said(name)))
    rows = [
        Row(period.name, (Phrase([period.title]),), _returns(context, sort, period))
        for period in context.periods
    ]
    title = said("Panel C: returns by subperiod")
    return Panel("returns", title, (Phrase(),), tuple(columns), tuple(rows))


def _returns(context: Context, sort: str, period: Subperiod) -> tuple[Cell, ...]:
    form = context.period.mean_format
    security = [
        cell(_panel(context, period, "mean_return"), form),
        cell(_panel(context, period, "sd_return"), "percent"),
    ]
    if not context.book.ran(sort, period.name, "describe"):
        return (*security, *[EMPTY] * 5)
    mean, sd, riskless, riskless_sd = (
        context.book.at(sort, period.name, "describe", "-", asset, term, "-")
        for asset in ("market", "riskless")
        for term in ("mean", "sd")
    )
    market = [cell(mean, form), cell(sd, "percent"), cell(mean, "number", "statistic")]
    return (*security, *market, cell(riskless, form), cell(riskless_sd, form))


def _panel(context: Context, period: Subperiod, term: str) -> Number:
    return context.book.at("-", period.name, "sample", "panel", "all", term, "-")
