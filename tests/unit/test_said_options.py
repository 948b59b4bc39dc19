"""Every option of betas and of ranked test assets is said in the words that the notes print."""

from __future__ import annotations

import textwrap
from pathlib import Path
from typing import Any

import pytest
import yaml

from lineproof.facts import facts
from lineproof.schema import study_schema
from lineproof.study import load_study

TEXT = textwrap.dedent(
    """\
    study: {name: mine, title: My study}
    data:
      returns:
        {file: raw.csv, frequency: daily,
         columns: {security: id, date: date, return: ret, size: cap, exchange: x}}
      market: {file: raw.csv, columns: {date: month, return: mkt}}
      riskless: {file: raw.csv, columns: {date: month, rate: bill}}
      factors: {file: raw.csv, columns: {date: month, smb: SMB, hml: HML}}
    betas:
      other: {returns: daily, window: 99, min: 33}
      shorter: {returns: daily, window: 77, min: 33}
      used: {returns: daily, window: 60, min: 24}
    portfolios:
      ten: {rank_on: used}
    subperiods: {full: {}}
    """
)
LAGGED = {"estimator": "lagged"}
CV = {"estimator": "correlation_volatility", "volatility_window": 50, "volatility_min": 20}
FIXED = {"from": "other", "shrink": "fixed", "weight": 0.6}
BLOCKS = {"design": "three_windows", "ante_betas": "other"}
DOUBLE = {"design": "double_sort", "rank_on": ["size", "used"], "groups": [3, 4]}

BETAS: list[tuple[str, dict[str, Any], str]] = [
    ("estimator", {"estimator": "scholes_williams"}, "the estimator of Scholes and Williams"),
    ("returns", {"returns": "own"}, "their last 60 months"),
    ("window", {"window": 61}, "61 trading days"),
    ("min", {"min": 25}, "at least 25 trading days"),
    ("factors", {"estimator": "multi_factor", "factors": ["smb", "hml"]}, "smb and hml"),
    ("lags", {**LAGGED, "lags": 3}, "3 lags and no leads"),
    ("leads", {**LAGGED, "leads": 2}, "1 lag and 2 leads"),
    ("half_life", {"estimator": "exponential", "half_life": 12.5}, "half-life 12.5 trading days"),
    ("volatility_window", CV, "volatilities over 50 trading days"),
    ("volatility_min", CV, "with at least 20"),
    ("overlap", {**CV, "overlap": 3}, "returns summed over 3"),
    ("below", {"estimator": "downside", "below": "zero"}, "those below zero"),
    ("from", FIXED, "of their last 99 trading days"),
    ("shrink", {"from": "other", "shrink": "cross_section"}, "shrunk to the cross-section"),
    ("weight", FIXED, "weight 0.6 on the estimate"),
    ("to", {**FIXED, "to": 0.5}, "a fixed value, 0.5,"),
]
PORTFOLIOS: list[tuple[str, dict[str, Any], str]] = [
    ("design", BLOCKS, "every 4 years"),
    ("title", {"title": "My groups"}, "My groups"),
    ("rank_on", {"rank_on": "used.residual_sd"}, "ranked on the residual standard deviation of"),
    ("groups", {"groups": 7}, "into 7 groups"),
    ("groups", DOUBLE, "into 3 × 4 groups"),
    ("dependent", DOUBLE, "size and, apart from it, on the beta"),
    ("dependent", {**DOUBLE, "dependent": True}, "size and, inside each group, on the beta"),
    ("rule", {"rule": "equal_counts"}, "parted by rank"),
    (
        "breakpoints",
        {"breakpoints": {"column": "exchange", "in": ["N"]}},
        "breakpoints of those with exchange",
    ),
    ("ante_betas", {"ante_betas": "other"}, "those of their last 99 trading days"),
    (
        "ante_betas",
        {"ante_betas": ["other", "shorter"], "hold": 24, "overlap": True},
        "those of their last 99 trading days (ordinary least squares; at least 33 trading days), taken "
        "anew at the end of each year, then of their last 77 trading days",
    ),
    ("estimation", {**BLOCKS, "estimation": 36}, "as of 36 months before"),
    ("weights", {"weights": "size"}, "weighted by size"),
    ("form_each", {"form_each": "month"}, "at the end of each month"),
    ("form_each", {"form_each": "quarter"}, "each March, June, September and December"),
    ("form_month", {"form_month": 6}, "at the end of each June"),
    ("first_formation", {"first_formation": "1970-06"}, "from June 1970 on"),
    ("hold", {"hold": 9}, "held for 9 months"),
    ("overlap", {"overlap": True, "hold": 24}, "the groups held at once averaged"),
    ("assign_betas", {"assign_betas": "ex_ante"}, "the group's ex-ante beta assigned"),
]
# Said elsewhere: `spread` where a table shows one, in test_group_tables; how a file is read, in the report's sources.
ELSEWHERE = {"spread", "file", "columns", "is", "unit", "missing", "dates", "separator", "decimal"}
ELSEWHERE |= {"encoding", "sheet", "layout", "leave_out", "source", "access", "may_share"}


def words(folder: Path, section: str, entry: str, options: dict[str, Any]) -> str:
    """All that the paper says of the sort `ten`, with options of one entry changed."""
    (folder / "raw.csv").touch()
    content = yaml.safe_load(TEXT)
    given = content[section][entry]
    content[section][entry] = options if "from" in options else {**given, **options}
    (folder / "mine.yaml").write_text(yaml.safe_dump(content), encoding="utf-8")
    said = facts(load_study(folder / "mine.yaml"))["sorts"]["ten"]
    parts = (said[key] for key in ("title", "formation", "weights_label"))
    return "; ".join([*parts, f"those {said['prior_betas']}"])


@pytest.mark.parametrize(("option", "options", "said"), BETAS)
def test_an_option_of_betas_is_said(
    tmp_path: Path, option: str, options: dict[str, Any], said: str
) -> None:
    assert said in words(tmp_path, "betas", "used", options)


@pytest.mark.parametrize(("option", "options", "said"), PORTFOLIOS)
def test_an_option_of_ranked_assets_is_said(
    tmp_path: Path, option: str, options: dict[str, Any], said: str
) -> None:
    assert said in words(tmp_path, "portfolios", "ten", options)


@pytest.mark.parametrize(
    ("section", "tried"),
    [("betas", BETAS), ("portfolios", PORTFOLIOS)],
)
def test_no_option_is_left_out(section: str, tried: list) -> None:
    entry = study_schema()["properties"][section]["additionalProperties"]
    assert set(entry["properties"]) - {option for option, *_ in tried} - ELSEWHERE == set()


def test_variables_are_told_apart(tmp_path: Path) -> None:
    (tmp_path / "raw.csv").touch()
    content = yaml.safe_load(TEXT)
    content["portfolios"]["ten"] = {**DOUBLE, "rank_on": ["other", "used"]}
    content["portfolios"]["mixed"] = {**DOUBLE, "rank_on": ["size", "used.r2"]}
    (tmp_path / "mine.yaml").write_text(yaml.safe_dump(content), encoding="utf-8")
    sorts = facts(load_study(tmp_path / "mine.yaml"))["sorts"]
    assert sorts["ten"]["variables"] == ["beta other", "beta used"]
    assert sorts["mixed"]["variables"] == ["size", "R²"]
    assert sorts["mixed"]["prior_betas"] == (
        "of their last 60 trading days (ordinary least squares; at least 24 trading days)"
    )
