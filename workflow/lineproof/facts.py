"""What the paper says about a study in words: plain values taken from the study file."""

from __future__ import annotations

from dataclasses import asdict
from math import prod
from typing import Any

from lineproof.designs import WEIGHTS, Design
from lineproof.estimators import ESTIMATORS, SHRINKAGES
from lineproof.formation_words import formation_in_words
from lineproof.frequency import FREQUENCIES
from lineproof.study import BetaSpec, SortSpec, Study


def facts(study: Study) -> dict[str, Any]:
    """Everything tables, figures, notes and the report need to know beside the numbers."""
    paper = asdict(study.paper)
    return {
        "name": study.name,
        "title": study.title,
        "market_name": study.market_name,
        "market_build": study.market_build,
        "invented": study.demo is not None,
        "level": study.level,
        "period": asdict(FREQUENCIES[study.frequency]),
        "hac_lag": study.hac_lag,
        "missing_final_return": study.intake.missing_final_return,
        "final_return_by_reason": dict(study.intake.final_return_by_reason),
        "screens": list(study.intake.screens),
        "sources": [
            {
                "place": place,
                "file": s.label,
                "source": s.source,
                "access": s.access,
                "may_share": s.may_share,
            }
            for place, s in study.sources().items()
        ],
        "sorts": {name: _sort_facts(sort, study) for name, sort in study.sorts.items()},
        "paper": {**paper, "authors": list(study.paper.authors)},
    }


def _sort_facts(sort: SortSpec, study: Study) -> dict[str, Any]:
    said: dict[str, Any] = {"title": sort.title, "design": sort.design}
    ranked = sort.ranked
    if ranked is None:
        return said
    said |= {
        "groups": int(prod(ranked.groups)),
        "weights": ranked.weights,
        "weights_label": WEIGHTS[ranked.weights].label.format(period=FREQUENCIES[study.frequency]),
        "form_month": ranked.form_month,
        "hold": ranked.hold,
    }
    if sort.estimates:
        betas = study.betas[(*ranked.ante_betas, *sort.estimates)[0]]
        said |= {
            "estimator_label": _estimator_label(betas),
            "window": betas.window,
            "window_periods": FREQUENCIES[betas.returns].counted,
            "min_obs": betas.min_obs,
        }
    if not _is_plain(ranked, sort.estimates):
        said["formation"] = formation_in_words(sort, study)
    return said


def _is_plain(ranked: Design, estimates: tuple[str, ...]) -> bool:
    """Whether groups are parted at the quantiles of one estimate of beta, once a year."""
    on_one = ranked.rank_on == ranked.ante_betas == estimates and len(estimates) == 1
    usual = (ranked.form_each, ranked.rule, ranked.breakpoints) == ("year", "quantiles", None)
    return on_one and usual and not (ranked.in_blocks or ranked.overlap)


def _estimator_label(betas: BetaSpec) -> str:
    label = ESTIMATORS[betas.estimator].label
    return f"{label}, {SHRINKAGES[betas.shrunk['shrink']].label}" if betas.shrunk else label
