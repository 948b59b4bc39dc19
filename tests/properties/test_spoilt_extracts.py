"""Spoilt extracts, hundreds here and thousands in the benchmarks: each ends in a sound panel, or in one clear stop.

Bytes are flipped, cut out, doubled, swapped, or replaced by what files like to hold instead. Never an error of ours,
never a hang, never half an output.
"""

from __future__ import annotations

import gzip
import signal
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from tests.unit import intake_examples as examples

from lineproof import store, validation
from lineproof.frames import contract
from lineproof.problems import KnownProblem

N_FILES = 200
ENDINGS = {".csv": 0.7, ".csv.gz": 0.15, ".parquet": 0.15}  # and their shares
_PATIENCE = 120  # seconds for one file of two kilobytes: a hang, not a slow machine
_INSTEAD = [
    *(
        b"",
        b"\x00",
        b"\xff",
        b"\xef\xbb\xbf",
        b'"',
        b"'",
        b",",
        b",,",
        b";",
        b"\t",
        b"\n",
        b"\r",
        b"\r\n",
    ),
    *(
        b"-99",
        b"nan",
        b"inf",
        b"1e400",
        b"-1e-400",
        b"1,5",
        b"9" * 40,
        b"0x1p3",
        b"=cmd()",
        b"\xe2\x88\x92",
    ),
    *(
        b"2000-02-30",
        b"0000-00-00",
        b"9999-12-31",
        b"20000131",
        b"2000-01",
        b" ",
        b"\xc2\xa0",
        b"NULL",
    ),
]


def extract() -> bytes:
    """Three securities over the months of a year, with all columns."""
    rng = np.random.default_rng(7)
    rows = [
        f"{name},{month}-28,{rng.normal(0, 0.05):.4f},,{rng.integers(1, 900)},{rng.integers(1, 90)}"
        for name in ("000A", "B", "C1")
        for month in examples.months("2000-01", 12)
    ]
    rows[11] += "x"
    return examples.lines(*rows).encode()


def spoilt(content: bytes, rng: np.random.Generator) -> bytes:
    """The content after one to five accidents."""
    found = bytearray(content)
    for _ in range(int(rng.integers(1, 6))):
        if len(found) < 4:
            break
        a, b = sorted(rng.integers(0, len(found), 2).tolist())
        match int(rng.integers(6)):
            case 0:
                found[a] ^= 1 << int(rng.integers(8))
            case 1:
                del found[a : b if rng.random() < 0.2 else a + 3]
            case 2:
                found[a:a] = found[a : min(b, a + 200)]
            case 3:
                found[a], found[b] = found[b], found[a]
            case 4:
                found[a : a + int(rng.integers(4))] = _INSTEAD[int(rng.integers(len(_INSTEAD)))]
            case _:
                lines = bytes(found).split(b"\n")
                order = rng.permutation(len(lines)) if rng.random() < 0.3 else range(len(lines))
                found = bytearray(b"\n".join(lines[i] for i in order))
    return bytes(found)


@contextmanager
def no_hang() -> Iterator[None]:
    def stop(*_: object) -> None:
        raise TimeoutError("the intake hangs")

    before = signal.signal(signal.SIGALRM, stop)
    signal.alarm(_PATIENCE)
    try:
        yield
    finally:
        signal.alarm(0)
        signal.signal(signal.SIGALRM, before)


def said_well(problem: KnownProblem, out: Path) -> str:
    assert problem.problems
    assert all(each.where and each.found for each in problem.problems)
    assert list(out.iterdir()) == [], "a stop left something behind"
    return "stop"


def outcome(folder: Path, file: Path) -> str:
    """ "panel" or "stop", after a look at what lies in the folder of outputs."""
    out = folder / "out"
    out.mkdir(exist_ok=True)
    for left in out.iterdir():
        left.unlink()
    year = examples.months("2000-01", 12)
    files = {
        "returns": [str(file)],
        "market": [str(folder / "m.csv")],
        "riskless": [str(folder / "r.csv")],
    }
    examples.write(folder / "m.csv", examples.monthly_file("mkt", dict.fromkeys(year, 0.01)))
    examples.write(folder / "r.csv", examples.monthly_file("rf", dict.fromkeys(year, 0.002)))
    options = {
        **examples.OF_RETURNS,
        "returns": examples.returns_reading(),
        "series": {
            **examples.OF_SERIES,
            "market": examples.reading("m", {"date": "month", "return": "mkt"}, dates="%Y-%m"),
            "riskless": examples.reading("r", {"date": "month", "rate": "rf"}, dates="%Y-%m"),
        },
        "rules": {**examples.RULES, "screens": [{"column": "price", "at_least": 5}]},
    }
    try:
        with no_hang(), store.Scratch(out) as scratch:
            found = validation.validate_returns(files, scratch, **options)
            store.write_together(found.tables(), {"panel": out / "panel.parquet"})
            store.write_table(found.markets()["market"], out / "market.parquet", "market")
            store.write_together(found.set_aside(), {"set_aside": out / "set_aside.parquet"})
            store.copy_as_csv(out / "set_aside.parquet", out / "set_aside.csv")
            store.write_json(found.counts(), out / "intake.json")
    except KnownProblem as problem:
        return said_well(problem, out)
    names = ["intake.json", "market.parquet", "panel.parquet", "set_aside.csv", "set_aside.parquet"]
    assert sorted(path.name for path in out.iterdir()) == names
    contract("panel").validate(pq.read_table(out / "panel.parquet").to_pandas())
    counts = store.read_json(out / "intake.json")
    parts = ("rows_kept", "rows_set_aside", "exact_duplicates")
    assert counts["rows_read"] == sum(counts[part] for part in parts)
    assert counts["rows_set_aside"] == pq.read_metadata(out / "set_aside.parquet").num_rows
    return "panel"


@pytest.mark.parametrize("ending", ENDINGS)
def test_spoilt_extracts_end_in_a_panel_or_a_stop(tmp_path: Path, ending: str) -> None:
    seen = outcomes(tmp_path, ending, int(N_FILES * ENDINGS[ending]))
    assert min(seen.values()) > 0, seen


def outcomes(folder: Path, ending: str, n_files: int) -> dict[str, int]:
    """How many of so many spoilt files ended in a panel, and in a stop; one that ends otherwise is kept."""
    rng = np.random.default_rng(20260101)
    whole = extract()
    if ending == ".parquet":
        rows = [line.split(",") for line in whole.decode().splitlines()]
        columns = {name: pa.array(values) for name, *values in zip(*rows, strict=True)}
        sink = pa.BufferOutputStream()
        pq.write_table(pa.table(columns), sink)
        whole = sink.getvalue().to_pybytes()
    file, seen = folder / f"returns{ending}", {"panel": 0, "stop": 0}
    for number in range(n_files):
        if ending == ".csv.gz" and number % 2:  # spoilt before it was packed
            content = gzip.compress(spoilt(whole, rng), mtime=0)
        else:
            content = spoilt(gzip.compress(whole, mtime=0) if ending == ".csv.gz" else whole, rng)
        file.write_bytes(content)
        try:
            seen[outcome(folder, file)] += 1
        except Exception as error:
            kept = folder / f"failed-{number}{ending}"
            kept.write_bytes(content)
            raise AssertionError(f"{kept}: {type(error).__name__}") from error
    return seen
