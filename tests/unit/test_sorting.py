"""Ranked portfolios: a tiny market worked by hand, and the corners of formation and holding.

The tiny market has two groups formed at the end of 2000 and of 2001 and four ranked securities:
A and B have low betas, C and D high ones. In the first holding year C leaves in March 2001 with a
final return, and B has a hole in February 2001.
"""

from __future__ import annotations

from typing import Any

import numpy as np
import pandas as pd
import pytest

from lineproof.designs import Design
from lineproof.formed_tables import asset_names
from lineproof.frames import contract
from lineproof.problems import KnownProblem
from lineproof.sorting import (
    Sorted,
    growth_of,
    sort_ranked,
    take_supplied,
)
from lineproof.stats.weights import lagged_sizes

OPTIONS = {
    "name": "two",
    "groups": (2,),
    "weights": "equal",
    "form_month": 12,
    "hold": 12,
    "rank_on": ("b",),
    "ante_betas": ("b",),
}
MONTHS = ["2000-12", "2001-01", "2001-02", "2001-03", "2001-04"]
RETURNS = {
    "A": [0.50, 0.10, 0.20, -0.10, 0.02],
    "B": [0.50, 0.30, None, 0.10, 0.04],
    "C": [0.50, 0.02, 0.04, -0.50],
    "D": [0.50, -0.06, 0.00, 0.10, 0.08],
}
SIZES = {
    "A": [100.0, 110.0, 120.0, 125.0, 130.0],
    "B": [300.0, 390.0, None, 500.0, 510.0],
    "C": [50.0, 52.0, 60.0, None],
    "D": [150.0, 140.0, None, None, 160.0],
}
BETAS = {"A": 0.5, "B": 0.8, "C": 1.2, "D": 1.6}


def month_ends(months: list[str]) -> pd.DatetimeIndex:
    return pd.PeriodIndex(months, freq="M").to_timestamp(how="end").normalize().as_unit("ms")


def security(name: str, months: list[str], returns: list, sizes: list) -> pd.DataFrame:
    """Rows of the panel; the riskless rate is nil, so that total and excess returns agree."""
    return pd.DataFrame(
        {
            "security": name,
            "date": month_ends(months),
            "total_return": np.array(returns, float),
            "excess_return": np.array(returns, float),
            "size": np.array(sizes, float),
            "eligible": True,
        }
    )


def tiny_panel() -> pd.DataFrame:
    parts = [security(s, MONTHS[: len(r)], r, SIZES[s]) for s, r in RETURNS.items()]
    return pd.concat(parts, ignore_index=True)


def betas_at(month: str, values: dict[str, float]) -> pd.DataFrame:
    date = month_ends([month] * len(values))
    return pd.DataFrame({"security": list(values), "date": date, "beta": list(values.values())})


def form(panel: pd.DataFrame, betas: pd.DataFrame, **changed: Any) -> Sorted:
    found = sort_ranked(panel, {"b": betas}, Design(**(OPTIONS | changed)))
    for name, table in found.tables().items():
        contract(name).validate(table)
    return found


def form_tiny(**changed: Any) -> Sorted:
    return form(tiny_panel(), betas_at("2000-12", BETAS), **changed)


def column(found: Sorted, asset: str, name: str) -> list[float]:
    return found.returns.loc[found.returns["asset"] == asset, name].tolist()


def test_members_by_hand() -> None:
    members = form_tiny(weights="size").members
    assert members["formed"].unique().tolist() == month_ends(["2000-12"]).tolist()
    assert members["asset"].tolist() == ["p01", "p01", "p02", "p02"]
    assert members["security"].tolist() == ["A", "B", "C", "D"]
    assert members["weight"].tolist() == [0.25, 0.75, 0.25, 0.75]
    assert members["ante_beta"].tolist() == [0.5, 0.8, 1.2, 1.6]
    assert members["size"].tolist() == [100.0, 300.0, 50.0, 150.0]
    assert form_tiny().members["weight"].tolist() == [0.5] * 4


def test_equal_weights_by_hand() -> None:
    found = form_tiny()
    months = month_ends(MONTHS[1:]).tolist()
    assert found.returns["date"].tolist() == months * 2
    # B has no return in February, C none after its final one in March: the others carry the group.
    low = [(0.10 + 0.30) / 2, 0.20, (-0.10 + 0.10) / 2, (0.02 + 0.04) / 2]
    high = [(0.02 - 0.06) / 2, (0.04 + 0.00) / 2, (-0.50 + 0.10) / 2, 0.08]
    np.testing.assert_allclose(column(found, "p01", "excess_return"), low, atol=1e-16)
    np.testing.assert_allclose(column(found, "p02", "excess_return"), high, atol=1e-16)
    assert column(found, "p01", "n_members") == [2, 1, 2, 2]
    assert column(found, "p02", "n_members") == [2, 2, 2, 1]
    np.testing.assert_allclose(column(found, "p01", "ante_beta"), [0.65, 0.5, 0.65, 0.65])
    np.testing.assert_allclose(column(found, "p02", "ante_beta"), [1.4, 1.4, 1.4, 1.6])


def test_size_weights_by_hand() -> None:
    """A size that is not known is the last known one grown by the returns since.

    B's size at the end of February is that of January, 390, as no return is known; D's is 140 at
    the end of January, 140 × 1.00 a month later and 140 × 1.00 × 1.10 = 154 at the end of March.
    """
    found = form_tiny(weights="size")
    low = [
        (100 * 0.10 + 300 * 0.30) / 400,
        0.20,
        (120 * -0.10 + 390 * 0.10) / 510,
        (125 * 0.02 + 500 * 0.04) / 625,
    ]
    high = [
        (50 * 0.02 + 150 * -0.06) / 200,
        (52 * 0.04 + 140 * 0.00) / 192,
        (60 * -0.50 + 140 * 0.10) / 200,
        0.08,
    ]
    np.testing.assert_allclose(column(found, "p01", "excess_return"), low, rtol=1e-13)
    np.testing.assert_allclose(column(found, "p02", "excess_return"), high, rtol=1e-13)
    np.testing.assert_allclose(column(found, "p01", "mean_size"), [200, 110, 255, 312.5])
    np.testing.assert_allclose(column(found, "p02", "mean_size"), [100, 96, 100, 154], rtol=1e-13)


def test_the_mean_size_does_not_depend_on_the_weights() -> None:
    assert column(form_tiny(), "p01", "mean_size") == [200, 110, 255, 312.5]


def test_screens_act_at_formation_only() -> None:
    panel = tiny_panel()
    panel.loc[(panel["security"] == "A") & (panel["date"] > panel["date"].min()), "eligible"] = (
        False
    )
    again = form(panel, betas_at("2000-12", BETAS))
    pd.testing.assert_frame_equal(again.returns, form_tiny().returns, check_exact=True)
    panel.loc[(panel["security"] == "A"), "eligible"] = False
    without = form(panel, betas_at("2000-12", BETAS))
    assert without.members["security"].tolist() == ["B", "C", "D"]
    assert without.members["asset"].tolist() == ["p01", "p01", "p02"]  # C is the median


@pytest.mark.parametrize("lacks", ["a beta", "a row", "a size"])
def test_who_cannot_be_ranked_at_formation(lacks: str) -> None:
    panel, betas = tiny_panel(), betas_at("2000-12", BETAS)
    is_a, formed = panel["security"] == "A", panel["date"] == panel["date"].min()
    if lacks == "a beta":
        betas = betas_at("2000-12", {s: b for s, b in BETAS.items() if s != "A"})
    elif lacks == "a row":
        panel = panel[~(is_a & formed)].reset_index(drop=True)
    else:
        panel.loc[is_a & formed, "size"] = np.nan
    assert "A" not in form(panel, betas, weights="size").members["security"].tolist()
    ranked = form(panel, betas).members["security"].tolist()
    assert ("A" in ranked) == (lacks == "a size")  # equal weights need no size


def two_years() -> pd.DataFrame:
    months = [str(m) for m in pd.period_range("2000-12", "2002-12", freq="M")]
    n = len(months)
    rng = np.random.default_rng(12)
    return pd.concat(
        [security(s, months, rng.normal(0, 0.1, n), rng.uniform(1, 9, n)) for s in BETAS],
        ignore_index=True,
    )


def test_groups_change_after_the_next_formation() -> None:
    swapped = dict(zip(BETAS, reversed(BETAS.values()), strict=True))
    betas = pd.concat([betas_at("2000-12", BETAS), betas_at("2001-12", swapped)])
    panel = two_years()
    found = form(panel, betas.sort_values(["security", "date"], ignore_index=True))
    wide = panel.pivot(index="date", columns="security", values="excess_return")
    first, second = wide.loc["2001"], wide.loc["2002"]
    low = [*first[["A", "B"]].mean(axis=1), *second[["C", "D"]].mean(axis=1)]
    np.testing.assert_allclose(column(found, "p01", "excess_return"), low, atol=1e-16)


def test_who_is_not_ranked_again_is_no_member_any_more() -> None:
    later = {s: b for s, b in BETAS.items() if s != "B"}
    betas = pd.concat([betas_at("2000-12", BETAS), betas_at("2001-12", later)])
    found = form(two_years(), betas.sort_values(["security", "date"], ignore_index=True))
    assert column(found, "p01", "n_members") == [2] * 24  # A and B, then A and the median C
    assert column(found, "p02", "n_members") == [2] * 12 + [1] * 12


def test_a_formation_with_too_few_is_left_out_and_the_hold_ends() -> None:
    """At the end of 2001 one security is left to rank: nobody is held in 2002."""
    betas = pd.concat([betas_at("2000-12", BETAS), betas_at("2001-12", {"A": 0.5})])
    found = form(two_years(), betas.sort_values(["security", "date"], ignore_index=True))
    assert found.members["formed"].nunique() == 1
    assert found.returns["date"].max() == month_ends(["2001-12"])[0]


def test_a_last_formation_without_later_months_keeps_its_members() -> None:
    betas = pd.concat([betas_at("2000-12", BETAS), betas_at("2002-12", BETAS)])
    found = form(two_years(), betas.sort_values(["security", "date"], ignore_index=True))
    assert found.members["formed"].nunique() == 2
    assert found.returns["date"].max() == month_ends(["2001-12"])[0]


def test_months_without_members_inside_are_missing_not_left_out() -> None:
    """No formation at the end of 2001: a year of 2003 follows one of 2001."""
    months = [str(m) for m in pd.period_range("2000-12", "2003-03", freq="M")]
    n = len(months)
    panel = pd.concat([security(s, months, [0.01] * n, [1.0] * n) for s in BETAS])
    betas = pd.concat([betas_at("2000-12", BETAS), betas_at("2002-12", BETAS)])
    found = form(
        panel.reset_index(drop=True), betas.sort_values(["security", "date"], ignore_index=True)
    )
    returns = column(found, "p02", "excess_return")
    assert len(returns) == 12 + 12 + 3
    assert np.isnan(returns[12:24]).all()
    np.testing.assert_allclose(np.delete(returns, range(12, 24)), 0.01, rtol=1e-14)
    assert column(found, "p02", "n_members")[12:24] == [0] * 12


def test_a_month_that_no_security_has_is_missing() -> None:
    panel = tiny_panel()
    panel = panel[panel["date"] != month_ends(["2001-02"])[0]].reset_index(drop=True)
    found = form(panel, betas_at("2000-12", BETAS), weights="size")
    assert np.isnan(column(found, "p01", "excess_return")).tolist() == [False, True, False, False]
    # Weights in March rest on the sizes of January, the last that are known.
    assert column(found, "p01", "mean_size")[2] == (110 + 390) / 2


def test_a_group_that_empties_is_missing_for_its_own_months() -> None:
    panel = tiny_panel()
    gone = panel["security"].isin(["C", "D"]) & (panel["date"] > month_ends(["2001-02"])[0])
    found = form(panel[~gone].reset_index(drop=True), betas_at("2000-12", BETAS))
    high = column(found, "p02", "excess_return")
    assert np.isnan(high).tolist() == [False, False, True, True]
    assert column(found, "p02", "n_members") == [2, 2, 0, 0]
    assert np.isfinite(column(found, "p01", "excess_return")).all()


def test_after_a_total_loss_a_security_weighs_nothing_by_size() -> None:
    months = ["2000-12", "2001-01", "2001-02"]
    panel = pd.concat(
        [
            security("A", months, [0.0, -1.0, 0.5], [100.0, None, None]),
            security("B", months, [0.0, 0.1, 0.2], [100.0, 110.0, 132.0]),
            security("C", months, [0.0, -1.0, 0.3], [100.0, None, None]),
        ],
        ignore_index=True,
    )
    found = form(panel, betas_at("2000-12", {"A": 0.1, "B": 0.2, "C": 0.3}), weights="size")
    np.testing.assert_allclose(column(found, "p01", "excess_return"), [-0.45, 0.2])
    assert column(found, "p01", "n_members") == [2, 2]
    assert column(found, "p01", "mean_size") == [100, 110]  # of B, whose size is known
    high = column(found, "p02", "excess_return")
    assert high[0] == -1.0
    assert np.isnan(high[1])  # nothing in the group has a weight


def test_sizes_of_one_security_do_not_reach_the_next() -> None:
    """B's first row has no size, and stands below a row of A that has one."""
    months = ["2000-12", "2001-01", "2001-02"]
    panel = pd.concat(
        [
            security("A", months, [0.0, 0.1, 0.1], [100.0, 110.0, 121.0]),
            security("B", months, [0.0, 0.1, 0.3], [None, None, 50.0]),
        ],
        ignore_index=True,
    )
    found = form(panel, betas_at("2000-12", {"A": 0.1, "B": 0.2}))
    assert np.isnan(column(found, "p02", "mean_size")).all()
    assert column(found, "p01", "mean_size") == [100, 110]


@pytest.mark.fault(33)
def test_too_many_groups() -> None:
    with pytest.raises(KnownProblem) as told:
        form_tiny(groups=(5,))
    assert "portfolios.two.groups: 5 groups, but at most 4 securities" in str(told.value)
    with pytest.raises(KnownProblem, match="no security has an estimate"):
        form_tiny(form_month=6)
    with pytest.raises(
        KnownProblem, match=r"first_formation: .* in any formation month from 2001-05 on"
    ):
        form_tiny(first_formation="2001-05")
    with pytest.raises(KnownProblem, match="breakpoints: too few securities meet the condition"):
        form_tiny(breakpoints={"column": "size", "at_least": 1e9})


def test_a_condition_on_returns_uses_those_that_are_known() -> None:
    """At formation each returns one half; without a riskless rate only excess returns are known."""
    condition = {"column": "return", "at_least": 0.4}
    panel = tiny_panel().assign(total_return=np.nan)
    found = form(panel, betas_at("2000-12", BETAS), breakpoints=condition)
    assert found.members["security"].tolist() == ["A", "B", "C", "D"]


def test_nothing_after_the_last_formation() -> None:
    panel = tiny_panel()
    alone = panel[panel["date"] == panel["date"].min()].reset_index(drop=True)
    with pytest.raises(KnownProblem) as told:
        form(alone, betas_at("2000-12", BETAS))
    assert "no member has a return after the last formation month, 2000-12" in str(told.value)


def test_names_of_groups_sort_in_their_order() -> None:
    assert asset_names(3) == ["p01", "p02", "p03"]
    for n in (10, 99, 100):
        assert asset_names(n) == sorted(asset_names(n))
        assert len(set(asset_names(n))) == n


def supplied() -> pd.DataFrame:
    return pd.DataFrame(
        {
            "asset": ["b", "b", "a", "a"],
            "date": month_ends(["2001-01", "2001-02", "2001-02", "1999-01"]),
            "return_": [0.02, 0.03, 0.05, 0.07],
        }
    )


def market() -> pd.DataFrame:
    date = month_ends(["2001-01", "2001-02", "2001-03"])
    return pd.DataFrame({"date": date, "market_excess": 0.01, "riskless": [0.001, 0.002, 0.003]})


@pytest.mark.parametrize(
    ("kind", "expected"),
    [("total", [0.05 - 0.002, 0.02 - 0.001, 0.03 - 0.002]), ("excess", [0.05, 0.02, 0.03])],
)
def test_supplied_assets(kind: str, expected: list[float]) -> None:
    found = take_supplied(supplied(), market(), returns_are=kind)
    for name, table in found.tables().items():
        contract(name).validate(table)
    assert len(found.members) == 0
    assert found.returns["asset"].tolist() == ["a", "b", "b"]
    assert found.returns["excess_return"].tolist() == expected
    assert found.returns[["n_members", "mean_size", "ante_beta"]].isna().all().all()


def test_supplied_assets_of_another_time() -> None:
    with pytest.raises(KnownProblem, match="no month in common with the market"):
        take_supplied(supplied().iloc[3:], market(), returns_are="total")


def test_supplied_total_returns_need_a_riskless_rate() -> None:
    unknown = market().assign(riskless=np.nan)
    with pytest.raises(KnownProblem) as caught:
        take_supplied(supplied(), unknown, returns_are="total")
    assert str(caught.value) == (
        "Excess returns cannot be taken.\n  the supplied test assets: total returns need a riskless rate\n"
        "    → add data.riskless, or set is: excess if they are in excess of it"
    )
    found = take_supplied(supplied(), unknown, returns_are="excess")
    assert found.returns["excess_return"].tolist() == [0.05, 0.02, 0.03]


def test_sizes_grow_by_excess_returns_where_no_total_is_known() -> None:
    panel = pd.DataFrame(
        {
            "security": ["a"] * 4 + ["b"] * 2,
            "date": month_ends(["2001-01", "2001-02", "2001-03", "2001-04", "2001-01", "2001-02"]),
            "total_return": np.nan,
            "excess_return": [0.1, 0.5, np.nan, 0.2, 0.1, 0.1],
            "size": [100.0, np.nan, np.nan, np.nan, np.nan, 8.0],
        }
    )
    found = lagged_sizes(np.array([0, 4, 6]), panel["size"].to_numpy(), growth_of(panel))
    # A product of numbers that are no binary fractions: one rounding.
    np.testing.assert_allclose(found, [np.nan, 100, 150, 150, np.nan, np.nan], rtol=1e-15)


def test_bought_and_held_by_hand() -> None:
    """A grows to 1.10, then B has no return in February; C leaves in March and D carries the group alone."""
    found = form_tiny(weights="buy_and_hold")
    low = [
        (0.10 + 0.30) / 2,
        0.20,
        (1.10 * 1.20 * -0.10 + 1.30 * 0.10) / (1.10 * 1.20 + 1.30),
        (1.10 * 1.20 * 0.90 * 0.02 + 1.30 * 1.10 * 0.04) / (1.10 * 1.20 * 0.90 + 1.30 * 1.10),
    ]
    np.testing.assert_allclose(column(found, "p01", "excess_return"), low, rtol=1e-13)
    assert column(found, "p02", "excess_return")[3] == pytest.approx(0.08, rel=1e-14)


def test_overlapping_groups_average_by_hand() -> None:
    """Formed each month and held for two: in February the groups of December and of January, of which C changes."""
    january = {"A": 0.5, "B": 1.3, "C": 0.6, "D": 1.6}
    betas = pd.concat([betas_at("2000-12", BETAS), betas_at("2001-01", january)])
    betas = betas.sort_values(["security", "date"], ignore_index=True)
    found = form(tiny_panel(), betas, form_each="month", hold=2, overlap=True)
    january_only, both, after = column(found, "p01", "excess_return")
    assert january_only == pytest.approx((0.10 + 0.30) / 2)
    assert both == pytest.approx((0.20 + (0.20 + 0.04) / 2) / 2)  # B has no return in February
    assert after == pytest.approx((-0.10 - 0.50) / 2)  # the groups of January: A and C
    assert column(found, "p01", "n_members") == [2, 3, 2]


def test_turnover_and_transitions_by_hand() -> None:
    """Equal weights of A and B drift by the last month to 1.02 and 1.04; then B makes way for C."""
    later = {"A": 0.5, "B": 1.3, "C": 0.6, "D": 1.6}
    panel = two_years()
    last = panel["date"] == month_ends(["2001-12"])[0]
    panel.loc[last, "total_return"] = [0.02, 0.04, 0.0, 0.1]
    betas = pd.concat([betas_at("2000-12", BETAS), betas_at("2001-12", later)])
    found = form(panel, betas.sort_values(["security", "date"], ignore_index=True))
    turnover = found.formations.set_index(["formed", "asset"])["turnover"]
    a, b = 1.02 / 2.06, 1.04 / 2.06
    at = month_ends(["2001-12"])[0]
    assert turnover[at, "p01"] == pytest.approx((abs(0.5 - a) + 0.5 + b) / 2, rel=1e-13)
    assert turnover[month_ends(["2000-12"])[0]].isna().all()
    moves = found.transitions[["from", "to", "n", "share"]].to_numpy().tolist()
    assert moves == [[x, y, 1, 0.5] for x in ("p01", "p02") for y in ("p01", "p02")]
