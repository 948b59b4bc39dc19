"""Invented groups: who is in which at each formation, and the tables that the pipeline keeps of that."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from itertools import pairwise

import numpy as np
import pandas as pd

Membership = dict[str, dict[str, str]]  # formation as "1990-12" → security → group


def drawn_membership(assets: Sequence[str], months: Sequence[str], seed: int) -> Membership:
    """Sixty securities, of which each stays in its group about half the time, and is in none now and then."""
    random = np.random.Generator(np.random.PCG64(seed))
    found: Membership = {}
    place = random.integers(0, len(assets), 60)
    for month in months:
        moves = random.random(60) < 0.5
        place = np.where(moves, random.integers(0, len(assets), 60), place)
        there = random.random(60) < 0.9
        found[month] = {f"S{n:02d}": assets[place[n]] for n in range(60) if there[n]}
    return found


def date(month: str) -> pd.Timestamp:
    """The last day of a month."""
    return pd.Period(month, "M").to_timestamp(how="end").normalize().as_unit("ms")


def formations(membership: Membership, assets: Sequence[str], **columns: float) -> pd.DataFrame:
    """The table of formations; `columns` hold one value for all rows of the columns that members do not give."""
    rows = [
        (date(month), asset, list(groups.values()).count(asset))
        for month, groups in membership.items()
        for asset in assets
    ]
    frame = pd.DataFrame(rows, columns=["formed", "asset", "n_members"])
    given = {"turnover": 0.5, "mean_size": 12.0, "ante_beta": 1.0, "n_exits": 0, **columns}
    return frame.assign(**given).astype({"formed": "datetime64[ms]", "n_exits": "int64"})


def transitions(membership: Membership) -> pd.DataFrame:
    """The table of transitions, from plain loops."""
    rows = []
    months = list(membership)
    for earlier, later in pairwise(months):
        before, after = membership[earlier], membership[later]
        moves = Counter(
            (before.get(who, "new"), after.get(who, "out")) for who in {*before, *after}
        )
        for (came, went), n in sorted(moves.items()):
            total = sum(count for (start, _), count in moves.items() if start == came)
            rows.append((date(later), came, went, n, n / total))
    frame = pd.DataFrame(rows, columns=["formed", "from", "to", "n", "share"])
    return frame.astype({"formed": "datetime64[ms]", "n": "int64", "share": float})
