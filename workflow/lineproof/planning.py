"""How many steps a run may have, said before the data have been read."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

from lineproof.specs import Study, SubperiodSpec

_YEARS = 40  # taken for the span of data that have not been read


@dataclass(frozen=True)
class Most:
    """No run of a study has more steps; `sure` unless subperiods are cut from a span that is not known yet."""

    steps: int
    sure: bool


def most_steps(study: Study, rules: Iterable[Sequence[str]]) -> Most:
    """Steps of a whole run, for the wildcards of each rule that runs a script."""
    spans = [_months(spec, study) for spec in study.subperiods.values()]
    parts = [_parts(*each) for each in zip(study.subperiods.values(), spans, strict=True)]
    counts = {"estimate": len(study.betas), "sort": len(study.sorts), "subperiod": sum(parts)}
    steps = 0
    for wildcards in rules:
        jobs = 1
        for name in wildcards:
            jobs *= counts[name]
        steps += jobs
    cut = zip(study.subperiods.values(), spans, strict=True)
    return Most(steps, all(months is not None for spec, months in cut if spec.every))


def _months(spec: SubperiodSpec, study: Study) -> int | None:
    """Months between the ends of an entry; an end that is left to the data is known of the demo market alone."""
    demo = study.demo or {}
    first = demo.get("first") if spec.first == "first" else spec.first
    last = demo.get("last") if spec.last == "last" else spec.last
    return None if first is None or last is None else _number(last) - _number(first) + 1


def _parts(spec: SubperiodSpec, months: int | None) -> int:
    if spec.every:
        return -(-(12 * _YEARS if months is None else months) // (12 * spec.every))
    return spec.split or 1


def _number(month: str) -> int:
    year, number = month.split("-")
    return 12 * int(year) + int(number)
