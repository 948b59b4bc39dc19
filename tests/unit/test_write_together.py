"""Tables written piece by piece: the same bytes however they are cut, all of them or none."""

from __future__ import annotations

import time
from collections.abc import Iterator
from itertools import pairwise
from pathlib import Path

import numpy as np
import pandas as pd
import pandera.errors
import pyarrow.parquet as pq
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from lineproof import store

N_MONTHS = 12


def panel(n_securities: int, seed: int = 1) -> pd.DataFrame:
    """Invented rows of the panel; some values are missing and a text column has several texts."""
    rng, n = np.random.default_rng(seed), n_securities * N_MONTHS
    ends = pd.period_range("2000-01", periods=N_MONTHS, freq="M").to_timestamp(how="end")
    names = [f"{number:05d}" for number in range(n_securities)]
    returns = np.where(rng.random(n) < 0.1, np.nan, rng.normal(0.01, 0.05, n).clip(-1))
    return pd.DataFrame(
        {
            "security": pd.Series(np.repeat(names, N_MONTHS), dtype=str),
            "date": np.tile(ends.normalize().as_unit("ms"), n_securities),
            "total_return": returns,
            "excess_return": returns - 0.002,
            "size": rng.lognormal(3, 1, n),
            "price": np.nan,
            "eligible": rng.random(n) < 0.5,
            "leaves": False,
            "sector": pd.Series(rng.choice(["banks", "mines", ""], n), dtype=str),
        }
    )


def pieces(frame: pd.DataFrame, cuts: list[int]) -> Iterator[dict[str, pd.DataFrame]]:
    edges = [0, *sorted(cuts), len(frame)]
    for first, last in pairwise(edges):
        if first < last:
            yield {"panel": frame.iloc[first:last]}


def written(frame: pd.DataFrame, cuts: list[int], path: Path) -> bytes:
    store.write_together(pieces(frame, cuts), {"panel": path})
    return path.read_bytes()


WHOLE = panel(10)


def as_text(table: pd.DataFrame) -> pd.DataFrame:
    """A table as read, with the names of its securities spelt out."""
    return table.astype({"security": "str"})


@settings(max_examples=25, deadline=None)
@given(
    cuts=st.lists(st.integers(1, len(WHOLE) - 1), max_size=6),
    row_group=st.sampled_from([1, 7, 40, 120, 1000]),
)
def test_the_cut_does_not_show(
    tmp_path_factory: pytest.TempPathFactory, cuts: list[int], row_group: int
) -> None:
    path = tmp_path_factory.mktemp("cut") / "panel.parquet"
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(store, "_ROW_GROUP", row_group)
        assert written(WHOLE, cuts, path) == written(WHOLE, [], path)
        assert pq.ParquetFile(path).num_row_groups == -(-len(WHOLE) // row_group)
    pd.testing.assert_frame_equal(as_text(store.read_table(path)), WHOLE)
    assert [each.name for each in path.parent.iterdir()] == ["panel.parquet"]


def test_the_cut_does_not_show_where_a_column_has_several_pages(tmp_path: Path) -> None:
    """A page of Parquet holds at most 1 MiB, or 131,072 numbers."""
    frame = panel(25_000)
    path = tmp_path / "panel.parquet"
    whole = written(frame, [], path)
    assert written(frame, [3, 1_000, 131_073, 250_001], path) == whole


def test_an_error_midway_leaves_nothing(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(store, "_ROW_GROUP", 10)

    def breaks() -> Iterator[dict[str, pd.DataFrame]]:
        yield from pieces(WHOLE.iloc[:60], [20, 40])
        late = time.monotonic() + 30  # batches are made ahead of what is written
        while not any(path.name.endswith(".part") for path in tmp_path.iterdir()):
            assert time.monotonic() < late
        raise OSError(28, "No space left on device")

    with pytest.raises(OSError, match="No space"):
        store.write_together(breaks(), {"panel": tmp_path / "panel.parquet"})
    assert list(tmp_path.iterdir()) == []


def test_an_error_midway_leaves_the_old_file(tmp_path: Path) -> None:
    path = tmp_path / "panel.parquet"
    old = written(WHOLE.iloc[:24], [], path)
    with pytest.raises(pandera.errors.SchemaError):
        written(WHOLE.iloc[::-1], [], path)
    assert path.read_bytes() == old
    assert list(tmp_path.iterdir()) == [path]


def test_a_disk_that_stays_full_leaves_no_part(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Closing the file fails as well, since its footer does not fit."""

    def full(self: pq.ParquetWriter) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(pq.ParquetWriter, "close", full)
    with pytest.raises(OSError, match="No space"):
        written(WHOLE, [], tmp_path / "panel.parquet")
    assert list(tmp_path.iterdir()) == []


def test_tables_take_their_place_only_when_all_are_written(tmp_path: Path) -> None:
    paths = {"panel": tmp_path / "panel.parquet", "market": tmp_path / "market.parquet"}
    with pytest.raises(ValueError, match=r"no rows for .*market\.parquet"):
        store.write_together(pieces(WHOLE, [30]), paths)
    assert list(tmp_path.iterdir()) == []


def test_several_tables_from_one_stream(tmp_path: Path) -> None:
    market = pd.DataFrame({"date": WHOLE["date"][:12], "market_excess": 0.01, "riskless": 0.002})
    batches = [
        {"panel": WHOLE.iloc[:50], "market": market[:5]},
        {"panel": WHOLE.iloc[50:]},
        {"market": market[5:]},
    ]
    paths = {name: tmp_path / "deep" / f"{name}.parquet" for name in ("panel", "market")}
    store.write_together(iter(batches), paths)
    pd.testing.assert_frame_equal(as_text(store.read_table(paths["panel"])), WHOLE)
    pd.testing.assert_frame_equal(store.read_table(paths["market"]), market)


@pytest.mark.parametrize(
    ("first", "second"),
    [
        (slice(0, 30), slice(29, 60)),  # the last row again
        (slice(30, 60), slice(0, 30)),
        (slice(12, 24), slice(0, 12)),  # each piece is a whole security
    ],
)
def test_the_contract_holds_across_the_seam(tmp_path: Path, first: slice, second: slice) -> None:
    batches = [{"panel": WHOLE.iloc[first]}, {"panel": WHOLE.iloc[second]}]
    with pytest.raises(pandera.errors.SchemaError):
        store.write_together(batches, {"panel": tmp_path / "panel.parquet"})
    assert list(tmp_path.iterdir()) == []


ASIDE = pd.DataFrame(
    {
        "file": pd.Series(["raw/r.csv"] * 3, dtype=str),
        "line": pd.Series([2, 3, 7], dtype="int64"),
        "fault": pd.Series([5, 13, 13], dtype="int64"),
        "reason": pd.Series(["a, b", 'say "x"', "é"], dtype=str),
        "raw": pd.Series(["1;2", "", " , "], dtype=str),
    }
)


def test_empty_pieces_do_not_show(tmp_path: Path) -> None:
    none, path = ASIDE.iloc[:0], tmp_path / "set_aside.parquet"
    contents = []
    for cut in ([ASIDE], [none, ASIDE], [none, ASIDE[:1], none, ASIDE[1:], none]):
        store.write_together(({"set_aside": piece} for piece in cut), {"set_aside": path})
        contents.append(path.read_bytes())
    assert contents == [contents[0]] * 3


def test_a_table_without_rows(tmp_path: Path) -> None:
    path = tmp_path / "set_aside.parquet"
    store.write_together([{"set_aside": ASIDE.iloc[:0]}], {"set_aside": path})
    pd.testing.assert_frame_equal(store.read_table(path), ASIDE.iloc[:0])


@pytest.mark.parametrize("row_group", [1, 2, 100])
@pytest.mark.parametrize("n_rows", [0, 1, 3])
def test_a_copy_as_csv(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, row_group: int, n_rows: int
) -> None:
    monkeypatch.setattr(store, "_ROW_GROUP", row_group)
    table, frame = tmp_path / "set_aside.parquet", ASIDE.iloc[:n_rows]
    store.write_together([{"set_aside": frame}], {"set_aside": table})
    store.copy_as_csv(table, tmp_path / "copy.csv")
    store.write_csv(frame, tmp_path / "whole.csv")
    assert (tmp_path / "copy.csv").read_bytes() == (tmp_path / "whole.csv").read_bytes()


def test_a_copy_of_the_panel_as_csv(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(store, "_ROW_GROUP", 7)
    written(WHOLE, [], tmp_path / "panel.parquet")
    store.copy_as_csv(tmp_path / "panel.parquet", tmp_path / "copy.csv")
    store.write_csv(WHOLE, tmp_path / "whole.csv")
    assert (tmp_path / "copy.csv").read_bytes() == (tmp_path / "whole.csv").read_bytes()
