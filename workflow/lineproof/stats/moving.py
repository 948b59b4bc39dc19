"""How members move from one formation to the next, compiled.

Members are listed by formation, parted by `starts` (n_formations + 1,); `security` and `group` number from 0.
"""

from __future__ import annotations

import numpy as np
from numba import njit


@njit(cache=True)
def turnover(
    starts, security, group, weight, drifted, ended, n_securities, n_groups
):  # pragma: no cover - compiled
    """½ Σ |new weight − drifted weight| over the members old and new of each group, (n_formations, n_groups).

    The old ones are those of the formation `ended` (n_formations,), −1 where there is none; `weight` and `drifted`
    sum to one in each group. NaN where the old group does not exist or weighs nothing.
    """
    found = np.full((len(ended), n_groups), np.nan)
    old_weight = np.zeros(n_securities)
    old_group = np.full(n_securities, -1)
    for now in range(len(ended)):
        if ended[now] < 0:
            continue
        first, last = starts[ended[now]], starts[ended[now] + 1]
        moved, held = np.zeros(n_groups), np.zeros(n_groups)
        for member in range(first, last):
            old_weight[security[member]] = drifted[member]
            old_group[security[member]] = group[member]
            held[group[member]] += drifted[member]
        for member in range(starts[now], starts[now + 1]):
            who = security[member]
            if old_group[who] == group[member]:
                moved[group[member]] += abs(weight[member] - old_weight[who])
                old_group[who] = -1
            else:
                moved[group[member]] += weight[member]
        for member in range(first, last):
            who = security[member]
            if old_group[who] >= 0:
                moved[group[member]] += old_weight[who]
            old_group[who] = -1
        for each in range(n_groups):
            if held[each] > 0:
                found[now, each] = moved[each] / 2
    return found


@njit(cache=True)
def at_formation(
    starts, group, weight, size, beta, last_row, last, n_groups
):  # pragma: no cover - compiled
    """Sums over the members of each group, (6, n_formations, n_groups): of members; of sizes, and how many are known;
    of weights × betas, and of the weights of members that have one; of members whose `last_row` is before `last` of
    their formation (n_formations,)."""
    sums = np.zeros((6, len(last), n_groups))
    for now in range(len(last)):
        for member in range(starts[now], starts[now + 1]):
            each = group[member]
            sums[0, now, each] += 1
            if not np.isnan(size[member]):
                sums[1, now, each] += size[member]
                sums[2, now, each] += 1
            if not np.isnan(beta[member]):
                sums[3, now, each] += weight[member] * beta[member]
                sums[4, now, each] += weight[member]
            sums[5, now, each] += last_row[member] < last[now]
    return sums


def moves(
    starts: np.ndarray, security: np.ndarray, group: np.ndarray, n_securities: int, n_groups: int
) -> tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray]:
    """From which group to which, at each formation but the first: formation, from, to and how many, sorted.

    Groups are numbered from 1 here; 0 is none. Moves that nobody makes are left out.
    """
    key = _keys(starts, security, group, n_securities, n_groups + 1)
    n_keys = (len(starts) - 1) * (n_groups + 1) ** 2
    if n_keys <= 4 * len(key) + _FEW_KEYS:
        counts = np.bincount(key, minlength=n_keys)
        found = np.flatnonzero(counts)
        counts = counts[found]
    else:
        found, counts = np.unique(key, return_counts=True)
    before, went = np.divmod(found, n_groups + 1)
    now, came = np.divmod(before, n_groups + 1)
    return now, came, went, counts


_FEW_KEYS = 1 << 20  # a table of counts that costs less than sorting


@njit(cache=True)
def _keys(starts, security, group, n_securities, n_states):  # pragma: no cover - compiled
    """(formation · n_states + group before) · n_states + group after, of each security that has either; int64."""
    keys = np.empty(2 * len(security), np.int64)
    before = np.zeros(n_securities, np.int64)
    n = 0
    for now in range(1, len(starts) - 1):
        for member in range(starts[now - 1], starts[now]):
            before[security[member]] = group[member] + 1
        for member in range(starts[now], starts[now + 1]):
            who = security[member]
            keys[n] = (now * n_states + before[who]) * n_states + group[member] + 1
            before[who] = 0
            n += 1
        for member in range(starts[now - 1], starts[now]):
            who = security[member]
            if before[who] > 0:
                keys[n] = (now * n_states + before[who]) * n_states
                before[who] = 0
                n += 1
    return keys[:n].copy()
