"""Moments over rolling windows, against exact rational arithmetic on each window by itself."""

from __future__ import annotations

from fractions import Fraction

import numpy as np
import pytest

from lineproof.stats.window_alone import MOMENTS
from lineproof.stats.windows import Sample, WindowEnds, fit_windows

WINDOW = 24
# Rounding only. A sum of 24 squares in float64 is good to about 24 × 1.1e-16; the block sums may lose
# three digits more before the window is summed pass by pass.
CLOSE = 1e-10
NAMES = ("mean_x", "mean_y", "sxx", "sxy", "syy", "residual_ss")
Moments = dict[str, np.ndarray]


def moments(
    starts: np.ndarray, period: np.ndarray, x: np.ndarray, y: np.ndarray, window: int
) -> Moments:
    """Moments at every row, `x` by period; NaN, and an `n` of 0, where there is nothing to tell."""
    sample = Sample(starts, period, y, x[:, None])
    found = fit_windows(sample, window=window, min_obs=1, what=MOMENTS)
    out = {name: np.full(len(period), np.nan) for name in NAMES}
    for name, values in zip(NAMES, found.values, strict=True):
        out[name][found.row] = values
    n = np.zeros(len(period), np.int64)
    n[found.row] = found.n_obs
    return {"n": n, **out}


def one_security(x: np.ndarray, y: np.ndarray, window: int = WINDOW) -> Moments:
    return moments(np.array([0, len(x)]), np.arange(len(x)), x, y, window)


def exact(x: np.ndarray, y: np.ndarray) -> dict[str, float]:
    """Moments of complete pairs, in rational arithmetic: the only rounding is of the result."""
    pairs = [(Fraction(a), Fraction(b)) for a, b in zip(x, y, strict=True) if a == a and b == b]
    n = len(pairs)
    mean_x, mean_y = sum(a for a, _ in pairs) / n, sum(b for _, b in pairs) / n
    sxx = sum((a - mean_x) ** 2 for a, _ in pairs)
    sxy = sum((a - mean_x) * (b - mean_y) for a, b in pairs)
    syy = sum((b - mean_y) ** 2 for _, b in pairs)
    found = {"n": n, "mean_x": mean_x, "mean_y": mean_y, "sxx": sxx, "sxy": sxy, "syy": syy}
    found["residual_ss"] = syy - sxy**2 / sxx if sxx else syy
    return {name: float(value) for name, value in found.items()}


def check_every_window(x: np.ndarray, y: np.ndarray, window: int = WINDOW) -> None:
    found = one_security(x, y, window)
    for row in range(len(x)):
        at = slice(max(0, row - window + 1), row + 1)
        complete = ~(np.isnan(x[at]) | np.isnan(y[at]))
        varies = len(set(x[at][complete])) > 1
        assert found["n"][row] == (complete.sum() if varies else 0)
        if not varies:
            continue
        want = exact(x[at], y[at])
        scale = want | {"sxy": np.sqrt(want["sxx"] * want["syy"])}
        scale["mean_x"] = abs(want["mean_x"]) + np.sqrt(want["sxx"])
        scale["mean_y"] = abs(want["mean_y"]) + np.sqrt(want["syy"])
        if complete.sum() == 2:
            scale["residual_ss"] = want["syy"]  # a line through two points leaves rounding only
        for name in NAMES:
            assert abs(found[name][row] - want[name]) <= CLOSE * scale[name], (name, row)


def series(kind: str, rng: np.random.Generator, n: int = 150) -> tuple[np.ndarray, np.ndarray]:
    """A market and a security of one difficulty each."""
    x = rng.normal(0.006, 0.045, n)
    y = 0.001 + rng.uniform(0.3, 1.8) * x + rng.normal(0.0, 0.09, n)
    match kind:
        case "percent":
            return 100 * x, 100 * y
        case "missing":
            x[rng.random(n) < 0.1] = np.nan
            y[rng.random(n) < 0.3] = np.nan
        case "outlier":
            y[40], x[90] = 100.0, 100.0  # +10,000 %
        case "constant stretches":
            y[20:60], x[80:120] = -0.0043, 0.0031
        case "zero stretches":
            y[20:60], x[80:120] = 0.0, 0.0
        case "close fit":
            y = 0.001 + 1.3 * x + rng.normal(0.0, 1e-6, n)
        case "common level":
            x, y = x + 1e4, y + 1e4
        case "close fit at a level":
            x, y = x + 100.0, 50.0 + 1.3 * x + rng.normal(0.0, 1e-5, n)
    return x, y


KINDS = [
    "decimal",
    "percent",
    "missing",
    "outlier",
    "constant stretches",
    "zero stretches",
    "close fit",
    "common level",
    "close fit at a level",
]


@pytest.mark.parametrize("kind", KINDS)
def test_every_window_equals_exact_arithmetic(kind: str) -> None:
    check_every_window(*series(kind, np.random.default_rng(KINDS.index(kind))))


@pytest.mark.parametrize("kind", ["close fit", "common level", "close fit at a level"])
def test_plain_sums_would_not_do(kind: str) -> None:
    """These series need the passes by window: sums of raw squares alone miss by far more."""
    x, y = series(kind, np.random.default_rng(KINDS.index(kind)), WINDOW)
    n, want = len(x), exact(x, y)
    sxx = (x * x).sum() - x.sum() ** 2 / n
    sxy = (x * y).sum() - x.sum() * y.sum() / n
    syy = (y * y).sum() - y.sum() ** 2 / n
    assert abs(syy - sxy**2 / sxx - want["residual_ss"]) > 100 * CLOSE * want["residual_ss"]


@pytest.mark.parametrize("window", [1, 2, 3, 7, 150, 400])
def test_any_length_of_window(window: int) -> None:
    check_every_window(*series("missing", np.random.default_rng(20)), window=window)


def test_by_hand() -> None:
    """x 1, 2, 4 and y 3, 5, 4 about the means 7/3 and 4: Sxx 14/3, Sxy 1, Syy 2."""
    found = one_security(np.array([9.0, 1.0, 2.0, 4.0]), np.array([9.0, 3.0, 5.0, 4.0]), window=3)
    assert found["n"].tolist() == [0, 2, 3, 3]  # one month alone does not vary
    got = [found[name][3] for name in NAMES]
    np.testing.assert_allclose(got, [7 / 3, 4, 14 / 3, 1, 2, 2 - 3 / 14], rtol=1e-14)


def test_a_hole_uses_up_its_periods() -> None:
    period = np.array([0, 1, 2, 5, 6, 20])
    x = np.arange(1.0, 22.0)
    found = moments(np.array([0, 6]), period, x, 2 * x[period], window=4)
    assert found["n"].tolist() == [0, 2, 3, 2, 2, 0]  # period 5 sees 2 and 5; 6 sees 5 and 6
    assert found["mean_x"][1:5].tolist() == [1.5, 2.0, 4.5, 6.5]


def test_securities_do_not_mix() -> None:
    rng = np.random.default_rng(3)
    x = rng.normal(size=120)
    rows = [np.arange(first, first + n) for first, n in ((7, 5), (30, 40), (0, 1), (21, 70))]
    parts = [(at, rng.normal(size=len(at))) for at in rows]
    starts = np.cumsum([0, *map(len, rows)])
    together = moments(
        starts, np.concatenate(rows), x, np.concatenate([y for _, y in parts]), WINDOW
    )
    alone = [moments(np.array([0, len(at)]), at, x, y, WINDOW) for at, y in parts]
    for name in together:
        expected = np.concatenate([each[name] for each in alone])
        np.testing.assert_array_equal(together[name], expected)


def test_an_outlier_leaves_nothing_behind() -> None:
    """Windows without it are the same to the last bit as if it had never been."""
    x, y = series("decimal", np.random.default_rng(4))
    wild_x, wild_y = x.copy(), y.copy()
    wild_x[50], wild_y[50] = -1e6, 1e6
    calm, wild = one_security(x, y), one_security(wild_x, wild_y)
    outside = np.r_[0:50, 50 + WINDOW : len(x)]
    for name in calm:
        np.testing.assert_array_equal(wild[name][outside], calm[name][outside])


def test_constant_series_have_no_variation_at_all() -> None:
    level = np.full(60, 0.1)  # 0.1 has no exact float64, so that a plain mean of 60 misses it
    x = np.random.default_rng(5).normal(size=60)
    assert not one_security(level, x)["n"].any()
    found = one_security(x, level)
    for name in ("sxy", "syy", "residual_ss"):
        assert not found[name][1:].any()
    assert (found["mean_y"][1:] == 0.1).all()


def test_factors_that_mix_into_one_another_give_nothing() -> None:
    rng = np.random.default_rng(6)
    two = rng.normal(size=(80, 2))
    mixed = np.column_stack([two, two @ [0.3, -1.1]])
    sample = Sample(np.array([0, 80]), np.arange(80), rng.normal(size=80), mixed)
    found = fit_windows(sample, window=WINDOW, min_obs=10)
    assert (len(found.row), found.n_too_few, found.n_no_variation) == (0, 9, 71)


def test_nothing_where_no_pair_is_complete() -> None:
    x = np.array([np.nan, 1.0, np.nan])
    assert not one_security(x, x[::-1] * np.nan)["n"].any()


def test_no_rows_and_empty_securities() -> None:
    nothing, x = np.zeros(0), np.arange(2.0)
    assert len(moments(np.array([0]), nothing.astype(int), x, nothing, 3)["n"]) == 0
    found = moments(np.array([0, 0, 2, 2]), np.arange(2), x, np.ones(2), 3)
    assert found["n"].tolist() == [0, 2]


def test_windows_may_end_before_the_first_period() -> None:
    x = np.random.default_rng(7).normal(size=10)
    sample = Sample(np.array([0, 10]), np.arange(10), x**2, x[:, None])
    ends = WindowEnds(np.array([0, 3]), np.array([-4, -1, 9]))
    found = fit_windows(sample, window=5, min_obs=3, ends=ends)
    assert (found.row.tolist(), found.n_too_few) == ([2], 2)


@pytest.mark.parametrize("bad", [{"window": 0, "min_obs": 3}, {"window": 3, "min_obs": 2}])
def test_a_window_has_a_period_and_a_standard_error_three(bad: dict[str, int]) -> None:
    sample = Sample(np.array([0, 3]), np.arange(3), np.ones(3), np.ones((3, 1)))
    with pytest.raises(ValueError, match=r"a window of 0 periods|at least 3 observations"):
        fit_windows(sample, **bad)
