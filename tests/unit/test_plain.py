"""Plain numbers, found compiled, against the regular expression that says what they are."""

from __future__ import annotations

import re

import numpy as np
import pyarrow as pa
import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st

from lineproof.intake.plain import find_plain
from lineproof.intake.values import _PLAIN

odd = st.one_of(
    st.text("0123456789.+-eE", max_size=8),
    st.text("0159.+-eE ,xé１\x00\n_", max_size=6),
    st.text(max_size=4),
    st.floats(allow_nan=True, allow_infinity=True).map(repr),
    st.integers().map(str),
)


def is_plain(text: str) -> bool:
    """Python's `$` also matches before a last line feed, so the whole text must match."""
    return re.fullmatch(_PLAIN.strip("^$"), text) is not None


@settings(max_examples=400, deadline=None)
@given(
    texts=st.lists(odd, max_size=12), wide=st.booleans(), cut=st.tuples(*[st.integers(0, 3)] * 2)
)
@example(texts=[""], wide=False, cut=(0, 0))
@example(texts=["", ""], wide=True, cut=(1, 0))
@example(
    texts=["1", "2e", "e2", "2e+", ".e1", "1.e1", "+", "+.", "-.5e-07"], wide=False, cut=(0, 0)
)
def test_agrees_with_the_regular_expression(
    texts: list[str], wide: bool, cut: tuple[int, int]
) -> None:
    array = pa.array(texts, pa.large_string() if wide else pa.string())
    first, last = cut[0], max(len(texts) - cut[1], cut[0])
    found = find_plain(array[first:last])
    assert found.dtype == bool
    assert found.tolist() == [is_plain(text) for text in texts[first:last]]


@pytest.mark.parametrize("kind", [pa.string(), pa.large_string()])
def test_a_number_does_not_run_on_into_the_next_text(kind: pa.DataType) -> None:
    """The texts lie end to end in memory: 1e and 5 are not 1e5."""
    assert find_plain(pa.array(["1e", "5", "-", "1", "1", ".5"], kind)).tolist() == [
        False, True, False, True, True, True
    ]  # fmt: skip


def test_nothing() -> None:
    assert find_plain(pa.array([], pa.string())).tolist() == []
    assert find_plain(pa.array(["1", "2"])[2:]).tolist() == []


def test_every_plain_number_can_be_parsed() -> None:
    texts = ["1", "+1", "-1.", ".5", "1e5", "1E-400", "1e400", "0" * 400 + "1", "9" * 400]
    assert find_plain(pa.array(texts)).all()
    assert not np.isnan([float(text) for text in texts]).any()
