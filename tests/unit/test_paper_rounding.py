"""Numbers as printed text."""

from __future__ import annotations

import math
from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import strategies as st

from lineproof.paper.rounding import DASH, FORMATS, printed, share


@pytest.mark.parametrize(
    ("value", "name", "text"),
    [
        (0.00125, "percent", "0.13"),  # half up, where binary rounding of 0.125 gives 0.12
        (-0.00125, "percent", "-0.13"),
        (2.675, "number", "2.68"),  # the double below 2.675 is still written 2.675
        (-0.00004, "percent", "0.00"),  # never minus zero
        (-0.0, "number", "0.00"),
        (1.0, "number", "1.00"),
        (0.0004999, "p", "<0.001"),
        (0.0005, "p", "0.001"),
        (0.0, "p", "0.000"),
        (0.9996, "p", "1.000"),
        (253112.0, "count", "253,112"),
        (281.25, "average", "281.3"),
        (1e30, "number", "1" + "0" * 30),
        (1e-300, "number", "0.00"),
        (None, "number", ""),
        (math.nan, "percent", DASH),
        (math.inf, "number", DASH),
    ],
)
def test_hand_worked(value: float | None, name: str, text: str) -> None:
    assert printed(value, name) == text


def test_unknown_format_is_an_error() -> None:
    with pytest.raises(KeyError):
        printed(1.0, "furlongs")


@given(st.floats(-1e9, 1e9), st.sampled_from(sorted(FORMATS)))
def test_nearest_and_away_from_zero_when_halfway(value: float, name: str) -> None:
    """Exact rational arithmetic on the shortest decimal form is the oracle."""
    style, text = FORMATS[name], printed(value, name)
    exact = Fraction(repr(value)) * 10**style.shift
    unit = Fraction(1, 10**style.places)
    if text.startswith("<"):
        assert 0 < exact < unit / 2
        return
    back = Fraction(text.replace(",", ""))
    assert abs(back - exact) <= unit / 2
    if abs(back - exact) == unit / 2:
        assert abs(back) > abs(exact)
    assert not (back == 0 and text.startswith("-"))


@pytest.mark.parametrize(
    ("value", "text"), [(0.05, "5"), (0.025, "2.5"), (0.1, "10"), (0.95, "95"), (-0.3, "−30")]
)
def test_shares_have_no_trailing_zeros(value: float, text: str) -> None:
    assert share(value) == text
