"""Tables: what they hold, and that every format prints the same numbers of the estimates."""

from __future__ import annotations

import csv
import io
import re
import subprocess
import sys
from collections.abc import Iterator
from html.parser import HTMLParser

import pytest
from tests.unit import paper_examples as examples

from lineproof.paper import html_table, latex
from lineproof.paper.context import Context
from lineproof.paper.exhibits import table_files
from lineproof.paper.rounding import printed
from lineproof.paper.specification import Cell, Column, Panel, Row, Table, explained
from lineproof.paper.symbols import SYMBOLS, Phrase, said
from lineproof.paper.tables import build, write_tables

STUDIES = [examples.usual, examples.hostile, examples.many, examples.double]


@pytest.fixture(params=STUDIES, ids=lambda make: make.__name__)
def context(request: pytest.FixtureRequest) -> Context:
    return request.param()


class Cells(HTMLParser):
    """Text of every table cell that carries an address, with the address and the column."""

    def __init__(self, text: str) -> None:
        super().__init__()
        self.found: list[tuple[str, str, str]] = []
        self._source: tuple[str, str] | None = None
        self.tags: list[str] = []
        self.feed(text)

    def handle_starttag(self, tag: str, attributes: list[tuple[str, str | None]]) -> None:
        given = dict(attributes)
        self.tags.append(tag)
        if tag == "td" and "title" in given:
            self._source = (given["title"] or "", given.get("data-column") or "estimate")

    def handle_data(self, data: str) -> None:
        if self._source:
            self.found.append((*self._source, data))
            self._source = None


def bare(text: str) -> str:
    """A printed number without brackets, its minus sign and dash in ASCII."""
    plain = re.sub(r"[()\[\]]", "", text).replace("−", "-").replace("–", "-")
    return plain.replace("\N{NARROW NO-BREAK SPACE}", "")


def rows_of_csv(text: str) -> list[dict[str, str]]:
    return list(csv.DictReader(io.StringIO(text)))


def rows_of_latex(text: str) -> Iterator[tuple[str, list[str], bool]]:
    """Of every row of every tabular: the letters of its layout, its cells, and whether it is a head."""
    for tabular in re.findall(r"\\begin\{tabular\*\}(.*?)\\end\{tabular\*\}", text, re.DOTALL):
        layout, body = tabular.split("\n", 1)
        letters = re.sub(r"@\{(?:[^{}]|\{[^{}]*\})*\}", "", layout)
        letters = letters.removeprefix(r"{\textwidth}").strip("{}")
        heads, _, numbers = body.rpartition("\\midrule\n")
        for part, is_head in ((heads, True), (numbers, False)):
            for line in part.splitlines():
                if line.endswith(r" \\"):
                    yield letters, line.removesuffix(r" \\").split(" & "), is_head


def numbers_of_latex(text: str) -> Iterator[str]:
    """Every number of the tabulars, in reading order, in ASCII and without brackets."""
    for letters, cells, is_head in rows_of_latex(text):
        for cell in [] if is_head else cells[letters.count("l") :]:
            plain = re.sub(r"\\rlap\{.\}|[(\[]", "", cell)
            plain = plain.replace("--", "-").replace("$-$", "-").replace("$<$", "<")
            if plain:
                yield plain


def test_files_are_those_announced(context: Context) -> None:
    assert list(write_tables(context)) == table_files(context.facts)


def test_every_number_is_the_rounded_estimate_at_its_address(context: Context) -> None:
    tables = write_tables(context)
    for name, table in build(context).items():
        page = Cells(tables[f"{name}.html"]).found
        assert page
        for address, column, text in page:
            value = getattr(context.book.at(address), column)
            assert bare(text) in {
                printed(value, form) for form in ("percent", "number", "p", "share")
            } | {
                printed(value, "count"),
                printed(value, "average"),
            }
        for row in rows_of_csv(tables[f"{name}.csv"]):
            address = row["address"].removeprefix("'")
            value = getattr(context.book.at(address), row["quantity"])
            shown = "" if row["status"] == "undefined" else printed(value, row["format"])
            assert row["printed"] == shown
            if row["status"] == "ok":
                assert float(row["value"]) == value
        for *_, cell in table.cells():
            assert bool(cell.address) == (cell.value is not None)


def test_formats_print_the_same_numbers(context: Context) -> None:
    tables = write_tables(context)
    for name in build(context):
        page = [bare(text) for *_, text in Cells(tables[f"{name}.html"]).found]
        sheet = [row["printed"] or "-" for row in rows_of_csv(tables[f"{name}.csv"])]
        assert page == sheet
        assert list(numbers_of_latex(tables[f"{name}.tex"])) == page


def test_undefined_is_a_dash_and_its_reason_a_note() -> None:
    table = build(examples.usual())["joint_tests"]
    dashes = [cell for *_, cell in table.cells() if cell.undefined]
    assert dashes
    assert {cell.text for cell in dashes} == {"-"}
    reason = examples.usual().book.at("ten/short/joint_alpha/f/all/alpha/-").reason
    notes = html_table.fragment(table)
    assert f"– not defined: {reason} (Jul 2009 – Dec 2009)" in notes
    assert "nan" not in latex.render(table).lower()


def test_an_undefined_number_stands_without_brackets() -> None:
    dash, gap = Cell(float("nan"), kind="round", reason="no months"), Cell(None, kind="round")
    assert (latex.number(dash), html_table.number(dash)) == ("--", "–")
    assert (latex.number(gap), html_table.number(gap)) == ("", "")


def test_digits_align_with_and_without_brackets() -> None:
    plain, round_, square = (Cell(-2.325, kind=kind) for kind in ("plain", "round", "square"))
    assert latex.number(plain) == "$-$2.33"
    assert latex.number(round_) == r"($-$2.33\rlap{)}"
    assert latex.number(square) == r"[$-$2.33\rlap{]}"
    assert html_table.number(round_) == "(−2.33)"


def test_a_row_of_the_wrong_length_is_refused() -> None:
    with pytest.raises(ValueError, match="row r has"):
        Panel("p", Phrase(), (Phrase(),), (Column("c", Phrase()),), (Row("r", (Phrase(),), ()),))


def test_an_unknown_symbol_is_refused() -> None:
    with pytest.raises(KeyError, match="omega"):
        said("{omega}")


def test_symbols_are_ascii_where_text_is_plain() -> None:
    assert all(symbol.plain.isascii() and symbol.tex.isascii() for symbol in SYMBOLS.values())


@pytest.mark.fault(38)
@pytest.mark.parametrize(
    ("raw", "tex"),
    [
        ("R&D_50%", r"R\&D\_50\%"),
        ("{$x^2$}#~\\", r"\{\$x\textasciicircum{}2\$\}\#\textasciitilde{}\textbackslash{}"),
        ('<b>|"`', r"\textless{}b\textgreater{}\textbar{}\textquotedbl{}\textasciigrave{}"),
        ("a--b 1990–2009 −1", "a-{}-b 1990--2009 $-$1"),
        ("two\nlines\x00", "two lines "),
        ("x" * 32, "x" * 15 + r"\allowbreak{}" + "x" * 15 + r"\allowbreak{}xx"),
    ],
)
def test_latex_escapes(raw: str, tex: str) -> None:
    assert latex.escape(raw) == tex


@pytest.mark.fault(38)
def test_hostile_names_stay_text() -> None:
    tables = write_tables(examples.hostile())
    for name, text in tables.items():
        if name.endswith(".html"):
            assert "script" not in Cells(text).tags
            assert "&lt;script&gt;alert(1);" in text or name.startswith(("sample", "data_intake"))
        if name.endswith(".csv"):
            fields = [field for row in rows_of_csv(text) for field in row.values()]
            numbers = re.compile(r"-?\d[\d.e+-]*")
            bad = [f for f in fields if f[:1] in "=+-@" and f and not numbers.fullmatch(f)]
            assert bad == []


def test_csv_keys_are_ascii() -> None:
    for name, text in write_tables(examples.usual()).items():
        assert not name.endswith(".csv") or text.isascii()


def test_no_row_of_latex_begins_with_what_the_row_before_would_swallow(context: Context) -> None:
    r"""`\\` and the rules read on, over the line break, for `[` and `*`."""
    for name, text in write_tables(context).items():
        if name.endswith(".tex"):
            assert not re.search(r"(\\|\[a-z]+rule|\addlinespace)\s*[\[*]", text)
    assert latex.escape("[2] *food") == "{[}2] {*}food"


def test_latex_is_balanced(context: Context) -> None:
    for name, text in write_tables(context).items():
        if not name.endswith(".tex"):
            continue
        braces = re.sub(r"\\[{}]", "", text)
        assert braces.count("{") == braces.count("}")
        assert re.sub(r"\\.", "", text).count("$") % 2 == 0
        opened = re.findall(r"\\begin\{([^}]+)\}", text)
        assert sorted(opened) == sorted(re.findall(r"\\end\{([^}]+)\}", text))
        assert set(opened) <= {"table", "tabular*", "minipage"}


def test_latex_rows_have_one_cell_for_each_column(context: Context) -> None:
    for name, text in write_tables(context).items():
        for letters, cells, _ in rows_of_latex(text) if name.endswith(".tex") else ():
            spans = re.findall(r"\\multicolumn\{(\d+)\}", " ".join(cells))
            assert len(cells) + sum(int(span) - 1 for span in spans) == len(letters)


def test_long_tables_are_cut_into_pages_without_losing_a_row() -> None:
    text = write_tables(examples.many())["alphas_betas.tex"]
    assert text.count(r"\begin{table}") > 1
    assert text.count(r"\label{") == 1
    assert text.count(r"\begin{minipage}") == 1
    assert text.count("(continued)") == text.count(r"\addtocounter{table}{-1}")


def test_wide_sorts_wrap_into_blocks_of_ten() -> None:
    panels = build(examples.many())["alphas_betas"].panels
    assert [len(panel.columns) for panel in panels] == [10, 10, 5]


def test_other_sorts_follow_in_an_appendix() -> None:
    tables = build(examples.usual())
    assert [table.number for table in tables.values()] == [
        *"12345678",
        *(f"A{n}" for n in range(1, 7)),
    ]
    assert "ranked_portfolios-sectors" in tables


def test_supplied_assets_have_no_members_or_prior_betas() -> None:
    columns = [c.key for c in build(examples.hostile())["ranked_portfolios"].panels[0].columns]
    assert "members" not in columns
    assert "members" in [
        c.key for c in build(examples.usual())["ranked_portfolios"].panels[0].columns
    ]


def test_chosen_tables_alone_and_in_order() -> None:
    context = examples.study(
        {"ten": (examples.ranked_facts(), examples.groups(4))},
        [examples.subperiod("full", "1990-01", "1999-12")],
        paper={"tables": ["market_line", "sample"]},
    )
    assert [(n, t.number) for n, t in build(context).items()] == [
        ("market_line", "1"),
        ("sample", "2"),
    ]


def test_an_analysis_that_is_not_run_is_said_so() -> None:
    context = examples.study(
        {"ten": (examples.ranked_facts(), examples.groups(4))},
        [examples.subperiod("full", "1990-01", "1999-12")],
        analyses=["describe"],
    )
    tables = write_tables(context)
    for name in ("alphas_betas", "joint_tests", "market_line"):
        assert "does not ask for" in tables[f"{name}.html"]
        assert r"\begin{table}" in tables[f"{name}.tex"]


def test_two_assets_have_no_line_but_a_table() -> None:
    context = examples.study(
        {"two": (examples.ranked_facts("2 groups", 2), examples.groups(2))},
        [examples.subperiod("full", "1990-01", "1999-12")],
    )
    table = build(context)["market_line"]
    assert any(cell.undefined for *_, cell in table.cells())
    assert "not defined" in html_table.fragment(table)


def test_reasons_are_gathered_by_block_of_rows() -> None:
    dash = Cell(float("nan"), reason="too few months")
    rows = (Row("a", (said("1950s"),), (dash,)), Row("b", (Phrase(),), (dash,)))
    panel = Panel("p", Phrase(), (Phrase(),), (Column("c", said("C")),), rows)
    table = explained(Table("t", said("T"), (panel,), ()))
    assert [html_table.phrase(note) for note in table.notes] == [
        "– not defined: too few months (1950s)."
    ]


def test_tables_and_report_need_no_matplotlib() -> None:
    code = (
        "import sys, lineproof.paper.tables, lineproof.paper.report;"
        "import lineproof.paper.sample_table, lineproof.paper.portfolio_tables;"
        "import lineproof.paper.pricing_tables, lineproof.paper.intake_table;"
        "print({'matplotlib', 'scipy', 'pandera'} & set(sys.modules))"
    )
    assert _python(code) == "set()"


def test_exhibits_need_no_library() -> None:
    code = (
        "import sys, lineproof.paper.exhibits;"
        "print({'numpy', 'pandas', 'matplotlib', 'jinja2'} & set(sys.modules))"
    )
    assert _python(code) == "set()"


def _python(code: str) -> str:
    run = subprocess.run(
        [sys.executable, "-c", f"import sys; sys.path[:0] = {sys.path!r}; {code}"],
        capture_output=True,
        text=True,
        check=True,
    )
    return run.stdout.strip()


DESCRIBE, SERIES = "ten/full/describe/-", "ten/full/time_series/market"
LINE, EIV = "ten/full/market_line/ols/all", "errors_in_variables"
MARKET_MEAN = "ten/full/market_line/-/all/market_mean/-"


@pytest.mark.parametrize(
    ("table", "row", "column", "address", "quantity"),
    [
        ("sample", "rows_read", "n_rows", "-/-/intake/rows/all/rows_read/-", "estimate"),
        ("sample", "fault-15", "n_rows", "-/-/intake/fault/fault-15/n_rows/-", "estimate"),
        ("sample", "screen-1", "n_rows", "-/-/intake/screen/screen-1/n_rows/-", "estimate"),
        ("data_intake", "rows", "rows_kept", "-/-/intake/rows/all/rows_kept/-", "estimate"),
        ("data_intake", "fault-15", "n_rows", "-/-/intake/fault/fault-15/n_rows/-", "estimate"),
        (
            "data_intake",
            "screen-1",
            "n_securities",
            "-/-/intake/screen/screen-1/n_securities/-",
            "estimate",
        ),
        ("sample", "full", "n_exits", "-/full/sample/panel/all/n_exits/-", "estimate"),
        ("sample", "full", "market_mean", f"{DESCRIBE}/market/mean/-", "estimate"),
        ("sample", "full", "market_sd", f"{DESCRIBE}/market/sd/-", "estimate"),
        ("sample", "full", "market_t", f"{DESCRIBE}/market/mean/-", "statistic"),
        ("sample", "full", "riskless_sd", f"{DESCRIBE}/riskless/sd/-", "estimate"),
        ("ranked_portfolios", "p03", "mean", f"{DESCRIBE}/p03/mean/-", "estimate"),
        ("ranked_portfolios", "p03", "sd", f"{DESCRIBE}/p03/sd/-", "estimate"),
        ("ranked_portfolios", "p03", "t_alpha", f"{SERIES}/p03/alpha/hac", "statistic"),
        ("ranked_portfolios", "p03", "rho", f"{SERIES}/p03/residual_ac1/-", "estimate"),
        ("ranked_portfolios", "market", "mean", f"{DESCRIBE}/market/mean/-", "estimate"),
        ("alphas_betas", "full:alpha", "p10", f"{SERIES}/p10/alpha/hac", "estimate"),
        ("alphas_betas", "full:t", "p10", f"{SERIES}/p10/alpha/hac", "statistic"),
        ("alphas_betas", "full:beta", "p10", f"{SERIES}/p10/beta/hac", "estimate"),
        ("joint_tests", "full:statistic", "f", "ten/full/joint_alpha/f/all/alpha/-", "statistic"),
        ("joint_tests", "full:p", "lm", "ten/full/joint_alpha/lm/all/alpha/-", "p"),
        (
            "joint_tests",
            "full:statistic",
            "periods",
            "ten/full/joint_alpha/f/all/alpha/-",
            "n_periods",
        ),
        ("market_line", "full:estimate", "gamma0", f"{LINE}/intercept/{EIV}", "estimate"),
        ("market_line", "full:t", "gamma1", f"{LINE}/slope/{EIV}", "statistic"),
        ("market_line", "full:estimate", "fbar", MARKET_MEAN, "estimate"),
        ("market_line", "full:t", "difference", f"{LINE}/slope_minus_market/{EIV}", "statistic"),
        (
            "market_line",
            "full:estimate",
            "critical",
            f"{LINE}/slope_minus_market/{EIV}",
            "critical",
        ),
        (
            "market_line",
            "full:estimate",
            "textbook_t",
            f"{LINE}/slope_minus_market/textbook",
            "statistic",
        ),
        (
            "market_line",
            "full:estimate",
            "joint_p",
            f"{LINE}/intercept_and_slope_minus_market/{EIV}",
            "p",
        ),
        ("market_line", "full:estimate", "r2", f"{LINE}/r2/-", "estimate"),
    ],
)
def test_cells_show_what_their_headings_say(
    table: str, row: str, column: str, address: str, quantity: str
) -> None:
    """The addresses are written out here, apart from the code that looks them up."""
    found = [
        (cell.address, cell.column)
        for panel, each, head, cell in build(examples.usual())[table].cells()
        if panel.key not in ("ten_size", "sectors")
        if (each.key, head.key) == (row, column)
    ]
    assert found == [(address, quantity)]


def test_without_a_riskless_rate_the_sample_shows_a_dash_and_says_why() -> None:
    period = examples.subperiod("full", "1990-01", "1999-12")
    study = examples.study(
        {"ten": (examples.ranked_facts(), examples.groups(10))},
        [period],
        has_riskless=False,
        market_build="size",
    )
    table = build(study)["sample"]
    returns = table.panels[2]
    shown = dict(zip([c.key for c in returns.columns], returns.rows[0].cells, strict=True))
    assert [key for key, cell in shown.items() if cell.undefined] == [
        "riskless_mean",
        "riskless_sd",
    ]
    text = write_tables(study)["sample.html"]
    why = "not defined: the study has returns in excess of a riskless rate that is not known"
    assert text.count(why) == 1
    assert (
        "The market is the mean of all securities, weighted by size at the end of the period before."
        in text
    )


def test_the_intake_without_faults_or_screens_says_so() -> None:
    table = build(examples.hostile())["data_intake"]
    assert [panel.key for panel in table.panels] == ["rows"]
    said_ = html_table.fragment(table)
    assert "No row has a fault." in said_
    assert "There are no screens." in said_


def test_faults_are_shown_with_number_and_answer() -> None:
    panel = build(examples.usual())["data_intake"].panels[1]
    labels = [[html_table.phrase(label) for label in row.labels] for row in panel.rows]
    assert labels[1] == ["a return below −100 %", "15", "set aside"]
    assert labels[3] == ["a return of exactly −100 %", "16", "kept, flagged"]
