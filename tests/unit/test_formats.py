"""Every format gives the same rows, whatever it is packed in, however it is laid out, and in whatever blocks."""

from __future__ import annotations

import datetime
import gzip
import shutil
import zipfile
from pathlib import Path
from typing import Any

import numpy as np
import openpyxl
import pandas as pd
import pyarrow as pa
import pyarrow.compute as pc
import pyarrow.feather
import pyarrow.parquet as pq
import pytest
import statsmodels
from tests.unit import format_examples as formats
from tests.unit import intake_examples as examples
from tests.unit.format_examples import COLUMNS, LEAP, NEW, ROWS, TABLE, WRITERS

from lineproof.intake import lines, packaged, textfile
from lineproof.intake.reading import RawBlock, open_files, read_text
from lineproof.problems import KnownProblem

TYPED = [name for name in WRITERS if ".csv" not in name and ".tsv" not in name]


def blocks_of(files: str | list[str], **changes: Any) -> list[RawBlock]:
    return [b for f in open_files(files, formats.reading(**changes)) for b in f.blocks()]


def column(blocks: list[RawBlock], name: str) -> pa.Array:
    return pa.concat_arrays([block.columns[name] for block in blocks])


def raw_of(file: str, positions: list[int], **changes: Any) -> list[str]:
    (opened,) = open_files(file, formats.reading(**changes))
    return [text for texts in opened.raw(formats.as_positions(positions)) for text in texts]


def message(files: str | list[str], **changes: Any) -> str:
    with pytest.raises(KnownProblem) as caught:
        blocks_of(files, **changes)
    assert len(caught.value.problems) == 1
    return str(caught.value).removeprefix(examples.UNUSABLE)


@pytest.mark.parametrize("name", WRITERS)
def test_every_format_gives_the_same_rows(tmp_path: Path, name: str) -> None:
    blocks = blocks_of(formats.write(tmp_path, name))
    assert column(blocks, "security").to_pylist() == [row[0] for row in ROWS]
    assert formats.dates(column(blocks, "date")) == [row[1] for row in ROWS]
    assert formats.numbers(column(blocks, "return")) == [row[2] for row in ROWS]
    assert formats.numbers(column(blocks, "size")) == [row[3] for row in ROWS]
    first = 1 if name in TYPED and name != "r.xlsx" else 2
    assert np.concatenate([b.position for b in blocks]).tolist() == list(range(first, first + 5))
    assert [block.rejects for block in blocks if block.rejects] == []


@pytest.mark.parametrize("name", TYPED)
def test_typed_formats_give_typed_columns(tmp_path: Path, name: str) -> None:
    blocks = blocks_of(formats.write(tmp_path, name))
    kinds = {ours: column(blocks, ours).type for ours in COLUMNS}
    assert kinds["security"] == pa.string()
    assert kinds["return"] == kinds["size"] == pa.float64()
    assert pa.types.is_date32(kinds["date"]) or pa.types.is_timestamp(kinds["date"])


@pytest.mark.parametrize("name", WRITERS)
def test_blocks_do_not_show(tmp_path: Path, name: str, monkeypatch: pytest.MonkeyPatch) -> None:
    file = formats.write(tmp_path, name)
    whole = read_text(file, formats.reading())
    for module, constant, size in (
        (lines, "_BLOCK", 20),
        (textfile, "_SPLIT", 1),
        (packaged, "_ROWS", 2),
        ("lineproof.intake.columnar", "PIECE", 2),
    ):
        if isinstance(module, str):
            monkeypatch.setattr(f"{module}.{constant}", size)
        else:
            monkeypatch.setattr(module, constant, size)
    assert len(blocks_of(file)) > 1
    pd.testing.assert_frame_equal(read_text(file, formats.reading()).rows, whole.rows)


@pytest.mark.parametrize("name", TYPED)
def test_raw_rows_of_typed_formats_are_lines_of_csv(tmp_path: Path, name: str) -> None:
    first = 2 if name == "r.xlsx" else 1
    found = raw_of(formats.write(tmp_path, name), [first + 1, first + 2])
    assert [text.split(",")[0] for text in found] == ["00102", "00103"]
    assert found[0].endswith(",-0.5,35.5")


# Identifiers and dates.


@pytest.mark.parametrize(
    ("given", "expected"),
    [
        (pa.array([10001.0, 2.5, None, float("nan")]), ["10001", "2.5", "", ""]),
        (pa.array([7, 2**62 + 1, None, 0]), ["7", "4611686018427387905", "", "0"]),
        (pa.array([" a ", "", None, "é\u00a0"]), ["a", "", "", "é"]),
        (pa.array(["x", None, "y", "x"]).dictionary_encode(), ["x", "", "y", "x"]),
        (pa.array([b"ab", None, b"c", b""]), ["ab", "", "c", ""]),
        (pa.array([1, 2, 3, None]).cast(pa.decimal128(22, 2)), ["1", "2", "3", ""]),
        (pa.nulls(4), ["", "", "", ""]),
    ],
)
def test_identifiers_are_text(tmp_path: Path, given: pa.Array, expected: list[str]) -> None:
    columns = {"id": given, "day": [20000131] * 4, "ret": [1, 2, 3, 4], "cap": pa.nulls(4)}
    blocks = blocks_of(examples.write_parquet(tmp_path / "r.parquet", columns))
    assert column(blocks, "security").to_pylist() == expected
    assert column(blocks, "date").to_pylist() == ["20000131"] * 4
    assert column(blocks, "return").type == pa.int64()
    assert column(blocks, "size").to_pylist() == [None] * 4


def test_lists_are_no_column(tmp_path: Path) -> None:
    columns = {"id": [[1]], "day": [NEW], "ret": [0.1], "cap": [1.0]}
    assert message(examples.write_parquet(tmp_path / "r.parquet", columns)) == (
        "  raw/r, column id: it holds values of the type list<element: int64>\n"
        "    → give numbers, text or dates"
    )


# Stata and Excel.


def test_stata_months_are_dates(tmp_path: Path) -> None:
    frame = pd.DataFrame({"id": [1, 2], "day": pd.to_datetime(["2000-01-01", "2000-02-01"])})
    frame = frame.assign(ret=np.float32([0.5, np.nan]), cap=[1, 2])
    frame.to_stata(tmp_path / "r.dta", write_index=False, convert_dates={"day": "tm"})
    blocks = blocks_of(str(tmp_path / "r.dta"))
    assert formats.dates(column(blocks, "date")) == [
        datetime.date(2000, 1, 1),
        datetime.date(2000, 2, 1),
    ]
    assert column(blocks, "security").to_pylist() == ["1", "2"]
    assert column(blocks, "return").to_pylist() == [0.5, None]


def test_stata_file_of_others(tmp_path: Path) -> None:
    """US macroeconomic data 1959–2009 in the .dta that statsmodels carries, against its CSV of the same data."""
    folder = Path(statsmodels.__file__).parent / "datasets" / "macrodata"
    columns = {"security": "quarter", "date": "year", "return": "infl", "size": "realgdp"}
    blocks = blocks_of(str(folder / "macrodata.dta"), columns=columns)
    with (folder / "macrodata.csv").open() as stream:
        table = pd.read_csv(stream)
    assert column(blocks, "date").to_pylist() == [str(int(year)) for year in table["year"]]
    assert column(blocks, "security").to_pylist() == [str(int(q)) for q in table["quarter"]]
    # The .dta holds single precision: 24 bits, so relative differences stay below 2**-24.
    for name, theirs in (("return", "infl"), ("size", "realgdp")):
        found = column(blocks, name).to_numpy()
        np.testing.assert_allclose(found, table[theirs], rtol=2**-24, atol=0)


def sheet(path: Path, rows: list[list[Any]], title: str = "data") -> str:
    book = openpyxl.Workbook()
    book.active.append(["a", "b"])
    target = book.create_sheet(title)
    for row in rows:
        target.append(row)
    book.save(path)
    return str(path)


def test_sheet_by_its_name_with_blank_rows_and_text_among_numbers(tmp_path: Path) -> None:
    rows = [
        ["id", "day", "ret", "cap"],
        [101, datetime.datetime(2000, 1, 31), 0.5, 10],
        [None, None, None, None],
        [102, datetime.datetime(2000, 2, 29), "NA", None],
    ]
    file = sheet(tmp_path / "r.xlsx", rows)
    blocks = blocks_of(file, sheet="data", decimal="comma")
    assert column(blocks, "security").to_pylist() == ["101", "102"]
    assert column(blocks, "return").to_pylist() == ["0,5", "NA"]
    assert column(blocks, "size").to_pylist() == [10.0, None]
    assert formats.dates(column(blocks, "date")) == [NEW, LEAP]
    assert blocks[0].position.tolist() == [2, 4]
    assert raw_of(file, [4], sheet="data") == ["102,2000-02-29,NA,"]
    assert (
        message(file, sheet="dato") == "  raw/r: there is no sheet 'dato'\n    → did you mean data?"
    )


# Several files.


def test_folder_of_parquet_files_whose_folders_are_columns(tmp_path: Path) -> None:
    root = tmp_path / "returns"
    with_year = TABLE.append_column(
        "year", pc.cast(pc.fill_null(pc.year(TABLE["day"]), 0), pa.string())
    )
    pq.write_to_dataset(with_year, root, partition_cols=["year", "id"])
    (root / "_SUCCESS").write_text("")
    pq.write_table(TABLE, root / "_hidden.parquet")
    columns = {**COLUMNS, "year": "year"}
    opened = open_files(str(root), formats.reading(label="raw/returns/", columns=columns))
    assert opened[0].label.startswith("raw/returns/year=0/id=")
    found = set()
    for file in opened:
        for block in file.blocks():
            names = ("security", "year", "return")
            found |= set(zip(*(block.columns[name].to_pylist() for name in names), strict=True))
            (texts,) = file.raw(block.position[:1])
            assert texts[0].endswith(block.columns["security"][0].as_py())
    assert found == {(r[0], str(r[1].year) if r[1] else "0", r[2]) for r in ROWS}


def test_several_files_keep_their_labels(tmp_path: Path) -> None:
    files = [examples.write(tmp_path / f"{n}.csv", formats.text()) for n in "ab"]
    labels = ["raw/a.csv", "raw/b.csv"]
    opened = open_files(files, formats.reading(labels=labels))
    assert [file.label for file in opened] == labels
    assert len(column(blocks_of(files), "return")) == 2 * len(ROWS)
    assert len(read_text(files, formats.reading()).rows) == 2 * len(ROWS)


def test_one_of_several_files_may_have_no_row(tmp_path: Path) -> None:
    empty = examples.write_parquet(tmp_path / "b.parquet", TABLE.slice(0, 0).to_pydict())
    whole = formats.write(tmp_path, "r.parquet")
    assert len(column(blocks_of([whole, empty]), "return")) == len(ROWS)
    assert message(empty) == "  raw/r: there is a header but no row\n    → deliver it again"


# Encodings, decimal commas, zip archives.


@pytest.mark.parametrize("encoding", ["latin-1", "cp1252", "utf-16", "utf-16-le", "utf-8-sig"])
@pytest.mark.parametrize("block", [1, 7, 1 << 20])
def test_encodings(
    tmp_path: Path, encoding: str, block: int, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(lines, "_BLOCK", block)
    text = formats.text().replace("00102", "Ærø Å")
    (tmp_path / "r.csv.gz").write_bytes(gzip.compress(text.encode(encoding)))
    blocks = blocks_of(str(tmp_path / "r.csv.gz"), encoding=encoding)
    assert column(blocks, "security").to_pylist()[1] == "Ærø Å"
    assert len(column(blocks, "return")) == len(ROWS)


@pytest.mark.parametrize(
    ("content", "encoding", "line", "byte"),
    [
        (b"id,day,ret,cap\n1,\x81,3,4\n", "cp1252", 2, 18),
        ("id,day,ret,cap\n1,".encode("utf-16-le") + b"\x00\xd8x\x00", "utf-16-le", 2, 35),
        ("id,day,ret,cap\n1,2,3,4".encode("utf-16-le") + b"x", "utf-16-le", 2, 45),
    ],
)
@pytest.mark.parametrize("block", [1, 1 << 20])
def test_first_byte_that_the_encoding_has_not(
    tmp_path: Path,
    content: bytes,
    encoding: str,
    line: int,
    byte: int,
    block: int,
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    monkeypatch.setattr(lines, "_BLOCK", block)
    (tmp_path / "r.csv").write_bytes(content)
    assert message(str(tmp_path / "r.csv"), encoding=encoding) == (
        f"  raw/r, line {line}: byte {byte} is not {encoding} text\n    → check encoding:"
    )


def test_decimal_comma_leaves_the_text_as_it_stands(tmp_path: Path) -> None:
    file = examples.write(tmp_path / "r.csv", formats.text(";", ","))
    blocks = blocks_of(file, separator=";", decimal="comma")
    assert column(blocks, "return").to_pylist()[:2] == ["0,0125", "-0,5"]
    assert raw_of(file, [2], separator=";") == ["00101;2000-01-31;0,0125;1200,0"]


def test_zip_with_several_files_or_a_broken_one(tmp_path: Path) -> None:
    with zipfile.ZipFile(tmp_path / "r.zip", "w") as archive:
        archive.writestr("a.csv", formats.text())
        archive.writestr("b.csv", formats.text())
    assert message(str(tmp_path / "r.zip")) == (
        "  raw/r: the zip archive holds 2 files: a.csv, b.csv\n"
        "    → pack one file, or unpack it and name the files under file:"
    )
    content = Path(formats.write(tmp_path, "r.csv.zip")).read_bytes()
    (tmp_path / "r.csv.zip").write_bytes(content[:-30])
    assert "r: it cannot be read: File is not a zip file" in message(str(tmp_path / "r.csv.zip"))


# Wide files.

WIDE = "month,A,B,index,007\n2000-01,0.1,,5,NA\n2000-02, 0.2,-0.3,6,\n2000-03,1,2\n2000-04,0.4,0.5,7,0.6\n"
CELLS = [
    ("A", "2000-01", "0.1", 2),
    ("007", "2000-01", "NA", 2),
    ("A", "2000-02", "0.2", 3),
    ("B", "2000-02", "-0.3", 3),
    ("A", "2000-04", "0.4", 5),
    ("B", "2000-04", "0.5", 5),
    ("007", "2000-04", "0.6", 5),
]
IS_WIDE = {"columns": {"date": "month"}, "layout": "wide", "leave_out": ["index"], "dates": "%Y-%m"}


@pytest.mark.parametrize("block", [10, 1 << 20])
def test_each_cell_of_a_wide_file_is_a_row(
    tmp_path: Path, block: int, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(lines, "_BLOCK", block)
    file = examples.write(tmp_path / "r.csv", WIDE)
    (opened,) = open_files(file, formats.reading(**IS_WIDE))
    found, positions, n_trimmed = [], [], 0
    for part in opened.blocks():
        names = ("security", "date", "return")
        rows = zip(*(part.columns[name].to_pylist() for name in names), strict=True)
        found += [
            (*row, line)
            for row, line in zip(rows, opened.line(part.position).tolist(), strict=True)
        ]
        positions += [*part.position.tolist(), *(position for position, _ in part.rejects)]
        n_trimmed += part.n_trimmed
        for position, reason in part.rejects:
            assert opened.line(np.array([position])).tolist() == [4]
            assert reason == "3 fields instead of 5"
    assert found == CELLS
    assert n_trimmed == 1
    assert raw_of(file, sorted(positions), **IS_WIDE) == [
        *("A=0.1", "007=NA", "A= 0.2", "B=-0.3", "2000-03,1,2", "A=0.4", "B=0.5", "007=0.6")
    ]


def test_wide_typed_files(tmp_path: Path) -> None:
    columns = {"month": [NEW, LEAP], "A": [0.1, None], "B": [1, 2], "index": ["x", "y"]}
    file = examples.write_parquet(tmp_path / "r.parquet", columns)
    blocks = blocks_of(file, **IS_WIDE, names="asset")
    assert column(blocks, "asset").to_pylist() == ["A", "B", "B"]
    assert column(blocks, "return").to_pylist() == [0.1, 1.0, 2.0]
    assert column(blocks, "date").to_pylist() == [NEW, NEW, LEAP]
    assert raw_of(file, blocks[0].position.tolist(), **IS_WIDE) == ["A=0.1", "B=1", "B=2"]


def test_wide_file_with_a_name_to_leave_out_that_is_absent(tmp_path: Path) -> None:
    file = examples.write(tmp_path / "r.csv", WIDE)
    assert message(file, **{**IS_WIDE, "leave_out": ["indx"]}) == (
        "  raw/r: there is no column 'indx'\n"
        "    → did you mean index? The columns are: month, A, B, index, 007"
    )


# Names that say another format.


@pytest.mark.parametrize("ending", ["parquet", "feather", "dta", "sas7bdat", "xlsx"])
def test_ending_says_a_typed_format_but_it_is_text(tmp_path: Path, ending: str) -> None:
    file = examples.write(tmp_path / f"r.{ending}", formats.text())
    said = message(file)
    assert "but its first bytes are those of something else" in said
    assert said.endswith("\n    → name it as what it is, or deliver it again")


def test_ending_says_one_typed_format_but_it_is_another(tmp_path: Path) -> None:
    shutil.copy(formats.write(tmp_path, "r.parquet"), tmp_path / "r.dta")
    assert message(str(tmp_path / "r.dta")) == (
        "  raw/r: its ending says a Stata file, but its first bytes say it is a Parquet file\n"
        "    → name it as what it is, or deliver it again"
    )


@pytest.mark.parametrize(
    ("name", "said"), [("r.xls", "an old Excel workbook"), ("r.sav", "an SPSS file")]
)
def test_formats_that_are_not_read(tmp_path: Path, name: str, said: str) -> None:
    file = examples.write(tmp_path / name, "x")
    assert (
        message(file)
        == f"  raw/r: it is {said}, which is not read\n    → save it as CSV or Parquet"
    )


def test_typed_file_inside_a_compressed_one(tmp_path: Path) -> None:
    file = examples.write(tmp_path / "r.dta.gz", "x")
    assert message(file) == (
        "  raw/r: it is a Stata file inside a compressed file\n"
        "    → unpack it first; only text is read compressed"
    )


def test_lines_that_end_with_carriage_returns_alone(tmp_path: Path) -> None:
    file = examples.write(tmp_path / "r.csv", formats.text().replace("\n", "\r"))
    assert message(file) == (
        "  raw/r, line 1: its lines end with carriage returns alone\n"
        "    → save it with line feeds, as other programs do"
    )


def test_reading_can_stop_early(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(lines, "_BLOCK", 10)
    (opened,) = open_files(formats.write(tmp_path, "r.csv"), formats.reading())
    blocks = opened.blocks()
    next(blocks)
    blocks.close()
    assert sum(len(block.position) for block in opened.blocks()) == len(ROWS)


def test_days_that_python_does_not_know_are_text_in_raw_rows(tmp_path: Path) -> None:
    day = pa.array([2**31 - 1], pa.int32()).cast(pa.date32())
    columns = {"id": ["1"], "day": day, "ret": [0.5], "cap": [1]}
    file = examples.write_parquet(tmp_path / "r.parquet", columns)
    assert raw_of(file, [1])[0].startswith("1,")
