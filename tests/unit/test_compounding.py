"""Days compounded to months: by hand, against an obvious loop, and in pieces."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from lineproof.intake.chunk import Chunk
from lineproof.intake.compounding import compound_to_months
from lineproof.periods import Months, TradingDays

NAN = float("nan")
SOME = settings(max_examples=40, deadline=None, derandomize=True)


def chunk_of(securities: dict[str, list[tuple]], names: tuple[str, ...]) -> Chunk:
    """Rows of (day, *values) by security; the values are called `names`, and each row has a text."""
    rows = [row for each in securities.values() for row in each]
    day = np.array([row[0] for row in rows], "datetime64[D]")
    return Chunk(
        names=np.array(list(securities), object),
        start=np.cumsum([0, *map(len, securities.values())]),
        period=TradingDays(np.unique(day)).number(day),
        day=day,
        values={n: np.array([row[1 + k] for row in rows], float) for k, n in enumerate(names)},
        texts={
            "sector": (np.arange(len(rows), dtype=np.int32), [str(k) for k in range(len(rows))])
        },
        code=np.arange(len(rows), dtype=np.int8) % 5,
    )


def test_by_hand() -> None:
    days = chunk_of(
        {
            "A": [
                ("2001-01-30", 0.10, 100.0, 5.0, NAN),
                ("2001-01-31", -0.50, NAN, 6.0, NAN),
                ("2001-02-01", NAN, 70.0, NAN, NAN),
                ("2001-04-02", 0.25, NAN, NAN, -0.3),
            ],
            "B": [("2001-04-03", 0.02, 9.0, 1.0, NAN), ("2001-04-05", 0.03, 9.5, 1.1, NAN)],
        },
        ("return_", "size", "price", "final_return"),
    )
    found = compound_to_months(days)
    months = found.months
    assert months.names.tolist() == ["A", "B"]
    assert months.start.tolist() == [0, 3, 4]
    assert [Months().name(m) for m in months.period] == ["2001-01", "2001-02", "2001-04", "2001-04"]
    assert months.day.astype(str).tolist() == [
        "2001-01-31",
        "2001-02-01",
        "2001-04-02",
        "2001-04-05",
    ]
    np.testing.assert_allclose(
        months.values["return_"], [1.1 * 0.5 - 1, NAN, 0.25, 1.02 * 1.03 - 1], rtol=0, atol=1e-15
    )
    assert found.n_days.tolist() == [2, 0, 1, 2]
    assert found.last.tolist() == [1, 2, 3, 5]
    np.testing.assert_array_equal(months.values["size"], [100.0, 70.0, NAN, 9.5])
    np.testing.assert_array_equal(months.values["price"], [6.0, NAN, NAN, 1.1])
    np.testing.assert_array_equal(months.values["final_return"], [NAN, NAN, -0.3, NAN])
    codes, texts = months.texts["sector"]
    assert [texts[code] for code in codes] == ["1", "2", "3", "5"]
    assert months.code.tolist() == [-1, 2, -1, -1]


def test_total_losses_stay_total() -> None:
    days = chunk_of(
        {"A": [("2001-01-30", -1.0), ("2001-01-31", 0.4), ("2001-02-01", -1.0)]}, ("total_return",)
    )
    assert compound_to_months(days).months.values["total_return"].tolist() == [-1.0, -1.0]


def draw(seed: int) -> Chunk:
    rng = np.random.default_rng(seed)
    calendar = pd.bdate_range("1999-12-20", periods=150).to_numpy().astype("datetime64[D]")
    securities = {}
    for k in range(int(rng.integers(1, 6))):
        here = calendar[rng.random(len(calendar)) < rng.uniform(0.05, 1.0)]
        values = rng.normal(0.0, 0.1, (len(here), 4)).clip(-1)
        values[:, 1:3] = np.exp(values[:, 1:3])
        values[rng.random(values.shape) < 0.3] = NAN
        securities[f"S{k}"] = [(day, *row) for day, row in zip(here, values, strict=True)]
    return chunk_of(securities, ("return_", "size", "price", "total_return"))


def slowly(days: Chunk) -> list[dict]:
    """The same months from dictionaries, one row at a time."""
    months: dict[tuple[str, str], dict] = {}
    for row in range(len(days)):
        key = (days.names[days.owner[row]], str(days.day[row])[:7])
        at = months.setdefault(key, {"key": key, "n": 0, "size": NAN, "price": NAN})
        at["last"] = row
        for name in ("return_", "total_return"):
            value = float(days.values[name][row])
            at.setdefault(name, NAN)
            if not math.isnan(value):
                before = 0.0 if math.isnan(at[name]) else at[name]
                at[name] = (1 + before) * (1 + value) - 1
                at["n"] += name == "return_"
        for name in ("size", "price"):
            value = float(days.values[name][row])
            at[name] = at[name] if math.isnan(value) else value
    return list(months.values())


@SOME
@given(st.integers(0, 2**32 - 1))
def test_equals_an_obvious_loop(seed: int) -> None:
    days = draw(seed)
    found, want = compound_to_months(days), slowly(days)
    months = found.months
    named = [
        (months.names[o], Months().name(p))
        for o, p in zip(months.owner, months.period, strict=True)
    ]
    assert named == [each["key"] for each in want]
    assert found.n_days.tolist() == [each["n"] for each in want]
    assert found.last.tolist() == [each["last"] for each in want]
    for name in ("return_", "total_return"):
        # A product of at most 23 factors near one, in the same order.
        np.testing.assert_allclose(
            months.values[name], [each[name] for each in want], rtol=1e-12, atol=1e-14
        )
    for name in ("size", "price"):
        np.testing.assert_array_equal(months.values[name], [each[name] for each in want])


@SOME
@given(st.integers(0, 2**32 - 1))
def test_securities_do_not_touch_one_another(seed: int) -> None:
    """To the last bit: each security by itself gives its own part of the whole."""
    days = draw(seed)
    whole = compound_to_months(days).months
    for place, name in enumerate(days.names):
        rows = slice(days.start[place], days.start[place + 1])
        alone = replace(
            days,
            names=days.names[place : place + 1],
            start=np.array([0, rows.stop - rows.start]),
            period=days.period[rows],
            day=days.day[rows],
            values={key: value[rows] for key, value in days.values.items()},
            texts={key: (codes[rows], texts) for key, (codes, texts) in days.texts.items()},
            code=days.code[rows],
        )
        months = compound_to_months(alone).months
        part = slice(whole.start[place], whole.start[place + 1])
        assert months.period.tolist() == whole.period[part].tolist(), name
        for key, value in months.values.items():
            assert value.tobytes() == whole.values[key][part].tobytes()


@pytest.mark.parametrize("names", [("A",), ("A", "B")])
def test_securities_without_rows(names: tuple[str, ...]) -> None:
    days = chunk_of({"A": [("2001-01-30", 0.1)], **{n: [] for n in names[1:]}}, ("return_",))
    months = compound_to_months(days).months
    assert months.start.tolist() == [0, 1, 1][: len(names) + 1]
