"""What `make check` prints."""

from __future__ import annotations

import textwrap
from pathlib import Path

import pytest
from tests.unit.intake_examples import lines, months, validate

from lineproof import store
from lineproof.checking import describe_intake, summary
from lineproof.study import load_study

MARKET = dict.fromkeys(months("2000-01", 3), 0.01)
ROWS = [
    *(f"A,2000-0{m}-28,{v},,1,5" for m, v in ((1, "0.1"), (2, "NA"), (3, "0.1"))),
    *("B,2000-01-31,0.1,,1,0.5",) * 2,
    "B,2000-02-29,x,,1,1",
    *(f"C,2000-0{m}-28,,,1,9" for m in (1, 2, 3, 4)),
]
EXPECTED = """\
    raw/returns.csv: 2000-01 to 2000-03, 3 securities
             10  rows read, of which
              7  kept, 4 of them without a return
              2  set aside
              1  dropped, as exact duplicates of others
    1 row of returns dated after 2000-03, where raw/market.csv ends: the study ends there

    Faults found:
              4  a missing return: kept, flagged
                   3 empty, 1 NA
                   it stays missing; it is never taken as zero
                   A on 2000-02-28, C on 2000-01-28, C on 2000-02-28, …
              1  text in a number column: set aside
                   line 7
              1  a security that leaves without a final return: kept, flagged
                   1 left as it is
                   for a failure, a final return of −30 % is the usual assumption (Shumway 1997)
                   B on 2000-01-31
              1  no market or riskless return in that month: set aside
                   line 11

    Rows that fail a screen, in order; they are kept, but not ranked that month:
              1  of 1 security: not “price at least 1”
"""


def test_summary_of_an_intake(tmp_path: Path) -> None:
    screens = [{"column": "price", "at_least": 1}]
    intake = validate(tmp_path, lines(*ROWS), market=MARKET, screens=screens).intake
    assert "\n".join(describe_intake(intake)) + "\n" == textwrap.dedent(EXPECTED)


def test_clean_data_say_little(tmp_path: Path) -> None:
    rows = ["A,2000-01-31,0.1,,1,5", "B,2000-01-31,0.1,0.1,1,5", "A,2000-02-29,0.1,,1,5"]
    assert describe_intake(validate(tmp_path, lines(*rows)).intake) == [
        "raw/returns.csv: 2000-01 to 2000-02, 2 securities",
        "          3  rows read, of which",
        "          3  kept",
        "          0  set aside",
        "          0  dropped, as exact duplicates of others",
    ]


def test_summary_of_a_study(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    (tmp_path / "mine.yaml").write_text(
        textwrap.dedent(
            """\
            study: {name: mine, title: A study of mine}
            demo: {}
            data:
              returns:
                file: results/mine/raw/returns.csv
                columns: {security: security, date: date, return: ret}
              market: {file: results/mine/raw/market.csv, columns: {date: month, return: total_return}}
              riskless: {file: results/mine/raw/riskless.csv, columns: {date: month, rate: annual_yield}}
            betas: {b: {}}
            portfolios: {ten: {rank_on: b}}
            subperiods: {full: {}}
            """
        )
    )
    intake = validate(tmp_path, lines(*ROWS), market=MARKET).intake
    store.write_json(intake, "results/mine/data/intake.json")
    said = summary(load_study("mine.yaml")).splitlines()
    assert said[0] == "A study of mine (mine.yaml): the study file and its data can be used."
    assert said[2:-2] == describe_intake(intake)
    assert said[-1] == (
        "The rows set aside, as they stand in the file: results/mine/data/set_aside.csv"
    )
