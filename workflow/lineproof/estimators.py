"""Which estimators of beta exist, and which ways to shrink their estimates: one line each."""

from __future__ import annotations

from lineproof.catalog import Entry

ESTIMATORS: dict[str, Entry] = {
    "ols": Entry("lineproof.stats.betas:rolling_ols", "ordinary least squares"),
    "multi_factor": Entry(
        "lineproof.stats.betas:rolling_multi_factor", "least squares beside further factors"
    ),
    "lagged": Entry("lineproof.stats.betas:rolling_lagged", "summed slopes on lagged markets"),
    "scholes_williams": Entry(
        "lineproof.stats.betas:rolling_scholes_williams", "the estimator of Scholes and Williams"
    ),
    "exponential": Entry(
        "lineproof.stats.betas:rolling_exponential", "exponentially weighted least squares"
    ),
    "correlation_volatility": Entry(
        "lineproof.stats.betas:rolling_correlation_volatility", "correlation times volatilities"
    ),
    "downside": Entry("lineproof.stats.betas:rolling_downside", "least squares in falling markets"),
}
SHRINKAGES: dict[str, Entry] = {
    "cross_section": Entry(
        "lineproof.stats.shrinkage:to_cross_section", "shrunk to the cross-section"
    ),
    "fixed": Entry("lineproof.stats.shrinkage:to_fixed", "shrunk to a fixed value"),
}

# The options of the study file that belong to one estimator or shrinkage, and whether it cannot do without.
OWN_OPTIONS: dict[str, dict[str, bool]] = {
    "multi_factor": {"factors": True},
    "lagged": {"lags": False, "leads": False},
    "exponential": {"half_life": True},
    "correlation_volatility": {
        "volatility_window": True,
        "volatility_min": True,
        "overlap": False,
    },
    "downside": {"below": False},
    "fixed": {"weight": True, "to": False},
}
