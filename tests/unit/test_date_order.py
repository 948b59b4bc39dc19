"""How dates are written, found out from the data: only where they leave no doubt."""

from __future__ import annotations

from datetime import date, datetime
from typing import Any

import pyarrow as pa
import pytest
from hypothesis import given
from hypothesis import strategies as st

from lineproof.intake.date_order import DateOrder, date_format
from lineproof.intake.values import check_date_format
from lineproof.problems import KnownProblem

READING: dict[str, Any] = {"label": "returns.csv", "columns": {"date": "day"}, "missing": ["NA"]}
HEAD = "The raw data cannot be used; nothing was written.\n  returns.csv, column day: "
FORMS = [
    *("%Y-%m-%d", "%Y/%m/%d", "%Y.%m.%d", "%Y%m%d", "%d%b%Y", "%d-%b-%Y", "%d %b %Y", "%d %B %Y"),
    *("%Y-%m-%d %H:%M:%S", "%Y-%m-%dT%H:%M:%S"),
    *("%b %d %Y", "%b %d, %Y", "%B %d, %Y"),
    *("%Y%m", "%Y-%m", "%Y/%m", "%m/%Y", "%m-%Y", "%m.%Y", "%b %Y", "%b-%Y"),
]
EITHER = ["%d/%m/%Y", "%m/%d/%Y", "%d.%m.%Y", "%m-%d-%Y"]
DATES = st.dates(date(1800, 1, 1), date(2200, 12, 31))


def refused(*texts: str) -> str:
    with pytest.raises(KnownProblem) as caught:
        date_format(texts, READING)
    return str(caught.value).removeprefix(HEAD)


@pytest.mark.fault(10)
@pytest.mark.parametrize("form", FORMS)
@given(st.lists(DATES, min_size=1))
def test_clear_forms_are_found(form: str, dates: list[date]) -> None:
    texts = [f"{datetime(d.year, d.month, d.day):{form}}" for d in dates]
    found = date_format(texts, READING)
    check_date_format({**READING, "dates": found})
    read = [datetime.strptime(text, found) for text in texts]
    assert read == [datetime.strptime(text, form) for text in texts]


@pytest.mark.parametrize("form", EITHER)
@given(st.lists(DATES, min_size=1, unique=True))
def test_the_order_of_day_and_month_is_decided_by_a_day_above_12_only(
    form: str, dates: list[date]
) -> None:
    texts = [f"{d:{form}}" for d in dates]
    if any(d.day > 12 for d in dates):
        assert date_format(texts, READING) == form
    else:
        assert "the order of its dates is ambiguous" in refused(*texts)


@pytest.mark.fault(9)
def test_an_ambiguous_order_stops() -> None:
    assert refused("03/04/2001", "04/05/2001", "01/01/2001", "NA", "") == (
        "the order of its dates is ambiguous: 03/04/2001 could be 3 April or 4 March 2001\n"
        '    → set dates: "%d/%m/%Y" or dates: "%m/%d/%Y"'
    )
    assert refused("03.03.2001").startswith(
        "the order of its dates is ambiguous: 03.03.2001 does not say which is the day\n"
    )


@pytest.mark.fault(9)
def test_an_order_that_contradicts_itself_stops() -> None:
    assert refused("31/01/2001", "01/31/2001", "01/02/2001") == (
        "its dates contradict one another: 31/01/2001 has the day first, 01/31/2001 the month\n"
        '    → set dates: "%d/%m/%Y" or dates: "%m/%d/%Y", and the other rows are set aside'
    )


@pytest.mark.fault(9)
@pytest.mark.parametrize(
    "texts", [("31/01/01", "28/02/01"), ("01-01-31",), ("310101", "280299"), ("1/86", "11/86")]
)
def test_two_digit_years_are_refused(texts: tuple[str, ...]) -> None:
    first = min(texts)
    assert refused(*texts) == (
        f"its years have two digits, as in {first}, which leaves the century open\n"
        "    → write years with four digits, or set dates: with %y"
    )


def test_what_has_no_form_is_shown() -> None:
    assert refused("2001-01-31", "31/01/2001", "Q1 2001") == (
        "its dates have no one form, as in '2001-01-31', '31/01/2001', 'Q1 2001'\n"
        "    → set dates:, as in %Y-%m-%d"
    )
    assert refused("NA", "").startswith("no row has a date\n")


@pytest.mark.parametrize("texts", [("1", "17", "9"), ("1989", "1990", "2001"), ("1", "254", "40")])
def test_numbers_that_are_no_dates(texts: tuple[str, ...]) -> None:
    """Days or years alone, and numbers of rows."""
    first, *_, last = sorted(texts)
    assert refused(*texts) == (
        f"it holds numbers that are no dates, as {first} and {last}\n"
        "    → name the column of the dates; of a date in parts make one column, as in 2000-01-31"
    )


def test_a_few_rows_that_do_not_fit_are_left_to_be_set_aside() -> None:
    texts = [f"2001-{m:02d}-28" for m in range(1, 13)]
    assert date_format([*texts, "2001-13-45", "never", "31/01/2001"], READING) == "%Y-%m-%d"


def test_days_above_31_decide_nothing() -> None:
    texts = [f"{d:02d}/{m:02d}/2001" for d in range(1, 13) for m in range(1, 13)]
    assert "ambiguous" in refused(*texts, "45/01/2001", "01/45/2001")


def test_texts_are_collected_over_blocks() -> None:
    one, other = DateOrder(), DateOrder()
    one.add(pa.array(["01/02/2001", "", None, "01/02/2001"]))
    other.add(pa.chunked_array([["13/02/2001"], ["01/03/2001"]]))
    one.merge(other)
    assert one.texts == {"01/02/2001", "13/02/2001", "01/03/2001"}
    assert one.found(READING) == "%d/%m/%Y"


@pytest.mark.fault(10)
@pytest.mark.parametrize("kind", [pa.int64(), pa.int32(), pa.float64()])
def test_whole_numbers_are_dates_and_never_counts_of_nanoseconds(kind: pa.DataType) -> None:
    order = DateOrder()
    order.add(pa.array([20010131, None, 20010228], pa.int64()).cast(kind))
    assert order.found(READING) == "%Y%m%d"


def test_typed_dates_need_no_format() -> None:
    for typed in (pa.array([date(2001, 3, 4)]), pa.array([datetime(2001, 3, 4)])):
        order = DateOrder()
        order.add(typed)
        assert order.found(READING) is None


def test_a_column_that_holds_no_dates_does_not_fill_the_memory() -> None:
    order = DateOrder()
    for first in range(0, 600_000, 100_000):
        order.add(pa.array([f"id{i}" for i in range(first, first + 100_000)]))
    assert len(order.texts) <= 300_001
    with pytest.raises(KnownProblem, match="more than 200,000 different values"):
        order.found(READING)
