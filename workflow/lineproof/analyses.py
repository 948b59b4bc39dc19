"""Which pricing tests exist, and what their variants and standard errors are called: one line each."""

from __future__ import annotations

from lineproof.catalog import Entry

ANALYSES: dict[str, Entry] = {
    "describe": Entry("lineproof.pricing_analyses:describe", "means and standard deviations"),
    "time_series": Entry("lineproof.pricing_analyses:time_series", "time-series regressions"),
    "joint_alpha": Entry(
        "lineproof.pricing_analyses:joint_alpha", "joint tests that every alpha is zero"
    ),
    "market_line": Entry(
        "lineproof.pricing_analyses:market_line", "the market line across test assets"
    ),
}

ALPHA_ERRORS: dict[str, str] = {
    "classical": "classical",
    "hc0": "heteroskedasticity-consistent HC0 (White 1980)",
    "hc1": "heteroskedasticity-consistent HC1 (MacKinnon and White 1985)",
    "hc2": "heteroskedasticity-consistent HC2 (MacKinnon and White 1985)",
    "hc3": "heteroskedasticity-consistent HC3 (MacKinnon and White 1985)",
    "hac": "heteroskedasticity- and autocorrelation-consistent, Bartlett weights "
    "(Newey and West 1987)",
}

LINE_WEIGHTS: dict[str, str] = {
    "ols": "ordinary least squares",
    "wls": "least squares weighted by the inverse residual variances",
    "gls": "generalised least squares with the residual covariance matrix",
}

# Templates that the notes fill in with the study's period, a `frequency.Frequency`.
LINE_ERRORS: dict[str, str] = {
    "textbook": "textbook errors, which take betas and the market's mean as known",
    "monthly_slopes": "the spread of {period.adjective} slopes (Fama and MacBeth 1973)",
    "monthly_slopes_hac": "{period.adjective} slopes with Bartlett weights (Newey and West 1987)",
    "errors_in_variables": "corrected for estimated betas (Shanken 1992)",
    "misspecification_robust": "robust to misspecification (Kan, Robotti and Shanken 2013)",
    "misspecification_robust_hac": "robust to misspecification, with Bartlett weights "
    "(Kan, Robotti and Shanken 2013)",
}
