"""What must hold of rolling betas for any returns, holes and windows whatever."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st
from tests.thorough import examples

from lineproof.stats.betas import RollingBetas, rolling_ols
from lineproof.stats.windows import Sample, WindowEnds

SEEDS = st.integers(0, 2**32 - 1)
MANY = settings(max_examples=examples(60), deadline=None, derandomize=True)
FIELDS = ("beta", "alpha", "se_beta", "r2", "residual_sd")


def sample_of(
    starts: np.ndarray, period: np.ndarray, excess: np.ndarray, market: np.ndarray
) -> Sample:
    """A sample whose market is given row by row, the same in every row of a period."""
    factor = np.full(period.max(initial=0) + 1, np.nan)
    known = ~np.isnan(market)
    factor[period[known]] = market[known]
    return Sample(starts, period, excess, factor[:, None])


@dataclass(frozen=True)
class Case:
    """A few securities with gaps in the calendar, missing returns and now and then an outlier."""

    starts: np.ndarray
    period: np.ndarray
    excess: np.ndarray
    market: np.ndarray
    window: int
    min_obs: int

    def fit(
        self, excess: np.ndarray | None = None, market: np.ndarray | None = None
    ) -> RollingBetas:
        return rolling_ols(
            sample_of(
                self.starts,
                self.period,
                self.excess if excess is None else excess,
                self.market if market is None else market,
            ),
            window=self.window,
            min_obs=self.min_obs,
        )


def draw(seed: int) -> Case:
    rng = np.random.default_rng(seed)
    lengths = rng.integers(1, 90, int(rng.integers(1, 4)))
    periods = [rng.integers(0, 50) + np.cumsum(1 + rng.geometric(0.9, n) - 1) for n in lengths]
    period = np.concatenate(periods)
    by_period = rng.normal(0.006, 0.045, period.max() + 1)
    market = by_period[period]
    excess = rng.uniform(-0.5, 2.0) * market + rng.normal(0.0, 0.1, len(period))
    if rng.random() < 0.5:
        excess[rng.integers(len(excess))] = 100.0  # +10,000 %
    excess[rng.random(len(excess)) < 0.15] = np.nan
    window = int(rng.integers(6, 61))
    min_obs = int(rng.integers(4, min(window, 24) + 1))
    starts = np.concatenate([[0], np.cumsum(lengths)])
    return Case(starts, period, excess, market, window, min_obs)


def assert_close(found: RollingBetas, want: dict[str, np.ndarray], steepest: np.ndarray) -> None:
    """1e-10 of each number's own size; for beta that of a regression with a correlation of one."""
    size = want | {"beta": steepest, "r2": 1.0}
    size["alpha"] = np.abs(want["alpha"]) + want["residual_sd"] + 0.1 * steepest
    for name in FIELDS:
        assert (np.abs(getattr(found, name) - want[name]) <= 1e-10 * size[name]).all(), name


@MANY
@given(SEEDS)
def test_each_estimate_is_least_squares_on_its_own_window(seed: int) -> None:
    case = draw(seed)
    found = case.fit()
    rows, fits, steepest = [], [], []
    for first, last in zip(case.starts[:-1], case.starts[1:], strict=True):
        for row in range(first, last):
            at = np.arange(first, row + 1)
            at = at[case.period[at] > case.period[row] - case.window]
            at = at[~np.isnan(case.excess[at])]
            if len(at) >= case.min_obs:
                rows.append(row)
                fits.append(least_squares(case.market[at], case.excess[at]))
                steepest.append(case.excess[at].std() / case.market[at].std())
    assert found.row.tolist() == rows
    assert found.n_too_few == len(case.period) - len(rows)
    want = {name: np.array([f[name] for f in fits]) for name in FIELDS}
    assert_close(found, want, np.array(steepest))


def least_squares(x: np.ndarray, y: np.ndarray) -> dict[str, float]:
    design = np.column_stack([np.ones(len(x)), x])
    (alpha, beta), *_ = np.linalg.lstsq(design, y, rcond=None)
    residual = y - design @ [alpha, beta]
    sd = np.sqrt(residual @ residual / (len(x) - 2))
    deviation = y - y.mean()
    return {
        "beta": beta,
        "alpha": alpha,
        "se_beta": sd / np.sqrt(((x - x.mean()) ** 2).sum()),
        "r2": 1 - residual @ residual / (deviation @ deviation),
        "residual_sd": sd,
    }


@MANY
@given(SEEDS, st.floats(0.01, 100.0))
def test_units_scale_as_they_must(seed: int, unit: float) -> None:
    case = draw(seed)
    one = case.fit()
    steepest = np.hypot(one.beta, one.residual_sd / 0.01)
    both = case.fit(unit * case.excess, unit * case.market)
    want = {name: getattr(one, name) for name in FIELDS}
    scaled = want | {name: unit * want[name] for name in ("alpha", "residual_sd")}
    assert both.row.tolist() == one.row.tolist()
    assert_close(both, scaled, max(unit, 1.0) * steepest)
    security = case.fit(excess=unit * case.excess)
    scaled |= {name: unit * want[name] for name in ("beta", "se_beta")}
    assert_close(security, scaled, max(unit, 1.0) * steepest)


@MANY
@given(SEEDS)
def test_adding_the_market_adds_one_to_beta_and_changes_no_residual(seed: int) -> None:
    case = draw(seed)
    one, more = case.fit(), case.fit(excess=case.excess + case.market + 0.01)
    steepest = 1 + np.hypot(one.beta, one.residual_sd / 0.01)
    for name, added in (("beta", 1.0), ("alpha", 0.01), ("residual_sd", 0.0), ("se_beta", 0.0)):
        difference = getattr(more, name) - getattr(one, name)
        assert (np.abs(difference - added) <= 1e-10 * steepest).all(), name


@MANY
@given(SEEDS)
def test_the_market_itself_has_a_beta_of_one(seed: int) -> None:
    case = draw(seed)
    found = case.fit(excess=case.market)
    np.testing.assert_allclose(found.beta, 1.0, rtol=1e-12)
    np.testing.assert_allclose(found.alpha, 0.0, atol=1e-14)
    assert (found.r2 <= 1).all()


@MANY
@given(SEEDS)
def test_later_months_and_other_securities_leave_an_estimate_alone(seed: int) -> None:
    """To the last bit: every security by itself, cut short at any row."""
    case = draw(seed)
    whole = case.fit()
    first, last = case.starts[0], case.starts[1]
    cut = int(np.random.default_rng(seed).integers(first, last)) + 1
    alone = rolling_ols(
        sample_of(np.array([0, cut]), case.period[:cut], case.excess[:cut], case.market[:cut]),
        window=case.window,
        min_obs=case.min_obs,
    )
    n = len(alone.row)
    for name in ("row", "n_obs", *FIELDS):
        assert getattr(whole, name)[:n].tobytes() == getattr(alone, name).tobytes()


@MANY
@given(SEEDS)
def test_a_window_may_end_where_the_security_has_no_row(seed: int) -> None:
    """Before its first row, in a hole or after its last row: the same as with an empty row there, to the last bit."""
    case = draw(seed)
    rng = np.random.default_rng(seed)
    parts, ends, is_row = [], [], []
    for first, last in zip(case.starts[:-1], case.starts[1:], strict=True):
        rows = case.period[first:last]
        span = np.arange(rows[0] - 3, rows[-1] + 2 * case.window)
        wanted = np.sort(rng.choice(span, int(rng.integers(0, len(span))), replace=False))
        ends.append(wanted)
        parts.append(np.union1d(rows, wanted[wanted > rows[0]]))
        is_row.append(np.isin(parts[-1], rows))
    filled, there = np.concatenate(parts), np.concatenate(is_row)
    excess, market = (np.full(len(filled), np.nan) for _ in range(2))
    excess[there], market[there] = case.excess, case.market
    starts = np.cumsum([0, *map(len, parts)])
    options = {"window": case.window, "min_obs": case.min_obs}
    whole = rolling_ols(sample_of(starts, filled, excess, market), **options)
    at = WindowEnds(np.cumsum([0, *map(len, ends)]), np.concatenate(ends))
    found = rolling_ols(
        sample_of(case.starts, case.period, case.excess, case.market), **options, ends=at
    )
    owner = {
        name: np.repeat(np.arange(len(of)), list(map(len, of)))
        for name, of in (("all", parts), ("ends", ends))
    }
    place = {
        (s, p): k
        for k, (s, p) in enumerate(zip(owner["all"][whole.row], filled[whole.row], strict=True))
    }
    keys = list(zip(owner["ends"], at.period, strict=True))
    assert [k for k in keys if k in place] == [keys[row] for row in found.row]
    same = [place[keys[row]] for row in found.row]
    for name in ("n_obs", *FIELDS):
        assert getattr(found, name).tobytes() == getattr(whole, name)[same].tobytes(), name
