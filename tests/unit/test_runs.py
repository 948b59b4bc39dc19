"""Sorted runs, merged, against one plain sort of everything in memory."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from lineproof import store
from lineproof.intake import runs as sorted_runs
from lineproof.intake.runs import Names, SortedRuns, counting_order
from lineproof.store import Scratch

NAMES = ["A", "B", "a", "10", "9", "é", "ż", "", "Z", "𝛽", "\uffee", "AA"]
blocks = st.lists(st.lists(st.sampled_from(NAMES), max_size=12), max_size=12)


def delivered(blocks: list[list[str]]) -> list[pd.DataFrame]:
    """Rows of each block: the security, and numbers that tell every row from every other."""
    frames, at = [], 0
    for listed in blocks:
        row = np.arange(at, at + len(listed))
        at += len(listed)
        frames.append(
            pd.DataFrame(
                {
                    "security": pd.Series(listed, dtype=object),
                    "row": row,
                    "value": np.where(row % 3 == 0, np.nan, row / 7),
                    "code": (row % 100).astype(np.int8),
                }
            )
        )
    return frames


def filled(scratch: Scratch, frames: list[pd.DataFrame]) -> SortedRuns:
    """Runs of the blocks; each block knows its names in an order of its own, some without rows."""
    runs = SortedRuns(scratch)
    for number, frame in enumerate(frames):
        names = list(dict.fromkeys([*frame["security"][::-1], NAMES[number % len(NAMES)]]))
        place = {name: at for at, name in enumerate(names)}
        security = np.array([place[name] for name in frame["security"]], np.int32)
        columns = {name: frame[name].to_numpy() for name in ("row", "value", "code")}
        runs.add(security, names, columns)
    return runs


def check_against_a_plain_sort(
    runs: SortedRuns, frames: list[pd.DataFrame], at_most: int
) -> list[int]:
    """Check content, order and types; how many rows each stretch has."""
    given = pd.concat(frames, ignore_index=True) if frames else pd.DataFrame()
    assert runs.n_rows == len(given)
    found, sizes = [], []
    for names, security, columns in runs.stretches(at_most):
        assert names == sorted(names)
        sizes.append(len(security))
        assert len(security) <= at_most or len(set(security.tolist())) == 1
        assert columns["value"].dtype == np.float64
        assert columns["code"].dtype == np.int8
        assert columns["row"].dtype == np.int64
        named = np.array(names, object)[security]
        found.append(pd.DataFrame({"security": named, **columns}))
    if not len(given):
        assert found == []
        return sizes
    # Within a stretch rows come by run; a stable sort by security brings them together.
    together = pd.concat([f.sort_values("security", kind="stable") for f in found])
    expected = given.sort_values("security", kind="stable")
    pd.testing.assert_frame_equal(
        together.reset_index(drop=True), expected.reset_index(drop=True), check_dtype=False
    )
    return sizes


@pytest.mark.parametrize("on_disk", [False, True], ids=["memory", "disk"])
@settings(max_examples=60, deadline=None)
@given(blocks=blocks, at_most=st.integers(1, 30))
def test_runs_give_what_a_plain_sort_gives(
    tmp_path_factory: pytest.TempPathFactory, on_disk: bool, blocks: list[list[str]], at_most: int
) -> None:
    folder, frames = tmp_path_factory.mktemp("runs"), delivered(blocks)
    with pytest.MonkeyPatch.context() as patch:
        if on_disk:
            patch.setattr(store, "_IN_MEMORY", 0)
        with Scratch(folder) as scratch:
            patch.setattr(sorted_runs, "_ROWS", 12)  # several blocks a run, and several runs
            runs = filled(scratch, frames)
            n_rows = runs.n_rows
            assert any(folder.iterdir()) == (on_disk and n_rows > 0)
            check_against_a_plain_sort(runs, frames, at_most)
            check_against_a_plain_sort(runs, frames, at_most)  # runs can be read again
    assert list(folder.iterdir()) == []


@pytest.mark.parametrize("in_memory", [0, 20_000, 1 << 28], ids=["disk", "both", "memory"])
def test_many_runs(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, in_memory: int) -> None:
    monkeypatch.setattr(store, "_IN_MEMORY", in_memory)
    rng = np.random.default_rng(3)
    names = [f"{number:03d}" for number in range(200)]
    frames = delivered([rng.choice(names, rng.integers(0, 40)).tolist() for _ in range(150)])
    with Scratch(tmp_path) as scratch:
        runs = filled(scratch, frames)
        assert len(check_against_a_plain_sort(runs, frames, 5)) > 100
        assert check_against_a_plain_sort(runs, frames, 1 << 20) == [runs.n_rows]


def test_a_stretch_is_as_long_as_it_may_be(tmp_path: Path) -> None:
    with Scratch(tmp_path) as scratch:
        frames = delivered([list("AAABBCDDDDDDDEF"), list("CAF")])
        sizes = check_against_a_plain_sort(filled(scratch, frames), frames, 4)
        assert sizes == [4, 4, 7, 3]  # A; B and C; D, which alone has more; E and F


def test_names_keep_the_code_they_were_given() -> None:
    names = Names()
    assert names.codes(["b", "a", "b"]).tolist() == [0, 1, 0]
    assert names.codes(["c", "a"]).tolist() == [2, 1]
    assert (len(names), names.texts()) == (3, ["b", "a", "c"])
    assert names.codes([]).dtype == np.int32


@settings(max_examples=200, deadline=None)
@given(
    key=st.lists(st.integers(0, 9), max_size=60),
    n_more=st.integers(0, 3),
    kind=st.sampled_from([np.int8, np.int32, np.int64]),
)
def test_counting_order_is_a_stable_sort(key: list[int], n_more: int, kind: type) -> None:
    keys = np.array(key, kind)
    n_keys = max(key, default=-1) + 1 + n_more
    order, start = counting_order(keys, n_keys)
    np.testing.assert_array_equal(order, np.argsort(keys, kind="stable"))
    np.testing.assert_array_equal(start, np.searchsorted(np.sort(keys), np.arange(n_keys + 1)))
    assert order.dtype == start.dtype == np.int64
