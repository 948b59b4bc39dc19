"""What `make check` prints: the intake of a study in a form one can read."""

from __future__ import annotations

from typing import Any

from lineproof import store
from lineproof.study import Study


def summary(study: Study) -> str:
    """The counts of the intake, its faults and screens, and what the study is set to do with the data."""
    intake = store.read_json(f"{study.folder}/data/intake.json")
    lines = [
        f"{study.title} ({study.path.name}): the study file and its data can be used.",
        "",
        f"{intake['file']}: {intake['first']} to {intake['last']}, {intake['n_securities']:,} securities",
        *_counts(intake),
    ]
    if intake["faults"]:
        lines += ["", "Faults found:", *(_fault(fault) for fault in intake["faults"])]
    if intake["screens"]:
        lines += ["", "Screens, in order; a row they mark is not ranked in that month:"]
        lines += [
            f"{s['n_rows']:>11,}  rows of {s['n_securities']:,} securities without {s['label']}"
            for s in intake["screens"]
        ]
    lines += ["", f"Set aside rows, with their text: {study.folder}/data/set_aside.csv"]
    return "\n".join(lines)


def _counts(intake: dict[str, Any]) -> list[str]:
    said = {
        "rows_read": "rows read =",
        "rows_kept": "kept +",
        "rows_set_aside": "set aside +",
        "exact_duplicates": "exact duplicates",
    }
    lines = [f"{intake[key]:>11,}  {words}" for key, words in said.items()]
    return [*lines, f"{intake['n_missing_returns']:>11,}  rows kept have no return"]


def _fault(fault: dict[str, Any]) -> str:
    answer = {"flag": "kept, flagged", "repair": "repaired"}.get(fault["answer"], fault["answer"])
    examples = f" ({', '.join(fault['examples'])})" if fault["examples"] else ""
    return f"{fault['n']:>11,}  {fault['label']}: {answer}{examples}"
