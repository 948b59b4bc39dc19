"""What is wrong with an entry under `portfolios`, in plain words."""

from __future__ import annotations

from pathlib import Path

import pytest

from lineproof.problems import KnownProblem
from lineproof.specs import Study
from lineproof.study import load_study

STUDY = """\
study: {{name: mine, title: Mine}}
data:
  returns: {{file: r.csv, columns: {{security: id, date: month, return: ret, size: cap, exchange: ex}}}}
  market: {{build: size}}
  riskless: {{file: r.csv, columns: {{date: month, rate: ret}}}}
betas: {{m60: {{}}, m84: {{window: 84}}}}
portfolios: {{it: {{{entry}}}}}
subperiods: {{full: {{}}}}
"""


def load(folder: Path, entry: str) -> Study:
    (folder / "r.csv").write_text("id,month,ret,cap,ex\n")
    (folder / "mine.yaml").write_text(STUDY.format(entry=entry))
    return load_study(folder / "mine.yaml")


@pytest.mark.parametrize(
    ("entry", "expected"),
    [
        ("rank_on: m60, hold: 13", "held for 13 months, and formed anew after 12"),
        ("rank_on: m60, form_each: month, hold: 2", "held for 2 months, and formed anew after 1"),
        ("rank_on: [size, m60], groups: 5", "design single_window takes one here"),
        ("design: double_sort, rank_on: [size, m60]", "the key 'groups' is missing"),
        ("design: double_sort, rank_on: m60, groups: [2, 2]", "takes a list of two here"),
        ("design: three_windows, rank_on: m60", "the key 'ante_betas' is missing"),
        ("design: three_windows, rank_on: m60, ante_betas: m84, hold: 18", "are no whole years"),
        (
            "design: three_windows, rank_on: m60, ante_betas: m84, overlap: yes",
            "does not use 'overlap'",
        ),
        ("rank_on: m60, dependent: yes", "design single_window does not use 'dependent'"),
        ("rank_on: m60.gamma", "betas have no column 'gamma'"),
        ("rank_on: sizes", "'sizes' is neither among betas nor a column"),
        ("rank_on: m60, ante_betas: m61", "'m61' is not declared under betas"),
        ("rank_on: m60, breakpoints: {column: exch, in: [N]}", "'exch' is not a column"),
        (
            "rank_on: m60, rule: equal_counts, breakpoints: {column: exchange, in: [N]}",
            "equal counts have no breakpoints",
        ),
        ("rank_on: size, assign_betas: ex_ante", "groups have no ex-ante betas"),
        ("rank_on: m60, groups: 5.0", "found 5.0"),
        (
            "rank_on: m60, ante_betas: [m60, m84]",
            "2 ex-ante betas by year, for a hold of 12 months",
        ),
        ("rank_on: m60, form_each: month, form_month: 6", "have no form_month"),
        ("design: double_sort, rank_on: [m60, m60.beta], groups: [2, 2]", "'m60' stands twice"),
        ("rank_on: m84.r2, form_each: quarter, form_month: 13", "13 is out of range"),
    ],
)
def test_what_does_not_fit(tmp_path: Path, entry: str, expected: str) -> None:
    with pytest.raises(KnownProblem) as caught:
        load(tmp_path, entry)
    assert expected in str(caught.value)
    assert len(caught.value.problems) == 1


def test_a_name_of_two_things_cannot_be_ranked_on(tmp_path: Path) -> None:
    (tmp_path / "r.csv").write_text("id,month,ret,cap,ex\n")
    text = STUDY.format(entry="rank_on: size").replace("m84:", "size:")
    (tmp_path / "mine.yaml").write_text(text)
    with pytest.raises(KnownProblem, match="'size' is a column of the returns, and of betas too"):
        load_study(tmp_path / "mine.yaml")


@pytest.mark.parametrize(
    ("entry", "hold", "ante", "estimates"),
    [
        ("rank_on: m60", 12, ("m60",), ("m60",)),
        ("rank_on: size, form_each: quarter", 3, (), ()),
        ("rank_on: m60.r2, form_each: month, hold: 6, overlap: yes", 6, ("m60",), ("m60",)),
        ("rank_on: size, ante_betas: m84", 12, ("m84",), ("m84",)),
        ("design: double_sort, rank_on: [size, m60], groups: [5, 5]", 12, ("m60",), ("m60",)),
        (
            "design: three_windows, rank_on: m84, ante_betas: [m60, m84]",
            48,
            ("m60", "m84"),
            ("m84", "m60"),
        ),
    ],
)
def test_what_is_filled_in(
    tmp_path: Path, entry: str, hold: int, ante: tuple, estimates: tuple
) -> None:
    sort = load(tmp_path, entry).sorts["it"]
    assert (sort.ranked.hold, sort.ranked.ante_betas, sort.estimates) == (hold, ante, estimates)
