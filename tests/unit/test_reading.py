"""Raw files as text: what stops a file, what sets a row aside, and what is read in spite of its looks."""

from __future__ import annotations

import csv
import datetime
import gzip
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pyarrow as pa
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from tests.unit import intake_examples as examples

from lineproof.intake import lines
from lineproof.intake.reading import TextTable, open_files, read_text
from lineproof.problems import KnownProblem

COLUMNS = {"security": "id", "date": "day", "return": "ret"}


def raw_rows(file: str, wanted: np.ndarray) -> list[str]:
    """The text of some lines, or rows, of a file."""
    (opened,) = open_files(file, {"label": file, "columns": {}})
    return [text for texts in opened.raw(wanted) for text in texts]


TEXT = "id,day,ret\n1,2000-01-31,0.1\n2,2000-01-31,0.2\n"


def read(folder: Path, content: str | bytes, name: str = "r.csv", **changes: Any) -> TextTable:
    file = examples.write(folder / name, content)
    return read_text(file, examples.reading(f"raw/{name}", COLUMNS, **changes))


def message(*arguments: Any, **options: Any) -> str:
    with pytest.raises(KnownProblem) as caught:
        read(*arguments, **options)
    return str(caught.value).removeprefix(examples.UNUSABLE)


def rows_of(table: TextTable) -> list[tuple]:
    return list(table.rows.itertuples(index=False, name=None))


# Fault 1: missing, empty, header only, broken.


@pytest.mark.fault(1)
def test_missing_file(tmp_path: Path) -> None:
    with pytest.raises(KnownProblem) as caught:
        read_text(str(tmp_path / "none.csv"), examples.reading("raw/none.csv", COLUMNS))
    assert str(caught.value) == (
        "The raw data cannot be used; nothing was written.\n"
        "  raw/none.csv: there is no such file\n"
        "    → check the path in the study file"
    )


@pytest.mark.fault(1)
@pytest.mark.parametrize("name", ["r.csv", "r.csv.gz", "r.parquet"])
def test_empty_file(tmp_path: Path, name: str) -> None:
    assert (
        message(tmp_path, b"", name) == f"  raw/{name}: the file is empty\n    → deliver it again"
    )


@pytest.mark.fault(1)
@pytest.mark.parametrize("text", ["id,day,ret", "id,day,ret\n", "id,day,ret\r\n\r\n  \n"])
def test_header_only(tmp_path: Path, text: str) -> None:
    said = "  raw/r.csv: there is a header but no row\n    → deliver it again"
    assert message(tmp_path, text) == said


def test_no_header(tmp_path: Path) -> None:
    said = "  raw/r.csv, line 1: there are no column names\n    → give a header in line 1"
    assert message(tmp_path, "\n" + TEXT) == said


@pytest.mark.fault(1)
def test_cut_off_gzip(tmp_path: Path) -> None:
    whole = gzip.compress((TEXT * 1000).encode())
    (tmp_path / "r.csv.gz").write_bytes(whole[:-20])
    with pytest.raises(KnownProblem) as caught:
        read_text(str(tmp_path / "r.csv.gz"), examples.reading("raw/r.csv.gz", COLUMNS))
    assert str(caught.value).removeprefix(examples.UNUSABLE) == (
        "  raw/r.csv.gz: it cannot be read: Truncated compressed stream\n"
        "    → is it complete, and what its ending says?"
    )


def test_ending_says_gzip_but_it_is_text(tmp_path: Path) -> None:
    (tmp_path / "r.csv.gz").write_text(TEXT)
    with pytest.raises(KnownProblem, match=r"raw/r\.csv\.gz: it cannot be read: zlib"):
        read_text(str(tmp_path / "r.csv.gz"), examples.reading("raw/r.csv.gz", COLUMNS))


@pytest.mark.fault(1)
@pytest.mark.parametrize(
    ("content", "what"),
    [
        (gzip.compress(TEXT.encode(), mtime=0), "compressed with gzip"),
        (b"PAR1\x15\x04", "a Parquet file"),
        (b"PK\x03\x04\x14", "a spreadsheet or a zip archive"),
        (b"BZh91AY", "compressed with bzip2"),
        (b"ARROW1\0\0", "a Feather (Arrow IPC) file"),
    ],
)
def test_ending_says_text_but_it_is_not(tmp_path: Path, content: bytes, what: str) -> None:
    assert message(tmp_path, content) == (
        f"  raw/r.csv: its ending says plain text, but its first bytes say it is {what}\n"
        "    → name it as what it is, or save it as CSV"
    )


def test_utf16_is_named_as_what_to_set(tmp_path: Path) -> None:
    assert message(tmp_path, TEXT.encode("utf-16")) == (
        "  raw/r.csv: its first bytes say it is UTF-16 text\n    → set encoding: utf-16"
    )


@pytest.mark.fault(1)
def test_broken_parquet_footer(tmp_path: Path) -> None:
    examples.write_parquet(tmp_path / "whole.parquet", {"id": ["1"], "day": ["x"], "ret": [0.1]})
    broken = (tmp_path / "whole.parquet").read_bytes()[:-4]
    said = message(tmp_path, broken, "r.parquet")
    assert said.startswith("  raw/r.parquet: it cannot be read: Parquet magic bytes not found")
    assert said.endswith("\n    → is it complete, and what its ending says?")


# Faults 2, 3, 4 and 6: encoding, columns, separator.


@pytest.mark.fault(2)
def test_first_byte_that_is_not_utf8(tmp_path: Path) -> None:
    content = TEXT.encode() + "3,2000-01-31,é\n".encode("latin-1")
    position = content.index(b"\xe9") + 1
    assert message(tmp_path, content) == (
        f"  raw/r.csv, line 4: byte {position} is not UTF-8 text\n"
        "    → save the file as UTF-8, or set encoding: as in latin-1 or cp1252"
    )


@pytest.mark.fault(3)
def test_absent_columns_with_the_nearest_name(tmp_path: Path) -> None:
    assert message(tmp_path, "id,date,return\n1,2000-01-31,0.1\n") == (
        "  raw/r.csv: there is no column 'day'\n"
        "    → The columns are: id, date, return\n"
        "  raw/r.csv: there is no column 'ret'\n"
        "    → did you mean return? The columns are: id, date, return"
    )


@pytest.mark.fault(4)
def test_column_twice(tmp_path: Path) -> None:
    assert message(tmp_path, "id,day,ret,note,note\n1,2,3,4,5\n") == (
        "  raw/r.csv: two columns are called 'note'\n    → rename one of them"
    )


def test_columns_without_a_name_may_repeat(tmp_path: Path) -> None:
    assert rows_of(read(tmp_path, "id,day,ret,,\n1,2,3,,\n")) == [("1", "2", "3", 2)]


@pytest.mark.fault(6)
@pytest.mark.parametrize(
    ("separator", "name", "shown"),
    [(";", "semicolon", '";"'), ("\t", "tab", '"\\t"'), ("|", "bar", '"|"')],
)
def test_other_separator(tmp_path: Path, separator: str, name: str, shown: str) -> None:
    text = TEXT.replace(",", separator)
    assert message(tmp_path, text) == (
        f"  raw/r.csv: its header has no comma but a {name}\n    → set separator: {shown}"
    )
    assert rows_of(read(tmp_path, text, separator=separator)) == rows_of(read(tmp_path, TEXT))


def test_separator_that_cannot_be_one(tmp_path: Path) -> None:
    assert message(tmp_path, TEXT, separator="§") == (
        "  raw/r.csv, separator: the character '§' cannot part the fields of a file\n"
        "    → use , or ; or | or a tab"
    )


# Fault 5: fields that do not fit the header.


@pytest.mark.fault(5)
def test_rows_that_do_not_fit(tmp_path: Path) -> None:
    table = read(
        tmp_path,
        'id,day,ret\n1,a,b,c\n1,a,b\n\n1,a\n1,"a,b\n1,a "b" c,d\n1,a\rb,c\n1,"a,b",c"',
    )
    assert rows_of(table) == [("1", "a", "b", 3)]
    assert list(table.rejects.itertuples(index=False, name=None)) == [
        (2, "4 fields instead of 3"),
        (5, "2 fields instead of 3"),
        (6, "a quote that is opened and not closed"),
        (7, "a quote that is not at the edge of its field"),
        (8, "a carriage return inside the row"),
        (9, "a quote that is opened and not closed"),
    ]
    assert table.n_read == 7


@pytest.mark.fault(5)
def test_unbalanced_quote_spoils_no_other_row(tmp_path: Path) -> None:
    table = read(tmp_path, 'id,day,ret\n1,"a,b\n2,c,d\n3,e,f\n4,"g,h\n5,i,j\n')
    assert [row[0] for row in rows_of(table)] == ["2", "3", "5"]
    assert table.rejects["line"].tolist() == [2, 5]


def slow_fields(line: str) -> list[str] | None:
    """The fields of a line by a state machine; None where it cannot be split."""
    fields, at = [], 0
    while True:
        if line[at : at + 1] == '"':
            value, at = "", at + 1
            while at < len(line) and (line[at] != '"' or line[at : at + 2] == '""'):
                value += line[at]
                at += 2 if line[at] == '"' else 1
            if at == len(line):
                return None
            at += 1
            while line[at : at + 1] == " ":
                at += 1
        else:
            end = (line + ",").index(",", at)
            value, at = line[at:end], end
            if '"' in value:
                return None
        fields.append(value.strip())
        if at == len(line):
            return fields
        if line[at] != ",":
            return None
        at += 1


@settings(max_examples=150, deadline=None)
@given(
    rows=st.lists(st.text('ab," é', max_size=12), min_size=1, max_size=12),
    ends=st.sampled_from(["\n", "\r\n"]),
    block=st.integers(1, 60),
)
def test_fields_agree_with_a_slow_reader(
    tmp_path_factory: pytest.TempPathFactory, rows: list[str], ends: str, block: int
) -> None:
    folder = tmp_path_factory.mktemp("fields")
    expected = [(slow_fields(row), number) for number, row in enumerate(rows, start=2)]
    expected = [(f, n) for (f, n), row in zip(expected, rows, strict=True) if row.strip()]
    fit = [(*f, n) for f, n in expected if f is not None and len(f) == 3]
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(lines, "_BLOCK", block)  # lines are cut at every place
        try:
            table = read(folder, ends.join(["id,day,ret", *rows]))
        except KnownProblem:
            assert not expected
            return
    assert rows_of(table) == fit
    assert table.rejects["line"].tolist() == [n for f, n in expected if not f or len(f) != 3]


@settings(max_examples=50, deadline=None)
@given(rows=st.lists(st.tuples(*[st.text('ab,"; 1', max_size=6)] * 3), min_size=1, max_size=8))
def test_what_a_csv_writer_quotes_is_read_back(
    tmp_path_factory: pytest.TempPathFactory, rows: list[tuple[str, str, str]]
) -> None:
    file = tmp_path_factory.mktemp("quoted") / "r.csv"
    with file.open("w", newline="") as stream:
        writer = csv.writer(stream, quoting=csv.QUOTE_ALL)
        writer.writerows([("id", "day", "ret"), *rows])
    table = read_text(str(file), examples.reading("raw/r.csv", COLUMNS))
    assert [row[:3] for row in rows_of(table)] == [tuple(v.strip() for v in row) for row in rows]
    assert table.rejects.empty


# Fault 7: marks, blanks and line ends.


@pytest.mark.fault(7)
def test_bom_crlf_quotes_blanks_and_empty_lines(tmp_path: Path) -> None:
    text = '\ufeff"id", day ,ret\r\n"001" , 2000-01-31,0.1\r\n\r\n2,"a, ""b""",\u00a00.2  \r\n   \r\n3,,'
    table = read(tmp_path, text)
    assert rows_of(table) == [
        ("001", "2000-01-31", "0.1", 2),
        ("2", 'a, "b"', "0.2", 4),
        ("3", "", "", 6),
    ]
    assert table.n_trimmed == 3
    assert table.n_read == 3


@pytest.mark.parametrize("name", ["r.csv.gz", "r.csv.bz2", "r.csv.zst", "r.tsv", "r.tsv.gz"])
def test_compressed_and_tab_separated_copies(tmp_path: Path, name: str) -> None:
    text = TEXT.replace(",", "\t") if "tsv" in name else TEXT
    assert rows_of(read(tmp_path, text, name)) == rows_of(read(tmp_path, TEXT))


def test_blocks_do_not_show(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    text = "id,day,ret\n" + "".join(
        f"{i},x,{i / 7:.6f}{',y' * (i % 50 == 0)}\n" for i in range(999)
    )
    whole = read(tmp_path, text)
    monkeypatch.setattr(lines, "_BLOCK", 1000)
    parts = read(tmp_path, text)
    pd.testing.assert_frame_equal(whole.rows, parts.rows)
    pd.testing.assert_frame_equal(whole.rejects, parts.rejects)
    wanted = np.array([2, 499, 500, 1000])
    everything = text.splitlines()
    file = str(tmp_path / "r.csv")
    assert raw_rows(file, wanted) == [everything[number - 1] for number in wanted]


def test_raw_text_is_as_it_stands(tmp_path: Path) -> None:
    file = examples.write(tmp_path / "r.csv.gz", '\ufeffid,day\r\n 1 ,"é, "\r\n2,b')
    assert raw_rows(file, np.array([1, 2, 3])) == ["id,day", ' 1 ,"é, "', "2,b"]
    assert raw_rows(file, np.array([], dtype=int)) == []


# Parquet.


def test_parquet_types_are_read_as_they_would_stand_in_a_text(tmp_path: Path) -> None:
    day = datetime.date(2000, 1, 31)
    file = examples.write_parquet(
        tmp_path / "r.parquet",
        {
            "id": pa.array([10001.0, 2.0, None]),
            "day": pa.array([day, None, day]),
            "ret": pa.array([0.1, float("nan"), None]),
            "sector": pa.array(["x ", None, "z"]).dictionary_encode(),
        },
    )
    options = examples.reading("raw/r.parquet", {**COLUMNS, "sector": "sector"}, dates="%d.%m.%Y")
    table = read_text(file, options)
    assert rows_of(table) == [
        ("10001", "31.01.2000", "0.1", "x", 1),
        ("2", "", "", "", 2),
        ("", "31.01.2000", "", "z", 3),
    ]
    assert (table.place, table.n_trimmed) == ("row", 1)
    assert raw_rows(file, np.array([2, 3])) == ["2.0,,nan,", ",2000-01-31,,z"]


@pytest.mark.parametrize("kind", [pa.timestamp("ns"), pa.timestamp("s"), pa.date64()])
def test_parquet_times_are_dates(tmp_path: Path, kind: pa.DataType) -> None:
    day = pa.array([datetime.datetime(2000, 1, 31)]).cast(kind)
    file = examples.write_parquet(tmp_path / "r.parquet", {"id": ["1"], "day": day, "ret": [0.5]})
    assert rows_of(read_text(file, examples.reading("r", COLUMNS))) == [
        ("1", "2000-01-31", "0.5", 1)
    ]


def test_parquet_without_a_column(tmp_path: Path) -> None:
    file = examples.write_parquet(tmp_path / "r.parquet", {"id": ["1"], "days": ["x"], "ret": [1]})
    with pytest.raises(KnownProblem) as caught:
        read_text(file, examples.reading("raw/r.parquet", COLUMNS))
    assert str(caught.value) == (
        "The raw data cannot be used; nothing was written.\n"
        "  raw/r.parquet: there is no column 'day'\n"
        "    → did you mean days? The columns are: id, days, ret"
    )
