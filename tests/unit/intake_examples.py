"""Small raw files for the tests of the intake, and the options to read them with."""

from __future__ import annotations

import bz2
import gzip
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pyarrow as pa
import pyarrow.parquet as pq
import pytest

from lineproof import validation
from lineproof.intake.blocks import RawBlock, RawFile
from lineproof.intake.chunk import Chunk
from lineproof.periods import Months
from lineproof.problems import KnownProblem
from lineproof.store import Scratch


@dataclass(frozen=True)
class Validated:
    """What validation writes, whole; see `frames` for the columns. `intake` holds the counts."""

    panel: pd.DataFrame
    market: pd.DataFrame
    set_aside: pd.DataFrame
    intake: dict[str, Any]


COLUMNS = {
    "security": "id",
    "date": "day",
    "return": "ret",
    "final_return": "final",
    "size": "cap",
    "price": "px",
}
HEADER = "id,day,ret,final,cap,px"
UNUSABLE = "The raw data cannot be used; nothing was written.\n"


def reading(label: str, columns: dict[str, str], **changes: Any) -> dict[str, Any]:
    """What a reader needs to know of a raw file, in its defaults."""
    return {
        "label": label,
        "columns": columns,
        "unit": "decimal",
        "missing": ["", "NA"],
        "dates": "%Y-%m-%d",
        "separator": None,
        **changes,
    }


def returns_reading(**changes: Any) -> dict[str, Any]:
    """Options for a file of returns with the columns of `HEADER`."""
    return reading("raw/returns.csv", changes.pop("columns", COLUMNS), **changes)


def months(first: str, n: int) -> list[str]:
    """`n` months from `first`, as `YYYY-MM`."""
    return pd.period_range(first, periods=n, freq="M").strftime("%Y-%m").tolist()


def monthly_file(name: str, values: dict[str, float | str]) -> str:
    """A series as CSV text, with the columns month and `name`."""
    return "\n".join([f"month,{name}", *(f"{m},{v}" for m, v in values.items())]) + "\n"


def write(path: Path, content: str | bytes) -> str:
    """Write a raw file, compressed as its ending says; the path as text."""
    data = content.encode() if isinstance(content, str) else content
    match path.suffix:
        case ".gz":
            data = gzip.compress(data, mtime=0)
        case ".bz2":
            data = bz2.compress(data)
        case ".zst":
            data = pa.compress(data, "zstd", asbytes=True)
    path.write_bytes(data)
    return str(path)


def write_parquet(path: Path, columns: dict[str, Any]) -> str:
    """Write columns as Parquet; the path as text."""
    pq.write_table(pa.table(columns), path)
    return str(path)


def lines(*rows: str, header: str = HEADER) -> str:
    """Rows under a header, as CSV text."""
    return "\n".join([header, *rows]) + "\n"


RULES: dict[str, Any] = {
    "screens": [],
    "missing_final_return": None,
    "final_return_by_reason": {},
    "same_month_rows": "set_aside",
    "stale_run": None,
    "return_after_hole": "keep",
    "outliers": {"jump_and_reversal": "flag"},
    "allow_partial_last_month": False,
    "other_unit_stop_above": 0.1,
}


def validate(
    folder: Path,
    returns: str | bytes | Path | Sequence[Path],
    *,
    market: dict[str, float | str] | None = None,
    riskless: dict[str, float | str] | None = None,
    name: str = "returns.csv",
    **changes: Any,
) -> Validated:
    """Validate returns (a text, or files that are there) with a market and a riskless rate.

    Unless given, the market is 1 % and the riskless return 0.2 % in every month of 2000. `changes` are
    options of `RULES` and of the file of returns.
    """
    year = months("2000-01", 12)
    if isinstance(returns, str | bytes):
        returns = Path(write(folder / name, returns))
    market = dict.fromkeys(year, 0.01) if market is None else market
    riskless = dict.fromkeys(year, 0.002) if riskless is None else riskless
    series = {"dates": "%Y-%m"}
    files = {
        "returns": [str(file) for file in ([returns] if isinstance(returns, Path) else returns)],
        "market": [write(folder / "market.csv", monthly_file("mkt", market))],
        "riskless": [write(folder / "riskless.csv", monthly_file("rf", riskless))],
    }
    rules = {rule: changes.pop(rule, usual) for rule, usual in RULES.items()}
    return run(
        folder,
        files,
        frequency="monthly",
        returns=returns_reading(**changes),
        returns_are="total",
        returns_frequency="monthly",
        market_build=None,
        series={
            "market": reading("raw/market.csv", {"date": "month", "return": "mkt"}, **series),
            "market_is": "total",
            "market_frequency": "monthly",
            "riskless": reading("raw/riskless.csv", {"date": "month", "rate": "rf"}, **series),
            "riskless_quoted": "period_return",
            "riskless_frequency": "monthly",
        },
        rules=rules,
    )


def run(folder: Path, files: dict[str, list[str]], **options: Any) -> Validated:
    """Everything that `validate_returns` gives, in the order in which it must be asked for."""
    with Scratch(folder) as scratch:
        found = validation.validate_returns(files, scratch, **options)
        return Validated(
            panel=pd.concat([piece["panel"] for piece in found.tables()], ignore_index=True),
            market=found.markets()["market"],
            set_aside=pd.concat(
                [piece["set_aside"] for piece in found.set_aside()], ignore_index=True
            ),
            intake=found.counts(),
        )


@dataclass(frozen=True)
class InPieces:
    """A raw file under a name of its own, whose rows come a few at a time."""

    file: RawFile
    label: str
    at_most: int

    @property
    def place(self) -> str:
        return self.file.place

    def blocks(self) -> Iterator[RawBlock]:
        for block in self.file.blocks():
            yield replace(block, columns={}, position=block.position[:0])  # counts and rejects
            for first in range(0, len(block.position), self.at_most):
                rows = slice(first, first + self.at_most)
                yield RawBlock(
                    {name: column[rows] for name, column in block.columns.items()},
                    block.position[rows],
                    [],
                    0,
                )

    def line(self, positions: np.ndarray) -> np.ndarray:
        return self.file.line(positions)

    def raw(self, positions: np.ndarray) -> Iterator[list[str]]:
        for texts in self.file.raw(positions):
            yield from ([text] for text in texts)


def in_pieces(patch: pytest.MonkeyPatch, at_most: int) -> None:
    """Let raw files come so many rows at a time, be called by their names, and be judged as few at a time."""
    opened = validation.open_files

    def open_files(files: Sequence[str], options: dict[str, Any]) -> list[InPieces]:
        both = zip(files, opened(files, options), strict=True)
        return [InPieces(file, f"raw/{Path(path).name}", at_most) for path, file in both]

    patch.setattr(validation, "open_files", open_files)
    patch.setattr("lineproof.intake.second_pass._ROWS", at_most)


_VALUES = ("return_", "final_return", "size", "price", "total_return")


def chunk_of(rows: pd.DataFrame) -> Chunk:
    """Rows (sorted by security and date) as a chunk of months: numbers by our names, all else text.

    A missing return has the first code for missing unless there is a column `code`.
    """
    names, start = np.unique(rows["security"].to_numpy(object), return_index=True)
    day = rows["date"].to_numpy().astype("datetime64[D]")
    values = {name: rows[name].to_numpy(float) for name in _VALUES if name in rows}
    code = np.where(np.isnan(values["return_"]), 0, -1) if "code" not in rows else rows["code"]
    further = [name for name in rows if name not in {"security", "date", "code", *_VALUES}]
    texts = {}
    for name in further:
        codes, distinct = pd.factorize(rows[name])
        texts[name] = (codes.astype(np.int32), distinct.tolist())
    return Chunk(
        names=names,
        start=np.append(start, len(rows)),
        period=Months().number(day),
        day=day,
        values=values,
        texts=texts,
        code=np.asarray(code, np.int8),
    )


def refused(*arguments: Any, **options: Any) -> str:
    """The message with which `validate` stops."""
    with pytest.raises(KnownProblem) as caught:
        validate(*arguments, **options)
    return str(caught.value)


def aside(found: Validated) -> list[tuple[int, int, str, str]]:
    """Line, fault, reason and raw text of every row set aside."""
    table = found.set_aside[["line", "fault", "reason", "raw"]]
    return list(table.itertuples(index=False, name=None))


def fault(found: Validated, number: int) -> dict[str, Any] | None:
    """The entry of a fault in the intake; None where it was not met."""
    return next((f for f in found.intake["faults"] if f["number"] == number), None)


def kept(found: Validated) -> list[tuple[str, str]]:
    """Security and month of every row kept."""
    panel = found.panel
    return list(zip(panel["security"], panel["date"].dt.strftime("%Y-%m"), strict=True))
