"""Invented studies for the tests of the paper: drawn returns, priced by the real analyses."""

from __future__ import annotations

import os
import subprocess
import sys
from collections.abc import Sequence
from dataclasses import asdict
from functools import cache
from typing import Any

import numpy as np
import pandas as pd
from tests.unit import group_examples

from lineproof.addresses import is_spread
from lineproof.analyses import ANALYSES
from lineproof.formation_summary import describe_formations
from lineproof.formed_tables import asset_names
from lineproof.frequency import FREQUENCIES
from lineproof.paper.context import Context
from lineproof.pricing import price_subperiod

HOSTILE = ["<script>alert(1);", "=cmd()|'calc'!A0", "R&D_50%", "{$x^2$}#~\\", "[2] food", "*Star"]
LONG = "The very long name of an index of everything that has ever been listed anywhere"
_KEYS = ["sort", "subperiod", "analysis", "variant", "asset", "term", "se_kind"]


def cut(
    sort: str, assets: Sequence[str], months: pd.PeriodIndex, *, ranked: bool, seed: int
) -> pd.DataFrame:
    """Monthly returns of assets with betas from 0.5 to 1.5, and alphas that fall with beta."""
    random = np.random.Generator(np.random.PCG64(seed))
    shape = (len(months), len(assets))
    betas = np.linspace(0.5, 1.5, len(assets))
    market = 0.006 + 0.045 * random.standard_normal(len(months))
    riskless = np.full(len(months), 0.003) + 0.0005 * random.standard_normal(len(months))
    excess = 0.004 * (1 - betas) + np.outer(market, betas) + 0.015 * random.standard_normal(shape)
    nothing = np.full(shape, np.nan)
    formed = ranked & np.array([not is_spread(asset) for asset in assets])
    wide = {
        "excess_return": excess,
        "n_members": np.where(formed, 30 + random.integers(0, 5, shape), np.nan),
        "mean_size": np.full(shape, 120.0) if ranked else nothing,
        "ante_beta": betas + 0.1 * random.standard_normal(shape) if ranked else nothing,
        "market_excess": np.repeat(market[:, None], len(assets), axis=1),
        "riskless": np.repeat(riskless[:, None], len(assets), axis=1),
    }
    frame = pd.DataFrame({name: values.T.ravel() for name, values in wide.items()})
    dates = months.to_timestamp(how="end").normalize().to_numpy().astype("datetime64[ms]")
    frame.insert(0, "date", np.tile(dates, len(assets)))
    frame.insert(0, "asset", np.repeat(list(assets), len(months)))
    frame.insert(0, "sort", sort)
    return frame


def subperiod(name: str, first: str, last: str, title: str | None = None) -> dict[str, Any]:
    """A subperiod as the pipeline lists it."""
    months = len(pd.period_range(first, last, freq="M"))
    title = title or f"{first[:4]}–{last[:4]}"
    return {"name": name, "title": title, "first": first, "last": last, "n_periods": months}


def counts(rows: list[tuple[str, str, str, str, str, float]]) -> pd.DataFrame:
    """Rows of the estimates that hold an estimate only."""
    frame = pd.DataFrame(
        rows, columns=["subperiod", "analysis", "variant", "asset", "term", "estimate"]
    )
    frame = frame.assign(sort="-", se_kind="-", n_periods=0, n_assets=0, status="ok", reason="")
    for column in (
        "se",
        "statistic",
        "df1",
        "df2",
        "p",
        "p_one_sided",
        "critical",
        "critical_one_sided",
    ):
        frame[column] = np.nan
    return frame


def sample_rows(
    periods: list[dict[str, Any]], intake: dict[str, Any], months: pd.PeriodIndex
) -> pd.DataFrame:
    """The sample's own numbers; the months' counts rise by one a month from 250."""
    rows = [("-", "intake", "rows", "all", term, n) for term, n in intake["rows"].items()]
    rows += [
        ("-", "intake", "fault", f"fault-{f['number']:02d}", "n_rows", f["n"])
        for f in intake["faults"]
    ]
    rows += [
        ("-", "intake", "screen", f"screen-{place}", term, each[term])
        for place, each in enumerate(intake["screens"], start=1)
        for term in ("n_rows", "n_securities")
    ]
    for place, month in enumerate(map(str, months)):
        rows.append(("-", "sample", "month", month, "n_securities", 250 + place % 200))
        rows.append(("-", "sample", "month", month, "n_with_beta", max(0, 200 + place % 150 - 24)))
    for each in periods:
        values = {
            "n_periods": each["n_periods"],
            "n_securities": 700,
            "n_security_periods": 253_112,
            "mean_alive": 281.25,
            "min_alive": 250,
            "max_alive": 1449,
            "n_entries": 320,
            "n_exits": 295,
            "mean_return": 0.0084,
            "sd_return": 0.0491,
        }
        rows += [(each["name"], "sample", "panel", "all", term, v) for term, v in values.items()]
    return counts(rows)


def group_rows(sort: str, assets: list[str], formed: list[str], seed: int) -> pd.DataFrame:
    """The numbers of groups that are drawn at each of some formations."""
    membership = group_examples.drawn_membership(assets, formed, seed)
    tables = (
        group_examples.formations(membership, assets, n_exits=1),
        group_examples.transitions(membership),
    )
    return describe_formations(sort, *tables, hold=12, last=group_examples.date(formed[-1]))


def facts(sorts: dict[str, dict[str, Any]], **changes: Any) -> dict[str, Any]:
    """What the paper knows of the study."""
    paper = {
        "authors": ["A. Author", "B. Author"],
        "main": next(iter(sorts)),
        "main_subperiod": "full",
        "alpha_errors": "hac",
        "line_weights": "ols",
        "line_errors": "errors_in_variables",
        "tables": "default",
        "figures": "default",
    }
    return {
        "name": "example",
        "title": "Is beta priced on the Kestrel Sound Exchange?",
        "market_name": "the Kestrel Sound Exchange",
        "market_build": None,
        "invented": True,
        "level": 0.05,
        "period": asdict(FREQUENCIES["monthly"]),
        "hac_lag": None,
        "missing_final_return": None,
        "final_return_by_reason": {},
        "screens": [{"column": "price", "at_least": 1}],
        "sources": [
            {
                "place": "data.returns",
                "file": "raw/returns.csv",
                "source": "Kestrel Sound Exchange (invented)",
                "access": "Made by this program.",
                "may_share": True,
            }
        ],
        "sorts": sorts,
        **changes,
        "paper": {**paper, **changes.get("paper", {})},
    }


def ranked_facts(
    title: str = "10 groups, equally weighted", groups: int | list[int] = 10
) -> dict[str, Any]:
    """What the paper knows of a ranked sort."""
    numbers = groups if isinstance(groups, list) else [groups]
    return {
        "title": title,
        "design": "single_window" if len(numbers) == 1 else "double_sort",
        "groups": numbers,
        "variables": ["size", "beta"][-len(numbers) :],
        "formation": f"at the end of each December, securities are ranked into {numbers} groups",
        "prior_betas": "that they are ranked on",
        "weights_label": "equally weighted, rebalanced monthly",
    }


INTAKE = {
    "rows": {
        "rows_read": 254_011,
        "rows_kept": 253_112,
        "rows_set_aside": 771,
        "exact_duplicates": 128,
        "rows_screened": 640,
    },
    "faults": [
        {"number": 8, "label": "a date that does not parse", "answer": "set aside", "n": 51},
        {"number": 15, "label": "a return below −100 %", "answer": "set aside", "n": 720},
        {"number": 7, "label": "blanks around a value", "answer": "repair", "n": 44},
        {"number": 16, "label": "a return of exactly −100 %", "answer": "flag", "n": 12},
    ],
    "screens": [{"label": "price at least 1", "n_rows": 640, "n_securities": 71}],
    "span": [],
}


def study(
    sorts: dict[str, tuple[dict[str, Any], Sequence[str]]],
    periods: list[dict[str, Any]],
    *,
    analyses: Sequence[str] = tuple(ANALYSES),
    intake: dict[str, Any] = INTAKE,
    has_riskless: bool = True,
    **changes: Any,
) -> Context:
    """Everything the paper needs for given sorts (facts and asset names) and subperiods."""
    first, last = min(p["first"] for p in periods), max(p["last"] for p in periods)
    months = pd.period_range(first, last, freq="M")
    whole = pd.concat(
        [
            cut(name, assets, months, ranked=said["design"] != "supplied", seed=4 + place)
            for place, (name, (said, assets)) in enumerate(sorts.items())
        ]
    )
    if not has_riskless:
        whole["riskless"] = np.nan
    frames = []
    for each in periods:
        start, end = pd.Period(each["first"], "M"), pd.Period(each["last"], "M")
        within = whole["date"].dt.to_period("M").between(start, end)
        frames.append(
            price_subperiod(
                whole[within], subperiod=each["name"], level=0.05, hac_lag=None, analyses=analyses
            )
        )
    frames.append(sample_rows(periods, intake, months))
    years = [str(month) for month in months if month.month == 12]
    for place, (name, (said, assets)) in enumerate(sorts.items()):
        if said["design"] != "supplied":
            frames.append(group_rows(name, [a for a in assets if a[0] == "p"], years, place))
    estimates = pd.concat(frames, ignore_index=True)[frames[0].columns]
    said = facts({name: about for name, (about, _) in sorts.items()}, **changes)
    return Context(estimates, periods, said, intake)


def groups(count: int) -> list[str]:
    """Names of ranked groups."""
    return [f"p{place:02d}" for place in range(1, count + 1)]


@cache
def usual() -> Context:
    """Three sorts over a full sample, five-year parts, and six months: too few for a joint test."""
    periods = [
        subperiod("full", "1990-01", "2009-12", "Full sample, 1990–2009"),
        *(subperiod(f"parts-{y}", f"{y}-01", f"{y + 4}-12") for y in range(1990, 2010, 5)),
        subperiod("short", "2009-07", "2009-12", "Jul 2009 – Dec 2009"),
    ]
    sorts = {
        "ten": (ranked_facts(), groups(10)),
        "ten_size": (ranked_facts("10 groups, size-weighted"), groups(10)),
        "sectors": (
            {"title": "Sector indices", "design": "supplied"},
            [
                "Agriculture",
                "Chemicals",
                "Energy",
                "Financials",
                "Machinery",
                "Retail",
                "Transport",
            ],
        ),
    }
    return study(sorts, periods)


@cache
def double() -> Context:
    """Three by four groups with their differences, and ten groups with theirs."""
    assets = [*asset_names(3, 4), "spread", "spread-01", "spread-02", "spread-03"]
    sorts = {
        "double": (ranked_facts("3 × 4 groups", [3, 4]), assets),
        "ten": (ranked_facts(), [*groups(10), "spread"]),
    }
    periods = [subperiod("full", "1990-01", "2009-12"), subperiod("late", "2000-01", "2009-12")]
    return study(sorts, periods)


@cache
def hostile() -> Context:
    """Supplied assets alone, 25 of them with names meant to break the formats, in one subperiod."""
    names = [*HOSTILE, LONG, *(f"Asset {place}" for place in range(8, 26))]
    sorts = {"given": ({"title": f"Supplied {HOSTILE[0]} & co", "design": "supplied"}, names)}
    intake = {**INTAKE, "faults": [], "screens": []}
    return study(
        sorts,
        [subperiod("full", "1990-01", "2009-12", f"{HOSTILE[0]} 100% {LONG}")],
        intake=intake,
        title=f"{HOSTILE[0]} & {HOSTILE[2]}",
        market_name=HOSTILE[3],
        invented=False,
        missing_final_return=-0.3,
        sources=[],
    )


@cache
def many() -> Context:
    """Thirty overlapping subperiods and 25 groups."""
    periods = [subperiod(f"y{y}", f"{y}-01", f"{y + 3}-12") for y in range(1960, 1990)]
    paper = {"main_subperiod": "y1960", "line_errors": "misspecification_robust_hac"}
    return study({"many": (ranked_facts("25 groups", 25), groups(25))}, periods, paper=paper)


def printed_under_hash_seeds(code: str) -> set[str]:
    """What a program prints where hashes are in another order."""
    return {
        subprocess.run(
            [sys.executable, "-c", code],
            env={**os.environ, "PYTHONHASHSEED": seed},
            capture_output=True,
            text=True,
            check=True,
        ).stdout
        for seed in ("0", "1")
    }
