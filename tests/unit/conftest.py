"""The demo market, made once for all tests of it."""

from __future__ import annotations

import pandas as pd
import pytest

from lineproof.demo import make_demo

LARGE = {"n_securities": 700, "first": "1950-01", "last": "2024-12", "seed": 20260101}
SMALL = {"n_securities": 60, "first": "1990-01", "last": "2004-12", "seed": 7}


@pytest.fixture(scope="session")
def large() -> dict[str, str | pd.DataFrame]:
    return make_demo(**LARGE)


@pytest.fixture(scope="session")
def small() -> dict[str, str | pd.DataFrame]:
    return make_demo(**SMALL)


@pytest.fixture(scope="session", params=["large", "small"])
def market(request: pytest.FixtureRequest) -> dict[str, str | pd.DataFrame]:
    return request.getfixturevalue(request.param)
