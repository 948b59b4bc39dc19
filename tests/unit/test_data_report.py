"""The data report: every number is the record's, every name is text, and nothing of the record is left out."""

from __future__ import annotations

import re
import sys
from decimal import Decimal
from html.parser import HTMLParser
from typing import Any

import pytest
from tests.unit import record_examples as examples
from tests.unit.paper_examples import facts, printed_under_hash_seeds, ranked_facts

from lineproof.paper.data_report import SECTIONS, write_data_report

FACTS = facts({"ten": ranked_facts()})
MAKERS = [
    examples.usual,
    examples.daily,
    examples.earlier,
    examples.clean,
    examples.hostile,
]


class Page(HTMLParser):
    """Tags, ids and links of a page, its texts, and the text of each element that has a title."""

    def __init__(self, text: str) -> None:
        super().__init__()
        self.tags: list[str] = []
        self.ids: list[str] = []
        self.links: list[str] = []
        self.labels: list[str] = []
        self.titled: list[tuple[str, str]] = []
        self.words = ""
        self._open: list[tuple[str, str]] = []
        self.feed(text)

    def handle_starttag(self, tag: str, attributes: list[tuple[str, str | None]]) -> None:
        given = {key: value or "" for key, value in attributes}
        self.tags.append(tag)
        self.ids += [given["id"]] if "id" in given else []
        self.links += [given["href"]] if "href" in given and tag == "a" else []
        self.labels += given.get("aria-labelledby", "").split()
        if "title" in given:
            self._open.append((tag, given["title"]))
            self.titled.append((given["title"], ""))

    def handle_endtag(self, tag: str) -> None:
        if self._open and self._open[-1][0] == tag:
            self._open.pop()

    def handle_data(self, data: str) -> None:
        self.words += data
        if self._open:
            title, text = self.titled[-1]
            self.titled[-1] = (title, text + data)

    @property
    def numbers(self) -> list[tuple[str, str]]:
        """Pointer and printed text of each number."""
        return [(title, text) for title, text in self.titled if title.startswith("/")]


def resolved(record: Any, pointer: str) -> Any:
    """What a JSON Pointer leads to (RFC 6901, section 4)."""
    for key in pointer.split("/")[1:]:
        plain = key.replace("~1", "/").replace("~0", "~")
        record = record[int(plain)] if isinstance(record, list) else record[plain]
    return record


def leaves(thing: Any, pointer: str = "") -> dict[str, float]:
    """Every number of a record by its pointer."""
    if isinstance(thing, int | float):
        return {pointer: thing}
    pairs = (
        thing.items()
        if isinstance(thing, dict)
        else enumerate(thing)
        if isinstance(thing, list)
        else ()
    )
    found = {}
    for key, each in pairs:
        found |= leaves(each, f"{pointer}/{str(key).replace('~', '~0').replace('/', '~1')}")
    return found


@pytest.fixture(params=MAKERS, ids=lambda make: make.__name__, scope="module")
def case(request: pytest.FixtureRequest) -> tuple[dict[str, Any], str, Page]:
    intake = request.param()
    text = write_data_report(intake, FACTS)
    return intake, text, Page(text)


PERCENT = re.compile(r"/(return_|mean|mean_with|mean_without|sd|min|max|stand_in)$|/quantiles/")


def test_every_number_is_the_records(case) -> None:
    """To half a unit of the last digit printed; a share is checked against its own two counts below."""
    intake, _, page = case
    assert page.numbers
    for pointer, text in page.numbers:
        value = resolved(intake, pointer)
        if pointer.endswith("/n_zero"):
            continue
        if value is None:
            assert text == "–", pointer
            continue
        shown = Decimal(text.replace(",", "").replace("−", "-"))
        exact = Decimal(repr(value)) * (100 if PERCENT.search(pointer) else 1)
        # integers beyond three digits are rounded to three where the number is one of significant digits
        unit = Decimal(1).scaleb(shown.as_tuple().exponent)
        coarse = (
            Decimal(1).scaleb(exact.adjusted() - 2) if PERCENT.search(pointer) and exact else unit
        )
        assert abs(shown - exact) <= max(unit, min(coarse, abs(exact))) / 2, pointer
        assert "." in text or isinstance(value, int) or shown == shown.to_integral(), pointer


def test_counts_are_printed_in_full(case) -> None:
    intake, _, page = case
    for pointer, text in page.numbers:
        value = resolved(intake, pointer)
        if isinstance(value, int) and not pointer.endswith("/n_zero"):
            assert text == f"{value:,}", pointer


DRAWN = re.compile(
    r"^/evidence/(alive|coverage|scale)/|/decade$|/n_missing$|^/set_aside/\d+/number$"
)


def test_no_number_of_the_record_is_left_out(case) -> None:
    """What is not printed by its place is drawn, or has a test of its own below."""
    intake, _, page = case
    printed = {pointer for pointer, _ in page.numbers}
    missing = {pointer for pointer in leaves(intake) if not DRAWN.search(pointer)} - printed
    top = {f"/{key}" for key in intake} if "files" in intake else set()
    assert missing - top == set()


def test_coverage_cells_are_the_counts(case) -> None:
    intake, _, page = case
    known = intake.get("evidence", {}).get("coverage", {"columns": {}, "n_rows": []})
    cells = [
        (title, text)
        for title, text in page.titled
        if re.fullmatch(r"[\d,]+ of [\d,]+ rows", title)
    ]
    expected = [
        (f"{column[at]:,} of {n_rows:,} rows", column[at], n_rows)
        for at, n_rows in enumerate(known["n_rows"])
        for column in known["columns"].values()
    ]
    assert [title for title, _ in cells] == [title for title, _, _ in expected]
    for (_, text), (_, n, n_rows) in zip(cells, expected, strict=True):
        share_is_printed(text, n, n_rows)


def share_is_printed(text: str, n: int, whole: int) -> None:
    if not whole:
        assert text == "–"
    elif n in (0, whole):
        assert text == ("100" if n else "0")
    elif text[0] in "<>":
        assert n / whole < 0.0005 if text == "<0.1" else n / whole >= 0.9995
    else:
        assert abs(Decimal(text) - Decimal(100 * n) / whole) <= Decimal("0.05")


def test_shares_of_zeros_and_of_missing_returns(case) -> None:
    intake, text, page = case
    shares = dict(page.numbers)
    for place, each in enumerate(intake.get("evidence", {}).get("distribution", [])):
        share_is_printed(
            shares[f"/evidence/distribution/{place}/n_zero"], each["n_zero"], each["n"]
        )
        row = re.search(rf'<tr><th scope="row">{each["decade"]}s</th>(.*?)</tr>', text)[1]
        missing = re.findall(r"<td[^>]*>(.*?)</td>", row)[2]
        share_is_printed(missing, each["n_missing"], each["n"] + each["n_missing"])


def test_each_file_has_its_equation(case) -> None:
    intake, _, page = case
    words = " ".join(page.words.split())
    for file in intake.get("files", [intake]):
        said = (
            f"{file['rows_read']:,} rows read = {file['rows_kept']:,} kept + {file['rows_set_aside']:,} set aside"
            f" + {file['exact_duplicates']:,} exact duplicates"
        )
        unused = file.get("rows_unused")
        assert said + (f" + {unused:,} not used" if unused else "") in words


def test_each_file_has_its_size_and_sum() -> None:
    raw = examples.raw_files()
    words = " ".join(Page(write_data_report(examples.usual(), FACTS, raw)).words.split())
    for file in raw["files"]:
        assert f"{file['n_bytes']:,} bytes" in words
    assert words.count("SHA-256") == 2
    assert "ab" * 32 in words


@pytest.mark.parametrize("key", ["rows_kept", "rows_set_aside", "exact_duplicates", "rows_read"])
def test_rows_that_do_not_add_up_are_never_printed(key: str) -> None:
    for intake in (examples.usual(), examples.earlier()):
        (intake["files"][0] if "files" in intake else intake)[key] += 1
        with pytest.raises(ValueError, match=r"rows of raw/returns.csv do not add up"):
            write_data_report(intake, FACTS)


def test_survivors_are_warned_of_before_all_else() -> None:
    text = write_data_report(examples.daily(), FACTS)
    main = text.split("<main>")[1]
    assert main.index("No security ever leaves.") < main.index("<h2")
    assert "there to the last day" in main
    assert 'class="warning"' not in write_data_report(examples.usual(), FACTS)


def test_span_is_said() -> None:
    words = Page(write_data_report(examples.usual(), FACTS)).words
    assert "where raw/market.csv ends: the study ends there." in words


def test_effect_of_final_returns_is_taken_before_rounding() -> None:
    intake = examples.usual()
    words = " ".join(Page(write_data_report(intake, FACTS)).words.split())
    assert (
        "0.8123 % a month with the final returns used, and 0.8877 % without any: a difference of −0.0753"
        in (words.replace("\N{NARROW NO-BREAK SPACE}", " "))
    )
    intake["delisting"]["mean_with"] = None
    assert "difference of" not in write_data_report(intake, FACTS)


def test_parts_without_evidence_are_left_out() -> None:
    every = [section.id for section in SECTIONS]
    shown = {
        make: [i for i in Page(write_data_report(make(), FACTS)).ids if i in every]
        for make in MAKERS
    }
    assert shown[examples.usual] == every
    assert shown[examples.earlier] == ["files", "faults", "screens"]
    assert shown[examples.daily] == [each for each in every if each != "delisting"]


def test_clean_data_are_said_to_be() -> None:
    words = Page(write_data_report(examples.clean(), FACTS)).words
    assert "No row had a fault." in words
    assert "No row is set aside." in words


def test_one_self_contained_page(case) -> None:
    _, text, page = case
    assert text.startswith("<!DOCTYPE html>")
    assert "default-src 'none'" in text
    assert {"script", "link", "img", "iframe", "object"} & set(page.tags) == set()
    assert not re.search(r"https?://|@import|url\((?!#)", text)


def test_ids_are_unique_and_every_link_arrives(case) -> None:
    _, _, page = case
    assert len(page.ids) == len(set(page.ids))
    assert {link.removeprefix("#") for link in page.links} <= set(page.ids)
    assert set(page.labels) <= set(page.ids)


def test_names_from_the_data_are_text() -> None:
    intake = examples.hostile()
    intake["set_aside"][0]["examples"][0]["raw"] = f"A&amp;B,{examples.HOSTILE}"
    text = write_data_report(intake, {**FACTS, "title": examples.HOSTILE})
    page = Page(text)
    assert "<script" not in text
    assert f"A&amp;B,{examples.HOSTILE}" in page.words
    assert f"Data report: {examples.HOSTILE}" in page.words
    for known in ("merged", "sector", "price at least 1", "line 7", "raw/market.csv", "S031"):
        assert f"{known} {examples.HOSTILE}" in page.words, known


def test_no_number_prints_as_nan(case) -> None:
    _, text, _ = case
    words = re.sub(r"<style>.*?</style>|<svg.*?</svg>|<[^>]*>", " ", text, flags=re.DOTALL)
    assert not re.search(r"\bnan\b|\bNone\b|−0\.0+\b|\binf\b", words)


def test_same_bytes_whatever_the_order_of_hashes() -> None:
    code = (
        "import hashlib, sys\n"
        f"sys.path[:0] = {sys.path!r}\n"
        "from tests.unit.test_data_report import FACTS, examples, write_data_report\n"
        "print(hashlib.sha256(write_data_report(examples.usual(), FACTS).encode()).hexdigest())"
    )
    assert len(printed_under_hash_seeds(code)) == 1
