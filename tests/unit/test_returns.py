"""Raw returns: each fault by a tiny file, with the full message or the exact rows set aside."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from tests.unit import intake_examples as examples
from tests.unit.intake_examples import aside, fault, kept, lines, refused, validate

SOUND = "000A,2000-01-31,0.01,,100,5"


def grid(n_securities: int, n_months: int, value: str, day: str = "28") -> list[str]:
    """Rows of `n_securities` in the first months of 2000, each with the same return."""
    return [
        f"{s:03d},2000-{m:02d}-{day},{value},,1,1"
        for s in range(n_securities)
        for m in range(1, n_months + 1)
    ]


def noisy(scale: float, n: int = 60, mean: float = 0.0) -> list[str]:
    """Rows of ten securities with normal returns of a given standard deviation."""
    values = np.random.default_rng(5).normal(mean, scale, n)
    return [f"{i % 10},2000-{i // 10 + 1:02d}-28,{v:.8f},,1,1" for i, v in enumerate(values)]


# Rows set aside.


@pytest.mark.fault(8)
@pytest.mark.fault(13)
@pytest.mark.fault(14)
@pytest.mark.fault(15)
@pytest.mark.fault(23)
def test_each_row_set_aside_with_its_reason(tmp_path: Path) -> None:
    rows = [
        SOUND,
        "B,2000-01-31,0.01,,100",
        "B,2000-02-30,0.01,,100,5",
        "B,1700-01-31,0.01,,100,5",
        "B,2000-01-31,halted,,100,5",
        "B,2000-02-29,0.01,n.a.,100,5",
        "B,2000-03-31,0.01,,100,see note",
        "B,2000-04-30,inf,,100,5",
        "B,2000-05-31,0.01,,1e999,5",
        "B,2000-06-30,-1.4,,100,5",
        "B,2000-07-31,-99.0,,100,5",
        "B,2000-08-31,0.01,-66,100,5",
        " ,2000-09-30,0.01,,100,5",
        "\"''\",2000-09-30,0.01,,100,5",
        "B,2001-01-31,0.01,,100,5",
        "B,1999-12-31,0.01,,100,5",
    ]
    found = validate(tmp_path, lines(*rows))
    assert kept(found) == [("000A", "2000-01")]
    code = ", which often stands for a missing value; if so, add it to missing:"
    reasons = [
        (5, "too many or too few fields, or a stray quote: 5 fields instead of 6"),
        (8, "a date that does not parse, or outside 1800–2200: '2000-02-30'"),
        (8, "a date that does not parse, or outside 1800–2200: '1700-01-31'"),
        (13, "text in a number column: ret is 'halted'"),
        (13, "text in a number column: final is 'n.a.'"),
        (13, "text in a number column: px is 'see note'"),
        (14, "an infinite value, or one spelt nan: ret is 'inf'"),
        (14, "an infinite value, or one spelt nan: cap is '1e999'"),
        (15, "a return below −100 %: ret is '-1.4'"),
        (15, f"a return below −100 %: ret is '-99.0'{code}"),
        (15, f"a return below −100 %: final is '-66'{code}"),
        (23, "a blank identifier"),
        (23, "a blank identifier"),
        (28, "no market or riskless return in that month: 2001-01-31"),
        (28, "no market or riskless return in that month: 1999-12-31"),
    ]
    assert aside(found) == [
        (line, number, reason, raw)
        for line, ((number, reason), raw) in enumerate(zip(reasons, rows[1:], strict=True), start=3)
    ]
    counts = {f["number"]: f["n"] for f in found.intake["faults"] if f["answer"] == "set aside"}
    assert counts == {5: 1, 8: 2, 13: 3, 14: 2, 15: 3, 23: 2, 28: 2}
    assert fault(found, 15)["examples"] == ["line 11", "line 12", "line 13"]


def test_a_row_with_several_faults_is_set_aside_once(tmp_path: Path) -> None:
    found = validate(tmp_path, lines(SOUND, ",31 May,halted,inf,x,y"))
    assert aside(found) == [(3, 23, "a blank identifier", ",31 May,halted,inf,x,y")]


def test_braces_in_names_and_values_are_shown_as_they_are(tmp_path: Path) -> None:
    columns = {"security": "id", "date": "day", "return": "{ret}"}
    text = lines("A,2000-01-31,0.01", "A,2000-02-29,{0!r}", header="id,day,{ret}")
    assert aside(validate(tmp_path, text, columns=columns)) == [
        (3, 13, "text in a number column: {ret} is '{0!r}'", "A,2000-02-29,{0!r}")
    ]


def test_parquet_rows_are_counted_from_one(tmp_path: Path) -> None:
    file = examples.write_parquet(
        tmp_path / "r.parquet",
        {"id": ["A", "", "B"], "day": ["2000-01-31"] * 3, "ret": [0.1, 0.2, -2.5]},
    )
    columns = {"security": "id", "date": "day", "return": "ret"}
    found = validate(tmp_path, Path(file), columns=columns)
    assert aside(found) == [
        (2, 23, "a blank identifier", ",2000-01-31,0.2"),
        (3, 15, "a return below −100 %: ret is -2.5", "B,2000-01-31,-2.5"),
    ]
    assert fault(found, 15)["examples"] == ["row 3"]


# Faults 7, 10, 11, 23: what is read in spite of its looks.


@pytest.mark.fault(23)
def test_identifiers_are_text_without_blanks_and_quotes(tmp_path: Path) -> None:
    rows = ["007,2000-01-31,0.1,,1,1", " '007' ,2000-02-29,0.1,,1,1", '"7 ",2000-01-31,0.1,,1,1']
    found = validate(tmp_path, lines(*rows))
    assert kept(found) == [("007", "2000-01"), ("007", "2000-02"), ("7", "2000-01")]
    assert fault(found, 7)["n"] == 3  # blanks twice, quotes once


@pytest.mark.fault(7)
def test_thousands_in_sizes_and_prices_only(tmp_path: Path) -> None:
    rows = ['A,2000-01-31,0.1,,"1,234.5","2,000"', 'A,2000-02-29,"1,234",,1,1']
    found = validate(tmp_path, lines(*rows))
    assert found.panel[["size", "price"]].to_numpy().tolist() == [[1234.5, 2000.0]]
    assert fault(found, 7)["n"] == 2
    assert aside(found)[0][:3] == (3, 13, "text in a number column: ret is '1,234'")


@pytest.mark.fault(11)
@pytest.mark.parametrize(
    ("form", "written"), [("%Y%m%d", "20000331"), ("%Y%m", "200003"), ("%Y-%m-%d", "2000-03-30")]
)
def test_integer_dates_and_last_trading_days(tmp_path: Path, form: str, written: str) -> None:
    found = validate(tmp_path, lines(f"A,{written},0.1,,1,1"), dates=form)
    assert found.panel["date"].dt.strftime("%Y-%m-%d").tolist() == ["2000-03-31"]


@pytest.mark.fault(10)
def test_integer_dates_in_parquet(tmp_path: Path) -> None:
    columns = {"security": "id", "date": "day", "return": "ret"}
    file = examples.write_parquet(
        tmp_path / "r.parquet", {"id": [10, 11], "day": [20000131, 20000229], "ret": [0.1, 0.2]}
    )
    found = validate(tmp_path, Path(file), columns=columns, dates="%Y%m%d")
    assert kept(found) == [("10", "2000-01"), ("11", "2000-02")]


# Fault 12: missing codes.


@pytest.mark.fault(12)
def test_missing_returns_by_code(tmp_path: Path) -> None:
    rows = [
        *(f"A,2000-0{m}-28,{v},,1,1" for m, v in enumerate(["", "NA", "-99", "-99.0", "0"], 1)),
        ",2000-01-31,NA,,1,1",  # set aside, so not counted
    ]
    found = validate(tmp_path, lines(*rows), missing=["NA", "-99"])
    assert np.isnan(found.panel["total_return"]).tolist() == [True] * 4 + [False]
    assert found.panel["total_return"].iloc[4] == 0.0
    entry = fault(found, 12)
    assert (entry["n"], entry["kinds"]) == (4, {"empty": 1, "NA": 1, "-99": 2})
    assert entry["examples"] == ["A on 2000-01-28", "A on 2000-02-28", "A on 2000-03-28"]
    assert found.intake["n_missing_returns"] == 4


def test_codes_in_other_columns(tmp_path: Path) -> None:
    columns = {**examples.COLUMNS, "sector": "sec"}
    text = lines("NA,2000-01-31,0.1,NA,NA,NA,NA", header=examples.HEADER + ",sec")
    found = validate(tmp_path, text, columns=columns)
    row = found.panel.iloc[0]
    assert (row["security"], row["sector"]) == ("NA", "")  # an identifier may be NA
    assert np.isnan([row["size"], row["price"]]).all()


# Fault 19: two rows for one security and month.

TWICE = [
    "A,2000-01-31,0.01,,1,1",
    "A,2000-01-31,0.010,,1,1",  # the same day and values: an exact duplicate
    "B,2000-01-31,0.01,,1,1",
    "B,2000-01-31,0.02,,1,1",
    "B,2000-01-31,0.01,,1,1",
    "C,2000-01-31,0.05,,1,1",
]


@pytest.mark.fault(19)
def test_different_rows_of_one_month_are_set_aside(tmp_path: Path) -> None:
    found = validate(tmp_path, lines(*TWICE))
    said = "another, different row of the same security and month: B on 2000-01-31"
    assert aside(found) == [(4, 19, said, TWICE[2]), (5, 19, said, TWICE[3])]
    assert found.intake["exact_duplicates"] == 2
    assert kept(found) == [("A", "2000-01"), ("C", "2000-01")]
    assert fault(found, 19)["n"] == 2


def test_two_days_of_one_month_are_different_rows(tmp_path: Path) -> None:
    rows = ["A,2000-01-31,0.01,,1,1", "A,2000-01-28,0.01,,1,1", SOUND]
    found = validate(tmp_path, lines(*rows))
    said = "another, different row of the same security and month: A on 2000-01"
    assert aside(found) == [(2, 19, f"{said}-31", rows[0]), (3, 19, f"{said}-28", rows[1])]
    assert found.intake["exact_duplicates"] == 0
    assert kept(validate(tmp_path, lines(*rows), same_month_rows="last")) == [
        ("000A", "2000-01"),
        ("A", "2000-01"),
    ]


@pytest.mark.fault(19)
@pytest.mark.parametrize("keep", ["first", "last"])
def test_the_first_or_last_row_may_be_kept(tmp_path: Path, keep: str) -> None:
    found = validate(tmp_path, lines(*TWICE), same_month_rows=keep)
    assert kept(found) == [("A", "2000-01"), ("B", "2000-01"), ("C", "2000-01")]
    assert found.panel["total_return"].tolist() == [0.01, 0.01, 0.05]
    assert found.set_aside["line"].tolist() == [5]  # both the first and the last row say 0.01
    assert found.intake["exact_duplicates"] == 2


def test_first_and_last_differ_where_the_rows_do(tmp_path: Path) -> None:
    text = lines(*TWICE[2:4])
    for keep, value, lost in (("first", 0.01, 3), ("last", 0.02, 2)):
        found = validate(tmp_path, text, same_month_rows=keep)
        assert found.panel["total_return"].tolist() == [value]
        assert found.set_aside["line"].tolist() == [lost]


# Faults 6 (decimal comma), 17, 39 and 40: stops of the whole file.


@pytest.mark.fault(6)
@pytest.mark.parametrize("mark", ["%", " %"])
def test_per_cent_signs(tmp_path: Path, mark: str) -> None:
    text = lines(f"A,2000-01-31,1.5{mark},,1,1", f"A,2000-02-29,-2{mark},,1,1")
    assert refused(tmp_path, text) == (
        "The raw data cannot be used; nothing was written.\n"
        f"  raw/returns.csv, column ret: most numbers end in a per cent sign, as in -2{mark}\n"
        "    → remove the signs, and set unit: percent"
    )


@pytest.mark.fault(6)
def test_decimal_comma(tmp_path: Path) -> None:
    rows = ["A;2000-01-31;0,015;;1;1", "A;2000-02-29;-0,02;;1;1"]
    text = lines(*rows, header=examples.HEADER.replace(",", ";"))
    assert refused(tmp_path, text, separator=";") == (
        "The raw data cannot be used; nothing was written.\n"
        "  raw/returns.csv, column ret: most numbers have a decimal comma, as in -0,02\n"
        "    → set decimal: comma"
    )


def test_decimal_comma_declared(tmp_path: Path) -> None:
    rows = ["A;2000-01-31;0,015;;1.234,5;1", "A;2000-02-29;-,02;;1;2,5", "A;2000-03-31;0.1;;1;1"]
    text = lines(*rows, header=examples.HEADER.replace(",", ";"))
    found = validate(tmp_path, text, separator=";", decimal="comma")
    assert found.panel["total_return"].tolist() == [0.015, -0.02]
    assert found.panel[["size", "price"]].to_numpy().tolist() == [[1234.5, 1.0], [1.0, 2.5]]
    assert aside(found) == [(4, 13, "text in a number column: ret is '0.1'", rows[2])]
    assert fault(found, 7)["n"] == 1


@pytest.mark.fault(17)
def test_percent_declared_decimal(tmp_path: Path) -> None:
    rows = noisy(5.0)
    size = np.abs([float(row.split(",")[2]) for row in rows])
    middle, high = 100 * np.quantile(size, [0.5, 0.95])
    assert refused(tmp_path, lines(*rows)) == (
        "The raw data cannot be used; nothing was written.\n"
        f"  raw/returns.csv, column ret: read as decimal, half of all returns exceed {middle:.3g} % in size "
        f"and one in twenty exceeds {high:.3g} %\n"
        "    → set unit: percent"
    )
    assert len(validate(tmp_path, lines(*rows), unit="percent").panel) == 60


@pytest.mark.fault(17)
def test_decimal_declared_percent(tmp_path: Path) -> None:
    message = refused(tmp_path, lines(*noisy(0.05)), unit="percent")
    assert "column ret: read as percent, half of all returns exceed 0.0" in message
    assert message.endswith("\n    → set unit: decimal")
    assert len(validate(tmp_path, lines(*noisy(0.05))).panel) == 60


@pytest.mark.fault(39)
@pytest.mark.parametrize("unit", ["decimal", "percent"])
def test_prices_delivered_as_returns(tmp_path: Path, unit: str) -> None:
    message = refused(tmp_path, lines(*noisy(5.0, mean=150.0)), unit=unit)
    assert message.endswith(
        "\n    → hardly any is negative: does the column hold prices, or 1 + return? "
        "For prices, name their column under price: and set return: {from: price}"
    )


def test_percent_declared_but_larger_still(tmp_path: Path) -> None:
    message = refused(tmp_path, lines(*noisy(500.0)), unit="percent")
    assert message.endswith("\n    → is this the column of the returns?")


def test_few_returns_say_nothing_of_the_unit(tmp_path: Path) -> None:
    assert len(validate(tmp_path, lines(*grid(1, 3, "0.9"))).panel) == 3


@pytest.mark.fault(40)
def test_daily_data(tmp_path: Path) -> None:
    rows = [
        f"{s},2000-{m:02d}-{d:02d},0.01,,1,1" for s in "AB" for m in (1, 2) for d in range(1, 21)
    ]
    assert refused(tmp_path, lines(*rows)) == (
        "The raw data cannot be used; nothing was written.\n"
        "  raw/returns.csv: declared monthly, but 80 dates in 4 months of single securities, 20 a month: daily data?\n"
        "    → set frequency: daily under data.returns, and they are compounded to months"
    )


def test_a_file_delivered_three_times_is_not_daily(tmp_path: Path) -> None:
    rows = grid(5, 6, "0.01")
    found = validate(tmp_path, lines(*rows, *rows, *rows))
    assert (len(found.panel), found.intake["exact_duplicates"]) == (30, 60)


@pytest.mark.fault(40)
def test_quarterly_data(tmp_path: Path) -> None:
    rows = [f"{s},2000-{m:02d}-28,0.01,,1,1" for s in range(11) for m in (3, 6, 9, 12)]
    assert refused(tmp_path, lines(*rows)) == (
        "The raw data cannot be used; nothing was written.\n"
        "  raw/returns.csv: declared monthly, but a security's next row is typically 3 months on, "
        "in 33 steps from row to row: quarterly data?\n"
        "    → deliver monthly returns"
    )


def test_every_row_set_aside(tmp_path: Path) -> None:
    rows = ["A,31/01/2000,0.01,,1,1", "A,29/02/2000,0.01,,1,1", "A,2000-03-31,x,,1,1"]
    assert refused(tmp_path, lines(*rows)) == (
        "Nothing is left to study. Every row is set aside.\n"
        "  raw/returns.csv: 2 rows with a date that does not parse, or outside 1800–2200\n"
        "    → line 2 has a date that does not parse, or outside 1800–2200: '31/01/2000'\n"
        "  raw/returns.csv: 1 row with text in a number column\n"
        "    → line 4 has text in a number column: ret is 'x'"
    )


def test_names_that_our_tables_use(tmp_path: Path) -> None:
    columns = {**examples.COLUMNS, "leaves": "px"}
    assert refused(tmp_path, lines(SOUND), columns=columns) == (
        "The raw data cannot be used; nothing was written.\n"
        "  raw/returns.csv, columns.leaves: our own tables have a column 'leaves' already\n"
        "    → give it another name"
    )


def test_every_other_row_broken_is_not_quarterly(tmp_path: Path) -> None:
    rows = [row + ",x" * (i % 2) for i, row in enumerate(grid(12, 12, "0.01"))]
    assert len(validate(tmp_path, lines(*rows)).panel) == 72
