"""What `make check` prints: the intake of a study in a form one can read."""

from __future__ import annotations

from typing import Any

from lineproof import store
from lineproof.study import Study

_WIDTH = 11  # of the counts
_ANSWERS = {"flag": "kept, flagged", "repair": "read without them", "set aside": "set aside"}


def summary(study: Study) -> str:
    """What the intake of a study found, from its results folder."""
    intake = store.read_json(f"{study.folder}/data/intake.json")
    return "\n".join(
        [
            f"{study.title} ({study.path.name}): the study file and its data can be used.",
            "",
            *describe_intake(intake),
            "",
            f"The rows set aside, as they stand in the file: {study.folder}/data/set_aside.csv",
        ]
    )


def describe_intake(intake: dict[str, Any]) -> list[str]:
    """The counts of an intake, its span, faults and screens, as lines of text."""
    span = f"{intake['first']} to {intake['last']}"
    lines = [
        f"{intake['file']}: {span}, {_securities(intake['n_securities'])}",
        *_counts(intake),
        *intake["span"],
    ]
    if intake["faults"]:
        lines += ["", "Faults found:"]
        lines += [line for fault in intake["faults"] for line in _fault(fault)]
    if intake["screens"]:
        lines += [
            "",
            "Rows that fail a screen, in order; they are kept, but not ranked that month:",
        ]
        lines += [_screen(screen) for screen in intake["screens"]]
    return lines


def _counts(intake: dict[str, Any]) -> list[str]:
    missing = intake["n_missing_returns"]
    said = {
        "rows_read": "rows read, of which",
        "rows_kept": "kept" + (f", {missing:,} of them without a return" if missing else ""),
        "rows_set_aside": "set aside",
        "exact_duplicates": "dropped, as exact duplicates of others",
    }
    return [f"{_number(intake[key])}  {words}" for key, words in said.items()]


def _fault(fault: dict[str, Any]) -> list[str]:
    """A line of count, label and answer; below it the kinds, the note and the first places."""
    kinds = ", ".join(f"{n:,} {kind}" for kind, n in fault["kinds"].items())
    examples = ", ".join(fault["examples"])
    if len(fault["examples"]) < fault["n"] and examples:
        examples += ", …"
    said = [f"{_number(fault['n'])}  {fault['label']}: {_ANSWERS[fault['answer']]}"]
    below = [text for text in (kinds, fault["note"], examples) if text]
    return said + [f"{'':{_WIDTH}}    {text}" for text in below]


def _screen(screen: dict[str, Any]) -> str:
    whose = _securities(screen["n_securities"])
    return f"{_number(screen['n_rows'])}  of {whose}: not “{screen['label']}”"


def _securities(n: int) -> str:
    return f"{n:,} {'security' if n == 1 else 'securities'}"


def _number(n: int) -> str:
    return f"{n:>{_WIDTH},}"
