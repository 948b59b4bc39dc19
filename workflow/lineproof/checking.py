"""What `make check` prints: the intake of a study in a form one can read on a terminal."""

from __future__ import annotations

import textwrap
from collections.abc import Iterator

from lineproof import store
from lineproof.intake.record import (
    ANSWERS,
    DelistingRecord,
    FaultRecord,
    FileRecord,
    Intake,
    LargeReturn,
    LargestEvidence,
    NeighbourRow,
    ScreenRecord,
    files_of,
    returns_in_all,
    survivors_only,
)
from lineproof.intake.signed import made_with
from lineproof.intake.stopping import counted
from lineproof.paper.rounding import printed
from lineproof.problems import KnownProblem, Problem
from lineproof.specs import Study
from lineproof.wiring import Wiring

WIDTH = 96  # of a line, unless a name or a row of the data is longer
_COUNT = 11  # of the counts
_N_LARGEST = 5  # gains and losses together
_DASH = "–"
_NO_SUMMARY = "There is no summary of the data to show."


def summary(study: Study) -> str:
    """What the intake of a study found, from its results folder.

    Raises KnownProblem when the record there is that of another study file.
    """
    place = f"{study.folder}/data/intake.json"
    intake, raw = store.read_json(place), store.read_json(f"{study.folder}/data/raw_files.json")
    if raw["made_with"] != made_with(Wiring(study).options("validate_returns")):
        found = f"it is not the record of {study.path.name} as it stands now"
        raise KnownProblem(_NO_SUMMARY, [Problem(place, found, "delete it and check again")])
    return "\n".join(
        [
            f"{study.title} ({study.path.name}): the study file and its data can be used.",
            "",
            *describe_intake(intake),
            "",
            f"Rows set aside, as they stand in the file:  {study.folder}/data/set_aside.csv",
            f"The data report, with tables and figures:   {study.folder}/data_report.html",
        ]
    )


def describe_intake(intake: Intake) -> list[str]:
    """All of an intake that a reader should see before the study runs, as lines of text.

    Raises ValueError when the rows of a file do not add up.
    """
    largest = intake.get("evidence", {}).get("largest", {"positive": [], "negative": []})
    scale = intake.get("evidence", {}).get("scale", [])
    parts = [
        _survivors(intake),
        _files(intake),
        _titled("Faults found:", [line for fault in intake["faults"] for line in _fault(fault)]),
        _titled(
            "Rows that fail a screen, in order; they are kept, but not ranked on:",
            [line for screen in intake["screens"] for line in _screen(screen)],
        ),
        _titled("Securities that leave:", _delisting(intake.get("delisting"), _period(intake))),
        _titled(
            "Units and scale:",
            [
                line
                for check in scale
                for line in _below(f"{check['what']}: {check['found']}: {check['verdict']}", 2, 4)
            ],
        ),
        _titled("The largest returns, in per cent:", _largest(largest)),
    ]
    shown = [part for part in parts if part]
    return [line for place, part in enumerate(shown) for line in ([""] if place else []) + part]


def _period(intake: Intake) -> str:
    return intake.get("period", "month")


def _titled(title: str, lines: list[str]) -> list[str]:
    return [title, *lines] if lines else []


def _survivors(intake: Intake) -> list[str]:
    if not survivors_only(intake):
        return []
    said = (
        "WARNING: no security ever leaves. The file may hold survivors only, and returns of survivors are too "
        "high. Ask the vendor for the securities that have left."
    )
    return _below(said, 0, 9)


def _files(intake: Intake) -> list[str]:
    """All returns together, then each of several files of them and the other files; then the span."""
    missing, n = intake["n_missing_returns"], intake["n_securities"]
    said = f"{intake['file']}: {intake['first']} to {intake['last']}, {counted(n, 'security')}"
    lines = _below(said, 0, 2)
    lines += _equation(returns_in_all(intake), missing, named=False)
    files = files_of(intake)
    several = sum(file["place"] == "data.returns" for file in files) > 1
    for file in files:
        if several or file["place"] != "data.returns":
            lines += _equation(file, 0, named=True)
    return lines + [line for sentence in intake["span"] for line in _below(sentence, 0, 2)]


def _equation(file: FileRecord, missing: int, *, named: bool) -> list[str]:
    """Rows read, and the parts that they are the sum of, one under the other."""
    parts = [
        ("rows_read", "rows read"),
        ("rows_kept", "kept" + (f", {missing:,} of them without a return" if missing else "")),
        ("rows_set_aside", "set aside"),
        ("exact_duplicates", "dropped, as exact duplicates of others"),
    ]
    if file["place"] != "data.returns":  # a fault in a series stops the run
        unused = ("rows_unused", "not used: without a value, or beyond the study")
        parts = [*parts[:2], *[unused] * bool(file.get("rows_unused"))]
    signs = ["", "=", *["+"] * (len(parts) - 2)]
    lines = [
        f"{sign:>2}{file[key]:>{_COUNT - 2},}  {words}"  # type: ignore[literal-required]
        for sign, (key, words) in zip(signs, parts, strict=True)
    ]
    return [*_below(f"{file['label']}:", 0, 2), *lines] if named else lines


def _fault(fault: FaultRecord) -> list[str]:
    """A line of count, label and answer; below it the kinds, the note and the first places."""
    kinds = ", ".join(f"{n:,} {kind}" for kind, n in fault["kinds"].items())
    examples = ", ".join(fault["examples"])
    if len(fault["examples"]) < fault["n"] and examples:
        examples += ", …"
    below = [text for text in (kinds, fault["note"], examples) if text]
    lines = _counted(fault["n"], f"{fault['label']}: {ANSWERS[fault['answer']]}")
    return lines + [line for text in below for line in _below(text, _COUNT + 4, _COUNT + 6)]


def _screen(screen: ScreenRecord) -> list[str]:
    n, whose = screen["n_rows"], counted(screen["n_securities"], "security")
    return _counted(n, f"{'row' if n == 1 else 'rows'} of {whose}: not “{screen['label']}”")


def _delisting(found: DelistingRecord | None, period: str) -> list[str]:
    """With and without a final return, what stood in, and what it does to the mean."""
    if found is None:
        return []
    lines = _counted(found["n_with"], "with a final return")
    lines += _counted(found["n_without"], "without one")
    for reason, each in found["by_reason"].items():
        if each["n_without"]:
            stand_in = each["stand_in"]
            taken = (
                "left without one"
                if stand_in is None
                else f"taken as {_minus(printed(stand_in, 'percent'))} %"
            )
            said = f"{each['n_without']:,} {reason or 'for no reason given'}: {taken}"
            lines += _below(said, _COUNT + 4, _COUNT + 6)
    means = [found["mean_with"], found["mean_without"]]
    if None not in means:
        with_, without = (_minus(printed(mean, "fine_percent")) for mean in means)
        said = f"equally weighted mean a {period}: {with_} % with final returns, {without} % without any"
        lines += _below(said, _COUNT + 2, _COUNT + 4)
    return lines


def _largest(largest: LargestEvidence) -> list[str]:
    """The largest of gains and losses, between the returns of the rows before and after."""
    both = [*largest["positive"], *largest["negative"]]
    rows = sorted(both, key=lambda each: -abs(each["return_"]))[:_N_LARGEST]  # stable
    if not rows:
        return []
    table = [("security", "date", "before", "return", "after"), *map(_large, rows)]
    widths = [max(len(row[at]) for row in table) for at in range(5)]
    return [
        (
            f"  {row[0]:<{widths[0]}}  {row[1]:<{widths[1]}}  "
            + "  ".join(f"{text:>{width}}" for text, width in zip(row[2:], widths[2:], strict=True))
        ).rstrip()
        for row in table
    ]


def _large(each: LargeReturn) -> tuple[str, str, str, str, str]:
    before, after = (_return(each[side]) for side in ("before", "after"))
    return (
        _visible(each["security"]),
        each["date"],
        before,
        _minus(printed(each["return_"], "percent")),
        after,
    )


def _return(row: NeighbourRow | None) -> str:
    """Blank where there is no row, a dash where the row has no return."""
    if row is None:
        return ""
    return _DASH if row["return_"] is None else _minus(printed(row["return_"], "percent"))


def _counted(n: int, words: str) -> list[str]:
    """A count in its column and words beside it, wrapped below themselves."""
    first, *rest = _below(words, _COUNT + 2, _COUNT + 4)
    return [f"{n:>{_COUNT},}  {first.strip()}", *rest]


def _below(text: str, indent: int, then: int) -> list[str]:
    """Text in lines of at most `WIDTH` characters, indented; words are never broken."""
    return list(_wrapped(text, " " * indent, " " * then)) or [""]


def _wrapped(text: str, first: str, then: str) -> Iterator[str]:
    yield from textwrap.wrap(
        _visible(text),
        WIDTH,
        initial_indent=first,
        subsequent_indent=then,
        break_long_words=False,
        break_on_hyphens=False,
    )


def _visible(text: str) -> str:
    """Text from the data without what would steer a terminal."""
    return "".join(
        char if char.isprintable() else " " if char.isspace() else "\N{REPLACEMENT CHARACTER}"
        for char in text
    )


def _minus(text: str) -> str:
    return text.replace("-", "−")
