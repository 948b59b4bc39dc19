"""What the record of an intake says of the market, of the riskless rate and of their files."""

from __future__ import annotations

import hashlib
import json
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest
from tests.unit import intake_examples as examples

from lineproof.intake.record import check_conserved
from lineproof.intake.series import FileOfSeries
from lineproof.intake.series_record import UsedDays, file_records, series_record
from lineproof.intake.signed import made_with, signed

RETURNS = examples.lines(*(f"{name},2000-0{m}-28,0.0{m},,1,5" for name in "AB" for m in (2, 3, 4)))
MARKET = {f"2000-0{m}": 0.01 * m for m in range(1, 7)}


def table(*dates: str) -> pd.DataFrame:
    return pd.DataFrame({"date": pd.to_datetime(list(dates)).astype("datetime64[ms]")})


def days(*dates: str) -> np.ndarray:
    return np.array(dates, "datetime64[D]")


def test_rows_of_the_series_beyond_the_returns_are_not_used(tmp_path: Path) -> None:
    intake = examples.validate(tmp_path, RETURNS, market=MARKET).intake
    market = intake["files"][1]
    assert (market["place"], market["rows_read"]) == ("data.market", 6)
    assert (market["rows_kept"], market["rows_unused"]) == (3, 3)
    for file in intake["files"]:
        check_conserved(file)


def test_the_numbers_of_the_series_are_those_of_the_study(tmp_path: Path) -> None:
    found = examples.validate(tmp_path, RETURNS, market=MARKET).intake["series"][0]
    span = {"first": "2000-02-29", "last": "2000-04-30", "n_periods": 3, "period": "month"}
    assert found.items() >= span.items()
    assert found["mean"] == pytest.approx(0.028, rel=1e-14)  # rounding of a sum
    assert found["sd"] == pytest.approx(0.01, rel=1e-14)
    assert (found["min"], found["max"]) == pytest.approx((0.018, 0.038), rel=1e-14)
    assert found["source"].startswith("raw/market.csv: ")


def test_one_period_has_no_standard_deviation() -> None:
    one = table("2001-01-31")
    found = series_record("data.market", "m", "month", one["date"], pd.Series([0.01]))
    assert found["sd"] is None
    assert json.loads(json.dumps(found, allow_nan=False)) == found


@pytest.mark.parametrize(
    ("tables", "frequency", "of", "used"),
    [
        # A monthly series is used in the months of any table, whatever day of the month dates it.
        ({"market": ["2001-02-28"]}, "monthly", "monthly", [False, True, True, False]),
        ({"market": ["2001-02-20"]}, "daily", "monthly", [False, True, True, False]),
        # Days compounded to months are used where their month is whole, or where the panel of days has them.
        ({"market": ["2001-02-28"]}, "monthly", "daily", [False, True, True, False]),
        (
            {"market": ["2001-02-28"], "market_daily": ["2001-03-01"]},
            "monthly",
            "daily",
            [False, True, True, True],
        ),
        # In a study of days only its own days count.
        ({"market": ["2001-02-27"]}, "daily", "daily", [False, False, True, False]),
    ],
)
def test_which_days_are_used(
    tables: dict[str, list[str]], frequency: str, of: str, used: list[bool]
) -> None:
    held = UsedDays({name: table(*dates) for name, dates in tables.items()}, frequency)
    found = held.among(days("2001-01-31", "2001-02-01", "2001-02-27", "2001-03-01"), of)
    assert found.tolist() == used


def test_rows_without_a_value_are_not_used() -> None:
    held = UsedDays({"market": table("2001-01-31", "2001-02-28")}, "monthly")
    file = FileOfSeries("m.csv", 5, days("2001-01-31", "2001-02-28", "2001-03-31"))
    (found,) = file_records("data.market", [file], "monthly", held)
    assert (found["rows_read"], found["rows_kept"], found["rows_unused"]) == (5, 2, 3)


def test_sizes_and_sums_of_raw_files(tmp_path: Path) -> None:
    paths = {"returns": ["a.csv", "b.csv"], "market": ["m.zip"], "riskless": ["r.csv"]}
    for name in ("a.csv", "b.csv", "m.zip", "r.csv"):
        (tmp_path / name).write_text(name * 3, encoding="ascii")
    full = {what: [str(tmp_path / name) for name in names] for what, names in paths.items()}
    sums = {
        what: [hashlib.sha256(Path(name).read_bytes()).hexdigest() for name in names]
        for what, names in full.items()
    }
    kept = []
    for what in ("returns", "market"):
        kept.append(tmp_path / f"data.{what}.json")
        kept[-1].write_text(json.dumps(sums[what]), encoding="utf-8")
    files: Any = [
        {"place": f"data.{what}", "label": label}
        for what, labels in (
            ("returns", ["a", "b"]),
            ("market", ["m.zip, one", "m.zip, two"]),
            ("riskless", ["r"]),
        )
        for label in labels
    ]
    record = signed(files, full, [str(path) for path in kept], {"b": 1, "a": 2})
    found = record.pop("files")
    assert record == {"made_with": made_with({"a": 2, "b": 1})}
    assert [file["label"] for file in found] == [file["label"] for file in files]
    assert [file.get("sha256") for file in found] == [*sums["returns"], None, None, None]
    assert [file.get("n_bytes") for file in found] == [15, 15, None, None, 15]
