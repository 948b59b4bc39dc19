"""Numbers about ranked groups over all their formations, as rows of the estimates."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
import pandas as pd

from lineproof.addresses import NEW, OUT
from lineproof.calendar import month_name, month_number
from lineproof.plain_estimates import plain_estimates

_ROW = ["analysis", "variant", "asset", "term", "estimate", "n_periods", "reason"]
Row = tuple[str, str, str, str, float, int, str]  # in the order of _ROW
_ALONE = "no formation follows another"
PLACES = ("first", "second")  # the variables of a sort on two


def describe_sorts(
    hold: Mapping[str, int], formed: Sequence[pd.DataFrame], last: pd.Timestamp
) -> list[pd.DataFrame]:
    """The numbers of `describe_formations` for every ranked sort in `hold`, months by name.

    `formed` has formations and transitions of the first sort, then those of the second, and so on.
    """
    tables = zip(hold.items(), zip(formed[::2], formed[1::2], strict=True), strict=True)
    return [
        describe_formations(sort, *pair, hold=months, last=last) for (sort, months), pair in tables
    ]


def describe_formations(
    sort: str, formations: pd.DataFrame, transitions: pd.DataFrame, *, hold: int, last: pd.Timestamp
) -> pd.DataFrame:
    """What the groups of one sort are at formation, and where members go by the next.

    Args:
        sort: its name.
        formations, transitions: as `formed_tables` makes them.
        hold: months a group is held.
        last: the last date of the panel; who leaves is counted where the hold has ended by then.

    Returns:
        Rows under the analyses `formations` and `transitions`, of no subperiod. `n_periods` is the
        number of formations that a number rests on; a mean weighs each of these alike. Shares of a
        group's members stand by the group before as asset and the group after as term, with
        `new` for securities that were in no group, and `out` for none. The rows of variant
        `month` are of one formation, with its month as asset: the fewest and most members of a
        group, and which part of the members of all groups before stays or is out.
    """
    rows = _group_rows(formations, hold, last)
    assets = list(dict.fromkeys(formations["asset"]))
    rows += _share_rows(_mean_shares(transitions, assets), assets)
    rows += _month_rows(formations, transitions)
    frame = pd.DataFrame(rows, columns=_ROW)
    return plain_estimates(frame.assign(sort=sort, subperiod="-"))


def _group_rows(formations: pd.DataFrame, hold: int, last: pd.Timestamp) -> list[Row]:
    ended = month_number(formations["formed"]) + hold <= month_number([last])[0]
    counted = ended & (formations["n_members"] > 0)
    exits = (formations["n_exits"] / formations["n_members"]).where(counted)
    groups = formations.assign(exit_share=exits).groupby("asset", sort=False)
    n = formations["formed"].nunique()
    rows: list[Row] = [("formations", "-", "all", "n_formations", n, n, "")]
    for term, how in (("n_members", "mean"), ("min_members", "min"), ("max_members", "max")):
        counts = groups["n_members"].agg(how)
        rows += [("formations", "-", asset, term, value, n, "") for asset, value in counts.items()]
    for term, reason in _MISSING.items():
        table = groups[term].agg(["mean", "count"])
        rows += [
            ("formations", "-", asset, term, mean, int(count), reason)
            for asset, mean, count in table.itertuples()
        ]
    return rows


_MISSING = {
    "mean_size": "no member has a size",
    "ante_beta": "no member has an ex-ante beta",
    "turnover": "no holding period of the group ends at a formation",
    "exit_share": "no holding period of the group has ended",
}


def _mean_shares(transitions: pd.DataFrame, assets: list[str]) -> pd.DataFrame:
    """Mean share by group before (rows, `new` last) and group after (`out` last), with the column `n`.

    The mean is over the formations, `n` of them, before which the group has a member; a move that
    nobody makes then counts as zero.
    """
    n = transitions.groupby("from")["formed"].nunique()
    total = transitions.pivot_table(index="from", columns="to", values="share", aggfunc="sum")
    whole = total.reindex(index=[*assets, NEW], columns=[*assets, OUT]).fillna(0.0)
    n = n.reindex(whole.index, fill_value=0)
    return whole.div(n.where(n > 0), axis=0).assign(n=n)


def _share_rows(shares: pd.DataFrame, assets: list[str]) -> list[Row]:
    rows: list[Row] = []
    for before, values in zip(shares.index, shares.to_numpy(), strict=True):
        reason = _ALONE if not shares["n"].any() else _nobody(before)
        n = int(values[-1])
        targets = [after for after in (*assets, OUT) if (before, after) != (NEW, OUT)]
        rows += [
            ("transitions", "-", before, after, share, n, reason)
            for after, share in zip(targets, values, strict=False)
        ]
        if before != NEW:
            rows += [
                ("transitions", "-", before, f"same_{place}", share, n, reason)
                for place, share in _same_variable(before, assets, values)
            ]
    return rows


def _nobody(before: str) -> str:
    if before == NEW:
        return "no security comes in after the first formation"
    return "the group has no member before a formation"


def _same_variable(before: str, assets: list[str], values: np.ndarray) -> list[tuple[str, float]]:
    """Of a sort on two variables, the share that stays in its group of each, whatever the other is."""
    parts = [asset.removeprefix("p").split("-") for asset in assets]
    mine = before.removeprefix("p").split("-")
    if len(mine) == 1:
        return []
    return [
        (place, sum(values[at] for at, each in enumerate(parts) if each[k] == mine[k]))
        for k, place in enumerate(PLACES)
    ]


def _month_rows(formations: pd.DataFrame, transitions: pd.DataFrame) -> list[Row]:
    """Of each formation the fewest and most members, and which part of all members before stays and is out."""
    members = formations.groupby("formed")["n_members"].agg(["min", "max"])
    old = transitions[transitions["from"] != NEW]
    before = old.groupby("formed")["n"].sum()
    parts = {
        "min_members": members["min"],
        "max_members": members["max"],
        "stay_share": _part(old[old["from"] == old["to"]], before),
        "leave_share": _part(old[old["to"] == OUT], before),
    }
    return [
        ("formations", "month", month_name(date), term, value, 1, "")
        for term, values in parts.items()
        for date, value in values.items()
    ]


def _part(moves: pd.DataFrame, before: pd.Series) -> pd.Series:
    return moves.groupby("formed")["n"].sum().reindex(before.index, fill_value=0) / before
