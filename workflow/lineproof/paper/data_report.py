"""The data report: what came in, what became of it and what the panel holds, as one page that needs no network."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any

from markupsafe import Markup

from lineproof.intake.record import ANSWERS, Intake, files_of, survivors_only
from lineproof.paper import data_evidence, data_figures
from lineproof.paper.context import month
from lineproof.paper.inline import inline_svg
from lineproof.paper.page import environment, palette
from lineproof.paper.recorded import Record, Value, typeset
from lineproof.paper.rounding import printed, share

PLACES = {
    "data.returns": "Returns",
    "data.market": "Market",
    "data.riskless": "Riskless rate",
}
SERIES = {"data.market": "Market less riskless", "data.riskless": "Riskless return"}
Builder = Callable[[Record], Any]


@dataclass(frozen=True)
class Section:
    """A part of the page: shown if its `build` finds anything in the record."""

    id: str
    title: str
    build: Builder


def write_data_report(
    intake: Intake, facts: dict[str, Any], raw: Mapping[str, Any] | None = None
) -> str:
    """The whole page from the record of the intake and what `lineproof.facts.facts` says of the study.

    `raw` has sizes and sums of the raw files, as `intake.signed.signed` gives them.

    Raises ValueError when the rows of a file do not add up.
    """
    record = Record(intake, (raw or {}).get("files", []))
    built = [(section, section.build(record)) for section in SECTIONS]
    shown = [(section, content) for section, content in built if content is not None]
    return (
        environment()
        .get_template("data_report.html.j2")
        .render(
            **palette(),
            facts=facts,
            first=when(intake["first"]),
            last=when(intake["last"]),
            period=intake.get("period", "month"),
            survivors_only=survivors_only(intake),
            span=intake["span"],
            totals=_totals(record),
            sections=shown,
        )
    )


def when(period: str) -> str:
    """A month as in "January 1955"; a day stays as it is."""
    return month(period) if period.count("-") == 1 else period


def _totals(record: Record) -> dict[str, Value]:
    keys = ("rows_read", "rows_kept", "rows_set_aside", "exact_duplicates", "rows_screened")
    return {key: record.at(key) for key in (*keys, "n_securities", "n_missing_returns")}


def _files(record: Record) -> list[dict[str, Any]]:
    """Each file with its equation of rows, its size and its checksum."""
    given = "files" in record.intake
    found = []
    for place, file in enumerate(files_of(record.intake)):
        path: tuple[str | int, ...] = ("files", place) if given else ()
        signs = record.raw_files[place] if given and record.raw_files else {}
        words = {"rows_kept": "kept", "rows_set_aside": "set aside"}
        words["exact_duplicates"] = "exact duplicates"
        if file.get("rows_unused"):
            words["rows_unused"] = "not used"
        found.append(
            {
                "what": PLACES.get(file["place"], file["place"]),
                "label": file["label"],
                "read": record.at(*path, "rows_read"),
                "parts": [(record.at(*path, key), said) for key, said in words.items()],
                "n_bytes": f"{signs['n_bytes']:,}" if "n_bytes" in signs else "",
                "sha256": signs.get("sha256", ""),
            }
        )
    return found


def _series(record: Record) -> list[dict[str, Any]] | None:
    """The market and the riskless return in the periods of the study, in per cent."""
    known = record.intake.get("series", [])
    return [
        {
            **each,
            "what": SERIES.get(each["place"], each["place"]),
            "span": [
                each[end][: 7 if each["period"] == "month" else 10] for end in ("first", "last")
            ],
            "n_periods": record.at("series", place, "n_periods"),
            "numbers": [
                record.at("series", place, key, form="fine_percent")
                for key in ("mean", "sd", "min", "max")
            ],
        }
        for place, each in enumerate(known)
    ] or None


def _faults(record: Record) -> list[dict[str, Any]]:
    """Each fault met, with kinds and first places; an empty list where there is none."""
    return [
        {
            **fault,
            "number": record.at("faults", place, "number"),
            "answer": ANSWERS[fault["answer"]],
            "n": record.at("faults", place, "n"),
            "kinds": [(record.at("faults", place, "kinds", kind), kind) for kind in fault["kinds"]],
            "more": len(fault["examples"]) < fault["n"],
        }
        for place, fault in enumerate(record.get("faults"))
    ]


def _set_aside(record: Record) -> list[dict[str, Any]] | None:
    """Rows set aside by reason, with the first of each as they stand in the file."""
    if "set_aside" not in record.intake:
        return None
    return [
        {**group, "n": record.at("set_aside", place, "n"), "several": group["n"] != 1}
        | {
            "examples": [
                {**each, "line": record.at("set_aside", place, "examples", at, "line")}
                for at, each in enumerate(group["examples"])
            ]
        }
        for place, group in enumerate(record.get("set_aside"))
    ]


def _screens(record: Record) -> list[dict[str, Any]] | None:
    screens = record.get("screens")
    return [
        {
            "label": screen["label"],
            "n_rows": record.at("screens", place, "n_rows"),
            "n_securities": record.at("screens", place, "n_securities"),
        }
        for place, screen in enumerate(screens)
    ] or None


def _delisting(record: Record) -> dict[str, Any] | None:
    """Leavers by reason, and what their final returns do to the mean of the market."""
    if "delisting" not in record.intake:
        return None
    known = record.get("delisting")
    found: dict[str, Any] = {
        key: record.at("delisting", key, form=form)
        for key, form in (
            ("n_with", "count"),
            ("n_without", "count"),
            ("mean_with", "fine_percent"),
            ("mean_without", "fine_percent"),
        )
    }
    found["reasons"] = [
        {"reason": reason or "no reason given"}
        | {key: record.at("delisting", "by_reason", reason, key) for key in ("n", "n_with")}
        | {"n_without": record.at("delisting", "by_reason", reason, "n_without")}
        | {"stand_in": record.at("delisting", "by_reason", reason, "stand_in", form="percent")}
        for reason in known["by_reason"]
    ]
    found["effect"] = None
    if None not in (known["mean_with"], known["mean_without"]):
        effect = known["mean_with"] - known["mean_without"]
        found["effect"] = typeset(printed(effect, "fine_percent"))
    return found


def _alive(record: Record) -> list[dict[str, Any]] | None:
    evidence = record.intake.get("evidence", {})
    if not evidence.get("alive", {}).get("periods"):
        return None
    known = evidence["alive"]
    most, fewest = max(known["alive"]), min(known["alive"])
    spread = f"Between {fewest:,} and {most:,} securities."
    moved = f"{sum(known['entries']):,} entries and {sum(known['exits']):,} exits in all."
    return [
        figure(
            "alive",
            "Securities alive over time",
            f"Securities with a return in each {record.intake.get('period', 'month')}. {spread}",
            data_figures.drawn("alive", data_figures.alive, known),
        ),
        figure(
            "entries-exits",
            "Entries and exits",
            "Securities by the year of their first and of their last row; those of the first and of the last "
            f"{record.intake.get('period', 'month')} of the data are neither. {moved}",
            data_figures.drawn("entries-exits", data_figures.entries_exits, known),
        ),
    ]


def _distribution(record: Record) -> dict[str, Any] | None:
    rows = data_evidence.distribution_rows(record)
    if not rows:
        return None
    known = record.get("evidence", "distribution")
    note = "Each decade’s median (circle) and the ranges that hold 50, 90 and 98 per cent of its returns."
    svg = data_figures.drawn("distribution", data_figures.distribution, known)
    picture = figure("distribution", "Returns by decade", note, svg)
    shares = [share(float(key)) for key in known[0]["quantiles"]]
    return {"rows": rows, "shares": shares, "figure": picture}


def _scale(record: Record) -> list[dict[str, Any]] | None:
    """Checks of scale in words; a series of evidence as a figure."""
    checks = record.intake.get("evidence", {}).get("scale")
    if not checks:
        return None
    found = []
    for place, check in enumerate(checks, start=1):
        said = {key: typeset(check[key]) for key in ("what", "found", "verdict")}
        series = check.get("series")
        if series and series["points"]:
            name = f"scale-{place}"
            svg = data_figures.drawn(name, data_figures.scale, series)
            points = series["points"]
            note = f"{points[0][0]} to {points[-1][0]}."
            said["figure"] = figure(name, series["label"], note, svg)
        found.append(said)
    return found


def figure(name: str, title: str, note: str, svg: bytes) -> dict[str, Any]:
    """A figure for the page; `note` is also what a screen reader says."""
    name = f"figure-{name}"
    return {
        "id": name,
        "title": title,
        "note": note,
        "svg": Markup(inline_svg(svg, name, title, note)),
    }


# The templates of their bodies are the blocks of the same name in templates/data_sections.
SECTIONS = (
    Section("files", "Files and rows", _files),
    Section("series", "The market and the riskless rate", _series),
    Section("faults", "Faults", _faults),
    Section("set-aside", "Rows set aside", _set_aside),
    Section("screens", "Screens", _screens),
    Section("delisting", "Leaving the sample", _delisting),
    Section("alive", "Securities over time", _alive),
    Section("coverage", "Coverage by column and year", data_evidence.coverage_table),
    Section("distribution", "Returns by decade", _distribution),
    Section("largest", "The largest returns", data_evidence.largest_rows),
    Section("scale", "Checks of units and scale", _scale),
)
