"""Whatever a delivery holds, no row is lost, and neither order nor packing changes what is found."""

from __future__ import annotations

import random
from collections import Counter
from pathlib import Path
from typing import Any

import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from tests.unit import intake_examples as examples
from tests.unit.intake_examples import Validated

from lineproof.problems import KnownProblem

SCREENS = [{"column": "price", "at_least": 1}, {"column": "sector", "not_in": ["banks"]}]
COLUMNS = {**examples.COLUMNS, "sector": "sector"}
HEADER = f"{examples.HEADER},sector"

security = st.sampled_from(["A", "B", " 007", "7", "'A'", "", "é,x"])
day = st.sampled_from(
    ["2000-01-31", "2000-01-28", "2000-02-29", "2000-04-30", "2000-02-30", "31.1.2000", "", "2001-01-31",
     "1999-12-31", "2000-12-29"]
)  # fmt: skip
value = st.sampled_from(
    [
        "0.01",
        "-0.02",
        "0.010",
        "0",
        "-1",
        "-1.5",
        "-99",
        "NA",
        "",
        "inf",
        "nan",
        "x",
        "4",
        "-0.8",
        "1e400",
        "1,234",
    ]
)
size = st.sampled_from(["1", "0", "-3", "", "1,234.5", "x", "7.5"])
price = st.sampled_from(["0.5", "1", "20", "NA"])
sector = st.sampled_from(["banks", "mines", "", "NA"])
final = st.sampled_from(["", "", "", "-0.3", "NA", "-2"])
record = st.tuples(security, day, value, final, size, price, sector)
deliveries = st.lists(record, min_size=1, max_size=25)
spoilers = st.lists(
    st.sampled_from(
        ["", "A,2000-01-31", 'A,"2000-01-31,0.1,,1,1,x', "   ", 'a"b,,,,,,', ",,,,,,,,"]
    ),
    max_size=3,
)


def as_line(fields: tuple[str, ...]) -> str:
    return ",".join(f'"{f}"' if "," in f else f for f in fields)


def outcome(folder: Path, content: str | Path, **options: Any) -> Validated | list[str]:
    """What validation gives; where it stops, what it found wrong."""
    try:
        return examples.validate(folder, content, screens=SCREENS, columns=COLUMNS, **options)
    except KnownProblem as problem:
        return [problem.headline, *(each.found for each in problem.problems)]


def check_same(one: Validated | list[str], other: Validated | list[str]) -> None:
    """The same panel and counts, or the same stop, whatever the lines are called."""
    if isinstance(one, list) or isinstance(other, list):
        assert one == other
        return
    pd.testing.assert_frame_equal(one.panel, other.panel)
    pd.testing.assert_frame_equal(one.market, other.market)
    reasons = [
        Counter(zip(f.set_aside["fault"], f.set_aside["reason"], strict=True)) for f in (one, other)
    ]
    assert reasons[0] == reasons[1]
    assert counts(one) == counts(other)


def counts(found: Validated) -> dict[str, Any]:
    """The intake without the lines that rows set aside stand on."""
    faults = [
        {k: v for k, v in fault.items() if k != "examples" or fault["answer"] != "set aside"}
        for fault in found.intake["faults"]
    ]
    aside = [{**each, "examples": []} for each in found.intake["set_aside"]]
    return {**found.intake, "faults": faults, "set_aside": aside}


@settings(max_examples=60, deadline=None)
@given(
    rows=deliveries,
    spoilt=spoilers,
    keep=st.sampled_from(["set_aside", "first", "last"]),
    at_most=st.sampled_from([1, 2, 5, 1000]),
)
def test_no_row_is_lost(
    tmp_path_factory: pytest.TempPathFactory,
    rows: list[tuple[str, ...]],
    spoilt: list[str],
    keep: str,
    at_most: int,
) -> None:
    folder = tmp_path_factory.mktemp("delivery")
    written = [*map(as_line, rows), *spoilt]
    random.Random(len(written)).shuffle(written)
    text = examples.lines(*written, header=HEADER)
    with pytest.MonkeyPatch.context() as patch:
        examples.in_pieces(patch, at_most)
        found = outcome(folder, text, same_month_rows=keep)
    if isinstance(found, list):
        return
    n_rows = sum(bool(line.strip()) for line in written)
    n_kept, n_aside = len(found.panel), len(found.set_aside)
    assert n_rows == n_kept + n_aside + found.intake["exact_duplicates"]
    assert found.set_aside["line"].is_unique
    everything = text.split("\n")
    for line, raw in found.set_aside[["line", "raw"]].itertuples(index=False):
        assert raw == everything[line - 1]
    in_faults = Counter(found.set_aside["fault"])
    assert in_faults == {
        f["number"]: f["n"] for f in found.intake["faults"] if f["answer"] == "set aside"
    }
    assert not found.panel.duplicated(["security", "date"]).any()
    assert (found.panel["total_return"].dropna() >= -1).all()
    assert (found.panel["size"].dropna() > 0).all()


@settings(max_examples=60, deadline=None)
@given(rows=deliveries, spoilt=spoilers, seed=st.integers(0, 99))
def test_the_order_of_rows_does_not_matter(
    tmp_path_factory: pytest.TempPathFactory,
    rows: list[tuple[str, ...]],
    spoilt: list[str],
    seed: int,
) -> None:
    folder = tmp_path_factory.mktemp("order")
    written = [*map(as_line, rows), *spoilt]
    first = outcome(folder, examples.lines(*written, header=HEADER))
    random.Random(seed).shuffle(written)
    check_same(first, outcome(folder, examples.lines(*written, header=HEADER)))


@settings(max_examples=40, deadline=None)
@given(
    # Whether a file has decimal commas is judged by its first piece, so none may look like it.
    rows=deliveries.filter(lambda rows: all(fields[2] != "1,234" for fields in rows)),
    spoilt=spoilers,
    keep=st.sampled_from(["set_aside", "first", "last"]),
    hole=st.sampled_from(["keep", "set_aside"]),
    at_most=st.integers(1, 6),
)
def test_pieces_do_not_show(
    tmp_path_factory: pytest.TempPathFactory,
    rows: list[tuple[str, ...]],
    spoilt: list[str],
    keep: str,
    hole: str,
    at_most: int,
) -> None:
    folder = tmp_path_factory.mktemp("pieces")
    text = examples.lines(*map(as_line, rows), *spoilt, header=HEADER)
    options = {"same_month_rows": keep, "return_after_hole": hole, "stale_run": 2}
    whole = outcome(folder, text, **options)
    with pytest.MonkeyPatch.context() as patch:
        examples.in_pieces(patch, at_most)
        cut = outcome(folder, text, **options)
    check_same(whole, cut)
    if isinstance(whole, Validated) and isinstance(cut, Validated):
        assert examples.aside(whole) == examples.aside(cut)


@settings(max_examples=40, deadline=None)
@given(rows=deliveries, spoilt=spoilers, keep=st.sampled_from(["set_aside", "first", "last"]))
def test_packing_does_not_matter(
    tmp_path_factory: pytest.TempPathFactory,
    rows: list[tuple[str, ...]],
    spoilt: list[str],
    keep: str,
) -> None:
    folder = tmp_path_factory.mktemp("packing")
    text = examples.lines(*map(as_line, rows), *spoilt, header=HEADER)
    plain = outcome(folder, text, same_month_rows=keep)
    for name, content in (
        ("r.csv.gz", text),
        ("r.csv.zst", text),
        ("crlf.csv", "\ufeff" + text.replace("\n", "\r\n")),
        ("open.csv", text.rstrip("\n")),
    ):
        packed = outcome(folder, content, name=name, same_month_rows=keep)
        check_same(plain, packed)
        if isinstance(plain, Validated) and isinstance(packed, Validated):
            pd.testing.assert_frame_equal(plain.set_aside, packed.set_aside)


@settings(max_examples=40, deadline=None)
@given(rows=deliveries, keep=st.sampled_from(["set_aside", "first", "last"]))
def test_parquet_holds_the_same_rows(
    tmp_path_factory: pytest.TempPathFactory, rows: list[tuple[str, ...]], keep: str
) -> None:
    folder = tmp_path_factory.mktemp("parquet")
    text = examples.lines(*map(as_line, rows), header=HEADER)
    names = HEADER.split(",")
    columns = {name: list(each) for name, each in zip(names, zip(*rows, strict=True), strict=True)}
    file = examples.write_parquet(folder / "r.parquet", columns)
    plain = outcome(folder, text, same_month_rows=keep)
    parquet = outcome(folder, Path(file), same_month_rows=keep)
    check_same(plain, parquet)
    if isinstance(plain, Validated) and isinstance(parquet, Validated):
        assert (plain.set_aside["line"] == parquet.set_aside["line"] + 1).all()  # no header
        assert plain.set_aside["raw"].tolist() == parquet.set_aside["raw"].tolist()
