"""Each fault of the intake's list has a test that makes it and checks its answer, marked `fault(number)`."""

from __future__ import annotations

import ast
from collections import defaultdict
from pathlib import Path

import pytest

from lineproof.intake.faults import FAULTS

TESTS = Path(__file__).parents[1]
ANSWERS = {"stop", "set aside", "repair", "flag", "handled"}


def marked() -> dict[int, list[str]]:
    """The tests that are marked with each number, as file and name."""
    found = defaultdict(list)
    for file in sorted(TESTS.rglob("test_*.py")):
        for node in ast.walk(ast.parse(file.read_text(encoding="utf-8"))):
            if isinstance(node, ast.FunctionDef) and node.name.startswith("test_"):
                for mark in node.decorator_list:
                    if ast.unparse(mark).startswith("pytest.mark.fault("):
                        found[ast.literal_eval(mark.args[0])].append(f"{file.name}: {node.name}")
    return dict(found)


def test_all_faults_are_listed_with_an_answer() -> None:
    assert list(FAULTS) == sorted(FAULTS)
    assert set(range(1, 41)) <= set(FAULTS)
    assert {fault.answer for fault in FAULTS.values()} == ANSWERS
    labels = [fault.label for fault in FAULTS.values()]
    assert len(set(labels)) == len(labels)


@pytest.mark.parametrize("number", FAULTS)
def test_a_test_makes_it(number: int) -> None:
    assert marked().get(number), f"no test is marked fault({number}): {FAULTS[number].label}"


def test_no_mark_names_a_fault_that_is_not_listed() -> None:
    assert set(marked()) <= set(FAULTS)
