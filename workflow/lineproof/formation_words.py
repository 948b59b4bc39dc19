"""How groups are ranked and formed, in words."""

from __future__ import annotations

from calendar import month_name

from lineproof.designs import ASSIGNED, RULES, Design
from lineproof.estimator_words import window_in_words
from lineproof.specs import SortSpec, Study

_COLUMNS = {
    "": "beta",
    "beta": "beta",
    "alpha": "alpha",
    "se_beta": "standard error of beta",
    "r2": "R²",
    "residual_sd": "residual standard deviation",
}


def formation_in_words(sort: SortSpec, study: Study) -> str:
    """A clause that starts with when groups are formed and ends with how long they are held."""
    ranked = sort.ranked
    assert ranked is not None
    on, *second = (_ranked_on(each, study) for each in ranked.rank_on)
    if second:
        on += (
            f" and, {'inside each group' if ranked.dependent else 'apart from it'}, on {second[0]}"
        )
    dated = f", as of {ranked.estimation} months before," if ranked.in_blocks else ""
    count = " × ".join(map(str, ranked.groups))
    parts = [
        f"{_when(ranked)}, securities are ranked{dated} on {on} and {RULES[ranked.rule].label} "
        f"into {count} groups{_breakpoints(ranked)}",
        f"held for {ranked.hold} months",
    ]
    if ranked.overlap:
        parts.append("the groups held at once averaged")
    if ranked.assign_betas != "none":
        parts.append(f"with {ASSIGNED[ranked.assign_betas]} assigned to each member")
    return ", ".join(parts)


def variables(sort: SortSpec, study: Study) -> list[str]:
    """What each variable that a sort ranks on is called in a table; the names of betas tell apart what would be one."""
    assert sort.ranked is not None
    found = [_called(each, study) for each in sort.ranked.rank_on]
    if len(set(found)) == len(found):
        return found
    tables = (each.partition(".")[0] for each in sort.ranked.rank_on)
    return [f"{name} {table}" for name, table in zip(found, tables, strict=True)]


def prior_betas(sort: SortSpec, study: Study) -> str | None:
    """Which betas of the members the ex-ante beta of a group is the mean of, or None where it has none."""
    ranked = sort.ranked
    assert ranked is not None
    if not ranked.ante_betas:
        return None
    first, *later = ranked.ante_betas
    on_it = {first, f"{first}.beta"} & set(ranked.rank_on) and not ranked.in_blocks
    found = (
        "that they are ranked on"
        if on_it
        else f"of their last {window_in_words(study.betas[first])}"
    )
    if ranked.renews:
        found += ", taken anew at the end of each year"
    for each in later:
        found += f", then of their last {window_in_words(study.betas[each])}"
    return found


def _called(asked: str, study: Study) -> str:
    table, _, column = asked.partition(".")
    return _COLUMNS[column] if table in study.betas else asked


def _ranked_on(asked: str, study: Study) -> str:
    table = asked.partition(".")[0]
    if table not in study.betas:
        return asked
    return f"the {_called(asked, study)} of their last {window_in_words(study.betas[table])}"


def _breakpoints(ranked: Design) -> str:
    if not ranked.breakpoints:
        return ""
    from lineproof.intake.screens import screen_label  # heavy, and the Snakefile comes through here

    return f" (breakpoints of those with {screen_label(ranked.breakpoints)})"


def _when(ranked: Design) -> str:
    start = ""
    if ranked.first_formation:
        year, month = ranked.first_formation.split("-")
        start = f", from {month_name[int(month)]} {year} on"
    if ranked.form_each == "month":
        return f"at the end of each month{start}"
    if ranked.form_each == "quarter":
        first = (ranked.form_month - 1) % 3 + 1
        *early, last = (month_name[first + step] for step in (0, 3, 6, 9))
        return f"at the end of each {', '.join(early)} and {last}{start}"
    month = month_name[ranked.form_month]
    if ranked.in_blocks:
        return f"every {ranked.hold // 12} years, at the end of {month}{start}"
    return f"at the end of each {month}{start}"
