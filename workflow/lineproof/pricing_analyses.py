"""What each pricing analysis of a sample reports, as rows.

Single coefficients are compared with Student's t: T-1 degrees of freedom for means and the slopes
of single periods, T-2 for time-series regressions whatever the standard error, N-2 for the textbook market
line; errors-in-variables and misspecification-robust standard errors hold in large samples only and
go with the standard normal.

A period counts where both the asset and the market have a return. Lags run over the periods that
count, so a hole in the middle of a sample takes no time.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass, replace
from functools import cache, cached_property, partial
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from lineproof.addresses import is_spread
from lineproof.frequency import FREQUENCIES, Frequency
from lineproof.pricing_rows import NAN, Row, attempt
from lineproof.stats import PERIOD, Undefined
from lineproof.stats import joint_alpha as joint
from lineproof.stats import market_line as lines
from lineproof.stats import time_series as series
from lineproof.stats.covariance import COEFFICIENT_COVARIANCES, automatic_lag, deviations
from lineproof.stats.distributions import JointStatistic
from lineproof.stats.fitted_line import line_r_squared

Floats = NDArray[np.float64]

NO_RISKLESS = "the study has returns in excess of a riskless rate that is not known"


@dataclass(frozen=True)
class Sample:
    """One sort in one subperiod.

    Attributes:
        sort: name of the sort.
        subperiod: name of the subperiod.
        dates: (T,) periods, datetime64.
        assets: N names.
        excess: (T, N) excess returns, decimal per period, NaN where an asset is missing.
        market: (T,) market excess returns.
        riskless: (T,) riskless returns, NaN throughout where the study has none.
        extras: other (T, N) columns of the cut by name.
        level: significance level of the critical values.
        hac_lag: truncation lag; None chooses it by the number of periods.
        frequency: how long a period is, and what reasons call it.
    """

    sort: str
    subperiod: str
    dates: NDArray[np.datetime64]
    assets: tuple[str, ...]
    excess: Floats
    market: Floats
    riskless: Floats
    extras: Mapping[str, Floats]
    level: float
    hac_lag: int | None
    frequency: Frequency = FREQUENCIES["monthly"]

    @cached_property
    def groups(self) -> Sample:
        """Without the spreads, which are differences of the other assets: beside them no covariance is regular."""
        kept = [at for at, asset in enumerate(self.assets) if not is_spread(asset)]
        if len(kept) == len(self.assets):
            return self
        extras = {name: values[:, kept] for name, values in self.extras.items()}
        assets = tuple(self.assets[at] for at in kept)
        return replace(self, assets=assets, excess=self.excess[:, kept], extras=extras)

    @property
    def counted(self) -> NDArray[np.bool_]:
        """(T, N): where both the asset and the market have a return."""
        return np.isfinite(self.excess) & np.isfinite(self.market)[:, None]

    def lag(self, n_periods: int) -> int:
        """Truncation lag for `n_periods` periods."""
        return automatic_lag(n_periods) if self.hac_lag is None else self.hac_lag


def describe(sample: Sample) -> Iterator[Row]:
    """Mean and standard deviation (divisor T-1) of each series, with the mean's t statistic; mean
    characteristics of the assets that have any."""
    for column, asset in enumerate(sample.assets):
        yield from _moments(sample, asset, sample.excess[:, column], "signed")
        for name, values in sample.extras.items():
            observed = values[np.isfinite(values[:, column]), column]
            if observed.size:
                mean = float(observed.mean())
                yield Row("-", asset, name, "-", observed.size, 1, estimate=mean)
    yield from _moments(sample, "market", sample.market, "signed")
    yield from _riskless(sample)


def _riskless(sample: Sample) -> Iterator[Row]:
    if np.isfinite(sample.riskless).any():
        yield from _moments(sample, "riskless", sample.riskless, "")
        return
    for term in ("mean", "sd"):
        yield Row("-", "riskless", term, "-", 0, 1, reason=NO_RISKLESS)


def _moments(sample: Sample, asset: str, returns: Floats, family: str) -> Iterator[Row]:
    """Mean and standard deviation; the mean is compared with zero if `family` is given."""
    observed = returns[np.isfinite(returns)]
    n_periods = observed.size
    nouns = sample.frequency.nouns
    reason = "" if n_periods > 1 else f"needs at least 2 {nouns}, has {n_periods}"
    mean = sd = se = NAN
    if not reason:
        mean = float(observed.mean())
        sd = float(np.sqrt((deviations(observed) ** 2).sum() / (n_periods - 1)))
        se = sd / np.sqrt(n_periods) if family else NAN
    df = n_periods - 1.0 if family else NAN
    yield Row("-", asset, "mean", "-", n_periods, 1, family, mean, se, df1=df, reason=reason)
    yield Row("-", asset, "sd", "-", n_periods, 1, estimate=sd, reason=reason)


# A number that sums a regression up, from it and from how many periods a year has.
FITS: dict[str, Callable[[series.Regression, int], Floats]] = {
    "r2": lambda fit, _: series.r_squared(fit),
    "correlation": lambda fit, _: series.correlation(fit),
    "residual_sd": lambda fit, _: series.residual_sd(fit),
    "residual_ac1": lambda fit, _: series.residual_autocorrelation(fit),
    "alpha_year": lambda fit, a_year: a_year * fit.alphas,
}


class _Fit(NamedTuple):
    """A regression or the reason why there is none; standard errors by kind or their reasons."""

    regression: series.Regression | None
    reason: str
    errors: dict[str, tuple[Floats | None, str]]
    summaries: dict[str, Floats]


def time_series(sample: Sample) -> Iterator[Row]:
    """Alpha and beta of each asset over its own periods, under every kind of standard error."""
    rows: dict[int, list[Row]] = {}
    # Assets that count in the same periods share one regression.
    patterns, pattern_of = np.unique(sample.counted, axis=1, return_inverse=True)
    for pattern, counted in enumerate(patterns.T):
        columns = np.flatnonzero(pattern_of == pattern)
        n_periods = int(counted.sum())
        returns = sample.excess[np.ix_(counted, columns)]
        fit = _fit(returns, sample.market[counted, None], sample)
        for place, column in enumerate(columns):
            rows[column] = list(_fit_rows(fit, place, sample.assets[column], n_periods))
    for column in range(len(sample.assets)):
        yield from rows[column]


def _fit(returns: Floats, factors: Floats, sample: Sample) -> _Fit:
    noun, lag = sample.frequency.noun, sample.lag(len(returns))
    regression, reason = attempt(noun, series.regress, returns, factors)
    if regression is None:
        return _Fit(None, reason, dict.fromkeys(COEFFICIENT_COVARIANCES, (None, reason)), {})
    errors = {
        kind: attempt(noun, series.standard_errors, regression, kind, lag)
        for kind in COEFFICIENT_COVARIANCES
    }
    a_year = sample.frequency.a_year
    summaries = {term: summary(regression, a_year) for term, summary in FITS.items()}
    return _Fit(regression, "", errors, summaries)


def _fit_rows(fit: _Fit, place: int, asset: str, n_periods: int) -> Iterator[Row]:
    """Rows of the asset in column `place` of the regression."""
    for number, term in enumerate(("alpha", "beta")):
        for kind, (errors, reason) in fit.errors.items():
            row = Row("market", asset, term, kind, n_periods, 1, "signed", reason=reason)
            if errors is not None:
                estimate = float(fit.regression.coefficients[number, place])
                se = float(errors[number, place])
                row = row._replace(estimate=estimate, se=se, df1=fit.regression.df)
            yield row
    for term in FITS:
        estimate = NAN if fit.reason else float(fit.summaries[term][place])
        yield Row("market", asset, term, "-", n_periods, 1, estimate=estimate, reason=fit.reason)


class _AllAssets:
    """The regression of all assets over their common periods, and rows about it."""

    def __init__(self, sample: Sample) -> None:
        self.sample = sample
        self.counted = sample.counted.all(axis=1)
        self.lag = sample.lag(int(self.counted.sum()))

    @cached_property
    def regression(self) -> series.Regression:
        """Raises `Undefined` where there is none."""
        ever = self.sample.counted.any(axis=0)
        absent = [name for name, seen in zip(self.sample.assets, ever, strict=True) if not seen]
        if absent:
            raise Undefined(f"no {PERIOD} has returns of both the market and {', '.join(absent)}")
        return series.regress(
            self.sample.excess[self.counted], self.sample.market[self.counted, None]
        )

    def row(
        self, variant: str, term: str, kind: str, family: str, find: Callable[[], dict[str, float]]
    ) -> Row:
        """A row with the numbers that `find` returns, or with the reason why it finds none."""
        counts = (int(self.counted.sum()), len(self.sample.assets))
        numbers, reason = attempt(self.sample.frequency.noun, find)
        row = Row(variant, "all", term, kind, *counts, family, reason=reason)
        return row._replace(**(numbers or {}))


def _joint_numbers(found: JointStatistic) -> dict[str, float]:
    return {"statistic": found.value, "df1": found.df1, "df2": found.df2}


def joint_alpha(sample: Sample) -> Iterator[Row]:
    """Joint pricing tests that every alpha is zero, and how large the alphas are."""
    sample = sample.groups
    assets = _AllAssets(sample)

    def from_distance(statistic: joint.AlphaStatistic) -> dict[str, float]:
        fit = assets.regression
        distance = joint.measure_alphas(fit).distance
        return _joint_numbers(statistic(distance, fit.n_periods, fit.n_assets, fit.n_factors))

    def robust() -> dict[str, float]:
        return _joint_numbers(joint.hac_wald(assets.regression, assets.lag))

    def measured(measure: Callable[[series.Regression], float]) -> dict[str, float]:
        return {"estimate": measure(assets.regression)}

    for variant, statistic in joint.ALPHA_STATISTICS.items():
        yield assets.row(variant, "alpha", "-", "joint", partial(from_distance, statistic))
    yield assets.row("hac_wald", "alpha", "-", "joint", robust)
    for term, measure in joint.ALPHA_MEASURES.items():
        yield assets.row("-", term, "-", "", partial(measured, measure))


# A term of the market line -> its numbers from the line and the covariance of its coefficients.
LineTerm = Callable[[lines.MarketLine, lines.LineCovariance], dict[str, float]]


def _coefficient(estimate: float, variance: float, df: float) -> dict[str, float]:
    return {"estimate": float(estimate), "se": float(np.sqrt(variance)), "df1": df}


def _intercept(drawn: lines.MarketLine, spread: lines.LineCovariance) -> dict[str, float]:
    return _coefficient(drawn.line.coefficients[0], spread.coefficients[0, 0], spread.df)


def _slope(drawn: lines.MarketLine, spread: lines.LineCovariance) -> dict[str, float]:
    return _coefficient(drawn.line.coefficients[1], spread.coefficients[1, 1], spread.df)


def _slope_minus_market(drawn: lines.MarketLine, spread: lines.LineCovariance) -> dict[str, float]:
    return _coefficient(drawn.against_market[1], spread.against_market[1, 1], spread.df)


def _both(drawn: lines.MarketLine, spread: lines.LineCovariance) -> dict[str, float]:
    return _joint_numbers(lines.sharpe_lintner_wald(drawn, spread))


LINE_TERMS: dict[str, tuple[str, LineTerm]] = {
    "intercept": ("signed", _intercept),
    "slope": ("signed", _slope),
    "slope_minus_market": ("signed", _slope_minus_market),
    "intercept_and_slope_minus_market": ("joint", _both),
}


def market_line(sample: Sample) -> Iterator[Row]:
    """The line by every weighting and kind of standard error, its hypotheses and pricing errors.

    With it the market's mean excess return over the line's own periods, to compare the slope with.
    """
    sample = sample.groups
    assets = _AllAssets(sample)
    mean, _ = _moments(sample, "all", np.where(assets.counted, sample.market, NAN), "signed")
    yield mean._replace(term="market_mean", n_assets=len(sample.assets))
    for variant, weighting in lines.WEIGHTINGS.items():
        yield from _line_rows(assets, variant, weighting)


def _line_rows(assets: _AllAssets, variant: str, weighting: lines.Weighting) -> Iterator[Row]:
    @cache
    def draw() -> lines.MarketLine:
        return lines.draw_line(assets.regression, weighting)

    @cache
    def spread(kind: str) -> lines.LineCovariance:
        return lines.LINE_COVARIANCES[kind](draw(), assets.lag)

    def coefficient(number: LineTerm, kind: str) -> dict[str, float]:
        return number(draw(), spread(kind))

    def errors(test: Callable[[lines.MarketLine], JointStatistic]) -> dict[str, float]:
        return _joint_numbers(test(draw()))

    def fit() -> dict[str, float]:
        return {"estimate": line_r_squared(draw().line, weighting.metric(assets.regression))}

    for term, (family, number) in LINE_TERMS.items():
        for kind in lines.LINE_COVARIANCES:
            yield assets.row(variant, term, kind, family, partial(coefficient, number, kind))
    for kind, test in weighting.pricing_error_tests.items():
        yield assets.row(variant, "pricing_errors", kind, "joint", partial(errors, test))
    yield assets.row(variant, "r2", "-", "", fit)
