"""The whole intake: the months of the study, nothing lost, and the demo market read as it was planted."""

from __future__ import annotations

import csv
import io
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest
from tests.unit import intake_examples as examples
from tests.unit.intake_examples import (
    Validated,
    aside,
    fault,
    kept,
    lines,
    monthly_file,
    months,
    refused,
    validate,
)

from lineproof.demo import make_demo
from lineproof.frames import CONTRACTS

ROW = "A,2000-01-31,0.01,,1,1"


# Fault 28: the months of market and riskless rate bound the study.


def rows_of(first: str, n: int) -> list[str]:
    return [f"A,{month}-28,0.05,,1,1" for month in months(first, n)]


@pytest.mark.fault(28)
def test_the_study_ends_at_the_last_common_month(tmp_path: Path) -> None:
    found = validate(
        tmp_path,
        lines(*rows_of("1999-12", 8)),
        market=dict.fromkeys(months("1999-01", 17), 0.01),  # to 2000-05
        riskless=dict.fromkeys(months("2000-02", 12), 0.002),
    )
    assert kept(found) == [("A", month) for month in months("2000-02", 4)]
    said = "no market or riskless return in that month"
    assert aside(found) == [
        (line, 28, f"{said}: {day}", f"A,{day},0.05,,1,1")
        for line, day in (
            (2, "1999-12-28"),
            (3, "2000-01-28"),
            (8, "2000-06-28"),
            (9, "2000-07-28"),
        )
    ]
    assert found.intake["span"] == [
        "2 rows of returns dated before 2000-02, where raw/riskless.csv begins: the study begins there",
        "2 rows of returns dated after 2000-05, where raw/market.csv ends: the study ends there",
    ]
    assert (found.intake["first"], found.intake["last"]) == ("2000-02", "2000-05")
    assert len(found.market) == 4


def test_both_series_may_bound_the_study(tmp_path: Path) -> None:
    found = validate(tmp_path, lines(*rows_of("2000-12", 2)))
    assert found.intake["span"] == [
        "1 row of returns dated after 2000-12, where raw/market.csv and raw/riskless.csv ends: the study ends there"
    ]


def test_returns_within_the_market_say_nothing(tmp_path: Path) -> None:
    found = validate(tmp_path, lines(*rows_of("2000-03", 2)))
    assert found.intake["span"] == []
    assert found.market["date"].dt.strftime("%Y-%m").tolist() == ["2000-03", "2000-04"]


def test_no_month_in_common(tmp_path: Path) -> None:
    market = dict.fromkeys(months("1990-01", 3), 0.01)
    assert refused(tmp_path, lines(ROW), market=market) == (
        "Nothing is left to study.\n"
        "  raw/market.csv: it has no month in common with raw/riskless.csv\n    → compare the dates"
    )
    assert refused(tmp_path, lines("A,1990-01-31,0.01,,1,1")) == (
        "Nothing is left to study. Every row is set aside.\n"
        "  raw/returns.csv: 1 row with no market or riskless return in that month\n"
        "    → line 2 has no market or riskless return in that month: 1990-01-31"
    )


def test_excess_returns_by_hand(tmp_path: Path) -> None:
    texts = {
        "returns": lines("A,2000-01-31,3,,1,1"),
        "market": monthly_file("mkt", {"2000-01": 0.02}),
        "riskless": monthly_file("rf", {"2000-01": 6.0}),
    }
    files = {n: [examples.write(tmp_path / f"{n}.csv", text)] for n, text in texts.items()}
    options: dict[str, Any] = {
        "returns": examples.returns_reading(unit="percent"),
        "market": examples.reading("m", {"date": "month", "return": "mkt"}, dates="%Y-%m"),
        "riskless": examples.reading(
            "f", {"date": "month", "rate": "rf"}, dates="%Y-%m", unit="percent"
        ),
        "riskless_quoted": "annual_yield",
        "rules": examples.RULES,
    }
    riskless = 0.004867550565343048  # 1.06^(1/12) − 1
    total, excess = (
        examples.run(tmp_path, files, **options, market_is=kind) for kind in ("total", "excess")
    )
    # Differences of numbers below 0.1 are right to a few units of 1e-17.
    np.testing.assert_allclose(total.market["riskless"], [riskless], rtol=0, atol=5e-16)
    np.testing.assert_allclose(total.market["market_excess"], [0.02 - riskless], rtol=0, atol=5e-16)
    assert excess.market["market_excess"].tolist() == [0.02]
    for found in (total, excess):
        np.testing.assert_allclose(
            found.panel["excess_return"], [0.03 - riskless], rtol=0, atol=5e-16
        )


def test_further_columns_are_kept_as_text(tmp_path: Path) -> None:
    columns = {**examples.COLUMNS, "sector": "sec", "exit_reason": "why"}
    text = lines(ROW + ", banks ,007", header=examples.HEADER + ",sec,why")
    panel = validate(tmp_path, text, columns=columns).panel
    assert panel[["sector", "exit_reason"]].to_numpy().tolist() == [["banks", "007"]]


# The demo market, whose faults are known.

AT_ONCE = {5, 8, 13, 14, 15}  # set aside by number; 19 and 23 by kind
FLAGGED = {7, 12, 16, 20, 21, 22, 24, 25}


@pytest.fixture(scope="module")
def demo() -> dict[str, Any]:
    return make_demo(n_securities=60, first="1990-01", last="2004-12", seed=7)


@pytest.fixture(scope="module")
def found(demo: dict[str, Any], tmp_path_factory: pytest.TempPathFactory) -> Validated:
    folder = tmp_path_factory.mktemp("demo")
    files = {
        name: [examples.write(folder / f"{name}.csv", demo[f"{name}.csv"])]
        for name in ("returns", "market", "riskless")
    }
    monthly = {"dates": "%Y-%m", "unit": "percent"}
    columns = {
        **{name: name for name in ("security", "date", "price", "size", "sector")},
        **{"return": "ret", "final_return": "final_ret", "exit_reason": "exit_code"},
    }
    return examples.run(
        folder,
        files,
        returns=examples.reading("returns.csv", columns, missing=["", "NA", "-99"]),
        market=examples.reading("m", {"date": "month", "return": "total_return"}, **monthly),
        market_is="total",
        riskless=examples.reading("f", {"date": "month", "rate": "annual_yield"}, **monthly),
        riskless_quoted="annual_yield",
        rules={**examples.RULES, "screens": [{"column": "price", "at_least": 1}]},
    )


def planted_aside(truth: pd.DataFrame) -> pd.DataFrame:
    return truth[
        truth["fault"].isin(AT_ONCE)
        | ((truth["fault"] == 19) & (truth["kind"] == "different"))
        | ((truth["fault"] == 23) & (truth["kind"] == "blank identifier"))
    ]


def test_rows_set_aside_are_exactly_those_planted(demo: dict, found: Validated) -> None:
    planted = planted_aside(demo["truth_faults"]).sort_values("line")
    assert set(planted["fault"]) == AT_ONCE | {19, 23}
    for column in ("line", "fault", "raw"):
        assert found.set_aside[column].tolist() == planted[column].tolist()


def test_exact_duplicates_are_exactly_those_planted(demo: dict, found: Validated) -> None:
    truth = demo["truth_faults"]
    n_planted = ((truth["fault"] == 19) & (truth["kind"] == "identical")).sum()
    assert found.intake["exact_duplicates"] == n_planted > 0


@pytest.mark.parametrize("number", sorted(FLAGGED))
def test_flags_count_at_least_what_was_planted(demo: dict, found: Validated, number: int) -> None:
    truth = demo["truth_faults"]
    n_planted = (truth["fault"] == number).sum()
    assert n_planted > 0
    if number in {
        7,
        20,
        25,
    }:  # also blanks of 23, holes left by rows set aside, blank final returns
        assert fault(found, number)["n"] >= n_planted
    else:
        assert fault(found, number)["n"] == n_planted


def test_rows_kept_are_the_true_ones_less_the_faulty(demo: dict, found: Validated) -> None:
    truth = demo["truth_faults"]
    gone = set(planted_aside(truth)[["security", "date"]].itertuples(index=False, name=None))
    listed = list(demo["truth_betas"][["security", "date"]].itertuples(index=False, name=None))
    place = {each: position for position, each in enumerate(listed)}
    for kind, length in (("hole of 1", 1), ("hole of 4", 4)):
        after = truth.loc[truth["kind"] == kind, ["security", "date"]]
        for each in after.itertuples(index=False, name=None):
            gone |= set(listed[place[each] - length : place[each]])
    expected = [(security, date[:7]) for security, date in listed if (security, date) not in gone]
    assert kept(found) == expected


def test_values_kept_are_those_of_the_file(demo: dict, found: Validated) -> None:
    def number(text: str) -> float:
        return float("nan") if text.strip() in {"", "NA", "-99"} else float(text)

    skip = set(planted_aside(demo["truth_faults"])["line"])
    expected = {}
    rows = csv.reader(io.StringIO(demo["returns.csv"]))
    header = next(rows)
    for line, fields in enumerate(rows, start=2):
        if line not in skip:
            row = dict(zip(header, map(str.strip, fields), strict=True))
            ret, final = number(row["ret"]), number(row["final_ret"])
            total = ret if np.isnan(final) else (1 + np.nan_to_num(ret)) * (1 + final) - 1
            size = number(row["size"])
            expected[row["security"], row["date"][:7]] = (
                total,
                size if size > 0 else np.nan,
                number(row["price"]),
                row["sector"],
            )
    columns = ["total_return", "size", "price", "sector"]
    values = found.panel[columns].itertuples(index=False, name=None)
    for key, row in zip(kept(found), values, strict=True):
        np.testing.assert_equal(row, expected[key])


def test_leavers_are_those_of_the_truth(demo: dict, found: Validated) -> None:
    last = demo["truth_betas"].groupby("security")["date"].max()
    left = {(s, d[:7]) for s, d in last.items() if d[:7] < "2004-12"}
    panel = found.panel[found.panel["leaves"]]
    assert set(zip(panel["security"], panel["date"].dt.strftime("%Y-%m"), strict=True)) == left


def test_tables_fit_their_contracts(found: Validated) -> None:
    CONTRACTS["panel"].validate(found.panel)
    CONTRACTS["market"].validate(found.market)
    CONTRACTS["set_aside"].validate(found.set_aside)


def test_nothing_set_aside_fits_the_contract(tmp_path: Path) -> None:
    clean = validate(tmp_path, lines(ROW))
    assert clean.set_aside.empty
    CONTRACTS["set_aside"].validate(clean.set_aside)


def test_counts_of_the_intake(found: Validated, demo: dict) -> None:
    counts = found.intake
    assert counts["rows_read"] == len(demo["returns.csv"].splitlines()) - 1
    assert counts["rows_kept"] == len(found.panel)
    assert counts["rows_set_aside"] == len(found.set_aside)
    assert counts["rows_read"] == (
        counts["rows_kept"] + counts["rows_set_aside"] + counts["exact_duplicates"]
    )
    assert counts["n_missing_returns"] == found.panel["total_return"].isna().sum()
    assert (
        counts["rows_screened"]
        == (found.panel["price"] < 1).sum() + found.panel["price"].isna().sum()
    )


@pytest.mark.parametrize("build", ["size", "equal"])
def test_a_built_market_shows_what_every_row_weighs(tmp_path: Path, build: str) -> None:
    """The market is the mean of the panel's returns by the panel's own weights, which are sizes of the month before."""
    rng = np.random.default_rng(5)
    rows = [
        f"{name},{month}-28,{rng.normal(0, 0.1):.6f},,{rng.integers(1, 900)},9"
        for name in "ABCD"
        for month in months("2000-01", 6)
    ]
    riskless = monthly_file("rf", dict.fromkeys(months("2000-01", 6), 0.002))
    found = examples.run(
        tmp_path,
        {
            "returns": [examples.write(tmp_path / "r.csv", lines(*rows))],
            "riskless": [examples.write(tmp_path / "f.csv", riskless)],
        },
        returns=examples.returns_reading(),
        market_build=build,
        riskless=examples.reading("f", {"date": "month", "rate": "rf"}, dates="%Y-%m"),
        rules=examples.RULES,
    )
    panel = found.panel
    total = (panel["market_weight"] * panel["total_return"]).groupby(panel["date"]).sum()
    weight = panel["market_weight"].groupby(panel["date"]).sum()
    market = (total / weight)[weight > 0] - 0.002
    assert market.index.tolist() == found.market["date"].tolist()
    # Means of four numbers, added up in two ways.
    np.testing.assert_allclose(found.market["market_excess"], market, rtol=0, atol=1e-15)
    if build == "size":
        lagged = panel.groupby("security")["size"].shift().fillna(0.0)
        known = panel.groupby("security")["size"].shift().notna()
        np.testing.assert_array_equal(panel.loc[known, "market_weight"], lagged[known])
