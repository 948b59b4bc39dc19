"""One small extract in every format, and how to read it."""

from __future__ import annotations

import datetime
import zipfile
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import openpyxl
import pandas as pd
import pyarrow as pa
import pyarrow.feather
import pyarrow.parquet as pq
from tests.unit import intake_examples as examples

FIXTURES = Path(__file__).parent / "fixtures"
COLUMNS = {"security": "id", "date": "day", "return": "ret", "size": "cap"}
LEAP, NEW = datetime.date(2000, 2, 29), datetime.date(2000, 1, 31)
ROWS: list[tuple[str, datetime.date | None, float | None, float | None]] = [
    ("00101", NEW, 0.0125, 1200.0),
    ("00102", NEW, -0.5, 35.5),
    ("00103", NEW, None, None),
    ("00101", LEAP, 0.1, 1300.0),
    ("", None, 0.2, 1.0),
]
TABLE = pa.table(
    {
        "id": pa.array([row[0] for row in ROWS]),
        "day": pa.array([row[1] for row in ROWS], pa.date32()),
        "ret": pa.array([row[2] for row in ROWS], pa.float64()),
        "cap": pa.array([row[3] for row in ROWS], pa.float64()),
    }
)


def text(separator: str = ",", mark: str = ".") -> str:
    """The extract as text with separators."""
    shown = [["" if v is None else str(v) for v in row] for row in ROWS]
    shown = [[row[0], row[1], *(v.replace(".", mark) for v in row[2:])] for row in shown]
    return "\n".join(separator.join(row) for row in [["id", "day", "ret", "cap"], *shown]) + "\n"


def _excel(path: Path) -> None:
    book = openpyxl.Workbook()
    sheet = book.active
    sheet.append(["id", "day", "ret", "cap"])
    for row in ROWS:
        sheet.append(list(row))
    book.create_sheet("notes").append(["nothing here"])
    book.save(path)


def _stata(path: Path) -> None:
    frame = TABLE.to_pandas().assign(day=lambda f: pd.to_datetime(f["day"]))
    frame.to_stata(path, write_index=False, convert_dates={"day": "td"}, version=118)


def _zip(path: Path) -> None:
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as archive:
        archive.writestr("folder/r.csv", text())
        archive.writestr("__MACOSX/folder/._r.csv", "x")


WRITERS: dict[str, Callable[[Path], Any]] = {
    "r.csv": lambda path: examples.write(path, text()),
    "r.tsv": lambda path: examples.write(path, text("\t")),
    "r.csv.gz": lambda path: examples.write(path, text()),
    "r.csv.bz2": lambda path: examples.write(path, text()),
    "r.csv.zst": lambda path: examples.write(path, text()),
    "r.csv.zip": _zip,
    "r.parquet": lambda path: pq.write_table(TABLE, path),
    "r.feather": lambda path: pyarrow.feather.write_feather(TABLE, str(path)),
    "r.arrow": lambda path: pyarrow.feather.write_feather(
        TABLE, str(path), compression="uncompressed"
    ),
    "r.dta": _stata,
    # Invented rows, written by haven 2.5 (R) as a SAS data set with the format DATE for `day`. Its library states the
    # length of the block of names 12 bytes too short, which hides two names; this one byte was set right by hand.
    "r.sas7bdat": lambda path: path.write_bytes((FIXTURES / "small.sas7bdat").read_bytes()),
    "r.xlsx": _excel,
}


def write(folder: Path, name: str) -> str:
    """Write the extract in the format that a name says; the path as text."""
    WRITERS[name](folder / name)
    return str(folder / name)


def reading(**changes: Any) -> dict[str, Any]:
    """How to read it."""
    return examples.reading(
        changes.pop("label", "raw/r"), changes.pop("columns", COLUMNS), **changes
    )


def numbers(array: pa.Array) -> list[float | None]:
    """Numbers, whether they are text or not."""
    return [None if value in (None, "") else float(value) for value in array.to_pylist()]


def dates(array: pa.Array) -> list[datetime.date | None]:
    """Days, whether they are text or not."""
    if pa.types.is_string(array.type):
        return [datetime.date.fromisoformat(text) if text else None for text in array.to_pylist()]
    return array.cast(pa.date32()).to_pylist()


def as_positions(values: list[int]) -> np.ndarray:
    return np.array(values, np.int64)
