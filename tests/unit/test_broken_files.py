"""Files that are cut off or spoilt, in every format: rows come out, or one clear message; never anything else."""

from __future__ import annotations

import os
from pathlib import Path

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from tests.unit import format_examples as formats
from tests.unit.format_examples import WRITERS

from lineproof.intake.reading import open_files, read_text
from lineproof.problems import KnownProblem

PACKED = [name for name in WRITERS if name not in ("r.csv", "r.tsv")]


def outcome(file: Path) -> int | str:
    """The number of rows, read in every way, or the message."""
    try:
        (opened,) = open_files(str(file), formats.reading(label=f"raw/{file.name}"))
        blocks = list(opened.blocks())
        for block in blocks:
            for array in block.columns.values():
                array.validate(full=True)
                assert len(array) == len(block.position)
            assert (np.diff(block.position) > 0).all()
            texts = [text for part in opened.raw(block.position) for text in part]
            assert len(texts) == len(block.position)
        read_text(str(file), formats.reading(label=f"raw/{file.name}"))
    except KnownProblem as problem:
        said = problem
    else:
        return sum(block.n_read for block in blocks)
    assert all(f"raw/{file.name}" in p.where for p in said.problems)
    assert str(file.parent) not in str(said)
    return str(said)


@pytest.fixture(scope="module")
def whole(tmp_path_factory: pytest.TempPathFactory) -> dict[str, bytes]:
    folder = tmp_path_factory.mktemp("whole")
    return {name: Path(formats.write(folder, name)).read_bytes() for name in WRITERS}


@pytest.mark.parametrize("name", PACKED)
@pytest.mark.parametrize("share", [0.1, 0.5, 0.9, 0.99])
def test_a_file_that_is_cut_off_is_refused(
    tmp_path: Path, whole: dict[str, bytes], name: str, share: float
) -> None:
    content = whole[name]
    (tmp_path / name).write_bytes(content[: int(len(content) * share)])
    said = outcome(tmp_path / name)
    assert isinstance(said, str), f"{said} rows came out"
    assert said.count("\n") == 2


@pytest.mark.parametrize("name", WRITERS)
@settings(
    max_examples=int(os.environ.get("LINEPROOF_SPOILT", "60")),
    deadline=None,
    suppress_health_check=[HealthCheck.function_scoped_fixture],
)
@given(data=st.data())
def test_a_spoilt_file_gives_rows_or_a_message(
    tmp_path: Path, whole: dict[str, bytes], name: str, data: st.DataObject
) -> None:
    content = bytearray(whole[name])
    places = st.integers(0, len(content) - 1)
    for _ in range(data.draw(st.integers(1, 6))):
        how, a, b = data.draw(
            st.tuples(st.sampled_from(["flip", "cut", "swap", "fill"]), places, places)
        )
        a, b = min(a, len(content) - 1), min(b, len(content) - 1)
        if how == "flip":
            content[a] ^= 1 << (b % 8)
        elif how == "cut" and len(content) > 10:
            del content[a : a + 1 + b % 9]
        elif how == "swap":
            content[a], content[b] = content[b], content[a]
        elif how == "fill":
            content[a : a + 4] = b"\xff" * len(content[a : a + 4])
    (tmp_path / name).write_bytes(content)
    assert outcome(tmp_path / name) is not None
