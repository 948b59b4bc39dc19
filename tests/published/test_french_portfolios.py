"""Kenneth French's size-value portfolios, 1949-2017, in the Python package linearmodels.

The figures are those of statsmodels, a general statistics library, on the same data. The F of the
joint test, 7.7528 with 9 and 809 degrees of freedom, is its exact multivariate test that every
intercept is zero.
"""

from __future__ import annotations

import numpy as np
import pytest
import statsmodels.api as sm
from linearmodels.datasets import french
from statsmodels.multivariate.multivariate_ols import _MultivariateOLS

from lineproof.stats.covariance import COEFFICIENT_COVARIANCES
from lineproof.stats.distributions import joint_p
from lineproof.stats.joint_alpha import exact_f, measure_alphas
from lineproof.stats.time_series import Regression, r_squared, regress, standard_errors

PORTFOLIOS = [f"S{size}V{value}" for size in (1, 3, 5) for value in (1, 3, 5)]
# Two libraries, the same formula, well-conditioned data.
SAME = 1e-10


def _fit(factors: list[str]) -> Regression:
    data = french.load()
    excess = data[PORTFOLIOS].sub(data["RF"], axis=0)
    return regress(excess.to_numpy(dtype=float), data[factors].to_numpy(dtype=float))


@pytest.mark.parametrize("kind", list(COEFFICIENT_COVARIANCES))
@pytest.mark.parametrize("factors", [["MktRF"], ["MktRF", "SMB", "HML"]])
def test_standard_errors_agree(factors: list[str], kind: str) -> None:
    fit, lag = _fit(factors), 6
    found = standard_errors(fit, kind, lag)
    library = {
        "classical": {"cov_type": "nonrobust"},
        "hac": {"cov_type": "HAC", "cov_kwds": {"maxlags": lag}},
    }.get(kind, {"cov_type": kind.upper()})
    for column in range(len(PORTFOLIOS)):
        expected = sm.OLS(fit.returns[:, column], fit.design).fit(**library)
        np.testing.assert_allclose(fit.coefficients[:, column], expected.params, rtol=SAME)
        np.testing.assert_allclose(found[:, column], expected.bse, rtol=SAME)
        assert r_squared(fit)[column] == pytest.approx(expected.rsquared, rel=SAME)


@pytest.mark.parametrize("factors", [["MktRF"], ["MktRF", "SMB", "HML"]])
def test_the_joint_f_is_the_exact_multivariate_test(factors: list[str]) -> None:
    fit = _fit(factors)
    found = exact_f(measure_alphas(fit).distance, fit.n_periods, fit.n_assets, fit.n_factors)
    test = _MultivariateOLS(fit.returns, fit.design).fit().mv_test()
    table = test.results["x0"]["stat"].loc["Wilks' lambda"]
    assert found.value == pytest.approx(float(table["F Value"]), rel=SAME)
    assert (found.df1, found.df2) == (table["Num DF"], table["Den DF"])
    # Far in the tail the relative error of p is many times that of F.
    assert float(joint_p(found.value, found.df1, found.df2)) == pytest.approx(
        float(table["Pr > F"]), rel=1e-7
    )


def test_the_figure_on_record() -> None:
    fit = _fit(["MktRF"])
    found = exact_f(measure_alphas(fit).distance, fit.n_periods, fit.n_assets, fit.n_factors)
    assert (found.df1, found.df2) == (9, 809)
    assert found.value == pytest.approx(7.7528, abs=0.00005)
