"""How many steps a run may have."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import pytest

from lineproof.planning import Most, most_steps
from lineproof.specs import Study, SubperiodSpec
from lineproof.study import load_study

RULES = [(), ("estimate",), ("sort",), ("subperiod",), ()]


@pytest.fixture(scope="module")
def demo() -> Study:
    return load_study(Path(__file__).parents[2] / "config" / "kestrel.yaml")


def test_the_demo_study_is_counted_by_hand(demo: Study) -> None:
    # One estimate and four sets; five stretches, two halves, and tens of 75 years at most: eight.
    assert most_steps(demo, RULES) == Most(1 + 1 + 4 + (5 + 2 + 8) + 1, sure=True)


@pytest.mark.parametrize(
    ("first", "last", "every", "parts", "sure"),
    [
        ("1990-01", "1999-12", 10, 1, True),
        ("1990-01", "2000-01", 10, 2, True),
        ("first", "2000-01", 10, 4, False),  # a span of forty years is taken
        ("first", "last", None, 1, True),
    ],
)
def test_parts_of_a_span(
    demo: Study, first: str, last: str, every: int | None, parts: int, sure: bool
) -> None:
    spec = SubperiodSpec("tens", first, last, None, every, None)
    study = replace(demo, demo=None, subperiods={"tens": spec})
    assert most_steps(study, [("subperiod",)]) == Most(parts, sure)
