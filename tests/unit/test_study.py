"""The study file: everything wrong with it is said at once, each with its line, what was found and what to change."""

from __future__ import annotations

import textwrap
from pathlib import Path

import pytest

from lineproof.problems import KnownProblem
from lineproof.study import load_study

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
    assert (ten.design, ten.groups, ten.weights, ten.form_month, ten.hold) == (
        "single_window",
        10,
        "equal",
        12,
        12,
    )
    assert (study.paper.main, study.paper.main_subperiod) == ("ten", "full")
    assert study.demo is None


def test_paths_are_relative_to_the_study_file(folder: Path) -> None:
    study = load_study(write(folder, GOOD))
    assert Path(study.returns.file) == (folder / "returns.csv").resolve()
    assert study.returns.label == "returns.csv"


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
            "    → give at least 2 and at most 600 months",
        ),
        (
            ("min: 24", "min: 70"),
            "mine.yaml, line 9, betas.monthly60.min: min 70 is longer than the window of 60 months\n"
            "    → lower min or lengthen window",
        ),
        (
            ("rank_on: monthly60", "rank_on: monthly36"),
            "mine.yaml, line 11, portfolios.ten.rank_on: 'monthly36' is not declared under betas\n"
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


def test_references_that_lead_nowhere_are_all_said(folder: Path) -> None:
    text = changed(("rank_on: monthly60", "rank_on: m60")) + textwrap.dedent(
        """\
        intake:
          screens: [{column: pric, at_least: 1}]
        paper: {main: tenn, main_subperiod: ful}
        """
    )
    assert [found.split("\n")[0] for found in problems(folder, text)] == [
        "mine.yaml, line 11, portfolios.ten.rank_on: 'm60' is not declared under betas",
        "mine.yaml, line 15, intake.screens.0.column: 'pric' is not among data.returns.columns",
        "mine.yaml, line 16, paper.main: 'tenn' is not declared under portfolios",
        "mine.yaml, line 16, paper.main_subperiod: 'ful' is not declared under subperiods",
    ]


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
        "'monthly60' is not declared under betas\n    → declare it there"
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
