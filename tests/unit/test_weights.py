"""Weights inside a group, by hand."""

from __future__ import annotations

import numpy as np

from lineproof.stats.weights import by_size, equal, scaled_to_one

SIZES = np.array([300.0, np.nan, 100.0])


def test_equal_weights_do_not_look_at_size() -> None:
    assert equal(SIZES).tolist() == [1.0, 1.0, 1.0]


def test_an_unknown_size_weighs_nothing() -> None:
    assert by_size(SIZES).tolist() == [300.0, 0.0, 100.0]


def test_scaled_inside_each_cell() -> None:
    weight = np.array([3.0, 5.0, 1.0, 0.0, 4.0])
    cell = np.array([0, 2, 0, 3, 0])
    assert scaled_to_one(weight, cell, 5).tolist() == [3 / 8, 1.0, 1 / 8, 0.0, 4 / 8]


def test_no_members_no_weights() -> None:
    assert len(scaled_to_one(np.zeros(0), np.zeros(0, np.int64), 3)) == 0
