"""Scratch holds arrays in memory or on disk, and leaves nothing behind."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from lineproof import store
from lineproof.store import Scratch

ARRAYS = {
    "numbers": np.array([0.5, np.nan, -np.inf, 2.0]),
    "codes": np.array([1, -1, 127, 0], np.int8),
    "days": np.array([-(2**31), 0, 5, 2**31 - 1], np.int32),
    "files": np.array([0, 1, 2, 3], np.int16),
    "nothing": np.array([], np.int64),
}


@pytest.mark.parametrize("in_memory", [0, 40, 1 << 28], ids=["disk", "both", "memory"])
def test_arrays_come_back_as_they_were(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, in_memory: int
) -> None:
    monkeypatch.setattr(store, "_IN_MEMORY", in_memory)
    with Scratch(tmp_path / "deep") as scratch:
        for name, values in ARRAYS.items():
            scratch.keep(name, values)
        for name, values in ARRAYS.items():
            for first in range(len(values) + 1):
                for last in range(first, len(values) + 1):
                    part = scratch.part(name, first, last)
                    np.testing.assert_array_equal(part, values[first:last])
                    assert part.dtype == values.dtype
    folder = tmp_path / "deep"
    assert not folder.exists() or list(folder.iterdir()) == []


def test_a_slice_with_steps_goes_to_disk_as_it_reads(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(store, "_IN_MEMORY", 0)
    with Scratch(tmp_path) as scratch:
        scratch.keep("every other", np.arange(10)[::2])
        assert scratch.part("every other", 1, 4).tolist() == [2, 4, 6]


def test_memory_is_used_first(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(store, "_IN_MEMORY", 32)
    with Scratch(tmp_path) as scratch:
        scratch.keep("first", ARRAYS["numbers"])
        assert list(tmp_path.iterdir()) == []
        scratch.keep("second", ARRAYS["codes"])
        assert len(list(tmp_path.iterdir())) == 1


def test_the_folder_goes_when_the_stage_fails(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(store, "_IN_MEMORY", 0)
    (tmp_path / "panel.parquet").touch()

    def fails() -> None:
        with Scratch(tmp_path) as scratch:
            scratch.keep("numbers", ARRAYS["numbers"])
            assert len(list(tmp_path.iterdir())) == 2
            raise OSError(28, "No space left on device")

    with pytest.raises(OSError, match="No space"):
        fails()
    assert [path.name for path in tmp_path.iterdir()] == ["panel.parquet"]


def test_what_a_killed_run_left_is_removed(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(store, "_IN_MEMORY", 0)
    killed = Scratch(tmp_path)
    killed.__enter__()
    killed.keep("numbers", ARRAYS["numbers"])  # and never left
    (tmp_path / "panel.parquet").touch()
    assert len(list(tmp_path.iterdir())) == 2
    with Scratch(tmp_path):
        assert [path.name for path in tmp_path.iterdir()] == ["panel.parquet"]


def test_an_array_that_was_not_kept(tmp_path: Path) -> None:
    with Scratch(tmp_path) as scratch, pytest.raises(KeyError):
        scratch.part("numbers", 0, 1)
