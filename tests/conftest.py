"""Tests marked `thorough` are whole runs of the program that take minutes on a slow machine."""

from __future__ import annotations

import pytest
from hypothesis import settings

from tests.thorough import IS_THOROUGH

# A slow machine is no failure.
settings.register_profile("patient", deadline=None)
settings.load_profile("patient")


def pytest_collection_modifyitems(items: list[pytest.Item]) -> None:
    """Skip what is thorough unless LINEPROOF_THOROUGH is set."""
    if IS_THOROUGH:
        return
    skip = pytest.mark.skip(reason="whole runs: set LINEPROOF_THOROUGH=1")
    for item in items:
        if item.get_closest_marker("thorough"):
            item.add_marker(skip)
