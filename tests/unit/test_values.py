"""Text into numbers and months: what is a value, what is missing, what is neither."""

from __future__ import annotations

import datetime
import math
import re

import numpy as np
import pandas as pd
import pyarrow as pa
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from tests.unit import intake_examples as examples

from lineproof.intake.values import (
    as_decimal,
    as_digits,
    check_date_format,
    missing_codes,
    settled_texts,
    to_days,
    to_numbers,
)
from lineproof.periods import Months
from lineproof.problems import KnownProblem

CODES = ["", "NA", "-99"]


def text(*values: str) -> pd.Series:
    return pd.Series(list(values), dtype="str")


@pytest.mark.parametrize(
    ("written", "value"),
    [
        ("0.05", 0.05),
        ("+0.05", 0.05),
        ("-.5", -0.5),
        ("5.", 5.0),
        ("007", 7.0),
        ("1e-3", 0.001),
        ("-1.5E+2", -150.0),
        ("1e-400", 0.0),
        ("0.1000000000000000055511151231257827", 0.1),
    ],
)
def test_plain_numbers(written: str, value: float) -> None:
    numbers = to_numbers(text(written), CODES)
    assert numbers.value.tolist() == [value]
    assert not numbers.is_text.any()
    assert numbers.code.tolist() == [-1]


@pytest.mark.parametrize(
    "written", ["halted", "1.2.3", "--1", "1 000", "0x10", "1e", "5%", ".", "1_0", "1,5", "é", "１"]
)
def test_text(written: str) -> None:
    numbers = to_numbers(text(written), CODES)
    assert numbers.is_text.tolist() == [True]
    assert np.isnan(numbers.value).all()


@pytest.mark.parametrize(
    "written", ["inf", "-INF", "Infinity", "nan", "NaN", "+inf", "1e400", "-1e400"]
)
def test_not_finite(written: str) -> None:
    numbers = to_numbers(text(written), CODES)
    assert numbers.is_not_finite.tolist() == [True]
    assert numbers.is_text.tolist() == [False]
    assert np.isnan(numbers.value).all()


def test_codes_for_missing_by_name() -> None:
    numbers = to_numbers(text("", "NA", "-99", "-99.00", "-9.9e1", "-99.01", "N/A"), CODES)
    assert numbers.code.tolist() == [0, 1, 2, 2, 2, -1, -1]
    assert numbers.is_text.tolist() == [False] * 6 + [True]
    assert np.isnan(numbers.value).tolist() == [True] * 5 + [False, True]


def test_a_code_may_be_spelt_like_a_number_that_is_none() -> None:
    numbers = to_numbers(text("nan", "inf", "."), ["nan", "."])
    assert numbers.code.tolist() == [1, -1, 2]
    assert numbers.is_not_finite.tolist() == [False, True, False]


def test_an_empty_field_is_always_missing() -> None:
    assert missing_codes(["NA", "NA", "x"]) == ["", "NA", "x"]
    assert to_numbers(text(""), ["NA"]).code.tolist() == [0]


@pytest.mark.parametrize(
    ("written", "value"),
    [("1,234", 1234.0), ("12,345,678.5", 12345678.5), ("-1,000.", -1000.0), ("+1,000", 1000.0)],
)
def test_thousands_separators_where_they_may_be(written: str, value: float) -> None:
    numbers = to_numbers(text(written, "5"), CODES, thousands=True)
    assert numbers.value.tolist() == [value, 5.0]
    assert numbers.had_thousands.tolist() == [True, False]
    assert to_numbers(text(written), CODES).is_text.tolist() == [True]


@pytest.mark.parametrize("written", ["0,123", "1,23", "1234,567", ",123", "1,234,56"])
def test_commas_that_part_no_thousands(written: str) -> None:
    assert to_numbers(text(written), CODES, thousands=True).is_text.tolist() == [True]


@settings(max_examples=300, deadline=None)
@given(st.lists(st.text("0123456789.,+-eEinfa ", max_size=8), min_size=1, max_size=20))
def test_numbers_agree_with_a_slow_loop(written: list[str]) -> None:
    numbers = to_numbers(text(*written), CODES, thousands=True)
    for position, each in enumerate(written):
        bare = each
        if re.fullmatch(r"[+-]?[1-9]\d{0,2}(,\d{3})+(\.\d*)?", each):
            bare = each.replace(",", "")
        try:
            expected = math.nan if bare != bare.strip() else float(bare)
            known = bare == bare.strip()
        except ValueError:
            expected, known = math.nan, False
        finite = known and math.isfinite(expected)
        is_code = each == "" or expected == -99
        assert (numbers.code[position] >= 0) == is_code
        assert numbers.is_text[position] == (not known and not is_code)
        assert numbers.is_not_finite[position] == (known and not finite)
        wanted = expected if finite and not is_code else math.nan
        np.testing.assert_equal(numbers.value[position], wanted)


def test_percent_and_decimal() -> None:
    assert as_decimal(np.array([-100.0, 0.0, 250.0]), "percent").tolist() == [-1.0, 0.0, 2.5]
    assert as_decimal(np.array([-1.0, 0.5]), "decimal").tolist() == [-1.0, 0.5]


@pytest.mark.parametrize(
    ("written", "value"),
    [
        ("0,05", 0.05),
        ("-,5", -0.5),
        ("5,", 5.0),
        ("12", 12.0),
        ("1e-3", 0.001),
        ("1,5E+2", 150.0),
    ],
)
def test_decimal_commas(written: str, value: float) -> None:
    numbers = to_numbers(text(written), CODES, decimal="comma")
    assert numbers.value.tolist() == [value]
    assert not numbers.is_text.any()


@pytest.mark.parametrize(
    ("decimal", "given", "kept"),
    [
        ("comma", "2,500", "2.500"),
        ("comma", "0,5", "0.5"),
        ("comma", "1.234,5", "1,234.5"),  # read with thousands later
        ("comma", "Ports, Mills", "Ports, Mills"),
        ("comma", "-99,0", ""),
        ("point", "2,500", "2,500"),
        ("point", "-99.0", ""),
        ("point", "-99.5", "-99.5"),
        ("point", "inf", "inf"),
        ("point", "", ""),
    ],
)
def test_texts_of_further_columns(decimal: str, given: str, kept: str) -> None:
    assert settled_texts([given, "x"], ["-99"], decimal) == [kept, "x"]


@pytest.mark.parametrize("written", ["0.05", "1.234", "1,2,3", "1 234", ",", "-1.000,5"])
def test_points_beside_decimal_commas(written: str) -> None:
    """A point parts thousands there, and no return has them."""
    numbers = to_numbers(text(written), CODES, decimal="comma")
    assert numbers.is_text.tolist() == [True]
    assert np.isnan(numbers.value).all()


@pytest.mark.parametrize(
    ("written", "value"),
    [
        ("1.234,5", 1234.5),
        ("12.345.678", 12345678.0),
        ("1 234,5", 1234.5),
        ("1\u00a0234", 1234.0),
        ("1\u202f234", 1234.0),
    ],
)
def test_thousands_beside_decimal_commas(written: str, value: float) -> None:
    numbers = to_numbers(text(written), CODES, thousands=True, decimal="comma")
    assert numbers.value.tolist() == [value]
    assert numbers.had_thousands.tolist() == [True]


def test_codes_beside_decimal_commas() -> None:
    numbers = to_numbers(
        text("n.a.", "-99,9", "-99,90", "-99.9", ""), ["n.a.", "-99,9"], decimal="comma"
    )
    assert numbers.code.tolist() == [1, 2, 2, -1, 0]
    assert numbers.is_text.tolist() == [False, False, False, True, False]


@pytest.mark.parametrize(
    ("column", "value", "code"),
    [
        (pa.array([1, None, -99, 0], pa.int64()), [1.0, None, None, 0.0], [-1, 0, 2, -1]),
        (pa.array([0.5, None, -99.0, math.nan]), [0.5, None, None, None], [-1, 0, 2, 0]),
        (pa.array([0.5, 0.25], pa.float32()), [0.5, 0.25], [-1, -1]),
        (pa.array([], pa.float64()), [], []),
    ],
    ids=["whole numbers", "numbers", "single precision", "none"],
)
def test_numbers_that_the_file_holds(
    column: pa.Array, value: list[float | None], code: list[int]
) -> None:
    numbers = to_numbers(column, CODES)
    wanted = [math.nan if each is None else each for each in value]
    np.testing.assert_array_equal(numbers.value, wanted)
    assert numbers.code.tolist() == code
    assert not (numbers.is_text | numbers.is_not_finite | numbers.had_thousands).any()


def test_infinite_numbers_that_the_file_holds() -> None:
    numbers = to_numbers(pa.array([math.inf, -math.inf, 1.0]), CODES)
    assert numbers.is_not_finite.tolist() == [True, True, False]
    np.testing.assert_array_equal(numbers.value, [math.nan, math.nan, 1.0])


@pytest.mark.parametrize("kind", [pa.string(), pa.large_string()])
def test_text_in_arrays_and_pieces_of_arrays(kind: pa.DataType) -> None:
    whole = pa.array(["junk", "1", "-99", "x", "2.5", "junk"], kind)
    numbers = to_numbers(whole[1:5], CODES)
    np.testing.assert_array_equal(numbers.value, [1.0, math.nan, math.nan, 2.5])
    assert numbers.code.tolist() == [-1, 2, -1, -1]
    assert numbers.is_text.tolist() == [False, False, True, False]
    pieces = pa.chunked_array([whole[1:2], whole[2:5]])
    np.testing.assert_array_equal(to_numbers(pieces, CODES).value, numbers.value)


def test_an_array_is_not_changed() -> None:
    array = pa.array([1.0, -99.0, math.inf])
    to_numbers(array, CODES)
    assert array.to_pylist() == [1.0, -99.0, math.inf]


@pytest.mark.parametrize(
    ("number", "digits"),
    [(10, "10"), (10.0, "10"), (-0.0, "0"), (1.5, "1.5"), (1e20, "1" + "0" * 20), (None, ""),
     (math.nan, ""), (math.inf, "inf"), ("007", "007")],
)  # fmt: skip
def test_digits(number: float | str | None, digits: str) -> None:
    assert as_digits(number) == digits


@pytest.mark.parametrize(
    ("column", "form", "expected"),
    [
        (pa.array([20000131, 2000131, None]), "%Y%m%d", ["2000-01-31", None, None]),
        (pa.array([200001, 20001]), "%Y%m", ["2000-01-01", None]),
        (
            pa.array([20000131.0, math.nan, math.inf, 20000131.5]),
            "%Y%m%d",
            ["2000-01-31", None, None, None],
        ),
        (pa.array([2000, 1999.0]), "%Y", ["2000-01-01", "1999-01-01"]),
        (
            pa.array([datetime.date(2000, 1, 31), None, datetime.date(1700, 1, 1)]),
            "%d/%m/%Y",
            ["2000-01-31", None, None],
        ),
        (pa.array([datetime.date(1850, 2, 3)], pa.date64()), "%Y", ["1850-02-03"]),
        (
            pa.array([datetime.datetime(1999, 12, 31, 23, 59), None]),
            "%Y",
            ["1999-12-31", None],
        ),
        (pa.array(["31.01.2000", "", "x"]), "%d.%m.%Y", ["2000-01-31", None, None]),
        (pa.array(["2000-01-31"], pa.large_string()), "%Y-%m-%d", ["2000-01-31"]),
        (pa.array([], pa.string()), "%Y-%m-%d", []),
        (pa.array([None, None], pa.int64()), "%Y%m%d", [None, None]),
    ],
)
def test_days_of_typed_arrays(column: pa.Array, form: str, expected: list[str | None]) -> None:
    found = to_days(column, form)
    assert found.dtype == "datetime64[D]"
    assert [None if np.isnat(day) else str(day) for day in found] == expected


@pytest.mark.parametrize("unit", ["s", "ms", "us", "ns"])
@pytest.mark.parametrize("zone", [None, "UTC"])
def test_the_last_moment_of_a_day_is_that_day(unit: str, zone: str | None) -> None:
    """Also before 1970, where moments are negative numbers and rounding towards zero gives the next day."""
    ends = pd.period_range("1965-03", periods=120, freq="M").to_timestamp(how="end")
    moments = pa.array(ends.tz_localize(zone)).cast(pa.timestamp("ns", zone))
    floored = pa.array(ends.floor(unit).tz_localize(zone)).cast(pa.timestamp(unit, zone))
    for column in (moments, floored):
        assert to_days(column, "%Y").tolist() == [end.date() for end in ends]


def test_days_of_a_piece_of_an_array() -> None:
    whole = pa.array(["x", "2000-01-31", "2000-02-29", "2000-01-31", "y"])
    found = to_days(whole[1:4], "%Y-%m-%d")
    assert [str(day) for day in found] == ["2000-01-31", "2000-02-29", "2000-01-31"]


def to_months(written: pd.Series, form: str) -> pd.Series:
    """The last day of the month of each date, as a study of months dates it; NaT where there is none."""
    days = to_days(written, form)
    ends = Months().date(Months().number(days)).astype("datetime64[ms]")
    return pd.Series(ends).mask(np.isnat(days))


def ends(dates: pd.Series) -> list[str]:
    return ["" if pd.isna(d) else d.strftime("%Y-%m-%d") for d in dates]


@pytest.mark.parametrize(
    ("form", "written", "expected"),
    [
        ("%Y-%m-%d", "2000-02-03", "2000-02-29"),
        ("%Y-%m-%d", "1999-12-31", "1999-12-31"),
        ("%Y-%m-%d", "2000-02-30", ""),
        ("%Y-%m-%d", "2000-13-01", ""),
        ("%Y-%m-%d", "2000-01", ""),
        ("%Y-%m-%d", "2000-01-31 09:00", ""),
        ("%Y-%m-%d", "", ""),
        ("%Y-%m-%d", "1799-12-31", ""),
        ("%Y-%m-%d", "1800-01-01", "1800-01-31"),
        ("%Y-%m-%d", "2200-12-01", "2200-12-31"),
        ("%Y-%m-%d", "2201-01-01", ""),
        ("%Y-%m-%d", "9999-12-31", ""),
        ("%Y%m%d", "20000131", "2000-01-31"),
        ("%Y%m%d", "2000131", ""),
        ("%Y%m%d", "200001", ""),
        ("%Y%m", "200001", "2000-01-31"),
        ("%Y%m", "20001", ""),
        ("%Y%m", "946598400000000000", ""),
        ("%d.%m.%Y", "31.01.2000", "2000-01-31"),
        ("%m/%d/%y", "01/31/99", "1999-01-31"),
        ("%d %b %Y", "31 Jan 2000", "2000-01-31"),
    ],
)
def test_months(form: str, written: str, expected: str) -> None:
    assert ends(to_months(text(written), form)) == [expected]


@settings(max_examples=50, deadline=None)
@given(st.lists(st.dates(datetime.date(1700, 1, 1), datetime.date(2300, 12, 31)), min_size=1))
def test_months_agree_with_the_calendar(days: list[datetime.date]) -> None:
    found = to_months(text(*[day.isoformat() for day in days]), "%Y-%m-%d")
    for day, end in zip(days, found, strict=True):
        if 1800 <= day.year <= 2200:
            following = datetime.date(day.year + day.month // 12, day.month % 12 + 1, 1)
            assert end == pd.Timestamp(following) - pd.Timedelta(days=1)
        else:
            assert pd.isna(end)


@pytest.mark.parametrize(
    ("form", "said"),
    [
        ("%Q-%m", "'%Q-%m' is no format for dates: %Q is not known"),
        ("%Y-%m-%", "'%Y-%m-%' is no format for dates: % is not known"),
        ("%Y-%m-%d %z", "'%Y-%m-%d %z' is no format for dates: %z is not known"),
        ("%Y-%m-%Y", "'%Y-%m-%Y' is no format for dates: %Y stands twice"),
        ("%d/%m", "'%d/%m' gives no year"),
        ("%Y", "'%Y' gives no month"),
    ],
)
def test_formats_that_give_no_month(form: str, said: str) -> None:
    with pytest.raises(KnownProblem) as caught:
        check_date_format(examples.reading("raw/r.csv", {}, dates=form))
    assert str(caught.value) == (
        f"The raw data cannot be used; nothing was written.\n"
        f"  raw/r.csv, dates: {said}\n    → as in %Y-%m-%d"
    )


@pytest.mark.parametrize(
    "form", ["%Y-%m", "%Y%m%d", "%d %b %y", "%Y-%j", "%Y-%m-%d %H:%M:%S", "%%%Y%m"]
)
def test_formats_that_do(form: str) -> None:
    check_date_format(examples.reading("raw/r.csv", {}, dates=form))
    to_months(text("x"), form)


def test_daily_data_need_a_day() -> None:
    for form in ("%Y-%m-%d", "%Y-%j"):
        check_date_format(examples.reading("raw/r.csv", {}, dates=form), daily=True)
    with pytest.raises(KnownProblem, match="'%Y-%m' gives no day"):
        check_date_format(examples.reading("raw/r.csv", {}, dates="%Y-%m"), daily=True)
