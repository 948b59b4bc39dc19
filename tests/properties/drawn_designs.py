"""A random design of each kind in the registry, with the estimates it takes from a random market."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pandas as pd
from tests.properties.random_market import WINDOWS

from lineproof.designs import FORM_EACH, RULES, Design
from lineproof.estimation import estimates_of

NOT_RANKED = {"supplied"}
SECTORS = ["ports", "mills", "rail"]


def with_sector(panel: pd.DataFrame) -> pd.DataFrame:
    """The panel with a column of text, by which breakpoints can be set."""
    return panel.assign(sector=[SECTORS[int(name[1:]) % 3] for name in panel["security"]])


def estimates(
    panel: pd.DataFrame, market: pd.DataFrame, frequency: str = "monthly"
) -> dict[str, pd.DataFrame]:
    """Two tables of betas: `b` from a short window, `c` from one half as long again."""
    short = WINDOWS[frequency]
    windows = {"b": short, "c": {**short, "window": short["window"] * 3 // 2}}
    how = {"estimator": "ols", "returns": frequency, "dated": frequency}
    return {
        name: estimates_of(panel, market, name=name, **how, **each)
        for name, each in windows.items()
    }


def _common(rng: np.random.Generator) -> dict[str, Any]:
    rule = str(rng.choice(list(RULES)))
    some = (
        {"column": "sector", "in": SECTORS[:2]}
        if rule == "quantiles" and rng.random() < 0.4
        else None
    )
    return {
        "name": "random",
        "rule": rule,
        "breakpoints": some,
        "form_month": int(rng.integers(1, 13)),
        "first_formation": [None, None, "1990-10", "1991-01", "1991-02"][rng.integers(5)],
        "spread": bool(rng.random() < 0.5),
        "assign_betas": str(rng.choice(["none", "ex_ante"])),
    }


def _when(rng: np.random.Generator) -> dict[str, Any]:
    each = str(rng.choice(list(FORM_EACH)))
    overlap = bool(rng.random() < 0.3)
    longest = 24 if overlap else FORM_EACH[each]
    return {"form_each": each, "overlap": overlap, "hold": int(rng.integers(1, longest + 1))}


def _single_window(rng: np.random.Generator) -> dict[str, Any]:
    ranked_on, ante = [
        ("b", ("b",)),
        ("b.residual_sd", ("c",)),
        ("size", ()),
        ("price", ("b", "c")),
    ][rng.integers(4)]
    several = len(ante) > 1
    return {
        "rank_on": (ranked_on,),
        "ante_betas": ante,
        "renews": several,
        "groups": (int(rng.integers(2, 6)),),
        **_when(rng),
    }


def _double_sort(rng: np.random.Generator) -> dict[str, Any]:
    return {
        "rank_on": ("size", "b"),
        "ante_betas": ("b",),
        "groups": (2, int(rng.integers(2, 4))),
        "dependent": bool(rng.random() < 0.5),
        **_when(rng),
    }


def _three_windows(rng: np.random.Generator) -> dict[str, Any]:
    return {
        "rank_on": ("b",),
        "ante_betas": [("b",), ("b", "c")][rng.integers(2)],
        "renews": True,
        "in_blocks": True,
        "estimation": int(rng.integers(1, 9)),
        "groups": (int(rng.integers(2, 5)),),
        "hold": int(rng.choice([12, 24, 36])),
    }


# How each design that ranks is drawn. A new design needs a line here.
DRAWN: dict[str, Callable[[np.random.Generator], dict[str, Any]]] = {
    "single_window": _single_window,
    "double_sort": _double_sort,
    "three_windows": _three_windows,
}


def options(design: str, seed: int) -> dict[str, Any]:
    """What a drawn design is made of, but for its weights."""
    rng = np.random.default_rng(seed)
    return _common(rng) | DRAWN[design](rng)


def draw_design(design: str, seed: int, weights: str) -> Design:
    """A design of one kind."""
    return Design(weights=weights, **options(design, seed))
