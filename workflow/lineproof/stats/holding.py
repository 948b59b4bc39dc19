"""What groups return while they are held, compiled: the only loop over members and periods.

Each formation is held on its own, from the period after it to the last of its holding period, and its sums go to cells
of its own; so blocks of formations run side by side, and the order of a sum depends on the members alone.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numba import njit, prange

# Sums of a cell: weights; weights × excess returns; members; sizes, and how many are known; weights × betas, and the
# weights of the members with one.
_WEIGHT, _RETURN, _MEMBERS, _SIZE, _SIZED, _BETA, _WITH_BETA = range(7)
_N_SUMS = 7
_N_BLOCKS = 16


@dataclass(frozen=True)
class Rows:
    """The panel row by row, (n_rows,) each, sorted by security and period.

    `period` counts from 0, and is −1 where a row lies in no period. `growth` is 1 + the total
    return, 1 where it is missing. `weight` is what a member weighs in the row's period; `drifts`
    says that weights are set at formation instead and then grow with their member. `beta` is
    (n_betas, n_rows): the ex-ante beta known at the row's end, to be used from formation on and, in
    each further line, from that many years after.
    """

    period: np.ndarray
    excess: np.ndarray
    growth: np.ndarray
    size: np.ndarray
    weight: np.ndarray
    beta: np.ndarray
    drifts: bool


@dataclass(frozen=True)
class Formations:
    """Groups by formation, ascending in time.

    Members are listed by formation, parted by `starts` (n_formations + 1,): the `security` of each, a
    number below `n_securities`, its `row` at the formation, the `end` of its security's rows, and its
    `group` from 0. `formed` and `last`
    (n_formations,) are the period of the formation and the last one of its holding period;
    `renewed` (n_formations, n_renewals) are the periods at whose ends ex-ante betas are taken anew.
    """

    starts: np.ndarray
    security: np.ndarray
    row: np.ndarray
    end: np.ndarray
    group: np.ndarray
    formed: np.ndarray
    last: np.ndarray
    renewed: np.ndarray
    n_groups: int
    n_securities: int

    @cached_property
    def cells(self) -> np.ndarray:
        """Where the periods of each formation begin among all of them, (n_formations + 1,)."""
        return np.concatenate([[0], np.cumsum(self.last - self.formed)]).astype(np.int64)


@dataclass(frozen=True)
class Held:
    """Groups while they are held.

    By formation and period as in `Formations.cells`, and group, (n_cells, n_groups): `excess` the
    group's return, NaN where nothing has a weight; `n_members` with a return; `total_size` of the
    `n_sized` members whose size the period before is known; `beta` the weighted mean of the ex-ante
    betas. `drifted` (n_members,) is what each member weighs at the end of the last period of the
    hold, not scaled, and 0 without a return in it.
    """

    excess: np.ndarray
    n_members: np.ndarray
    total_size: np.ndarray
    n_sized: np.ndarray
    beta: np.ndarray
    drifted: np.ndarray


def hold(rows: Rows, formations: Formations) -> Held:
    """Returns of each group in each period it is held.

    In a period without a return a security is no member, and the others carry the group in
    proportion to their weights.
    """
    out = np.zeros((formations.cells[-1], formations.n_groups, _N_SUMS))
    drifted = np.zeros(len(formations.row))
    _hold(*_arguments(rows, formations), out, drifted)
    weight = out[..., _WEIGHT]
    return Held(
        excess=_ratio(out[..., _RETURN], weight),
        n_members=out[..., _MEMBERS],
        total_size=out[..., _SIZE],
        n_sized=out[..., _SIZED],
        beta=_ratio(out[..., _BETA], out[..., _WITH_BETA]),
        drifted=drifted,
    )


def assign(rows: Rows, formations: Formations, beta: np.ndarray) -> np.ndarray:
    """The beta of its group for each row of a member with a return, (n_rows,), else NaN.

    `beta` is (n_cells, n_groups). A member of several groups that are held at once gets their mean.
    """
    total, count = np.zeros(len(rows.period)), np.zeros(len(rows.period), np.int64)
    f = formations
    given = (f.starts, f.row, f.end, f.group, f.formed, f.last, f.cells)
    _assign(rows.period, rows.excess, *given, beta, total, count)
    return _ratio(total, count)


def _ratio(part: np.ndarray, whole: np.ndarray) -> np.ndarray:
    return np.divide(part, whole, out=np.full(part.shape, np.nan), where=whole > 0)


def _arguments(rows: Rows, f: Formations) -> tuple:
    of_rows = (rows.period, rows.excess, rows.growth, rows.size, rows.weight, rows.beta)
    return (
        *of_rows,
        rows.drifts,
        *_in_blocks(f),
        f.row,
        f.end,
        f.group,
        f.formed,
        f.last,
        f.renewed,
        f.cells,
    )


def _in_blocks(f: Formations) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Where blocks of formations begin among the members, the members of each in the order of their rows, and the
    formation of each: what is read then lies together, and sums still run in the order of the securities."""
    first = np.linspace(0, len(f.formed), _N_BLOCKS + 1).astype(np.int64)
    formation_of = np.repeat(np.arange(len(f.formed)), np.diff(f.starts))
    begins = f.starts[first]
    block = np.repeat(np.arange(_N_BLOCKS), np.diff(begins))
    security, n_securities = f.security, f.n_securities
    return begins, in_order(block * n_securities + security, _N_BLOCKS * n_securities), formation_of


@njit(cache=True, parallel=True)
def _hold(
    period, excess, growth, size, weight, beta, drifts, begins, order, formation_of, row, end, group,
    formed, last, renewed, cells, out, drifted,
):  # fmt: skip  # pragma: no cover - compiled
    for block in prange(len(begins) - 1):
        for place in range(begins[block], begins[block + 1]):
            member = order[place]
            f = formation_of[member]
            drifted[member] = _one_member(
                period, excess, growth, size, weight, beta, drifts, row[member], end[member],
                formed[f], last[f], renewed[f], out[cells[f] : cells[f + 1], group[member]],
            )  # fmt: skip


@njit(cache=True)
def _one_member(
    period, excess, growth, size, weight, beta, drifts, row, end, formed, last, renewed, out
):  # pragma: no cover - compiled
    """Adds a member to the cells (n_periods, n_sums) of its group, and returns what it weighs after the last one."""
    wealth, known, year, left = 1.0, np.nan, 0, 0.0
    if len(beta) > 0:
        known = beta[0, row]
    for at in range(row + 1, end):
        now = period[at]
        if now > last:
            break
        if now <= formed:
            continue  # in no period
        if not np.isnan(excess[at]):
            share = wealth if drifts else weight[at]
            _add(out[now - formed - 1], share, excess[at], size[at], known)
            if now == last:
                left = share * growth[at]
        wealth *= growth[at]
        while year < len(renewed) and renewed[year] < now:
            year += 1
        if year < len(renewed) and renewed[year] == now:
            newer = beta[min(year + 1, len(beta) - 1), at]
            if not np.isnan(newer):
                known = newer
    return left


@njit(cache=True)
def _add(cell, share, excess, size, beta):  # pragma: no cover - compiled
    cell[_WEIGHT] += share
    cell[_RETURN] += share * excess
    cell[_MEMBERS] += 1
    if not np.isnan(size):
        cell[_SIZE] += size
        cell[_SIZED] += 1
    if not np.isnan(beta):
        cell[_BETA] += share * beta
        cell[_WITH_BETA] += share


@njit(cache=True)
def _assign(
    period, excess, starts, row, end, group, formed, last, cells, beta, total, count
):  # pragma: no cover - compiled
    for f in range(len(formed)):
        for member in range(starts[f], starts[f + 1]):
            for at in range(row[member] + 1, end[member]):
                now = period[at]
                if now > last[f]:
                    break
                if now > formed[f] and not np.isnan(excess[at]):
                    found = beta[cells[f] + now - formed[f] - 1, group[member]]
                    if not np.isnan(found):
                        total[at] += found
                        count[at] += 1


@njit(cache=True)
def in_order(key, n_keys):  # pragma: no cover - compiled
    """Places that put whole numbers from 0 to n_keys − 1 in order, equal ones as they stand; int64 (n,)."""
    after = np.zeros(n_keys + 1, np.int64)
    for each in key:
        after[each + 1] += 1
    for each in range(n_keys):
        after[each + 1] += after[each]
    order = np.empty(len(key), np.int64)
    for place in range(len(key)):
        order[after[key[place]]] = place
        after[key[place]] += 1
    return order


@njit(cache=True)
def matched(starts, period, other_starts, other_period, other_of):  # pragma: no cover - compiled
    """For each row of a table, the row of another of the same security and period, or −1; int64 (n_rows,).

    Both are sorted by security and period, and parted by `starts` and `other_starts`; `other_of`
    (n_securities,) is the place of each security in the other table, −1 where it has none.
    """
    found = np.full(len(period), -1, np.int64)
    for security in range(len(starts) - 1):
        other = other_of[security]
        if other >= 0:
            at, stop = other_starts[other], other_starts[other + 1]
            for row in range(starts[security], starts[security + 1]):
                while at < stop and other_period[at] < period[row]:
                    at += 1
                if at < stop and other_period[at] == period[row] and period[row] >= 0:
                    found[row] = at
    return found
