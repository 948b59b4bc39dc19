"""What the paper says about a study in words: plain values taken from the study file."""

from __future__ import annotations

from dataclasses import asdict
from typing import Any

from lineproof.designs import WEIGHTS
from lineproof.estimators import ESTIMATORS, SHRINKAGES
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
    if sort.rank_on is None:
        return said
    betas = study.betas[sort.rank_on]
    return {
        **said,
        "groups": sort.groups,
        "weights": sort.weights,
        "weights_label": WEIGHTS[sort.weights].label.format(period=FREQUENCIES[study.frequency]),
        "form_month": sort.form_month,
        "hold": sort.hold,
        "estimator_label": _estimator_label(betas),
        "window": betas.window,
        "window_periods": FREQUENCIES[betas.returns].counted,
        "min_obs": betas.min_obs,
    }


def _estimator_label(betas: BetaSpec) -> str:
    label = ESTIMATORS[betas.estimator].label
    return f"{label}, {SHRINKAGES[betas.shrunk['shrink']].label}" if betas.shrunk else label
