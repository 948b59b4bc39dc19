"""Small raw files for the tests of the intake, and the options to read them with."""

from __future__ import annotations

import bz2
import gzip
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import pandas as pd
import pyarrow as pa
import pyarrow.parquet as pq
import pytest

from lineproof.problems import KnownProblem
from lineproof.store import Scratch
from lineproof.validation import validate_returns


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


def validate(
    folder: Path,
    returns: str | bytes | Path,
    *,
    market: dict[str, float | str] | None = None,
    riskless: dict[str, float | str] | None = None,
    name: str = "returns.csv",
    same_month_rows: str = "set_aside",
    screens: list[dict[str, Any]] | None = None,
    missing_final_return: float | None = None,
    **changes: Any,
) -> Validated:
    """Validate returns (a text, or a file that is there) with a market and a riskless rate.

    Unless given, the market is 1 % and the riskless return 0.2 % in every month of 2000.
    """
    year = months("2000-01", 12)
    file = str(returns) if isinstance(returns, Path) else write(folder / name, returns)
    market = dict.fromkeys(year, 0.01) if market is None else market
    riskless = dict.fromkeys(year, 0.002) if riskless is None else riskless
    series = {"dates": "%Y-%m"}
    files = {
        "returns": [file],
        "market": [write(folder / "market.csv", monthly_file("mkt", market))],
        "riskless": [write(folder / "riskless.csv", monthly_file("rf", riskless))],
    }
    rules = {
        "screens": screens or [],
        "missing_final_return": missing_final_return,
        "final_return_by_reason": {},
        "same_month_rows": same_month_rows,
        "stale_run": None,
        "return_after_hole": "keep",
        "jump_and_reversal": "flag",
    }
    with Scratch(folder) as scratch:
        found = validate_returns(
            files,
            scratch,
            returns=returns_reading(**changes),
            market=reading("raw/market.csv", {"date": "month", "return": "mkt"}, **series),
            market_is="total",
            riskless=reading("raw/riskless.csv", {"date": "month", "rate": "rf"}, **series),
            riskless_quoted="period_return",
            rules=rules,
        )
        return Validated(
            panel=pd.concat([t["panel"] for t in found.tables()], ignore_index=True),
            market=found.market(),
            set_aside=pd.concat([t["set_aside"] for t in found.set_aside()], ignore_index=True),
            intake=found.counts(),
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
