"""The report: one HTML page that needs no network and no script."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from markupsafe import Markup

from lineproof.analyses import ALPHA_ERRORS, LINE_WEIGHTS
from lineproof.intake.record import ANSWERS, survivors_only
from lineproof.paper import answer, exhibits, html_table, notes, tables
from lineproof.paper.context import Context
from lineproof.paper.inline import inline_svg
from lineproof.paper.page import environment, palette
from lineproof.paper.rounding import share
from lineproof.paper.specification import cell
from lineproof.paper.symbols import Phrase, Symbol, said


def write_report(context: Context, figures: Mapping[str, bytes]) -> str:
    """The whole page, with the SVG files among those that `figures.draw_figures` gives.

    Raises KeyError if a figure of the study is not among them.
    """
    main, appendix = _tables(context)
    return (
        environment()
        .get_template("report.html.j2")
        .render(
            **palette(),
            facts=context.facts,
            market=context.facts["market_name"],
            dates=context.main_period.dates,
            answer=_html(answer.overall(context)),
            assets=context.title(context.sorts[0]),
            periods=[(each, _html(answer.of_period(context, each))) for each in context.periods],
            tables=main,
            appendix=appendix,
            figures=_figures(context, figures),
            methods=_methods(context),
            intake=_html(_intake(context)),
            faults=_faults(context),
            survivors_only=survivors_only(context.intake),
            span=context.intake["span"],
            at=_at(context),
        )
    )


def _html(phrase: Phrase) -> Markup:
    return Markup(html_table.phrase(phrase))


def _plain(phrase: Phrase) -> str:
    """A phrase without markup, for what only a screen reader says."""
    return "".join(part.plain if isinstance(part, Symbol) else str(part) for part in phrase)


def _tables(context: Context) -> tuple[list[dict[str, Any]], list[dict[str, Any]]]:
    """Tables of the main test assets, and those of the others."""
    built = tables.build(context)
    entries = [
        {
            "id": f"table-{exhibit.stem}",
            "number": exhibit.number,
            "title": exhibit.entry.label,
            "sort": context.title(exhibit.sort),
            "html": Markup(html_table.fragment(built[exhibit.stem])),
        }
        for exhibit in exhibits.tables(context.facts)
    ]
    appendix = [each for each in entries if each["number"].startswith("A")]
    return [each for each in entries if each not in appendix], appendix


def _figures(context: Context, figures: Mapping[str, bytes]) -> list[dict[str, Any]]:
    found = []
    for exhibit in exhibits.figures(context.facts):
        note = said(exhibit.entry.note, **_figure_words(context, exhibit.sort))
        name = f"figure-{exhibit.stem}"
        svg = inline_svg(figures[f"{exhibit.stem}.svg"], name, exhibit.entry.label, _plain(note))
        found.append(
            {
                "id": name,
                "number": exhibit.number,
                "title": exhibit.entry.label,
                "svg": Markup(svg),
                "note": _html(note),
            }
        )
    return found


def _at(context: Context) -> str:
    """When in a month securities are counted."""
    return "in" if context.period.noun == "month" else "at the end of"


def _figure_words(context: Context, sort: str) -> dict[str, Any]:
    paper = context.facts["paper"]
    return {
        "assets": context.title(sort),
        "weights": LINE_WEIGHTS[paper["line_weights"]],
        "confidence": share(1 - context.level),
        "periods": context.period.nouns,
        "at": _at(context),
        "alpha_errors": ALPHA_ERRORS[paper["alpha_errors"]],
    }


def _methods(context: Context) -> list[tuple[str, list[Markup]]]:
    """The study's choices in words: heading and paragraphs."""
    return [
        ("Test assets", [_html(each) for each in notes.formations(context, context.sorts)]),
        ("Time series", [_html(notes.alpha_errors(context))]),
        (
            "Market line",
            [_html(notes.line_estimation(context)), _html(notes.line_hypothesis(context))],
        ),
        ("Level of the tests", [_html(said("{level}{percent}", level=share(context.level)))]),
        ("Leaving the sample", [_html(each) for each in _leaving(context)]),
    ]


def _leaving(context: Context) -> list[Phrase]:
    """What becomes of a security that leaves without a final return."""
    final, by_reason = (
        context.facts[key] for key in ("missing_final_return", "final_return_by_reason")
    )
    given = said(
        "A security that leaves without a final return keeps its last one."
        if final is None
        else "A security that leaves without a final return is given one of {final}{percent}.",
        final=share(final or 0.0),
    )
    reasons = [
        said("For the reason {reason} it is {final}{percent}.", reason=reason, final=share(value))
        for reason, value in sorted(by_reason.items())
    ]
    return [given, *reasons]


def _intake(context: Context) -> Phrase:
    rows = {
        term: cell(context.book.at("-", "-", "intake", "rows", "all", term, "-"), "count")
        for term in ("rows_read", "rows_kept", "rows_set_aside", "exact_duplicates")
    }
    return said(
        "Of {rows_read} rows of the raw returns, {rows_kept} were kept, {rows_set_aside} set "
        "aside with their "
        "reason, and {exact_duplicates} dropped as exact duplicates.",
        **rows,
    )


def _faults(context: Context) -> list[dict[str, Any]]:
    found = []
    for fault in context.intake["faults"]:
        key = f"fault-{fault['number']:02d}"
        number = context.book.at("-", "-", "intake", "fault", key, "n_rows", "-")
        count = _html(Phrase([cell(number, "count")]))
        found.append({**fault, "answer": ANSWERS[fault["answer"]], "count": count})
    return found
