"""Every estimator of the registry, against an obvious loop over windows: one least-squares fit each.

A new estimator needs a line in `ORACLES`.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
import pytest

from lineproof import catalog
from lineproof.estimators import ESTIMATORS
from lineproof.stats.windows import Sample

WINDOW, MIN_OBS = 36, 12
FIELDS = ("beta", "alpha", "se_beta", "r2", "residual_sd")
KINDS = ["plain", "outlier", "close fit", "level", "stale", "whole"]


@dataclass(frozen=True)
class Known:
    """What one security's window may use: returns by period, NaN where unknown, and the factors (n_periods, 3)."""

    own: np.ndarray
    factors: np.ndarray
    end: int

    def pairs(self, columns: np.ndarray, window: int, until: int) -> tuple[np.ndarray, np.ndarray]:
        """Complete rows of some columns and returns in the window that ends at a period; and those periods."""
        at = np.arange(max(until - window + 1, 0), until + 1)
        at = at[~np.isnan(self.own[at]) & ~np.isnan(columns[at]).any(axis=1)]
        return at, self.own[at]

    def later(self, shifts: list[int]) -> np.ndarray:
        """The market of so many periods later, a column each, nothing later than the window's date."""
        market = self.factors[:, 0]
        out = np.full((len(market), len(shifts)), np.nan)
        for column, shift in enumerate(shifts):
            for t in range(len(market)):
                if 0 <= t + shift <= self.end:
                    out[t, column] = market[t + shift]
        return out


def fit(x: np.ndarray, y: np.ndarray, w: np.ndarray, take: np.ndarray) -> dict[str, float]:
    """Weighted least squares on [1, x], x and y measured from their means; beta is `take` @ slopes."""
    n, k = x.shape
    mean_x, mean_y = np.average(x, axis=0, weights=w), y[0] + np.average(y - y[0], weights=w)
    a, b = (x - mean_x) * np.sqrt(w)[:, None], (y - mean_y) * np.sqrt(w)
    slopes, *_ = np.linalg.lstsq(a, b, rcond=None)
    residual = b - a @ slopes
    variance = residual @ residual / (n - k - 1)
    return {
        "beta": take @ slopes,
        "alpha": mean_y - slopes @ mean_x,
        "se_beta": np.sqrt(variance * take @ np.linalg.inv(a.T @ a) @ take),
        "r2": 1 - residual @ residual / (b @ b) if b.any() else 0.0,
        "residual_sd": np.sqrt(variance / w.mean()),
        "n_obs": n,
    }


Oracle = Callable[..., dict[str, float] | None]


def regression(known: Known, columns: np.ndarray, until: int, **how: Any) -> dict | None:
    at, y = known.pairs(columns, WINDOW, until)
    if len(at) < MIN_OBS:
        return None
    k = columns.shape[1]
    w = 0.5 ** ((until - at) / how["half_life"]) if "half_life" in how else np.ones(len(at))
    return fit(columns[at], y, w, how.get("take", np.eye(k)[0]))


def ols(known: Known) -> dict | None:
    return regression(known, known.factors[:, :1], known.end)


def multi_factor(known: Known) -> dict | None:
    return regression(known, known.factors, known.end)


def lagged(known: Known, lags: int, leads: int) -> dict | None:
    columns = known.later(list(range(-lags, leads + 1)))
    return regression(known, columns, known.end - leads, take=np.ones(lags + leads + 1))


def scholes_williams(known: Known) -> dict | None:
    columns = known.later([-1, 0, 1])
    at, y = known.pairs(columns, WINDOW, known.end - 1)
    if len(at) < MIN_OBS:
        return None
    x = columns[at] - columns[at].mean(axis=0)
    scale = 1 + 2 * np.corrcoef(x[:, 0], x[:, 1])[0, 1]
    if scale <= 0:
        return None
    weights = (x / (x * x).sum(axis=0)).sum(axis=1) / scale  # beta is weights @ y
    centred = y - (y[0] + (y - y[0]).mean())
    beta = weights @ centred
    residual = centred - beta * x[:, 1]
    variance = residual @ residual / (len(y) - 2)
    total = centred @ centred
    return {
        "beta": beta,
        "alpha": y.mean() - beta * columns[at, 1].mean(),
        "se_beta": np.sqrt(variance * weights @ weights),
        "r2": max(0.0, 1 - residual @ residual / total) if total else 0.0,
        "residual_sd": np.sqrt(variance),
        "n_obs": len(y),
    }


def exponential(known: Known, half_life: float) -> dict | None:
    return regression(known, known.factors[:, :1], known.end, half_life=half_life)


def downside(known: Known, below: str) -> dict | None:
    market = known.factors[:, :1]
    at, y = known.pairs(market, WINDOW, known.end)
    level = market[at].mean() if below == "mean" and len(at) else 0.0
    falls = market[at, 0] < level
    if falls.sum() < MIN_OBS:
        return None
    return fit(market[at][falls], y[falls], np.ones(falls.sum()), np.ones(1))


def correlation_volatility(
    known: Known, volatility_window: int, volatility_min_obs: int, overlap: int
) -> dict | None:
    market, own = known.factors[:, 0], known.own
    sums = np.full((len(market), 2), np.nan)
    for t in range(overlap - 1, len(market)):
        span = slice(t - overlap + 1, t + 1)
        sums[t] = market[span].sum(), own[span].sum()
    long = sums[max(known.end - WINDOW + 1, 0) : known.end + 1]
    long = long[~np.isnan(long).any(axis=1)]
    at, y = known.pairs(known.factors[:, :1], volatility_window, known.end)
    if len(long) < MIN_OBS or len(at) < volatility_min_obs:
        return None
    n, n_short, k = len(long), len(y), overlap
    a, b = market[at] - market[at].mean(), y - (y[0] + (y - y[0]).mean())
    u, v = (long - long[0]).T
    u, v = u - u.mean(), v - v.mean()
    rho = (u @ v) / np.sqrt((u @ u) * (v @ v)) if v.any() else 0.0
    # 1 − ρ² from the residuals, since the difference loses digits in a close fit
    rest = v - (u @ v) / (u @ u) * u
    apart = (rest @ rest) / (v @ v) if v.any() else 1.0
    ratio = np.sqrt((b @ b) / (a @ a))
    beta = rho * ratio
    spread = apart**2 * (2 * k * k + 1) / (3 * k) / (n - 2) + rho**2 * apart / (n_short - 2)
    residual = b - beta * a
    return {
        "beta": beta,
        "alpha": (long[:, 1].mean() - beta * long[:, 0].mean()) / k,
        "se_beta": ratio * np.sqrt(spread),
        "r2": rho**2,
        "residual_sd": np.sqrt(residual @ residual / (n_short - 2)),
        "n_obs": n,
    }


SHORT = {"volatility_window": 20, "volatility_min_obs": 8}
ORACLES: dict[str, tuple[Oracle, list[dict[str, Any]]]] = {
    "ols": (ols, [{}]),
    "multi_factor": (multi_factor, [{}]),
    "lagged": (lagged, [{"lags": 1, "leads": 0}, {"lags": 2, "leads": 1}, {"lags": 0, "leads": 0}]),
    "scholes_williams": (scholes_williams, [{}]),
    "exponential": (exponential, [{"half_life": 12.0}, {"half_life": 0.7}]),
    "correlation_volatility": (
        correlation_volatility,
        [{**SHORT, "overlap": 1}, {**SHORT, "overlap": 3}],
    ),
    "downside": (downside, [{"below": "mean"}, {"below": "zero"}]),
}
CASES = [(name, options) for name, (_, all_of) in ORACLES.items() for options in all_of]


def test_every_estimator_has_an_oracle() -> None:
    assert set(ORACLES) == set(ESTIMATORS)


def draw(kind: str, unit: float) -> tuple[Sample, np.ndarray]:
    """Three securities over 160 periods, with gaps but in the kind "whole"; and their returns (3, 160) by period."""
    rng = np.random.default_rng(KINDS.index(kind))
    factors = np.column_stack([rng.normal(0.006, 0.045, 160), rng.normal(0.0, 0.03, (160, 2))])
    own = 0.002 + factors @ rng.uniform(0.2, 1.5, (3, 3)) + rng.normal(0.0, 0.08, (160, 3))
    match kind:
        case "outlier":
            own[60] = 100.0  # +10,000 %, enters and leaves
        case "close fit":
            own = 0.002 + 1.2 * factors[:, :1] + rng.normal(0.0, 1e-5, (160, 3))
        case "level":
            factors, own = factors + 50.0, own + 50.0
        case "stale":
            own[70:110] = 0.0
    if kind != "whole":
        factors[rng.random(160) < 0.03, 0] = np.nan
        own[rng.random(own.shape) < 0.08] = np.nan
    factors, own = unit * factors, unit * own.T
    rows = [np.sort(rng.choice(160, n, replace=False)) for n in (160, 150, 90)]
    if kind == "whole":
        rows = [np.arange(160), np.arange(20, 160), np.arange(60, 150)]
    seen = np.full(own.shape, np.nan)
    for security, at in enumerate(rows):
        seen[security, at] = own[security, at]
    starts = np.cumsum([0, *map(len, rows)])
    excess = np.concatenate([seen[i, at] for i, at in enumerate(rows)])
    return Sample(starts, np.concatenate(rows), excess, factors), seen


@pytest.mark.parametrize("unit", [1.0, 100.0], ids=["decimal", "percent"])
@pytest.mark.parametrize("kind", KINDS)
@pytest.mark.parametrize(("name", "options"), CASES, ids=str)
def test_each_window_equals_its_own_fit(
    name: str, options: dict[str, Any], kind: str, unit: float
) -> None:
    """1e-10 of the size each number has by itself.

    A beta or alpha near zero is a difference of larger numbers: its size is that of a line with a correlation of one,
    or its standard error times √n if that is larger. R² is taken from one, where both sides round. Where the fit is
    close the loop itself only resolves residuals to the rounding of the returns: so much is allowed for.
    """
    sample, seen = draw(kind, unit)
    found = catalog.load(ESTIMATORS[name])(sample, window=WINDOW, min_obs=MIN_OBS, **options)
    oracle = ORACLES[name][0]
    owner = np.repeat(np.arange(3), np.diff(sample.starts))
    place, compared = dict(zip(found.row, range(len(found.row)), strict=True)), 0
    for row, period in enumerate(sample.period):
        want = oracle(Known(seen[owner[row]], sample.factors, int(period)), **options)
        assert (row in place) == (want is not None), row
        if want is None:
            continue
        got = {field: getattr(found, field)[place[row]] for field in (*FIELDS, "n_obs")}
        assert got["n_obs"] == want["n_obs"]
        level = np.nanmax(np.abs(seen[owner[row]][max(0, period - 40) : period + 1]))
        market = np.nanmax(np.abs(sample.factors[max(0, period - 40) : period + 1, 0]))
        spread = np.sqrt(want["n_obs"]) * want["se_beta"]
        # Rounding of the data, 1e-16 of their level, over what is left by the fit.
        noise = 1e-15 * level / want["residual_sd"] if want["residual_sd"] else 0.0
        size = {
            "beta": abs(want["beta"]) + spread,
            "alpha": level + (abs(want["beta"]) + spread) * market,
            "se_beta": want["se_beta"] * (1 + noise * 1e10),
            "r2": 1.0,
            "residual_sd": want["residual_sd"] * (1 + noise * 1e10),
        }
        for field in FIELDS:
            assert abs(got[field] - want[field]) <= 1e-10 * size[field] + 1e-300, (
                field,
                row,
                got,
                want,
            )
        compared += 1
    always_up = kind == "level" and options.get("below") == "zero"
    assert compared == 0 if always_up else compared > 100
    assert found.n_too_few + found.n_no_variation == len(sample.period) - compared
