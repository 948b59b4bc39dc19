"""Total or excess: what the market moves with says which, and sound data are left alone."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
import statsmodels.api as sm
from tests.unit import intake_examples as examples

from lineproof.intake.excess_or_total import looks_like_excess, market_evidence

T = 900


def drawn(seed: int, riskless_sd: float = 0.004, n: int = T) -> tuple[np.ndarray, ...]:
    """A market premium, a riskless return and the total return of a panel with a beta of 1.1."""
    rng = np.random.default_rng(seed)
    riskless = 0.006 + riskless_sd * np.sin(np.arange(n) / 40) + 0.0003 * rng.standard_normal(n)
    premium = 0.005 + 0.045 * rng.standard_normal(n)
    panel = riskless + 1.1 * premium + 0.015 * rng.standard_normal(n)
    return premium, riskless, panel


def test_the_evidence_is_the_regression_it_says_it_is() -> None:
    premium, riskless, panel = drawn(1)
    found = market_evidence(premium + riskless, riskless, panel)
    x = sm.add_constant(np.column_stack([premium + riskless, riskless]))
    fit = sm.OLS(panel - premium - riskless, x).fit(cov_type="HC0")
    # The same normal equations, solved otherwise; they are well conditioned once scaled, to about 1e4.
    np.testing.assert_allclose(found.slope, fit.params[2], rtol=1e-9)
    np.testing.assert_allclose(found.se, fit.bse[2], rtol=1e-9)
    np.testing.assert_allclose(found.if_total, -fit.params[1], rtol=1e-9)


def test_without_noise_the_slopes_are_exact() -> None:
    premium, riskless, _ = drawn(2)
    panel = riskless + 1.1 * premium
    total = market_evidence(premium + riskless, riskless, panel)
    excess = market_evidence(premium, riskless, panel)
    assert total.slope == pytest.approx(1 - 1.1, abs=1e-9)  # sums of squares of 1e-5 each
    assert total.if_total == pytest.approx(1 - 1.1, abs=1e-9)
    assert excess.slope == pytest.approx(1, abs=1e-9)


def test_an_excess_return_declared_total_is_said_with_its_evidence() -> None:
    premium, riskless, panel = drawn(3)
    evidence = market_evidence(premium, riskless, panel)
    assert looks_like_excess(premium, riskless, panel, "total") == (
        "the market is declared total, but looks like an excess return: the equally weighted return of all "
        f"securities less the market's has a slope of {evidence.slope:.2f} (standard error {evidence.se:.2f}) on "
        f"the riskless return, where {evidence.if_total:.2f} is due to a total return and 1.00 to an excess return; "
        "check data.market.is"
    )
    assert looks_like_excess(premium, riskless, panel, "excess") == ""


def test_a_total_return_declared_excess_is_said() -> None:
    premium, riskless, panel = drawn(4)
    said = looks_like_excess(premium + riskless, riskless, panel, "excess")
    assert said.startswith("the market is declared excess, but looks like a total return: ")
    assert looks_like_excess(premium + riskless, riskless, panel, "total") == ""


def test_sound_data_are_left_alone() -> None:
    """With a limit of three standard errors, and the other kind within two, an alarm in 400 is rare."""
    for seed in range(200):
        premium, riskless, panel = drawn(seed, riskless_sd=0.0005 * (1 + seed % 8), n=60 + 4 * seed)
        assert looks_like_excess(premium + riskless, riskless, panel, "total") == ""
        assert looks_like_excess(premium, riskless, panel, "excess") == ""


@pytest.mark.parametrize("case", ["few", "constant", "missing"])
def test_where_the_data_cannot_tell_nothing_is_said(case: str) -> None:
    premium, riskless, panel = drawn(5)
    if case == "few":
        premium, riskless, panel = premium[:59], riskless[:59], panel[:59]
    elif case == "constant":
        riskless = np.full(T, 0.004)
    else:
        panel = np.full(T, np.nan)
    assert market_evidence(premium, riskless, panel).looks == ""
    assert looks_like_excess(premium, riskless, panel, "total") == ""


@pytest.mark.fault(30)
def test_a_market_in_excess_declared_total_is_flagged_in_the_intake(tmp_path: Path) -> None:
    rng = np.random.default_rng(30)
    months = examples.months("1990-01", 240)
    riskless = 0.004 + 0.003 * np.sin(np.arange(240) / 20)  # a slow swing, as of rates
    excess = rng.normal(0.005, 0.02, 240)
    rows = [
        f"{name},{month}-28,{riskless[at] + excess[at] + rng.normal(0, 0.01):.8f},,1,9"
        for name in range(30)
        for at, month in enumerate(months)
    ]
    found = examples.validate(
        tmp_path,
        examples.lines(*rows),
        market=dict(zip(months, excess.round(8).tolist(), strict=True)),
        riskless=dict(zip(months, riskless.round(8).tolist(), strict=True)),
    )
    flag = examples.fault(found, 30)
    assert (flag["n"], flag["answer"]) == (1, "flag")
    (said,) = flag["examples"]
    assert said.startswith("the market is declared total, but looks like an excess return")
    assert len(found.panel) == len(rows)
