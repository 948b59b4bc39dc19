"""Numbers of groups over their formations: by hand, and the mean transition matrix against a slow loop."""

from __future__ import annotations

from collections import defaultdict
from itertools import pairwise

import numpy as np
import pandas as pd
import pytest
from tests.unit.group_examples import date, drawn_membership, formations, transitions

from lineproof.addresses import address
from lineproof.formation_summary import describe_formations, describe_sorts
from lineproof.formed_tables import asset_names
from lineproof.frames import ESTIMATES, FORMATIONS, TRANSITIONS

# Four formations of two groups. A and B leave no gap; C comes in, D leaves, E is out once and comes back.
MEMBERS = {
    "2000-12": {"A": "p01", "B": "p01", "D": "p02", "E": "p02"},
    "2001-12": {"A": "p01", "B": "p02", "C": "p01", "D": "p02"},
    "2002-12": {"A": "p02", "B": "p02", "C": "p01", "E": "p01"},
    "2003-12": {"A": "p02", "B": "p02", "C": "p02", "E": "p02"},
}
GROUPS = ["p01", "p02"]


def by_address(frame: pd.DataFrame) -> dict[str, float]:
    return dict(zip(address(frame), frame["estimate"], strict=True))


def described(membership: dict, assets: list[str], last: str, hold: int = 12) -> pd.DataFrame:
    given = formations(membership, assets)
    frame = describe_formations("two", given, transitions(membership), hold=hold, last=date(last))
    ESTIMATES.validate(frame)
    return frame


def test_the_examples_keep_the_contracts() -> None:
    FORMATIONS.validate(formations(MEMBERS, GROUPS))
    TRANSITIONS.validate(transitions(MEMBERS))


def test_groups_by_hand() -> None:
    given = formations(MEMBERS, GROUPS)
    # p01 has 2, 2, 2 and 0 members, p02 has 2, 2, 2 and 4.
    given["turnover"] = [np.nan, np.nan, 0.5, 0.25, 0.3, 0.75, np.nan, 0.1]
    given["mean_size"] = [10.0, 1.0, 20.0, 2.0, 60.0, np.nan, np.nan, 3.0]
    given["ante_beta"] = [0.5, 1.5, 0.7, 1.7, 0.9, 1.9, np.nan, 2.1]
    given["n_exits"] = [1, 0, 0, 1, 0, 2, 0, 4]
    frame = describe_formations("two", given, transitions(MEMBERS), hold=12, last=date("2004-06"))
    found = by_address(frame)
    by_hand = {
        "all/n_formations": 4,
        "p01/n_members": 1.5,
        "p02/n_members": 2.5,
        "p01/min_members": 0,
        "p02/min_members": 2,
        "p01/max_members": 2,
        "p02/max_members": 4,
        "p01/mean_size": 30,
        "p02/mean_size": 2,
        "p01/ante_beta": 0.7,
        "p02/ante_beta": 1.8,
        "p01/turnover": 0.4,
        "p02/turnover": (0.25 + 0.75 + 0.1) / 3,
        "p01/exit_share": 1 / 6,  # ½, 0 and 0
        "p02/exit_share": 0.5,  # 0, ½ and 1; the last hold has not ended
    }
    for key, value in by_hand.items():
        assert found[f"two/-/formations/-/{key}/-"] == pytest.approx(value, rel=1e-15), key
    n = dict(zip(address(frame), frame["n_periods"], strict=True))
    assert n["two/-/formations/-/p01/turnover/-"] == 2
    assert n["two/-/formations/-/p02/exit_share/-"] == 3


@pytest.mark.parametrize(("last", "counted"), [("2004-11", 3), ("2004-12", 4)])
def test_who_leaves_is_counted_where_the_hold_has_ended(last: str, counted: int) -> None:
    frame = described(MEMBERS, GROUPS, last).set_index(["asset", "term"])
    assert frame.loc[("p02", "exit_share"), "n_periods"] == counted


def test_moves_by_hand() -> None:
    found = by_address(described(MEMBERS, GROUPS, "2004-12"))
    # p01 before: {A: p01, B: p02}, {A: p02, C: p01}, {C: p02, E: p02}.
    # p02 before: {D: p02, E: out}, {B: p02, D: out}, {A: p02, B: p02}. New: C to p01, E to p01, none.
    by_hand = {
        "p01/p01": (0.5 + 0.5 + 0) / 3,
        "p01/p02": (0.5 + 0.5 + 1) / 3,
        "p01/out": 0,
        "p02/p01": 0,
        "p02/p02": (0.5 + 0.5 + 1) / 3,
        "p02/out": (0.5 + 0.5 + 0) / 3,
        "new/p01": 1,
        "new/p02": 0,
    }
    for key, value in by_hand.items():
        assert found[f"two/-/transitions/-/{key}/-"] == pytest.approx(value, abs=1e-15), key
    assert "two/-/transitions/-/new/out/-" not in found


def test_months_by_hand() -> None:
    found = by_address(described(MEMBERS, GROUPS, "2004-12"))
    by_hand = {  # fewest and most members; who stays of the four before, and who is out
        "2000-12": (2, 2, None, None),
        "2001-12": (2, 2, 2 / 4, 1 / 4),  # A and D stay, E is out
        "2002-12": (2, 2, 2 / 4, 1 / 4),  # B and C stay, D is out
        "2003-12": (0, 4, 2 / 4, 0),  # A and B stay
    }
    terms = ("min_members", "max_members", "stay_share", "leave_share")
    for month, values in by_hand.items():
        for term, value in zip(terms, values, strict=True):
            assert found.get(f"two/-/formations/month/{month}/{term}/-") == value, (month, term)


def slow_mean_matrix(membership: dict, assets: list[str]) -> dict[tuple[str, str], float]:
    """Who was where, one security at a time; then the mean over the formations at which the group before had any."""
    shares: dict[tuple[str, str], list[float]] = defaultdict(list)
    for earlier, later in pairwise(membership):
        before, after = membership[earlier], membership[later]
        for start in [*assets, "new"]:
            if start == "new":
                who = [each for each in after if each not in before]
            else:
                who = [each for each in before if before[each] == start]
            for end in [*assets, "out"]:
                if who:
                    here = [each for each in who if after.get(each, "out") == end]
                    shares[start, end].append(len(here) / len(who))
    return {key: sum(values) / len(values) for key, values in shares.items()}


@pytest.mark.parametrize("seed", range(4))
@pytest.mark.parametrize("assets", [asset_names(7), asset_names(2, 3)])
def test_the_mean_matrix_is_that_of_a_slow_loop(assets: list[str], seed: int) -> None:
    """Sums of up to ten shares in another order: a few units of the last place."""
    months = [f"{year}-06" for year in range(1990, 2001)]
    membership = drawn_membership(assets, months, seed)
    frame = described(membership, assets, "2001-06")
    rows = frame[frame["analysis"] == "transitions"]
    found = dict(zip(zip(rows["asset"], rows["term"], strict=True), rows["estimate"], strict=True))
    slow = slow_mean_matrix(membership, assets)
    slow.pop(("new", "out"))
    for key, value in slow.items():
        assert found.pop(key) == pytest.approx(value, abs=1e-14)
    for asset in assets if "-" in assets[0] else []:
        for place, term in enumerate(("same_first", "same_second")):
            mine = asset[1:].split("-")[place]
            same = sum(slow[asset, to] for to in assets if to[1:].split("-")[place] == mine)
            assert found.pop((asset, term)) == pytest.approx(same, abs=1e-14)
    assert found == {}
    for start in assets:
        assert sum(slow[start, end] for end in [*assets, "out"]) == pytest.approx(1, abs=1e-14)


def test_one_formation_has_no_next() -> None:
    frame = described({"2000-12": {"A": "p01", "B": "p02"}}, GROUPS, "2001-06")
    moves = frame[frame["analysis"] == "transitions"]
    assert set(moves["reason"]) == {"no formation follows another"}
    assert moves["estimate"].isna().all()
    exits = frame[frame["term"] == "exit_share"]
    assert set(exits["reason"]) == {"no holding period of the group has ended"}
    assert set(frame.loc[frame["variant"] == "month", "term"]) == {"min_members", "max_members"}


def test_what_no_group_has_is_undefined_with_its_reason() -> None:
    months = {"2000-12": {"A": "p02"}, "2001-12": {"A": "p02"}}
    given = formations(months, GROUPS, mean_size=np.nan, ante_beta=np.nan, turnover=np.nan)
    frame = describe_formations("two", given, transitions(months), hold=12, last=date("2002-12"))
    reasons = {
        (row.asset, row.term): row.reason for row in frame.itertuples() if row.status == "undefined"
    }
    assert reasons["p02", "mean_size"] == "no member has a size"
    assert reasons["p02", "ante_beta"] == "no member has an ex-ante beta"
    assert reasons["p02", "turnover"] == "no holding period of the group ends at a formation"
    assert reasons["p01", "p02"] == "the group has no member before a formation"
    assert reasons["new", "p01"] == "no security comes in after the first formation"
    assert ("p02", "p02") not in reasons


def test_sorts_follow_one_another_and_supplied_assets_have_none() -> None:
    tables = [formations(MEMBERS, GROUPS), transitions(MEMBERS)]
    first, second = describe_sorts({"a": 12, "b": 12}, tables * 2, date("2004-12"))
    assert (set(first["sort"]), set(second["sort"])) == ({"a"}, {"b"})
    assert describe_sorts({}, [], date("2004-12")) == []
