"""The study file: everything wrong with it is said at once, each with its line, what was found and what to change."""

from __future__ import annotations

import textwrap
from dataclasses import asdict
from pathlib import Path

import pytest

from lineproof.problems import KnownProblem
from lineproof.specs import IntakeSpec
from lineproof.study import load_study
from lineproof.wiring import Wiring

GOOD = textwrap.dedent(
    """\
    study: {name: mine, title: My study}
    data:
      returns:
        file: returns.csv
        columns: {security: id, date: date, return: ret, size: cap}
      market: {file: market.csv, columns: {date: month, return: mkt}}
      riskless: {file: bills.csv, columns: {date: month, rate: bill}}
    betas:
      monthly60: {window: 60, min: 24}
    portfolios:
      ten: {rank_on: monthly60}
    subperiods:
      full: {}
    """
)


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    """A folder with the raw files that GOOD names, empty."""
    for name in ("returns.csv", "market.csv", "bills.csv"):
        (tmp_path / name).touch()
    return tmp_path


def write(folder: Path, text: str) -> Path:
    path = folder / "mine.yaml"
    path.write_text(text, encoding="utf-8")
    return path


def problems(folder: Path, text: str) -> list[str]:
    """The problems found in a study file, each as its text."""
    with pytest.raises(KnownProblem) as caught:
        load_study(write(folder, text))
    assert "nothing was run" in caught.value.headline or "cannot be read" in caught.value.headline
    return [str(problem) for problem in caught.value.problems]


def changed(*edits: tuple[str, str]) -> str:
    text = GOOD
    for old, new in edits:
        assert old in text, old
        text = text.replace(old, new)
    return text


def test_defaults_are_those_of_the_schema(folder: Path) -> None:
    study = load_study(write(folder, GOOD))
    assert (study.level, study.hac_lag, study.market_is, study.riskless_quoted) == (
        0.05,
        None,
        "total",
        "period_return",
    )
    assert study.returns.unit == "decimal"
    assert study.returns.missing == ("", "NA")
    ten = study.sorts["ten"]
    assert (ten.design, ten.ranked.groups, ten.ranked.weights) == ("single_window", (10,), "equal")
    assert (ten.ranked.form_month, ten.ranked.hold, ten.estimates) == (12, 12, ("monthly60",))
    assert (study.paper.main, study.paper.main_subperiod) == ("ten", "full")
    assert study.demo is None


def test_paths_are_relative_to_the_study_file(folder: Path) -> None:
    study = load_study(write(folder, GOOD))
    assert study.returns.files == (str((folder / "returns.csv").resolve()),)
    assert study.returns.label == "returns.csv"


@pytest.mark.fault(33)
@pytest.mark.parametrize(
    ("edit", "expected"),
    [
        (
            ("window: 60", "windw: 60"),
            "mine.yaml, line 9, betas.monthly60.windw: unknown key 'windw'\n    → did you mean window?",
        ),
        (
            ("{rank_on: monthly60}", "{rank_on: monthly60, weights: equl}"),
            "mine.yaml, line 11, portfolios.ten.weights: 'equl' is not one of the choices\n    → did you mean equal?",
        ),
        (
            ("window: 60", "window: sixty"),
            "mine.yaml, line 9, betas.monthly60.window: found 'sixty'\n    → give a whole number",
        ),
        (
            ("window: 60", "window: 1"),
            "mine.yaml, line 9, betas.monthly60.window: 1 is out of range\n"
            "    → give at least 2 and at most 10000 months or trading days",
        ),
        (
            ("min: 24", "min: 70"),
            "mine.yaml, line 9, betas.monthly60.min: min 70 is longer than the window of 60 months\n"
            "    → lower min or lengthen window",
        ),
        (
            ("rank_on: monthly60", "rank_on: monthly36"),
            "mine.yaml, line 11, portfolios.ten.rank_on: 'monthly36' is neither among betas nor a column of numbers\n"
            "    → did you mean monthly60?",
        ),
        (
            ("full: {}", "full: {from: 1990-01, to: 1980-12}"),
            "mine.yaml, line 13, subperiods.full: runs backwards, from 1990-01 to 1980-12\n    → swap from and to",
        ),
        (
            ("full: {}", "full: {split: 2, every: 5}"),
            "mine.yaml, line 13, subperiods.full: has both split and every\n    → keep one of the two",
        ),
        (
            ("name: mine", "name: ../mine"),
            "mine.yaml, line 1, study.name: '../mine' does not fit\n"
            "    → Short name; results go to `results/<name>/`.",
        ),
        (
            ("study: {", "study: {level: .nan, "),
            "mine.yaml, line 1, study.level: not a finite number\n    → give a finite number",
        ),
        (
            ("study: {", "study: {level: .inf, "),
            "mine.yaml, line 1, study.level: not a finite number\n    → give a finite number",
        ),
        (
            ("  full: {}", "  Full: {}"),
            "mine.yaml, line 13, subperiods.Full: 'Full' cannot be a name\n"
            "    → a name starts with a small letter, then small letters, digits, _ or - only",
        ),
        (
            ("file: market.csv", "file: markets.csv"),
            "mine.yaml, line 6, data.market.file: there is no file markets.csv\n    → did you mean market.csv?",
        ),
    ],
)
def test_one_problem_is_said_with_its_place(
    folder: Path, edit: tuple[str, str], expected: str
) -> None:
    assert problems(folder, changed(edit)) == [expected]


@pytest.mark.fault(33)
def test_all_problems_are_said_at_once_in_the_order_of_the_file(folder: Path) -> None:
    text = changed(
        ("title: My study", "titel: My study"),
        ("window: 60", "windw: 60"),
        ("{rank_on: monthly60}", "{rank_on: monthly60, groups: 1}"),
    )
    found = problems(folder, text)
    assert [line.split(":")[0] for line in found] == [
        "mine.yaml, line 1, study.titel",
        "mine.yaml, line 1, study",
        "mine.yaml, line 9, betas.monthly60.windw",
        "mine.yaml, line 11, portfolios.ten.groups",
    ]


@pytest.mark.fault(33)
def test_references_that_lead_nowhere_are_all_said(folder: Path) -> None:
    text = changed(("rank_on: monthly60", "rank_on: m60")) + textwrap.dedent(
        """\
        intake:
          screens: [{column: pric, at_least: 1}]
        paper: {main: tenn, main_subperiod: ful}
        """
    )
    assert [found.split("\n")[0] for found in problems(folder, text)] == [
        "mine.yaml, line 11, portfolios.ten.rank_on: 'm60' is neither among betas nor a column of numbers",
        "mine.yaml, line 15, intake.screens.0.column: 'pric' is not among data.returns.columns",
        "mine.yaml, line 16, paper.main: 'tenn' is not declared under portfolios",
        "mine.yaml, line 16, paper.main_subperiod: 'ful' is not declared under subperiods",
    ]


@pytest.mark.fault(33)
def test_a_key_that_stands_twice_is_said(folder: Path) -> None:
    text = changed(("  full: {}", "  full: {}\n  full: {from: 1990-01}"))
    assert problems(folder, text) == [
        "mine.yaml, line 14, subperiods.full: this key stands twice\n    → keep one of the two"
    ]


def test_options_of_another_design_are_refused(folder: Path) -> None:
    text = changed(("{rank_on: monthly60}", "{design: supplied, groups: 5}"))
    assert [found.split("\n")[0] for found in problems(folder, text)] == [
        "mine.yaml, line 11, portfolios.ten: the key 'columns' is missing",
        "mine.yaml, line 11, portfolios.ten: the key 'file' is missing",
        "mine.yaml, line 11, portfolios.ten.groups: design supplied does not use 'groups'",
    ]


def test_weights_by_size_need_a_size(folder: Path) -> None:
    text = changed(
        (", size: cap", ""), ("{rank_on: monthly60}", "{rank_on: monthly60, weights: size}")
    )
    assert problems(folder, text)[0].startswith(
        "mine.yaml, line 11, portfolios.ten.weights: weights by size need a size column"
    )


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("a: [1,\n", "not YAML"),
        ("- just\n- a list\n", "not a mapping of keys"),
        ("", "not a mapping of keys"),
        ("study: {name: x\n\tbad: y}", "not YAML"),
    ],
)
def test_what_is_no_study_file_is_said(folder: Path, text: str, expected: str) -> None:
    assert expected in problems(folder, text)[0]


def test_a_missing_study_file_is_said(tmp_path: Path) -> None:
    with pytest.raises(KnownProblem, match="no such file"):
        load_study(tmp_path / "none.yaml")


def test_a_study_file_that_is_not_text_is_said(tmp_path: Path) -> None:
    path = tmp_path / "bytes.yaml"
    path.write_bytes(b"\xff\xfe\x00")
    with pytest.raises(KnownProblem, match="cannot be read"):
        load_study(path)


def test_dates_with_a_day_are_refused_with_the_form_wanted(folder: Path) -> None:
    found = problems(folder, changed(("full: {}", "full: {from: 1990-01-31}")))
    assert found[0].startswith("mine.yaml, line 13, subperiods.full.from: found 1990-01-31")
    assert "YYYY-MM" in found[0]


def test_the_demo_study_is_sound() -> None:
    study = load_study(Path(__file__).parents[2] / "config" / "kestrel.yaml")
    assert study.demo is not None
    assert all(study.is_made(source) for source in study.sources().values())


def test_what_is_sound_is_checked_further_although_another_section_is_not(folder: Path) -> None:
    text = changed(
        ("window: 60", "windw: 60"),
        ("file: bills.csv", "file: bill.csv"),
        ("full: {}", "full: {split: 2, every: 5}"),
    )
    assert [found.split("\n")[0] for found in problems(folder, text)] == [
        "mine.yaml, line 7, data.riskless.file: there is no file bill.csv",
        "mine.yaml, line 9, betas.monthly60.windw: unknown key 'windw'",
        "mine.yaml, line 13, subperiods.full: has both split and every",
    ]


MARKET = "market: {file: market.csv, columns: {date: month, return: mkt}}"
RISKLESS = "  riskless: {file: bills.csv, columns: {date: month, rate: bill}}\n"


def test_a_market_that_is_built(folder: Path) -> None:
    study = load_study(write(folder, changed((MARKET, "market: {build: size}"))))
    assert (study.market, study.market_build, study.market_is) == (None, "size", "total")
    assert list(study.sources()) == ["data.returns", "data.riskless"]


@pytest.mark.parametrize(
    ("edits", "expected"),
    [
        (
            [(MARKET, "market: {build: sise}")],
            [
                "mine.yaml, line 6, data.market.build: 'sise' is not one of the choices\n    → did you mean size?"
            ],
        ),
        (
            [(MARKET, "market: {build: size}"), (", size: cap", "")],
            [
                "mine.yaml, line 6, data.market.build: a market weighted by size needs a size column, and "
                "data.returns.columns has none\n    → add size under data.returns.columns, or use build: equal"
            ],
        ),
        (
            [(MARKET, "market: {build: equal, file: market.csv, unit: percent}")],
            [
                "mine.yaml, line 6, data.market.file: a market that is built does not use 'file'\n"
                "    → remove it, or remove build",
                "mine.yaml, line 6, data.market.unit: a market that is built does not use 'unit'\n"
                "    → remove it, or remove build",
            ],
        ),
        (
            [(MARKET, "market: {unit: percent}")],
            [
                "mine.yaml, line 6, data.market: the key 'columns' is missing\n"
                "    → add it, or build: equal or size to make the market from the returns",
                "mine.yaml, line 6, data.market: the key 'file' is missing\n"
                "    → add it, or build: equal or size to make the market from the returns",
            ],
        ),
    ],
)
def test_a_market_is_read_or_built(
    folder: Path, edits: list[tuple[str, str]], expected: list[str]
) -> None:
    assert problems(folder, changed(*edits)) == expected


def test_a_study_of_excess_returns_needs_no_riskless_rate(folder: Path) -> None:
    text = changed(
        ("size: cap}", "size: cap}\n    is: excess"),
        ("return: mkt}", "return: mkt}, is: excess"),
        (RISKLESS, ""),
    )
    study = load_study(write(folder, text))
    assert (study.returns_are, study.market_is, study.riskless) == ("excess", "excess", None)
    assert list(study.sources()) == ["data.returns", "data.market"]


def test_a_market_built_of_excess_returns_is_one(folder: Path) -> None:
    text = changed(
        ("size: cap}", "size: cap}\n    is: excess"),
        (MARKET, "market: {build: equal}"),
        (RISKLESS, ""),
    )
    study = load_study(write(folder, text))
    assert (study.market_is, study.market_build, study.riskless) == ("excess", "equal", None)


def test_total_returns_need_a_riskless_rate(folder: Path) -> None:
    supplied = "{design: supplied, file: market.csv, columns: {asset: a, date: d, return: r}}"
    text = changed((RISKLESS, ""), ("{rank_on: monthly60}", supplied))
    change = "    → add data.riskless, or set is: excess if they are in excess of it"
    assert problems(folder, text) == [
        f"mine.yaml, line 3, data.returns: total returns need a riskless rate\n{change}",
        f"mine.yaml, line 6, data.market: a total return needs a riskless rate\n{change}",
        f"mine.yaml, line 10, portfolios.ten: total returns need a riskless rate\n{change}",
    ]
    one = text.replace("size: cap}", "size: cap}\n    is: excess").replace(
        "mkt}", "mkt}, is: excess"
    )
    assert problems(folder, one) == [
        f"mine.yaml, line 11, portfolios.ten: total returns need a riskless rate\n{change}"
    ]


def test_a_market_to_be_built_is_told_to_the_validation(folder: Path) -> None:
    text = changed(
        (MARKET, "market: {build: size}"), ("rate: bill}", "rate: bill}, frequency: daily")
    )
    wiring = Wiring(load_study(write(folder, text)))
    found = wiring.options("validate_returns")
    assert (found["series"]["market"], found["market_build"]) == (None, "size")
    assert found["series"]["riskless_frequency"] == "daily"


def plus_intake(options: str, *edits: tuple[str, str]) -> str:
    return changed(*edits) + f"intake:\n  {options}\n"


def test_options_of_the_intake_and_their_defaults(folder: Path) -> None:
    assert load_study(write(folder, GOOD)).intake == IntakeSpec(
        screens=(),
        outliers={"jump_and_reversal": "flag"},
        return_after_hole="keep",
        stale_run=None,
        missing_final_return=None,
        final_return_by_reason={},
        allow_partial_last_month=False,
        other_unit_stop_above=0.1,
        same_month_rows="set_aside",
    )
    text = plus_intake(
        "{outliers: {jump_and_reversal: set_aside}, return_after_hole: set_aside, stale_prices: {run: 6}, "
        'delisting: {missing_final_return: -1, by_reason: {500: -0.3, "007": 0}}, '
        "allow_partial_last_month: yes, other_unit_stop_above: 0, same_month_rows: last}",
        ("size: cap", "size: cap, exit_reason: why"),
    )
    assert load_study(write(folder, text)).intake == IntakeSpec(
        screens=(),
        outliers={"jump_and_reversal": "set_aside"},
        return_after_hole="set_aside",
        stale_run=6,
        missing_final_return=-1.0,
        final_return_by_reason={"500": -0.3, "007": 0.0},
        allow_partial_last_month=True,
        other_unit_stop_above=0.0,
        same_month_rows="last",
    )


def test_the_options_of_the_intake_are_those_of_the_validation(folder: Path) -> None:
    study = load_study(write(folder, GOOD))
    assert Wiring(study).options("validate_returns")["rules"] == asdict(study.intake)


def test_dates_may_be_left_to_the_data(folder: Path) -> None:
    assert load_study(write(folder, GOOD)).returns.reading()["dates"] is None
    text = changed(("riskless: {file", 'riskless: {dates: "%m/%Y", file'))
    assert load_study(write(folder, text)).riskless.reading()["dates"] == "%m/%Y"


@pytest.mark.fault(39)
def test_returns_may_be_computed_from_prices(folder: Path) -> None:
    text = changed(("return: ret, size: cap", "return: {from: price}, price: px"))
    returns = load_study(write(folder, text)).returns
    assert returns.return_from == returns.reading()["return_from"] == "price"
    assert returns.columns == {"security": "id", "date": "date", "price": "px"}
    assert load_study(write(folder, GOOD)).returns.return_from is None


COLUMNS = "mine.yaml, line 5, data.returns.columns"


@pytest.mark.fault(33)
@pytest.mark.parametrize(
    ("text", "expected"),
    [
        (
            changed(("return: ret", "return: {from: price}")),
            f"{COLUMNS}.return: returns from prices need a price column, and there is none\n"
            "    → add price under data.returns.columns",
        ),
        (
            changed(("return: ret", "return: {from: prize}, price: px")),
            f"{COLUMNS}.return.from: 'prize' is not one of the choices\n    → did you mean price?",
        ),
        (
            changed(("return: ret", "return: 5")),
            f"{COLUMNS}.return: found 5\n    → give text or a mapping of keys",
        ),
        (
            changed(("size: cap", "size: cap, price: cap")),
            f"{COLUMNS}.price: 'cap' is the column of 'size' already\n"
            "    → one column cannot be both: change one of the two",
        ),
        (
            plus_intake("delisting: {by_reason: {A: -0.3}}"),
            "mine.yaml, line 15, intake.delisting.by_reason: final returns by reason need a column exit_reason, "
            "and data.returns.columns has none\n"
            "    → add exit_reason under data.returns.columns, or remove by_reason",
        ),
        (
            plus_intake("delisting: {by_reason: {007: -0.3}}", ("size: cap", "exit_reason: why")),
            "mine.yaml, line 15, intake.delisting.by_reason: a code that YAML takes for 7 is not what is written\n"
            "    → put it in quotes",
        ),
        (
            plus_intake("delisting: {by_reason: {A: -30}}", ("size: cap", "exit_reason: why")),
            "mine.yaml, line 15, intake.delisting.by_reason.A: -30 is out of range\n"
            "    → give at least -1 and at most 1",
        ),
        (
            plus_intake("stale_prices: {}"),
            "mine.yaml, line 15, intake.stale_prices: the key 'run' is missing\n"
            "    → add it: Rows within runs of at least so many zero returns do not pass.",
        ),
        (
            plus_intake("stale_prices: {run: 1}"),
            "mine.yaml, line 15, intake.stale_prices.run: 1 is out of range\n"
            "    → give at least 2 and at most 10000 periods",
        ),
        (
            plus_intake("return_after_hole: set_asid"),
            "mine.yaml, line 15, intake.return_after_hole: 'set_asid' is not one of the choices\n"
            "    → did you mean set_aside?",
        ),
        (
            plus_intake("allow_partial_last_month: perhaps"),
            "mine.yaml, line 15, intake.allow_partial_last_month: found 'perhaps'\n    → give yes or no",
        ),
        (
            plus_intake("other_unit_stop_above: 10"),
            "mine.yaml, line 15, intake.other_unit_stop_above: 10 is out of range\n"
            "    → give at least 0 and at most 1",
        ),
        (
            plus_intake("outlier: {}"),
            "mine.yaml, line 15, intake.outlier: unknown key 'outlier'\n    → did you mean outliers?",
        ),
        (
            changed(("  full: {}", "  full: {split: 2}\n  full-1: {}")),
            "mine.yaml, line 14, subperiods.full-1: two subperiods would be called full-1: this one and one of full\n"
            "    → rename one of them",
        ),
        (
            changed(("subperiods:", "pricing: {run: [time_series, time_series]}\nsubperiods:")),
            "mine.yaml, line 12, pricing.run: 'time_series' stands twice\n    → name each once",
        ),
        (
            changed(("data:", "demo: {first: 1999-01, last: 1990-01}\ndata:")),
            "mine.yaml, line 2, demo: runs backwards, from 1999-01 to 1990-01\n    → swap first and last",
        ),
    ],
)
def test_problems_of_single_options(folder: Path, text: str, expected: str) -> None:
    assert problems(folder, text) == [expected]


def test_one_name_in_two_sections_is_not_ambiguous(folder: Path) -> None:
    """`rank_on` looks among the betas only, `paper.main` among the portfolios only."""
    text = changed(
        ("  monthly60: {window", "  ten: {window"), ("rank_on: monthly60", "rank_on: ten")
    )
    study = load_study(write(folder, text))
    assert (study.sorts["ten"].ranked.rank_on, study.paper.main) == (("ten",), "ten")

    text = changed(
        ("title: My study}", "title: My study, frequency: daily}"),
        ("monthly60: {window: 60, min: 24}", "monthly60: {window: 250, min: 120}"),
    )
    study = load_study(write(folder, text))
    assert (study.frequency, study.betas["monthly60"].returns) == ("daily", "daily")
    assert load_study(write(folder, GOOD)).betas["monthly60"].returns == "monthly"


@pytest.mark.parametrize(
    ("edits", "expected"),
    [
        (
            [("window: 60, min: 24", "returns: daily, window: 250, min: 120")],
            "mine.yaml, line 9, betas.monthly60.returns: daily returns are asked for, and the study has monthly ones "
            "only\n    → declare data.returns.frequency: daily if the file has days, or use returns: own",
        ),
        (
            [("My study}", "My study, frequency: daily}"), ("window: 60, min: 24", "window: 250")],
            "mine.yaml, line 9, betas.monthly60: the key 'min' is missing\n"
            "    → betas from daily returns need it, in trading days",
        ),
        (
            [("window: 60, min: 24", "window: 601, min: 24")],
            "mine.yaml, line 9, betas.monthly60.window: 601 is out of range\n    → give at most 600 months",
        ),
        (
            [
                ("title: My study}", "title: My study, frequency: daily}\ndemo: {}"),
                ("window: 60, min: 24", "window: 250, min: 120"),
            ],
            "mine.yaml, line 1, study.frequency: the invented market has monthly returns only\n"
            "    → use frequency: monthly, or leave out the section demo",
        ),
    ],
)
def test_daily_returns_must_exist_and_be_counted_in_days(
    folder: Path, edits: list[tuple[str, str]], expected: str
) -> None:
    assert problems(folder, changed(*edits)) == [expected]


@pytest.mark.parametrize(
    ("edit", "place"),
    [
        (
            ("subperiods:", "intake: {screens: [{column: size, at_least: .nan}]}\nsubperiods:"),
            "intake.screens.0.at_least",
        ),
        (
            ("subperiods:", "intake: {screens: [{column: size, in: [1, -.inf]}]}\nsubperiods:"),
            "intake.screens.0.in.1",
        ),
        (("window: 60", "window: .inf"), "betas.monthly60.window"),
    ],
)
def test_numbers_are_finite_wherever_they_stand(
    folder: Path, edit: tuple[str, str], place: str
) -> None:
    (found,) = problems(folder, changed(edit))
    assert f"{place}: not a finite number\n    → give a finite number" in found


@pytest.mark.parametrize(
    ("span", "expected"),
    [
        ("first: 2024-01, last: 1950-01", "runs backwards, from 2024-01 to 1950-01"),
        ("first: 2000-02, last: 2004-12", "2000-02 to 2004-12 is 59 months"),
    ],
)
def test_a_demo_market_needs_its_months(folder: Path, span: str, expected: str) -> None:
    found = problems(folder, changed(("data:\n", f"demo: {{{span}}}\ndata:\n")))
    assert expected in "\n".join(found)
    assert "demo" in found[0]


def test_a_demo_study_reads_only_what_the_demo_makes(
    folder: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Not even where an earlier run, or another program, left a file of that name."""
    monkeypatch.chdir(folder)
    raw = folder / "results" / "mine" / "raw"
    raw.mkdir(parents=True)
    (raw / "retruns.csv").touch()
    text = changed(
        ("data:\n", "demo: {}\ndata:\n"), ("returns.csv", "results/mine/raw/retruns.csv")
    )
    (found,) = problems(folder, text)
    assert "there is no file results/mine/raw/retruns.csv\n    → did you mean returns.csv?" in found
    right = text.replace("retruns", "returns")
    assert load_study(write(folder, right)).returns.label == "results/mine/raw/returns.csv"


@pytest.mark.parametrize(
    ("edit", "place"),
    [
        (("size: cap", "size: ret"), "data.returns.columns.size: 'ret' is the column of 'return'"),
        (("return: mkt", "return: month"), "data.market.columns.return: 'month' is the column of"),
    ],
)
def test_one_column_is_not_two_things(folder: Path, edit: tuple[str, str], place: str) -> None:
    (found,) = problems(folder, changed(edit))
    assert place in found


def test_a_column_may_serve_a_screen_as_well(folder: Path) -> None:
    columns = load_study(
        write(folder, changed(("size: cap", "size: cap, value: cap")))
    ).returns.columns
    assert columns["value"] == columns["size"]


def test_a_ranking_without_any_betas_says_where_to_declare_them(folder: Path) -> None:
    text = changed(("betas:\n  monthly60: {window: 60, min: 24}\n", ""))
    assert (
        "'monthly60' is neither among betas nor a column of numbers\n    → declare it under betas"
        in problems(folder, text)[0]
    )


def test_a_folder_is_no_study_file(tmp_path: Path) -> None:
    with pytest.raises(KnownProblem, match="a folder\n    → give the study file itself"):
        load_study(tmp_path)


def test_a_byte_that_is_not_utf8_is_said_with_its_line(tmp_path: Path) -> None:
    path = tmp_path / "mine.yaml"
    path.write_bytes(GOOD.replace("My study", "Meine Studie \xfc").encode("latin-1"))
    with pytest.raises(KnownProblem, match=r"mine\.yaml, line 1: a byte that is not UTF-8: 0xfc"):
        load_study(path)


SUPPLIED = (
    "  given: {design: supplied, file: bills.csv, columns: {asset: a, date: month, return: ret}}\n"
)


@pytest.mark.parametrize(
    ("paper", "places"),
    [
        ("tables: [group_moves]", ["tables"]),
        ("tables: [group_moves], figures: [moves, staying]", ["figures", "tables"]),
        ("tables: [group_moves, sample], figures: [moves, coverage]", []),
        ("tables: default", []),
    ],
)
def test_supplied_assets_alone_leave_nothing_to_show_of_groups(
    folder: Path, paper: str, places: list[str]
) -> None:
    text = changed(("  ten: {rank_on: monthly60}\n", SUPPLIED)) + f"paper: {{{paper}}}\n"
    if not places:
        assert list(load_study(write(folder, text)).sorts) == ["given"]
        return
    found = problems(folder, text)
    assert len(found) == len(places)
    for place, problem in zip(places, found, strict=True):
        assert f"paper.{place}" in problem
        assert "only what shows ranked groups" in problem


def test_tables_of_groups_beside_supplied_main_assets_go_to_the_appendix(folder: Path) -> None:
    text = changed(("  ten: {rank_on: monthly60}\n", SUPPLIED + "  ten: {rank_on: monthly60}\n"))
    study = load_study(write(folder, text + "paper: {main: given, tables: [group_moves]}\n"))
    assert Wiring(study).tables[0] == "tables/group_moves-ten.tex"
