"""Entries under `betas`: what each estimator and shrinkage takes, and what is told where that does not fit."""

from __future__ import annotations

import textwrap
from pathlib import Path

import pytest

from lineproof.facts import facts
from lineproof.problems import KnownProblem
from lineproof.specs import Study
from lineproof.study import load_study
from lineproof.wiring import Wiring

TEXT = textwrap.dedent(
    """\
    study: {name: mine, title: My study}
    data:
      returns: {file: raw.csv, columns: {security: id, date: date, return: ret}}
      market: {file: raw.csv, columns: {date: month, return: mkt}}
      riskless: {file: raw.csv, columns: {date: month, rate: bill}}
      factors: {file: raw.csv, columns: {date: month, smb: SMB, hml: HML}}
    betas:
      first: {window: 60, min: 24}
      second: {ENTRY}
    portfolios: {ten: {rank_on: second}}
    subperiods: {full: {}}
    """
)


def load(folder: Path, entry: str, text: str = TEXT) -> Study:
    (folder / "raw.csv").touch()
    path = folder / "mine.yaml"
    path.write_text(text.replace("ENTRY", entry), encoding="utf-8")
    return load_study(path)


@pytest.mark.parametrize(
    ("entry", "own"),
    [
        ("estimator: ols", {}),
        ("estimator: lagged", {"lags": 1, "leads": 0}),
        ("estimator: exponential, half_life: 24", {"half_life": 24}),
        ("estimator: downside", {"below": "mean"}),
        (
            "estimator: correlation_volatility, volatility_window: 12, volatility_min: 6",
            {"volatility_window": 12, "volatility_min_obs": 6, "overlap": 1},
        ),
    ],
)
def test_an_estimator_gets_its_own_options(tmp_path: Path, entry: str, own: dict) -> None:
    options = Wiring(load(tmp_path, entry)).options("estimate_betas-second")
    assert (options["own"], options["beside"]) == (own, [])


def test_factors_come_in_by_name(tmp_path: Path) -> None:
    wiring = Wiring(load(tmp_path, "estimator: multi_factor, factors: [hml]"))
    assert wiring.options("estimate_betas-second")["beside"] == ["hml"]
    assert wiring.beta_inputs("second")["factors"].endswith("data/factors.parquet")
    assert "factors" not in wiring.beta_inputs("first")
    assert wiring.options("read_factors")["frequency"] == "monthly"
    assert len(wiring.raw_digests("data.factors")) == 1


def test_a_shrunk_entry_is_made_from_another(tmp_path: Path) -> None:
    study = load(tmp_path, "from: first, shrink: fixed, weight: 0.6")
    wiring = Wiring(study)
    assert list(wiring.beta_inputs("second")) == ["betas"]
    options = {"shrink": "fixed", "own": {"weight": 0.6, "to": 1}, "dated": "monthly"}
    assert wiring.options("shrink_betas-second") == options
    said = facts(study)["sorts"]["ten"]
    words = "of their last 60 months (ordinary least squares; at least 24 months; shrunk to a fixed value, 1,"
    assert f"{words} with weight 0.6 on the estimate)" in said["formation"]


@pytest.mark.parametrize(
    ("entry", "place", "said"),
    [
        ("estimator: exponential", "", "the key 'half_life' is missing"),
        ("estimator: ols, lags: 1", ".lags", "estimator ols does not use 'lags'"),
        ("estimator: ols, weight: 0.5", ".weight", "'weight' is for shrinking another entry"),
        ("estimator: lagged, lags: 20, leads: 5", ".min", "min 24 is too few for a standard error"),
        ("estimator: multi_factor", "", "the key 'factors' is missing"),
        ("estimator: multi_factor, factors: [sml]", ".factors", "'sml' is not among"),
        (
            "estimator: correlation_volatility, volatility_window: 5, volatility_min: 6",
            ".volatility_min",
            "volatility_min 6 is longer than the volatility_window of 5",
        ),
        (
            "estimator: correlation_volatility, volatility_window: 70, volatility_min: 6",
            ".volatility_window",
            "volatility_window 70 is longer than the window of 60",
        ),
        (
            "estimator: correlation_volatility, volatility_window: 8, volatility_min: 6, overlap: 9",
            ".overlap",
            "overlap 9 is longer than the volatility_window of 8",
        ),
        ("from: firts, shrink: cross_section", ".from", "'firts' is not declared under betas"),
        ("from: second, shrink: cross_section", ".from", "'second' is shrunk itself"),
        ("from: first", "", "the key 'shrink' is missing"),
        ("from: first, shrink: fixed", "", "the key 'weight' is missing"),
        ("from: first, shrink: cross_section, to: 1", ".to", "cross_section does not use 'to'"),
        ("from: first, shrink: cross_section, window: 9", ".window", "does not use 'window'"),
    ],
)
def test_what_does_not_fit_is_told(tmp_path: Path, entry: str, place: str, said: str) -> None:
    with pytest.raises(KnownProblem) as told:
        load(tmp_path, entry)
    (problem,) = told.value.problems
    assert problem.where == f"mine.yaml, line 9, betas.second{place}"
    assert said in problem.found


def test_factors_are_as_frequent_as_the_returns(tmp_path: Path) -> None:
    text = TEXT.replace("hml: HML}", "hml: HML}, frequency: daily")
    with pytest.raises(KnownProblem, match=r"monthly returns are asked for, and data\.factors has"):
        load(tmp_path, "estimator: multi_factor, factors: [smb]", text)
    with pytest.raises(KnownProblem, match=r"there is no data\.factors"):
        load(tmp_path, "estimator: multi_factor, factors: [smb]", TEXT.replace("  factors", "#"))
