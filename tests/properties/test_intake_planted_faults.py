"""A clean extract with faults planted in it: what is kept is the clean extract less the faulty rows, nothing else."""

from __future__ import annotations

import random
from collections import Counter
from collections.abc import Iterable
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from tests.unit import intake_examples as examples
from tests.unit.intake_examples import Validated

from lineproof import validation
from lineproof.intake.first_pass import take_rows
from lineproof.intake.second_pass import Rules, Span, Tracked, chunks
from lineproof.periods import Months
from lineproof.store import Scratch


@dataclass(frozen=True)
class Row:
    """One row of a clean extract; returns and sizes are written so that they read back exactly."""

    security: str
    month: int
    ret: float
    size: float

    def line(self, **changed: str) -> str:
        fields = {
            "security": self.security,
            "date": f"2000-{self.month:02d}-28",
            "ret": repr(self.ret),
            "final": "",
            "size": repr(self.size),
            "price": "1",
            **changed,
        }
        return ",".join(fields.values())


# The line that each fault makes of a row; the row is set aside for it.
SPOILT = {
    5: lambda row: row.line() + ",more",
    8: lambda row: row.line(date="2000-02-30"),
    13: lambda row: row.line(ret="halted"),
    14: lambda row: row.line(size="inf"),
    15: lambda row: row.line(ret="-1.5"),
    23: lambda row: row.line(security=" "),
    28: lambda row: row.line(date=f"2001-{row.month:02d}-28"),
}
SOUND, TWICE, CONFLICT = 0, 1, 19


def planted(rows: Iterable[Row], plan: list[int]) -> tuple[list[Row], list[str], Counter, int]:
    """Rows to be kept, lines, (fault, line) to be set aside with their counts, and exact duplicates."""
    keep: list[Row] = []
    lines: list[str] = []
    aside: list[tuple[int, str]] = []
    n_exact = 0
    for row, fault in zip(rows, plan, strict=False):
        if fault in SPOILT:
            lines.append(SPOILT[fault](row))
            aside.append((fault, lines[-1]))
        elif fault == CONFLICT:
            both = [row.line(), row.line(ret=repr(row.ret + 0.25))]
            lines += both
            aside += [(fault, line) for line in both]
        else:
            keep.append(row)
            lines += [row.line()] * (1 + (fault == TWICE))
            n_exact += fault == TWICE
    return keep, lines, Counter(aside), n_exact


clean = st.dictionaries(
    st.tuples(st.sampled_from(["A", "B", "007", "7", "é", "Z9"]), st.integers(1, 12)),
    st.tuples(st.floats(-0.2, 0.2), st.floats(0.5, 1e6)),
    min_size=1,
    max_size=25,
).map(lambda cells: [Row(*place, *values) for place, values in sorted(cells.items())])
plans = st.lists(
    st.sampled_from([SOUND, SOUND, SOUND, TWICE, CONFLICT, *SPOILT]), min_size=25, max_size=25
)


def delivered(folder: Path, lines: list[str], n_files: int, seed: int) -> list[Path]:
    """The lines in some order, dealt to some files."""
    deal, shuffled = random.Random(seed), list(lines)
    deal.shuffle(shuffled)
    hands: list[list[str]] = [[] for _ in range(n_files)]
    for number, line in enumerate(shuffled):
        hands[number if number < n_files else deal.randrange(n_files)].append(line)
    return [
        Path(examples.write(folder / f"{seed}-{number}.csv", examples.lines(*hand)))
        for number, hand in enumerate(hands)
        if hand
    ]


def found_in(folder: Path, files: list[Path], at_most: int) -> Validated:
    with pytest.MonkeyPatch.context() as patch:
        examples.in_pieces(patch, at_most)
        return examples.validate(folder, files)


@settings(max_examples=40, deadline=None)
@given(
    rows=clean,
    plan=plans,
    n_files=st.integers(1, 3),
    seeds=st.tuples(st.integers(0, 999), st.integers(0, 999)),
    at_most=st.sampled_from([1, 2, 3, 7, 1 << 20]),
)
def test_what_is_kept_is_the_clean_extract_less_the_faulty_rows(
    tmp_path_factory: pytest.TempPathFactory,
    rows: list[Row],
    plan: list[int],
    n_files: int,
    seeds: tuple[int, int],
    at_most: int,
) -> None:
    folder = tmp_path_factory.mktemp("planted")
    keep, lines, aside, n_exact = planted(rows, plan)
    files = delivered(folder, lines, n_files, seeds[0])
    if not keep:
        assert "Every row is set aside." in examples.refused(folder, files)
        return
    found = found_in(folder, files, at_most)
    expected = [(row.security, f"2000-{row.month:02d}", row.ret, row.size) for row in keep]
    values = found.panel[["total_return", "size"]].to_numpy().tolist()
    assert [(*place, *row) for place, row in zip(examples.kept(found), values, strict=True)] == (
        expected
    )
    listed = found.set_aside[["fault", "raw"]].itertuples(index=False, name=None)
    assert Counter(listed) == aside
    assert found.intake["exact_duplicates"] == n_exact
    for path in files:  # every row set aside stands where it is said to stand
        text = path.read_text().split("\n")
        of_file = found.set_aside[found.set_aside["file"] == f"raw/{path.name}"]
        assert [text[line - 1] for line in of_file["line"]] == of_file["raw"].tolist()
    # Another order of the rows, dealt to other files and read whole: the same panel.
    other = found_in(folder, delivered(folder, lines, 4 - n_files, seeds[1] + 1000), 1 << 20)
    pd.testing.assert_frame_equal(found.panel, other.panel)
    pd.testing.assert_frame_equal(found.market, other.market)
    assert Counter(found.set_aside["reason"]) == Counter(other.set_aside["reason"])
    for count in ("rows_read", "rows_kept", "rows_set_aside", "exact_duplicates"):
        assert found.intake[count] == other.intake[count]


@settings(max_examples=40, deadline=None)
@given(
    rows=clean,
    plan=plans,
    n_files=st.integers(1, 3),
    seed=st.integers(0, 999),
    keep=st.sampled_from(["set_aside", "first", "last"]),
    at_most=st.sampled_from([1, 3, 1 << 20]),
)
def test_each_file_keeps_its_rows(
    tmp_path_factory: pytest.TempPathFactory,
    rows: list[Row],
    plan: list[int],
    n_files: int,
    seed: int,
    keep: str,
    at_most: int,
) -> None:
    """In each file the rows read are those kept, set aside and exact duplicates, each counted on its own."""
    folder = tmp_path_factory.mktemp("files")
    files = delivered(folder, planted(rows, plan)[1], n_files, seed)
    n = len(files)
    tracked = Tracked(np.zeros(n, np.int64), np.zeros(n, np.int64))
    span = Span(Months(), 2000 * 12, 2000 * 12 + 11)
    rules = Rules(
        same_month_rows=keep, return_after_hole="keep", jumps="flag", from_price=False, added=None
    )
    seen: list[int] = []
    with pytest.MonkeyPatch.context() as patch, Scratch(folder) as scratch:
        examples.in_pieces(patch, at_most)
        reading = examples.returns_reading()
        opened = validation.open_files([str(path) for path in files], reading)
        taken = take_rows(opened, reading, scratch, lambda day, decimal: seen.append(len(day)))
        n_kept = sum(map(len, chunks(taken, span, rules, tracked)))
    n_read = [len(path.read_text().splitlines()) - 1 for path in files]
    assert taken.n_read == n_read
    assert n_kept == tracked.n_kept.sum()
    n_aside = taken.aside.counts(n)
    assert n_read == (tracked.n_kept + tracked.n_duplicates + n_aside).tolist()
    # The evidence is shown every row that fits the header, the faulty ones as well.
    n_misfits = sum(fault == 5 for _, fault in zip(rows, plan, strict=False))
    assert sum(seen) == sum(n_read) - n_misfits
