"""Series of one value a month: every fault stops, with the full message."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest
from tests.unit import intake_examples as examples
from tests.unit.intake_examples import lines, monthly_file, months, refused

from lineproof.intake.riskless import check_riskless, riskless_return
from lineproof.intake.series import read_series
from lineproof.problems import KnownProblem

YEAR = months("2000-01", 12)
ROW = lines("A,2000-01-31,0.01,,1,1")
HEAD = "The raw data cannot be used; nothing was written.\n"


def read(folder: Path, text: str, columns: dict[str, str] | None = None, **changes: Any):
    file = examples.write(folder / "market.csv", text)
    columns = columns or {"date": "month", "return": "mkt"}
    reading = examples.reading("raw/market.csv", columns, **{"dates": "%Y-%m", **changes})
    return read_series(file, reading, "return").values


def message(*arguments: Any, **options: Any) -> str:
    with pytest.raises(KnownProblem) as caught:
        read(*arguments, **options)
    return str(caught.value)


def test_values_are_decimal_and_sorted(tmp_path: Path) -> None:
    text = "month,mkt\n2000-02, 2.5 \n2000-01,-100\n"
    found = read(tmp_path, text, unit="percent")
    assert found["date"].dt.strftime("%Y-%m-%d").tolist() == ["2000-01-31", "2000-02-29"]
    assert found["return"].tolist() == [-1.0, 0.025]


@pytest.mark.fault(27)
def test_months_missing_inside(tmp_path: Path) -> None:
    values = {m: 0.01 for m in YEAR if m not in {"2000-03", "2000-07"}} | {"2000-09": "NA"}
    assert refused(tmp_path, ROW, market=values) == (
        f"{HEAD}  raw/market.csv: 3 months missing inside the series: 2000-03, 2000-07, 2000-09\n"
        "    → deliver them, or shorten the series"
    )
    assert "  raw/riskless.csv: 3 months missing" in refused(tmp_path, ROW, riskless=values)


def test_many_months_missing_inside(tmp_path: Path) -> None:
    text = monthly_file("mkt", {"1999-11": 0.1, "2001-12": 0.1})
    assert message(tmp_path, text) == (
        f"{HEAD}  raw/market.csv: 24 months missing inside the series: 1999-12, {', '.join(YEAR[:11])} "
        "and 12 more\n    → deliver them, or shorten the series"
    )


def test_missing_values_at_the_ends_only_shorten(tmp_path: Path) -> None:
    found = read(
        tmp_path, monthly_file("mkt", {**dict.fromkeys(YEAR, 0.01), YEAR[0]: "", YEAR[11]: "NA"})
    )
    assert len(found) == 10


@pytest.mark.fault(31)
def test_months_twice(tmp_path: Path) -> None:
    text = "month,mkt\n2000-02,0.1\n2000-01,0.1\n2000-01,0.2\n2000-02,0.1\n2000-02,0.1\n"
    assert message(tmp_path, text) == (
        f"{HEAD}  raw/market.csv: months that stand twice: 2000-01, 2000-02\n    → keep one row a month"
    )


def test_rows_that_cannot_be_read(tmp_path: Path) -> None:
    text = "month,mkt\n2000-01,0.1\n2000-02,0.1,x\n\n2000-13,0.1\n2000-04,closed\n2000-05,inf\n"
    assert message(tmp_path, text) == (
        f"{HEAD}"
        "  raw/market.csv, line 3: it has 3 fields instead of 2\n    → mend the row\n"
        "  raw/market.csv, line 5, column month: '2000-13' is not a date of the form %Y-%m\n"
        "    → mend it, or set dates:\n"
        "  raw/market.csv, line 6, column mkt: 'closed' is not a number\n"
        "    → mend it, or list it under missing:\n"
        "  raw/market.csv, line 7, column mkt: 'inf' is not a number\n"
        "    → mend it, or list it under missing:"
    )


def test_only_the_first_of_many_bad_rows_are_listed(tmp_path: Path) -> None:
    said = message(tmp_path, monthly_file("mkt", dict.fromkeys(months("2000-01", 15), "x")))
    assert said.count("'x' is not a number") == 12
    assert said.endswith("\n  raw/market.csv, column mkt: 3 more rows like this")


def test_no_value_at_all(tmp_path: Path) -> None:
    assert message(tmp_path, "month,mkt\n2000-01,NA\n") == (
        f"{HEAD}  raw/market.csv: no row has both a date and a value\n    → deliver it again"
    )


def test_market_in_another_unit(tmp_path: Path) -> None:
    values = np.random.default_rng(3).normal(1, 5, 60).round(3)
    text = monthly_file("mkt", dict(zip(months("2000-01", 60), values, strict=True)))
    middle, high = 100 * np.quantile(np.abs(values), [0.5, 0.95])
    assert message(tmp_path, text) == (
        f"{HEAD}  raw/market.csv, column mkt: read as decimal, half of all returns exceed {middle:.3g} % in size "
        f"and one in twenty exceeds {high:.3g} %\n    → set unit: percent"
    )


def test_test_assets_may_have_gaps_but_no_month_twice(tmp_path: Path) -> None:
    columns = {"asset": "name", "date": "month", "return": "ret"}
    text = "name,month,ret\nb,2000-01,0.1\na,2000-03,0.2\na,2000-01,0.3\n"
    found = read(tmp_path, text, columns)
    assert found["asset"].tolist() == ["a", "a", "b"]
    assert found["return"].tolist() == [0.3, 0.2, 0.1]
    assert message(tmp_path, text + "a,2000-03,0.2\n", columns) == (
        f"{HEAD}  raw/market.csv: months that stand twice: a 2000-03\n    → keep one row a month"
    )
    assert message(tmp_path, text + "market,2000-03,0.2\nx/y,2000-03,0.2\n", columns) == (
        f"{HEAD}  raw/market.csv, column name: test assets may not be called 'market', 'x/y'\n"
        "    → these names stand for other rows of the estimates or for spreads, and / parts an address: rename them"
    )


def test_riskless_return_by_hand() -> None:
    rate = pd.Series([0.0, 0.12, 0.05, -1.5])
    monthly = riskless_return(rate, "annual_yield")
    # 1.12^(1/12) and 1.05^(1/12) by logarithms: ln 1.12 = 0.1133286853, ln 1.05 = 0.0487901642.
    by_hand = [0.0, np.expm1(0.1133286853 / 12), np.expm1(0.0487901642 / 12), np.nan]
    # The logarithms have ten digits: an error of 5e-11 in them is one of 5e-12 in the result.
    np.testing.assert_allclose(monthly, by_hand, rtol=0, atol=5e-12)
    np.testing.assert_allclose(
        (1 + monthly[:3]) ** 12 - 1, rate[:3], rtol=0, atol=1e-14
    )  # rounding
    assert riskless_return(rate, "period_return").tolist() == rate.tolist()


@pytest.mark.fault(29)
@pytest.mark.parametrize(
    ("rate", "quoted", "unit", "said"),
    [
        (
            {"2000-05": 0.05, "2000-06": 0.07},
            "period_return",
            "decimal",
            "read as period_return in decimal, 2 months would earn beyond 3 % without risk; "
            "the rate of 2000-06 would be 7 %",
        ),
        (
            {"2000-05": 5.25},
            "annual_yield",
            "decimal",
            "read as annual_yield in decimal, 1 month would earn beyond 3 % without risk; "
            "the rate of 2000-05 would be 525 %",
        ),
        (
            {"2000-05": -9.99},
            "annual_yield",
            "percent",
            "read as annual_yield in percent, 1 month would earn beyond 3 % without risk; "
            "the rate of 2000-05 would be -999 %",
        ),
    ],
)
def test_implausible_riskless_rate(rate: dict, quoted: str, unit: str, said: str) -> None:
    dates = pd.PeriodIndex([*YEAR[:4], *rate], freq="M").to_timestamp(how="end").normalize()
    series = pd.DataFrame({"date": dates, "rate": [0.002] * 4 + list(rate.values())})
    series["riskless"] = riskless_return(series["rate"], quoted)
    reading = examples.reading("raw/riskless.csv", {"date": "month", "rate": "rf"}, unit=unit)
    with pytest.raises(KnownProblem) as caught:
        check_riskless(series, reading, quoted)
    assert str(caught.value) == (
        f"{HEAD}  raw/riskless.csv, column rf: {said}\n    → check unit: and quoted:"
    )


def test_a_high_but_plausible_rate_passes() -> None:
    dates = pd.to_datetime(["2000-01-31"])
    series = pd.DataFrame({"date": dates, "rate": [0.03], "riskless": [0.03]})
    check_riskless(series, examples.reading("r", {"rate": "rf"}), "period_return")


# Series of days, and frequencies that are not as declared.


def read_as(folder: Path, text: str, frequency: str, **changes: Any) -> pd.DataFrame:
    file = examples.write(folder / "market.csv", text)
    columns = changes.pop("columns", {"date": "date", "return": "mkt"})
    reading = examples.reading("raw/market.csv", columns, **changes)
    return read_series(file, reading, "return", frequency).values


def refused_as(*arguments: Any, **options: Any) -> str:
    with pytest.raises(KnownProblem) as caught:
        read_as(*arguments, **options)
    return str(caught.value)


def daily_file(first: str, end: str, step: int = 1) -> str:
    days = np.arange(first, end, dtype="datetime64[D]")
    days = days[np.is_busday(days)][::step]
    return "date,mkt\n" + "".join(f"{day},{0.001 * (-1) ** i}\n" for i, day in enumerate(days))


def test_days_keep_their_dates(tmp_path: Path) -> None:
    found = read_as(tmp_path, "date,mkt\n2000-02-29,0.2\n2000-01-03,0.1\n2000-01-04,NA\n", "daily")
    assert found["date"].dt.strftime("%Y-%m-%d").tolist() == ["2000-01-03", "2000-02-29"]
    assert found["return"].tolist() == [0.1, 0.2]
    assert found["date"].dtype == "datetime64[ms]"


def test_days_twice(tmp_path: Path) -> None:
    text = "date,mkt\n2000-01-04,0.2\n2000-01-03,0.1\n2000-01-03,0.1\n"
    assert refused_as(tmp_path, text, "daily") == (
        f"{HEAD}  raw/market.csv: days that stand twice: 2000-01-03\n    → keep one row a day"
    )


def test_days_need_a_day(tmp_path: Path) -> None:
    assert refused_as(tmp_path, "date,mkt\n2000-01,0.2\n", "daily", dates="%Y-%m") == (
        f"{HEAD}  raw/market.csv, dates: '%Y-%m' gives no day\n"
        "    → as in %Y-%m-%d, or set frequency: monthly"
    )


@pytest.mark.parametrize(
    ("text", "frequency", "said"),
    [
        (
            daily_file("2000-01-01", "2000-07-01"),
            "monthly",
            "declared monthly, but it has 130 dates in 6 months: are these daily or weekly data?\n"
            "    → set frequency: daily, or deliver one value a month",
        ),
        (
            "date,mkt\n"
            + "".join(f"{y}-{m:02d}-28,0.1\n" for y in (2000, 2001) for m in (3, 6, 9, 12)),
            "monthly",
            "declared monthly, but a value is typically 3 months from the next: are these quarterly or yearly data?\n"
            "    → deliver monthly values",
        ),
        (
            "date,mkt\n" + "".join(f"{month}-28,0.1\n" for month in YEAR),
            "daily",
            "declared daily, but it has 12 dates in 12 months: are these monthly data?\n"
            "    → set frequency: monthly",
        ),
        (
            daily_file("2000-01-01", "2000-07-01", step=5),
            "daily",
            "declared daily, but it has 26 dates in 6 months: are these weekly data?\n"
            "    → deliver daily data",
        ),
    ],
    ids=["daily", "quarterly", "monthly", "weekly"],
)
def test_another_frequency_than_declared(
    tmp_path: Path, text: str, frequency: str, said: str
) -> None:
    assert refused_as(tmp_path, text, frequency) == f"{HEAD}  raw/market.csv: {said}"


def test_test_assets_of_another_frequency(tmp_path: Path) -> None:
    rows = daily_file("2000-01-01", "2000-07-01").splitlines()[1:]
    text = "date,mkt,name\n" + "".join(f"{row},{name}\n" for name in "ab" for row in rows)
    columns = {"date": "date", "return": "mkt", "asset": "name"}
    assert refused_as(tmp_path, text, "monthly", columns=columns) == (
        f"{HEAD}  raw/market.csv: declared monthly, but it has 260 dates in 12 months of 2 series: "
        "are these daily or weekly data?\n    → set frequency: daily, or deliver one value a month"
    )


def test_a_month_that_stands_twice_is_no_daily_series(tmp_path: Path) -> None:
    text = "date,mkt\n" + "".join(f"{month}-28,0.1\n" for month in [*YEAR, YEAR[3]])
    assert "months that stand twice: 2000-04" in refused_as(tmp_path, text, "monthly")


@pytest.mark.parametrize(
    ("unit", "size", "said"),
    [
        ("decimal", 1.0, "read as decimal, half of all returns exceed"),
        ("percent", 0.01, "read as percent, half of all returns exceed"),
    ],
)
def test_daily_returns_in_another_unit(tmp_path: Path, unit: str, size: float, said: str) -> None:
    rng = np.random.default_rng(2)
    rows = daily_file("2000-01-01", "2000-07-01").splitlines()
    values = rng.normal(0, size, len(rows) - 1)
    lines_of = [f"{row.split(',')[0]},{v:.6f}" for row, v in zip(rows[1:], values, strict=True)]
    text = "\n".join([rows[0], *lines_of]) + "\n"
    assert said in refused_as(tmp_path, text, "daily", unit=unit)
    other = "percent" if unit == "decimal" else "decimal"
    assert len(read_as(tmp_path, text, "daily", unit=other)) == len(values)


def test_several_files_are_one_series(tmp_path: Path) -> None:
    files = [
        examples.write(
            tmp_path / f"{year}.csv",
            monthly_file("mkt", dict.fromkeys(months(f"{year}-01", 12), 0.01)),
        )
        for year in (2001, 2000)
    ]
    reading = examples.reading("raw/*.csv", {"date": "month", "return": "mkt"}, dates="%Y-%m")
    found = read_series(files, reading, "return").values
    assert len(found) == 24
    assert found["date"].is_monotonic_increasing
    with pytest.raises(KnownProblem) as caught:
        read_series(
            [files[0], examples.write(tmp_path / "bad.csv", "month,mkt\n2000-01,x\n")],
            reading,
            "return",
        )
    assert str(caught.value) == (
        f"{HEAD}  bad.csv, line 2, column mkt: 'x' is not a number\n    → mend it, or list it under missing:"
    )
    with pytest.raises(
        KnownProblem, match=r"raw/\*\.csv: months that stand twice: 2001-01, 2001-02"
    ):
        read_series([files[0], files[0]], reading, "return")


def test_dates_that_are_left_open_are_found_out(tmp_path: Path) -> None:
    """Also for supplied test assets, which nothing else reads before."""
    text = "asset,day,ret\n" + "".join(f"a,{month}/28/2000,0.01\n" for month in range(1, 13))
    columns = {"asset": "asset", "date": "day", "return": "ret"}
    reading = examples.reading("raw/assets.csv", columns, dates=None)
    found = read_series([examples.write(tmp_path / "a.csv", text)], reading, "return").values
    assert found["date"].tolist() == pd.date_range("2000-01-31", periods=12, freq="ME").tolist()


def test_several_files_with_labels_of_their_own_are_one_series(tmp_path: Path) -> None:
    files = [
        examples.write(
            tmp_path / f"{year}.csv",
            "day,ret\n" + "".join(f"{year}-{month:02d}-28,0.01\n" for month in range(1, 13)),
        )
        for year in (2000, 2001)
    ]
    reading = examples.reading("raw/*.csv", {"date": "day", "return": "ret"})
    reading["labels"] = ["raw/2000.csv", "raw/2001.csv"]
    assert len(read_series(files, reading, "return").values) == 24
