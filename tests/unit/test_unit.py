"""The unit of returns: what is misread is stopped or flagged, what is sound never is."""

from __future__ import annotations

import re
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from lineproof.intake.chunk import Chunk
from lineproof.intake.scale import ScaleEvidence
from lineproof.intake.unit import judge_scale, judge_stretches, judge_unit, scale_findings
from lineproof.intake.unit_by_security import UnitBySecurity
from lineproof.problems import KnownProblem

MONTH = 2000 * 12
# Standard deviations of one security's returns, from the quietest to the wildest markets.
MONTHLY, DAILY = (0.01, 0.3), (0.0025, 0.08)
HEAD = "The raw data cannot be used; nothing was written.\n  returns.csv"


def reading(unit: str = "decimal") -> dict[str, Any]:
    return {"label": "returns.csv", "unit": unit, "columns": {"return": "ret"}}


def market(
    seed: int, n_securities: int, n_months: int, scale: float, df: float = 4.0
) -> np.ndarray:
    """Decimal returns (n_months, n_securities) with heavy tails, quiet and wild securities, and a crisis."""
    random = np.random.default_rng(seed)
    shape = (n_months, n_securities)
    tailed = random.standard_t(df, shape) * np.sqrt((df - 2) / df)
    own = np.exp(0.4 * random.standard_normal(n_securities).clip(-2, 2))
    usual = np.exp(0.3 * random.standard_normal((n_months, 1)).clip(-2, 2))
    usual[n_months // 2] *= 3  # a crisis
    returns = np.maximum(scale * own * usual * tailed, -1.0)
    returns[random.random(shape) < 0.1] = 0.0
    returns[random.random(shape) < 0.05] = np.nan
    return returns


def seen(returns: np.ndarray) -> ScaleEvidence:
    evidence = ScaleEvidence()
    month = MONTH + np.repeat(np.arange(len(returns)), returns.shape[1])
    evidence.add(month, returns.ravel())
    return evidence


def refused(judge: Any, *arguments: Any) -> str:
    with pytest.raises(KnownProblem) as caught:
        judge(*arguments)
    return str(caught.value)


def chunk(returns: np.ndarray) -> Chunk:
    """All months of each security in turn, from returns (n_months, n_securities)."""
    n_months, n = returns.shape
    return Chunk(
        names=np.array([f"S{i:03d}" for i in range(n)], object),
        start=np.arange(n + 1) * n_months,
        period=np.tile(MONTH + np.arange(n_months), n),
        day=np.zeros(n * n_months, "datetime64[D]"),
        values={"return_": returns.T.ravel()},
        texts={},
        code=np.full(n * n_months, -1, np.int8),
    )


@pytest.mark.parametrize(("frequency", "span"), [("monthly", MONTHLY), ("daily", DAILY)])
@pytest.mark.parametrize("unit", ["decimal", "percent"])
@settings(max_examples=80, deadline=None)
@given(
    seed=st.integers(0, 2**32 - 1),
    n_securities=st.integers(1, 40),
    n_months=st.integers(1, 60),
    wild=st.floats(0, 1),
    df=st.floats(2.5, 30),
)
def test_sound_markets_pass(
    frequency: str,
    span: tuple[float, float],
    unit: str,
    seed: int,
    n_securities: int,
    n_months: int,
    wild: float,
    df: float,
) -> None:
    """Of few rows and many, with tails heavy and light; and no month or security of them is flagged."""
    scale = span[0] ** (1 - wild) * span[1] ** wild
    returns = market(seed, n_securities, n_months, scale, df)
    assert judge_scale(seen(returns), reading(unit), frequency, 0.1).n == 0
    observer = UnitBySecurity()
    observer.see(chunk(returns))
    assert observer.judge("returns.csv", 0.1).n == 0


@pytest.mark.parametrize(
    ("frequency", "span"), [("monthly", (0.02, 0.3)), ("daily", (0.005, 0.08))]
)
@settings(max_examples=60, deadline=None)
@given(seed=st.integers(0, 2**32 - 1), wild=st.floats(0, 1))
def test_percent_read_as_decimal_stops(
    frequency: str, span: tuple[float, float], seed: int, wild: float
) -> None:
    scale = span[0] ** (1 - wild) * span[1] ** wild
    returns = 100 * market(seed, 30, 24, scale)
    message = refused(judge_unit, seen(returns), reading("decimal"), frequency)
    assert message.endswith("→ set unit: percent")


@pytest.mark.parametrize(
    ("frequency", "span"), [("monthly", (0.01, 0.07)), ("daily", (0.0025, 0.015))]
)
@settings(max_examples=60, deadline=None)
@given(seed=st.integers(0, 2**32 - 1), wild=st.floats(0, 1))
def test_decimal_read_as_percent_stops(
    frequency: str, span: tuple[float, float], seed: int, wild: float
) -> None:
    """In markets of usual risk; those of the wildest look like quiet ones then, and pass."""
    scale = span[0] ** (1 - wild) * span[1] ** wild
    returns = market(seed, 30, 24, scale) / 100
    message = refused(judge_unit, seen(returns), reading("percent"), frequency)
    assert message.endswith("→ set unit: decimal")


@pytest.mark.fault(17)
def test_the_message_gives_the_quantiles() -> None:
    returns = np.tile([0.03, -0.05, 0.2, -0.004], 10).reshape(1, -1) * 100
    assert refused(judge_unit, seen(returns), reading()) == (
        f"{HEAD}, column ret: read as decimal, half of all returns exceed 400 % in size and one in twenty exceeds "
        "2e+03 %\n    → set unit: percent"
    )


def test_a_quiet_market_in_percent_is_told_by_its_impossible_losses() -> None:
    """Half of the returns are below 50 % in size, as they might be in decimals."""
    returns = 100 * np.random.default_rng(1).normal(0, 0.006, (24, 50))
    message = refused(judge_unit, seen(returns), reading())
    assert re.search(r"exceed 4\d(\.\d)? % in size .*; \d+ of 1,200 lie below −100 %", message)
    assert message.endswith("→ set unit: percent")


def test_codes_for_missing_that_nobody_declared_are_no_unit() -> None:
    returns = market(2, 50, 24, 0.05)
    returns[::4, ::4] = -99.0
    judge_unit(seen(returns), reading())


@pytest.mark.fault(39)
@pytest.mark.parametrize("unit", ["decimal", "percent"])
@pytest.mark.parametrize("frequency", ["monthly", "daily"])
@pytest.mark.parametrize("typical", [20.0, 1.0])
def test_prices_and_gross_returns(unit: str, frequency: str, typical: float) -> None:
    """Prices of about 20, and 1 + return; one of them in per cent would be 1 % and is not told."""
    returns = typical * np.exp(np.random.default_rng(3).normal(0, 0.1, (24, 30)))
    returns = returns if unit == "decimal" or typical < 2 else returns / 100
    message = refused(judge_unit, seen(returns), reading(unit), frequency)
    assert message.endswith(
        "→ hardly any is negative: does the column hold prices, or 1 + return? "
        "For prices, name their column under price: and set return: {from: price}"
    )


def test_thirty_returns_are_the_fewest_to_judge() -> None:
    returns = np.full((1, 29), 5.0) * np.tile([1, -1, 1], 10)[:29]
    judge_unit(seen(returns), reading())
    with pytest.raises(KnownProblem):
        judge_unit(seen(np.append(returns, [[5.0]], axis=1)), reading())


# Fault 18: stretches of time.


@pytest.mark.fault(18)
@pytest.mark.parametrize(
    ("factor", "kind", "said"),
    [
        (100, "in months some 100 times larger", r"\d+ times"),
        (0.01, "in months some 100 times smaller", r"1/\d+ of"),
    ],
)
def test_a_stretch_in_another_unit_is_flagged(factor: float, kind: str, said: str) -> None:
    returns = market(4, 30, 60, 0.05)
    returns[10:14] *= factor
    n = int((np.isfinite(returns[10:14]) & (returns[10:14] != 0)).sum())
    flag = judge_stretches(seen(returns), "returns.csv", 0.1)
    assert (flag.number, flag.n) == (18, n)
    assert {k: v for k, v in flag.kinds.items() if v} == {kind: n}
    found = re.fullmatch(
        rf"2000-11 to 2001-02, ({said}) ?(?:of )?the size of the months around", flag.examples[0]
    )
    assert found, flag.examples
    ratio = float(re.search(r"(\d+)( times| of)", flag.examples[0])[1])
    assert 60 < ratio < 160  # four months of 30 returns each, whose usual size varies by a third


def test_a_flag_may_be_at_either_end_and_of_one_month() -> None:
    returns = market(5, 30, 60, 0.05)
    returns[0] *= 100
    returns[-2:] *= 100
    flag = judge_stretches(seen(returns), "returns.csv", 0.1)
    assert [each.split(",")[0] for each in flag.examples] == ["2000-01", "2004-11 to 2004-12"]


def test_too_long_a_stretch_stops() -> None:
    returns = market(6, 30, 60, 0.05)
    returns[20:30] *= 100
    message = refused(judge_stretches, seen(returns), "returns.csv", 0.1)
    assert re.fullmatch(
        re.escape(HEAD)
        + r": 10 of 60 months seem to be in another unit: 2001-09 to 2002-06, \d+ times the size of "
        r"the months around\n    → bring the months to one unit, or raise other_unit_stop_above: under intake",
        message,
    )
    assert judge_stretches(seen(returns), "returns.csv", 0.2).n > 0


def test_a_mixture_is_not_taken_for_the_wrong_unit() -> None:
    returns = market(7, 30, 60, 0.05)
    returns[20:] *= 100
    message = refused(judge_scale, seen(returns), reading(), "monthly", 0.1)
    assert "20 of 60 months seem to be in another unit: 2000-01 to 2001-08, 1/" in message


def test_months_with_few_returns_are_not_judged() -> None:
    returns = market(8, 30, 60, 0.05)
    returns[10] = np.nan
    returns[10, :9] = 50.0
    assert judge_stretches(seen(returns), "returns.csv", 0.1).n == 0
    assert judge_stretches(seen(returns[:11]), "returns.csv", 0.0).n == 0


def test_findings_in_words() -> None:
    returns = market(9, 30, 60, 0.05)
    evidence = seen(returns)
    unit, stretches = scale_findings(evidence, reading(), judge_stretches(evidence, "f", 0.1))
    assert re.fullmatch(r"read as decimal, half of all returns exceed [\d.]+ % .*", unit["found"])
    assert unit["verdict"] == "decimal, as declared"
    assert stretches["verdict"] == "one unit throughout"
    returns[10] *= 100
    evidence = seen(returns)
    _, stretches = scale_findings(evidence, reading(), judge_stretches(evidence, "f", 0.1))
    assert stretches["verdict"] == "to be looked at"
    assert stretches["found"].startswith("2000-11, ")


# Fault 18: securities.


@pytest.mark.fault(18)
def test_a_security_in_another_unit_is_flagged_whatever_the_cut() -> None:
    returns = market(10, 30, 60, 0.05)
    returns[:, 3] *= 100
    returns[:, 20] /= 100
    whole, parts = UnitBySecurity(), UnitBySecurity()
    whole.see(chunk(returns))
    for first in range(0, 30, 7):
        part = chunk(returns[:, first : first + 7])
        names = np.array([f"S{i:03d}" for i in range(first, first + len(part.names))], object)
        parts.see(Chunk(**{**vars(part), "names": names}))
    flag = whole.judge("returns.csv", 0.1)
    assert flag == parts.judge("returns.csv", 0.1)
    assert whole.result() == parts.result()
    assert [each.split(",")[0] for each in flag.examples] == ["S003", "S020"]
    assert re.fullmatch(r"S003, \d+ times the size of the others", flag.examples[0])
    n = (np.isfinite(returns) & (returns != 0)).sum(axis=0)
    assert flag.kinds == {
        "of securities some 100 times larger": n[3],
        "of securities some 100 times smaller": n[20],
    }
    assert flag.n == n[3] + n[20]


def test_too_many_securities_stop() -> None:
    returns = market(11, 30, 60, 0.05)
    returns[:, :4] *= 100
    observer = UnitBySecurity()
    observer.see(chunk(returns))
    message = refused(observer.judge, "returns.csv", 0.1)
    assert message.startswith(f"{HEAD}: 4 of 30 securities seem to be in another unit: S000, ")
    assert message.endswith(
        "; and 1 more\n    → bring the securities to one unit, or raise other_unit_stop_above: under intake"
    )


def test_no_security_is_judged_on_few_returns_or_alone() -> None:
    returns = market(12, 12, 60, 0.05)
    returns[:, 0] *= 100
    returns[11:, 0] = np.nan
    observer = UnitBySecurity()
    observer.see(chunk(returns))
    assert observer.judge("returns.csv", 0.0).n == 0
    alone = UnitBySecurity()
    assert alone.result() == {"n_judged": 0, "quantiles": []}
    alone.see(chunk(returns[:, :3]))
    assert alone.judge("returns.csv", 0.0).n == 0
