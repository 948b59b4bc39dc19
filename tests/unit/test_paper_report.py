"""The report: what it says, and that it is one safe and self-contained page."""

from __future__ import annotations

import re
import sys
from dataclasses import replace
from html.parser import HTMLParser

import pytest
from tests.unit import paper_examples as examples

from lineproof.paper import answer, html_table
from lineproof.paper.book import Number
from lineproof.paper.exhibits import figure_files
from lineproof.paper.report import write_report

NAN = float("nan")
SVG = b'<svg xmlns="x" viewBox="0 0 400 200" version="1.1"><g id="a"/></svg>'


class Page(HTMLParser):
    """Tags, ids, link targets and numbers with an address."""

    def __init__(self, text: str) -> None:
        super().__init__()
        self.tags: list[str] = []
        self.ids: list[str] = []
        self.links: list[str] = []
        self.labels: list[str] = []
        self.feed(text)

    def handle_starttag(self, tag: str, attributes: list[tuple[str, str | None]]) -> None:
        given = {key: value or "" for key, value in attributes}
        self.tags.append(tag)
        self.ids += [given["id"]] if "id" in given else []
        self.links += [given["href"]] if "href" in given else []
        self.labels += given.get("aria-labelledby", "").split()


def report_of(context: examples.Context) -> str:
    return write_report(context, dict.fromkeys(figure_files(context.facts), SVG))


@pytest.fixture(params=[examples.usual, examples.hostile], ids=lambda make: make.__name__)
def page(request: pytest.FixtureRequest) -> str:
    return report_of(request.param())


def number(estimate: float, p: float, status: str = "ok") -> Number:
    """A number with an estimate and a p value; the rest is out of play."""
    reason = "" if status == "ok" else "too few"
    return Number(
        "a", estimate, NAN, NAN, NAN, NAN, p, NAN, NAN, NAN, n_periods=9, n_assets=3,
        status=status, reason=reason,
    )  # fmt: skip


@pytest.mark.parametrize(
    ("slope", "slope_p", "difference", "difference_p", "words"),
    [
        (0.006, 0.01, 0.001, 0.40, answer.PRICED),
        (0.006, 0.01, -0.003, 0.01, answer.PRICED_BELOW),
        (0.009, 0.01, 0.003, 0.01, answer.PRICED_ABOVE),
        (0.001, 0.60, -0.005, 0.01, answer.UNPRICED),
        (0.001, 0.60, 0.005, 0.01, answer.UNPRICED_ABOVE),
        (0.003, 0.20, -0.002, 0.30, answer.UNDECIDED),
        (-0.006, 0.01, -0.011, 0.01, answer.WRONG_SIGN),
        (-0.006, 0.01, 0.001, 0.80, answer.WRONG_SIGN),
        (0.006, 0.05, 0.001, 0.40, answer.UNDECIDED),  # at the level itself nothing is rejected
    ],
)
def test_words_follow_the_numbers(
    slope: float, slope_p: float, difference: float, difference_p: float, words: str
) -> None:
    found = answer.reading(number(slope, slope_p), number(difference, difference_p), level=0.05)
    assert found == words


def test_sentences_print_the_estimates_they_name() -> None:
    context = examples.usual()
    period = context.main_period
    text = html_table.phrase(answer.of_period(context, period))
    address = "ten/full/market_line/ols/all/slope_minus_market/errors_in_variables"
    found = context.book.at(address)
    shown = f"{100 * found.estimate:.2f}".replace("-", "−")
    assert f'<span class="n" title="{address}">{shown}</span>' in text
    assert f'title="{address}" data-column="se">{100 * found.se:.2f}</span>' in text
    assert "corrected for estimated betas (Shanken 1992)" in text
    joint = context.book.at("ten/full/joint_alpha/f/all/alpha/-")
    assert ("is rejected" in text) == (joint.p < 0.05)


def test_undefined_tests_are_said_in_words() -> None:
    context = examples.usual()
    period = next(each for each in context.periods if each.name == "short")
    assert "The joint test is not defined: " in html_table.phrase(answer.of_period(context, period))


def test_level_of_the_study_is_the_level_of_the_words() -> None:
    context = examples.usual()
    p = context.book.at("ten/full/joint_alpha/f/all/alpha/-").p
    for level in (p * 0.99, min(p * 1.01, 0.49)):
        other = replace(context, facts={**context.facts, "level": level})
        text = html_table.phrase(answer.of_period(other, other.main_period))
        assert ("is rejected" in text) == (p < level)


def test_a_study_without_pricing_tests_still_reports() -> None:
    context = examples.study(
        {"ten": (examples.ranked_facts(), examples.groups(4))},
        [examples.subperiod("full", "1990-01", "1999-12")],
        analyses=["describe"],
    )
    assert "The market line is not reported." in report_of(context)


def test_one_self_contained_page(page: str) -> None:
    found = Page(page)
    assert "default-src 'none'" in page
    assert {"script", "link", "img", "iframe", "object"} & set(found.tags) == set()
    assert not re.search(r"https?://|@import|url\((?!#)", page)


def test_ids_are_unique_and_every_link_arrives(page: str) -> None:
    found = Page(page)
    assert len(found.ids) == len(set(found.ids))
    inside = {link for link in found.links if link.startswith("#")}
    assert {link.removeprefix("#") for link in inside} <= set(found.ids)
    assert set(found.links) - inside == {
        "data_report.html"
    }  # beside the report, written by the same run
    assert set(found.labels) <= set(found.ids)


def test_cautions() -> None:
    usual, hostile = report_of(examples.usual()), report_of(examples.hostile())
    assert "The market is invented" in usual
    assert "The market is invented" not in hostile
    assert usual.count("no investment advice") == hostile.count("no investment advice") == 1


def test_the_intake_in_short_and_where_the_rest_is() -> None:
    usual = examples.usual()
    section = report_of(usual).split('<section id="data"')[1]
    row = (
        r'<tr><th scope="row">a return below −100 %</th><td class="count">15</td><td>set aside</td>'
    )
    assert re.search(row + r'<td class="count"><span [^>]*>720</span></td></tr>', section)
    assert '<a href="#figure-coverage">Figure 5</a>' in section
    assert "No security ever leaves" not in section
    survivors = {"number": 26, "label": "no security ever leaves", "answer": "flag", "n": 1}
    intake = {**examples.INTAKE, "faults": [survivors], "span": ["The study begins there & ends"]}
    sorts = {"ten": (examples.ranked_facts(), examples.groups(4))}
    context = examples.study(
        sorts, [examples.subperiod("full", "1990-01", "1999-12")], intake=intake
    )
    section = report_of(context).split('<section id="data"')[1]
    assert "<b>No security ever leaves: " in section
    assert "The study begins there &amp; ends." in section


@pytest.mark.fault(38)
def test_hostile_titles_are_escaped() -> None:
    page = report_of(examples.hostile())
    assert "<title>&lt;script&gt;alert(1); &amp; R&amp;D_50%</title>" in page


def test_no_number_prints_as_nan(page: str) -> None:
    words = re.sub(r"<style>.*?</style>|<[^>]*>", " ", page, flags=re.DOTALL)
    assert not re.search(r"\bnan\b|\bNone\b|−0\.00\b|\binf\b", words)


def test_same_bytes_whatever_the_order_of_hashes() -> None:
    code = (
        "import hashlib, sys\n"
        f"sys.path[:0] = {sys.path!r}\n"
        "from tests.unit import paper_examples as examples\n"
        "from lineproof.paper.exhibits import figure_files\n"
        "from lineproof.paper.report import write_report\n"
        "from lineproof.paper.tables import write_tables\n"
        "context = examples.usual()\n"
        f"figures = dict.fromkeys(figure_files(context.facts), {SVG!r})\n"
        "text = write_report(context, figures) + ''.join(write_tables(context).values())\n"
        "print(hashlib.sha256(text.encode()).hexdigest())"
    )
    assert len(examples.printed_under_hash_seeds(code)) == 1


def test_missing_figure_is_an_error() -> None:
    with pytest.raises(KeyError, match="market_lines"):
        write_report(examples.usual(), {})
