"""How groups are ranked and formed, in words, where the design is not the plain one on betas at quantiles each year."""

from __future__ import annotations

from calendar import month_name

from lineproof.designs import RULES, Design
from lineproof.estimators import ESTIMATORS
from lineproof.frequency import FREQUENCIES
from lineproof.study import SortSpec, Study

_COLUMNS = {
    "": "the beta",
    "beta": "the beta",
    "alpha": "the alpha",
    "se_beta": "the standard error of the beta",
    "r2": "the R²",
    "residual_sd": "the residual standard deviation",
}


def formation_in_words(sort: SortSpec, study: Study) -> str:
    """A clause that starts with when groups are formed and ends with how long they are held."""
    ranked = sort.ranked
    assert ranked is not None
    first, *second = (_variable(each, study) for each in ranked.rank_on)
    on = first
    if second:
        on += (
            f" and, {'inside each group' if ranked.dependent else 'apart from it'}, on {second[0]}"
        )
    count = " × ".join(map(str, ranked.groups))
    parts = [
        f"at the end of {_when(ranked)}, securities are ranked on {on} and "
        f"{RULES[ranked.rule].label} into {count} groups",
        f"held for {ranked.hold} months"
        + (", the groups held at once averaged" if ranked.overlap else ""),
    ]
    if ranked.in_blocks:
        parts[0] = parts[0].replace(
            "ranked on", f"ranked, as of {ranked.estimation} months before, on", 1
        )
        parts.append("with ex-ante betas taken anew each year")
    if ranked.breakpoints:
        from lineproof.intake.screens import (
            screen_label,
        )  # heavy, and the Snakefile comes through here

        parts[0] += f" (breakpoints of those with {screen_label(ranked.breakpoints)})"
    return ", ".join(parts)


def _when(ranked: Design) -> str:
    if ranked.form_each == "month":
        return "each month"
    if ranked.form_each == "quarter":
        first = (ranked.form_month - 1) % 3 + 1
        *early, last = (month_name[first + step] for step in (0, 3, 6, 9))
        return f"each {', '.join(early)} and {last}"
    every = f"every {ranked.hold // 12} years, in" if ranked.in_blocks else "each"
    return f"{every} {month_name[ranked.form_month]}"


def _variable(asked: str, study: Study) -> str:
    table, _, column = asked.partition(".")
    if table not in study.betas:
        return asked
    betas = study.betas[table]
    periods = FREQUENCIES[betas.returns].counted
    return (
        f"{_COLUMNS[column]} of their last {betas.window} {periods} "
        f"({ESTIMATORS[betas.estimator].label}; at least {betas.min_obs} {periods})"
    )
