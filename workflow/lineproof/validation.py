"""The stage that takes raw files in: a clean panel, the market, everything set aside, and the counts."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np

from lineproof.ahead import ahead
from lineproof.frequency import FREQUENCIES
from lineproof.intake.dating import with_dates
from lineproof.intake.first_pass import Taken, take_rows
from lineproof.intake.frequency import FrequencyEvidence
from lineproof.intake.rates import read_supplied
from lineproof.intake.reading import open_files
from lineproof.intake.scale import ScaleEvidence
from lineproof.intake.second_pass import in_order
from lineproof.intake.stopping import stop
from lineproof.intake.stream import Intake, Kinds
from lineproof.intake.unit import judge_scale
from lineproof.periods import Months
from lineproof.store import Scratch

_OURS = {
    "line",
    "code",
    "return_",
    "total_return",
    "excess_return",
    "eligible",
    "leaves",
    "n_days",
    "market_weight",
}
_CHUNK = 1 << 20  # rows


def validate_returns(
    files: Mapping[str, list[str]],
    scratch: Scratch,
    *,
    frequency: str,
    returns: dict[str, Any],
    returns_are: str,
    returns_frequency: str,
    series: dict[str, Any],
    market_build: str | None,
    rules: dict[str, Any],
) -> Intake:
    """Read every row of the raw files once: `files` has lists of them for returns, market and riskless.

    `frequency` is that of the study, `returns_frequency` that of the raw returns; `series` is what `read_supplied`
    takes of market and riskless rate, and `rules` are those of `IntakeSpec`. `scratch` holds what memory does not.

    Raises KnownProblem when a file cannot be used, or the returns are not in the unit or frequency declared.
    """
    _check_names(returns)
    returns = dict(with_dates(files["returns"], returns, daily=returns_frequency == "daily"))
    returns |= {"are": returns_are, "noun": FREQUENCIES[returns_frequency].noun}
    supplied = read_supplied(files, **series)
    opened = open_files(list(files["returns"]), returns)
    scale = ScaleEvidence()
    months = Months()
    taken = take_rows(
        opened, returns, scratch, lambda day, decimal: scale.add(months.number(day), decimal)
    )
    stretches = judge_scale(scale, returns, returns_frequency, rules["other_unit_stop_above"])
    _judge_frequency(taken, returns["label"], returns_frequency)
    kinds = Kinds(frequency, returns_frequency, returns_are, market_build)
    return Intake(opened, returns, taken, supplied, kinds, rules, scale, stretches)


def _check_names(reading: dict[str, Any]) -> None:
    taken = sorted(_OURS & set(reading["columns"]))
    if taken:
        found = f"our own tables have a column {taken[0]!r} already"
        raise stop(f"{reading['label']}, columns.{taken[0]}", found, "give it another name")


def _judge_frequency(taken: Taken, label: str, frequency: str) -> None:
    evidence = FrequencyEvidence()
    for names, owner, columns in ahead(taken.runs.stretches(_CHUNK, ["day"])):
        day = columns["day"].astype("datetime64[D]")
        month = Months().number(day)
        order = in_order(owner, month, np.ones(len(day), bool), len(names))
        evidence.add(np.searchsorted(owner[order], np.arange(len(names) + 1)), day[order])
    evidence.judge(label, frequency)
