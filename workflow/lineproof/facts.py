"""What the paper says about a study in words: plain values taken from the study file."""

from __future__ import annotations

from dataclasses import asdict
from typing import Any

from lineproof.designs import WEIGHTS
from lineproof.formation_words import formation_in_words, prior_betas, variables
from lineproof.frequency import FREQUENCIES
from lineproof.specs import SortSpec, Study


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
    return said | {
        "groups": list(ranked.groups),
        "variables": variables(sort, study),
        "formation": formation_in_words(sort, study),
        "prior_betas": prior_betas(sort, study),
        "weights_label": WEIGHTS[ranked.weights].label.format(period=FREQUENCIES[study.frequency]),
    }
