"""What `make check` prints."""

from __future__ import annotations

import re
import textwrap
from collections.abc import Callable
from pathlib import Path

import pytest
from tests.unit import record_examples as examples
from tests.unit.intake_examples import lines, months, validate

from lineproof import store
from lineproof.checking import WIDTH, describe_intake, summary
from lineproof.intake.record import Intake
from lineproof.intake.signed import made_with
from lineproof.problems import KnownProblem
from lineproof.study import load_study
from lineproof.wiring import Wiring

MARKET = dict.fromkeys(months("2000-01", 3), 0.01)
ROWS = [
    *(f"A,2000-0{m}-28,{v},,1,5" for m, v in ((1, "0.1"), (2, "NA"), (3, "0.1"))),
    *("B,2000-01-31,0.1,,1,0.5",) * 2,
    "B,2000-02-29,x,,1,1",
    *(f"C,2000-0{m}-28,,,1,9" for m in (1, 2, 3, 4)),
]
EXPECTED = """\
    raw/returns.csv: 2000-01 to 2000-03, 3 securities
             10  rows read
     =        7  kept, 4 of them without a return
     +        2  set aside
     +        1  dropped, as exact duplicates of others
    raw/market.csv:
              3  rows read
     =        3  kept
    raw/riskless.csv:
             12  rows read
     =        3  kept
     +        9  not used: without a value, or beyond the study
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

    Rows that fail a screen, in order; they are kept, but not ranked on:
              1  row of 1 security: not “price at least 1”

    Securities that leave:
              0  with a final return
              1  without one
                   1 for no reason given: left without one
                 equally weighted mean a month: 10.0000 % with final returns, 10.0000 % without any

    Units and scale:
      unit of the returns: read as decimal, half of all returns exceed 10 % in size and one in
        twenty exceeds 10 %: too few to judge
      the same unit in every month: no month stands out: one unit throughout
      the same unit for every security: none of 0 securities stands out: one unit throughout

    The largest returns, in per cent:
      security  date        before  return  after
      A         2000-01-28           10.00      –
      A         2000-03-28       –   10.00
      B         2000-01-31           10.00
"""
FULL = """\
raw/market.csv:
        320  rows read
 =      312  kept
 +        8  not used: without a value, or beyond the study
"""
ENDING = """\
Securities that leave:
         22  with a final return
         31  without one
               3 for no reason given: left without one
               10 merged: taken as 0.00 %
               18 failed: taken as −30.00 %
             equally weighted mean a month: 0.8123 % with final returns, 0.8877 % without any

Units and scale:
  Unit of the returns: half of all returns lie between −3.2 % and 4.1 %: decimal, as declared
  Unit by month: in 1 month the median size is 102 times its neighbours’: kept, flagged

The largest returns, in per cent:
  security  date         before    return    after
"""


def test_summary_of_an_intake(tmp_path: Path) -> None:
    screens = [{"column": "price", "at_least": 1}]
    intake = validate(tmp_path, lines(*ROWS), market=MARKET, screens=screens).intake
    assert "\n".join(describe_intake(intake)) + "\n" == textwrap.dedent(EXPECTED)


def test_clean_data_say_little(tmp_path: Path) -> None:
    """The mean of the first month is that of 10 % and of 10 % compounded with a final 10 %; the second's is 10 %."""
    rows = ["A,2000-01-31,0.1,,1,5", "B,2000-01-31,0.1,0.1,1,5", "A,2000-02-29,0.1,,1,5"]
    two = dict.fromkeys(("2000-01", "2000-02"), 0.01)
    said = describe_intake(validate(tmp_path, lines(*rows), market=two, riskless=two).intake)
    assert said[:16] == [
        "raw/returns.csv: 2000-01 to 2000-02, 2 securities",
        "          3  rows read",
        " =        3  kept",
        " +        0  set aside",
        " +        0  dropped, as exact duplicates of others",
        "raw/market.csv:",
        "          2  rows read",
        " =        2  kept",
        "raw/riskless.csv:",
        "          2  rows read",
        " =        2  kept",
        "",
        "Securities that leave:",
        "          1  with a final return",
        "          0  without one",
        "             equally weighted mean a month: 12.7500 % with final returns, 10.0000 % without any",
    ]
    assert not any(line.startswith(("Faults", "Rows that fail")) for line in said)


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
    study = load_study("mine.yaml")
    options = Wiring(study).options("validate_returns")
    store.write_json(intake, "results/mine/data/intake.json")
    store.write_json({"made_with": made_with(options)}, "results/mine/data/raw_files.json")
    said = summary(study).splitlines()
    assert said[0] == "A study of mine (mine.yaml): the study file and its data can be used."
    assert said[2:-3] == describe_intake(intake)
    assert said[-2:] == [
        "Rows set aside, as they stand in the file:  results/mine/data/set_aside.csv",
        "The data report, with tables and figures:   results/mine/data_report.html",
    ]
    text = (tmp_path / "mine.yaml").read_text()
    (tmp_path / "mine.yaml").write_text(text.replace("ret}", "ret}\n    unit: percent"))
    with pytest.raises(KnownProblem) as stopped:
        summary(load_study("mine.yaml"))
    assert str(stopped.value).splitlines() == [
        "There is no summary of the data to show.",
        "  results/mine/data/intake.json: it is not the record of mine.yaml as it stands now",
        "    → delete it and check again",
    ]


@pytest.mark.parametrize("make", [examples.usual, examples.daily, examples.earlier, examples.clean])
def test_lines_fit_a_terminal_and_columns_stand_in_line(make: Callable[[], Intake]) -> None:
    said = describe_intake(make())
    assert max(map(len, said)) <= WIDTH
    counts = [line.index("  ", 11) for line in said if re.match(r" [ =+][ \d,]{9}  \S", line)]
    assert set(counts) == {11}


def test_all_parts_of_a_full_record() -> None:
    said = "\n".join(describe_intake(examples.usual()))
    assert FULL in said
    assert ENDING in said


def test_survivors_are_warned_of_first() -> None:
    assert describe_intake(examples.daily())[0].startswith("WARNING: no security ever leaves.")
    assert not any("WARNING" in line for line in describe_intake(examples.usual()))


def test_the_largest_five_are_of_gains_and_losses_together() -> None:
    intake = examples.usual()
    largest = intake["evidence"]["largest"]
    sizes = sorted(
        (abs(each["return_"]) for side in largest.values() for each in side), reverse=True
    )
    said = describe_intake(intake)
    rows = said[said.index("The largest returns, in per cent:") + 2 :]
    shown = [abs(float(row.split()[-2].replace("−", "-"))) for row in rows]
    assert shown == [round(100 * size, 2) for size in sizes[:5]]


def test_rows_that_do_not_add_up_are_never_printed() -> None:
    intake = examples.usual()
    intake["files"][1]["rows_unused"] = 7
    with pytest.raises(
        ValueError, match=r"rows of raw/market.csv do not add up: 320 ≠ 312 \+ 0 \+ 0 \+ 7"
    ):
        describe_intake(intake)


def test_names_from_the_data_cannot_steer_the_terminal() -> None:
    intake = examples.usual()
    intake["faults"][0]["examples"] = ["\x1b[2Jline 7"]
    intake["evidence"]["largest"]["negative"][0]["security"] = "S\x1b[31m\n1"
    said = describe_intake(intake)
    assert all(line.isprintable() for line in said)
    assert any("\N{REPLACEMENT CHARACTER}[2Jline 7" in line for line in said)


def test_several_files_of_returns_are_summed_and_then_told_one_by_one() -> None:
    intake = examples.usual()
    first = intake["files"][0]
    parts = [{**first, "label": "raw/a.csv"}, {**first, "label": "raw/b.csv"}]
    for key in ("rows_read", "rows_kept", "rows_set_aside", "exact_duplicates"):
        parts[1][key] = first[key] // 3
    parts[1]["rows_read"] = sum(
        parts[1][key] for key in ("rows_kept", "rows_set_aside", "exact_duplicates")
    )
    for key in ("rows_read", "rows_kept", "rows_set_aside", "exact_duplicates"):
        parts[0][key] = first[key] - parts[1][key]
    intake["files"][:1] = parts
    said = describe_intake(intake)
    assert said[1] == f"{intake['rows_read']:>11,}  rows read"
    for part in parts:
        at = said.index(f"{part['label']}:")
        assert said[at + 1] == f"{part['rows_read']:>11,}  rows read"
        assert said[at + 2] == f" ={part['rows_kept']:>9,}  kept"
