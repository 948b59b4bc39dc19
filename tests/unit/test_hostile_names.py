"""Names that look like markup or formulas, from the raw file to the CSV and the printed page: text everywhere."""

from __future__ import annotations

import csv
import html
import io
from pathlib import Path

import pytest
from tests.unit import paper_examples as paper
from tests.unit.intake_examples import COLUMNS, HEADER, fault, months, validate

from lineproof import store
from lineproof.checking import describe_intake
from lineproof.paper import latex
from lineproof.paper.context import Context
from lineproof.paper.exhibits import figure_files
from lineproof.paper.report import write_report
from lineproof.paper.tables import write_tables
from lineproof.spreadsheet import as_text

NAMES = ["<script>alert(1);", "=cmd()|'calc'!A0", "R&D_50%", "+1+1", "@SUM(1)", "-2-3"]


def raw(names: list[str]) -> str:
    """Two months of each security, the second of which has no number for a return; each in a sector of its name."""
    sink = io.StringIO()
    writer = csv.writer(sink, lineterminator="\n")
    writer.writerow([*HEADER.split(","), "sector"])
    for name in names:
        for month, value in zip(months("2000-01", 2), ("0.01", "x"), strict=True):
            writer.writerow([name, f"{month}-28", value, "", "1", "1", name])
    return sink.getvalue()


@pytest.mark.fault(38)
def test_securities_and_sectors_stay_what_they_are(tmp_path: Path) -> None:
    found = validate(tmp_path, raw(NAMES), columns={**COLUMNS, "sector": "sector"})
    assert sorted(found.panel["security"].astype(str)) == sorted(NAMES)
    assert found.panel["sector"].astype(str).tolist() == found.panel["security"].tolist()
    assert fault(found, 13)["n"] == len(NAMES)
    assert describe_intake(found.intake)


@pytest.mark.fault(38)
def test_the_rows_set_aside_hold_no_formula(tmp_path: Path) -> None:
    found = validate(tmp_path, raw(NAMES), columns={**COLUMNS, "sector": "sector"})
    store.write_csv(found.set_aside, tmp_path / "set_aside.csv")
    text = (tmp_path / "set_aside.csv").read_text("utf-8")
    rows = list(csv.DictReader(io.StringIO(text)))
    assert [row["raw"].removeprefix("'") for row in rows] == list(found.set_aside["raw"])
    marked = [name for name, row in zip(NAMES, rows, strict=True) if row["raw"].startswith("'")]
    assert marked == ["=cmd()|'calc'!A0", "+1+1", "@SUM(1)", "-2-3"]
    cells = [cell for row in rows for cell in row.values()]
    assert [cell for cell in cells if cell[:1] in set("=+-@")] == []


@pytest.fixture(scope="module")
def context() -> Context:
    """Test assets, as sectors are, a subperiod, a title and the label of a screen with such names."""
    intake = {
        **paper.INTAKE,
        "screens": [{"label": f"sector is {NAMES[0]}", "n_rows": 1, "n_securities": 1}],
    }
    intake["faults"] = [{"number": 19, "label": NAMES[0], "answer": "set aside", "n": 2}]
    return paper.study(
        {"given": ({"title": f"Sectors of {NAMES[0]}", "design": "supplied"}, NAMES)},
        [paper.subperiod("full", "1990-01", "1999-12", f"All of {NAMES[1]}")],
        intake=intake,
        title=NAMES[0],
        market_name=NAMES[2],
    )


@pytest.mark.fault(38)
def test_tables_print_them_as_text(context: Context) -> None:
    tables = write_tables(context)
    whole = {
        ending: "".join(text for file, text in tables.items() if file.endswith(ending))
        for ending in (".html", ".tex", ".csv")
    }
    assert "<script" not in whole[".html"]
    assert "<script" not in whole[".tex"]
    cells = {cell for row in csv.reader(io.StringIO(whole[".csv"])) for cell in row}
    for name in NAMES:
        assert f">{html.escape(name)}<" in whole[".html"]
        assert (
            latex.escape(name, longest=10) in whole[".tex"] or latex.escape(name) in whole[".tex"]
        )
        assert as_text(name) in cells
        assert name not in cells - {as_text(name)}


@pytest.mark.fault(38)
def test_the_report_prints_them_as_text(context: Context) -> None:
    svg = b'<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 1 1"></svg>'
    page = write_report(context, dict.fromkeys(figure_files(context.facts), svg))
    assert "<script" not in page
    assert html.escape(NAMES[0]) in page
