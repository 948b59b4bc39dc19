"""A market built from the panel: by hand, against exact sums, whatever the cut, and rebuilt by portfolios."""

from __future__ import annotations

import math
from itertools import pairwise

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from lineproof.designs import Design
from lineproof.intake.chunk import Chunk
from lineproof.intake.market_build import MarketBuild
from lineproof.periods import Months, TradingDays
from lineproof.problems import KnownProblem
from lineproof.sorting import sort_ranked

JANUARY_2000 = 2000 * 12
N = 23  # months, of which the twelfth is the only December
NAN = float("nan")


def chunk(rows: list[tuple[str, int, float, float]]) -> Chunk:
    """A chunk of (security, period, total return, size), which must be sorted."""
    names, first = np.unique([row[0] for row in rows], return_index=True)
    period = np.array([row[1] for row in rows], np.int64)
    return Chunk(
        names=names,
        start=np.append(first, len(rows)).astype(np.int64),
        period=period,
        day=Months().date(period),
        values={
            "total_return": np.array([row[2] for row in rows], float),
            "size": np.array([row[3] for row in rows], float),
        },
        texts={},
        code=np.full(len(rows), -1, np.int8),
    )


def built(weights: str, *chunks: Chunk) -> pd.DataFrame:
    build = MarketBuild(weights)
    for each in chunks:
        build.see(each, each.values["total_return"])
    return build.result(Months())


MARCH = [JANUARY_2000 + k for k in range(4)]
ROWS = [
    ("a", MARCH[0], 0.10, 100.0),
    ("a", MARCH[1], 0.50, NAN),  # its size is not known: 100 · 1.5 = 150 stands in
    ("a", MARCH[2], 0.02, 120.0),
    ("a", MARCH[3], NAN, NAN),
    ("b", MARCH[0], -0.20, 300.0),
    ("b", MARCH[1], 0.10, 0.0),  # no size either: 300 · 1.1 = 330
    ("b", MARCH[2], -1.00, NAN),  # a total loss, after which it weighs nothing
    ("b", MARCH[3], 0.30, NAN),
    ("c", MARCH[1], 0.04, 50.0),
    ("c", MARCH[2], 0.08, 60.0),
    ("c", MARCH[3], 0.05, NAN),
]


def test_equal_weights_by_hand() -> None:
    found = built("equal", chunk(ROWS))
    by_hand = [-0.1 / 2, 0.64 / 3, -0.9 / 3, 0.35 / 2]
    np.testing.assert_allclose(found["return"], by_hand, rtol=1e-15)  # a few roundings
    assert found["n_securities"].tolist() == [2, 3, 3, 2]
    assert found["date"].dt.strftime("%Y-%m-%d").tolist() == [
        "2000-01-31",
        "2000-02-29",
        "2000-03-31",
        "2000-04-30",
    ]


def test_weights_by_size_by_hand() -> None:
    found = built("size", chunk(ROWS))
    by_hand = [
        (100 * 0.5 + 300 * 0.1) / 400,  # c has no size before its first row
        (150 * 0.02 - 330 + 50 * 0.08) / 530,
        0.05,  # a has no return, and b no size any more
    ]
    np.testing.assert_allclose(found["return"], by_hand, rtol=1e-14)  # a few roundings
    assert found["n_securities"].tolist() == [2, 3, 1]
    assert found["date"].iloc[0] == pd.Timestamp("2000-02-29")


@st.composite
def panels(draw: st.DrawFn) -> list[list[tuple[str, int, float, float]]]:
    """Rows by security, with holes, missing values, losses, and sizes of many orders of magnitude."""
    rng = np.random.default_rng(draw(st.integers(0, 2**32)))
    securities = []
    for number in range(draw(st.integers(1, 12))):
        at = np.flatnonzero(rng.random(18) < 0.8)
        r = np.where(rng.random(18) < 0.1, NAN, np.maximum(rng.standard_t(3, 18) * 0.1, -1))
        size = np.where(rng.random(18) < 0.3, NAN, 10.0 ** rng.uniform(-8, 12, 18))
        rows = [(f"s{number:02d}", JANUARY_2000 + int(t), r[t], size[t]) for t in at]
        if rows:
            securities.append(rows)
    return securities


def flat(securities: list[list[tuple]]) -> list[tuple]:
    return [row for rows in securities for row in rows]


@settings(max_examples=60, deadline=None)
@given(panels(), st.data(), st.sampled_from(["equal", "size"]))
def test_the_cut_into_chunks_changes_no_bit(
    securities: list[list[tuple]], data: st.DataObject, weights: str
) -> None:
    def whole(parts: list[list[list[tuple]]]) -> str:
        try:
            found = built(weights, *(chunk(flat(part)) for part in parts if part))
        except KnownProblem as problem:
            return str(problem)
        return found.to_csv(float_format="%.17g")

    cuts = sorted(data.draw(st.sets(st.integers(0, len(securities)))))
    edges = [0, *cuts, len(securities)]
    parts = [securities[a:b] for a, b in pairwise(edges)]
    assert whole(parts) == whole([securities])


@settings(max_examples=60, deadline=None)
@given(panels())
def test_sums_are_exact_to_the_last_digits(securities: list[list[tuple]]) -> None:
    """An obvious loop with exactly rounded sums (math.fsum) as the oracle."""
    weight: dict[int, list[float]] = {}
    product: dict[int, list[float]] = {}
    for rows in securities:
        known, growth = NAN, 1.0
        for _, period, r, size in rows:
            if known * growth > 0 and not math.isnan(r):
                weight.setdefault(period, []).append(known * growth)
                product.setdefault(period, []).append(known * growth * r)
            if size > 0:
                known, growth = size, 1.0
            elif not math.isnan(r):
                growth *= 1 + r
    expected = {p: math.fsum(product[p]) / math.fsum(weight[p]) for p in sorted(weight)}
    build = MarketBuild("size")
    build.see(chunk(flat(securities)), chunk(flat(securities)).values["total_return"])
    try:
        found = build.result(Months())
    except KnownProblem:
        numbers = list(expected)
        assert not numbers or len(numbers) < numbers[-1] - numbers[0] + 1
        return
    # Twice compensated sums are right to two units in the last place of the sum of absolute terms.
    scale = [math.fsum(map(abs, product[p])) / math.fsum(weight[p]) for p in expected]
    gap = np.abs(found["return"].to_numpy() - list(expected.values()))
    assert (gap <= 4 * np.finfo(float).eps * np.array(scale)).all()


@pytest.mark.parametrize("weights", ["equal", "size"])
@pytest.mark.parametrize("groups", [2, 5])
def test_portfolios_of_all_securities_rebuild_the_market(weights: str, groups: int) -> None:
    """Groups weighted by size, themselves weighted by what they hold, are the market; likewise equal weights."""
    rng = np.random.default_rng(11)
    rows = []
    for number in range(40):
        sizes = np.where(rng.random(N) < 0.25, NAN, rng.lognormal(3, 2, N))
        sizes[11] = rng.lognormal(3, 2)  # known at the formation, so that every security is ranked
        returns = np.where(rng.random(N) < 0.1, NAN, rng.normal(0.01, 0.1, N))
        rows += [
            (f"s{number:02d}", JANUARY_2000 + t, returns[t], sizes[t])
            for t in range(N)
            if t == 11 or rng.random() < 0.9
        ]
    whole = chunk(rows)
    panel = pd.DataFrame(
        {
            "security": [row[0] for row in rows],
            "date": whole.day.astype("datetime64[ms]"),
            "total_return": whole.values["total_return"],
            "excess_return": whole.values["total_return"],
            "size": whole.values["size"],
            "eligible": True,
        }
    )
    betas = panel[["security", "date"]].assign(beta=rng.normal(1, 0.5, len(panel)))
    design = Design(name="all", rank_on=("b",), groups=(groups,), weights=weights)
    sorted_ = sort_ranked(panel, {"b": betas}, design)
    returns = sorted_.returns
    held = returns["n_members"].to_numpy()
    if (
        weights == "size"
    ):  # what the members with a known size hold: their mean size by their number
        lagged = _known_lagged(panel, returns, sorted_.members)
        held = returns["mean_size"].to_numpy() * lagged
    of_group = pd.DataFrame(
        {"date": returns["date"], "w": held, "wr": held * returns["excess_return"]}
    )
    sums = of_group.groupby("date")[["w", "wr"]].sum()
    market = built(weights, whole).set_index("date")["return"]
    assert len(sums) == 11
    # Both sum some forty products of either sign: a few units in the sixteenth digit of the largest.
    np.testing.assert_allclose(sums["wr"] / sums["w"], market.loc[sums.index], rtol=0, atol=1e-15)


def _known_lagged(panel: pd.DataFrame, returns: pd.DataFrame, members: pd.DataFrame) -> np.ndarray:
    """How many members of each group and month have a return and a size before, by an obvious loop."""
    group = members.set_index("security")["asset"]
    n: dict[tuple[str, pd.Timestamp], int] = {}
    for security, rows in panel.groupby("security"):
        known = False
        for row in rows.itertuples():
            if known and not math.isnan(row.total_return):
                key = (group[security], row.date)
                n[key] = n.get(key, 0) + 1
            known = known or row.size > 0
    return np.array([n.get(key, 0) for key in zip(returns["asset"], returns["date"], strict=True)])


def test_a_hole_in_the_built_market_stops() -> None:
    rows = [("a", MARCH[0], 0.1, 1.0), ("a", MARCH[2], 0.1, 1.0), ("b", MARCH[1], NAN, 1.0)]
    with pytest.raises(KnownProblem) as caught:
        built("equal", chunk(rows))
    assert str(caught.value) == (
        "The raw data cannot be used; nothing was written.\n"
        "  data.market.build: no security has a return and a weight in 1 month: 2000-02\n"
        "    → supply the market's return as a file, or shorten the returns"
    )


def test_nothing_to_build_from_stops() -> None:
    with pytest.raises(KnownProblem) as caught:
        built("size", chunk([("a", MARCH[0], 0.1, 1.0)]))
    assert str(caught.value) == (
        "The raw data cannot be used; nothing was written.\n"
        "  data.market.build: no security has a return and a weight\n"
        "    → check the columns of data.returns"
    )


def test_a_market_of_days() -> None:
    calendar = np.array(["2001-05-30", "2001-05-31", "2001-06-01"], "datetime64[D]")
    build = MarketBuild("equal")
    one = chunk([("a", 0, 0.1, 1.0), ("a", 1, 0.2, 1.0), ("b", 1, 0.4, 1.0), ("b", 2, -0.1, 1.0)])
    build.see(one, one.values["total_return"])
    found = build.result(TradingDays(calendar))
    assert found["date"].to_numpy().astype("datetime64[D]").tolist() == calendar.tolist()
    np.testing.assert_allclose(found["return"], [0.1, 0.3, -0.1], rtol=1e-15)  # one rounding


def test_unknown_weights_are_an_error_of_ours() -> None:
    with pytest.raises(ValueError, match="no weights 'value'"):
        MarketBuild("value")
