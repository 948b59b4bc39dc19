"""What groups return while they are held, compiled: the only loop over members and periods.

Each formation is held on its own, from the period after it to the last of its holding period, and its sums go to cells
of its own. Blocks of formations run side by side, each through the rows of the panel as they lie in memory; the order
of a sum depends on the members alone.
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
_N_BLOCKS = 4


@dataclass(frozen=True)
class Rows:
    """The panel row by row, (n_rows,) each, sorted by security and period and parted by `starts` (n_securities + 1,).

    `period` counts from 0, and is −1 where a row lies in no period. `growth` is 1 + the total
    return, 1 where it is missing. `weight` is what a member weighs in the row's period; `drifts`
    says that weights are set at formation instead and then grow with their member. `beta` is
    (n_betas, n_rows): the ex-ante beta known at the row's end, to be used from formation on and, in
    each further line, from that many years after.
    """

    starts: np.ndarray
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
    number below `n_securities`, its `row` at the formation, which is that of no other, and its
    `group` from 0. `formed` and `last`
    (n_formations,) are the period of the formation and the last one of its holding period;
    `renewed` (n_formations, n_renewals) are the periods at whose ends ex-ante betas are taken anew.
    """

    starts: np.ndarray
    security: np.ndarray
    row: np.ndarray
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
    f = formations
    out = np.zeros((f.cells[-1], f.n_groups, _N_SUMS))
    drifted = np.zeros(len(rows.period))
    if len(f.formed):
        of_rows = (rows.starts, rows.period, rows.excess, rows.growth, rows.size, rows.weight)
        of_formations = (f.formed, f.last, f.renewed, f.cells)
        _hold(*of_rows, rows.beta, rows.drifts, *_by_row(rows, f), *of_formations, out, drifted)
    weight = out[..., _WEIGHT]
    return Held(
        excess=ratio(out[..., _RETURN], weight),
        n_members=out[..., _MEMBERS],
        total_size=out[..., _SIZE],
        n_sized=out[..., _SIZED],
        beta=ratio(out[..., _BETA], out[..., _WITH_BETA]),
        drifted=drifted[f.row],
    )


def assign(rows: Rows, formations: Formations, beta: np.ndarray) -> np.ndarray:
    """The beta of its group for each row of a member with a return, (n_rows,), else NaN.

    `beta` is (n_cells, n_groups). A member of several groups that are held at once gets their mean.
    """
    f = formations
    found = np.full(len(rows.period), np.nan)
    if len(f.formed):
        group, formation, _ = _by_row(rows, f)
        given = (group, formation, f.formed, f.last, f.cells)
        _assign(rows.starts, rows.period, rows.excess, *given, beta, found)
    return found


def ratio(part: np.ndarray, whole: np.ndarray) -> np.ndarray:
    """Part over whole, NaN where the whole is not above zero; shapes alike."""
    return np.divide(part, whole, out=np.full(part.shape, np.nan), where=whole > 0)


def _by_row(rows: Rows, f: Formations) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """The group formed at each row, −1 for none, (n_rows,); the formation of each period, −1 for none; and where blocks
    of formations begin, by their members."""
    group = np.full(len(rows.period), -1, np.int32)
    group[f.row] = f.group
    formation = np.full(int(f.last.max()) + 1, -1, np.int64)
    formation[f.formed] = np.arange(len(f.formed))
    shares = f.starts[-1] * np.arange(_N_BLOCKS + 1) // _N_BLOCKS
    return group, formation, np.searchsorted(f.starts, shares)


@njit(cache=True, parallel=True)
def _hold(
    starts, period, excess, growth, size, weight, beta, drifts, group, formation, blocks, formed, last,
    renewed, cells, out, drifted,
):  # fmt: skip  # pragma: no cover - compiled
    for block in prange(len(blocks) - 1):
        _hold_block(
            starts, period, excess, growth, size, weight, beta, drifts, group, formation,
            blocks[block], blocks[block + 1], formed, last, renewed, cells, out, drifted,
        )  # fmt: skip


@njit(cache=True)
def _hold_block(
    starts, period, excess, growth, size, weight, beta, drifts, group, formation, low, high, formed,
    last, renewed, cells, out, drifted,
):  # fmt: skip  # pragma: no cover - compiled
    """Adds the members of the formations from `low` to `high` to the cells of their groups, and notes what each weighs
    after the last period. One function, since a call with as many arrays would cost as much as what it does."""
    has_beta, n_years = len(beta) > 0, renewed.shape[1]
    first_day, last_day = formed[low] if low < high else 1, formed[high - 1] if low < high else 0
    for security in range(len(starts) - 1):
        end = starts[security + 1]
        for row in range(starts[security], end):
            if group[row] < 0 or period[row] < first_day or period[row] > last_day:
                continue
            f, g = formation[period[row]], group[row]
            begins, ends, cell = formed[f], last[f], cells[f]
            wealth, year = 1.0, 0
            known = beta[0, row] if has_beta else np.nan
            for at in range(row + 1, end):
                now = period[at]
                if now > ends:
                    break
                if now <= begins:
                    continue  # in no period
                if not np.isnan(excess[at]):
                    share = wealth if drifts else weight[at]
                    place = cell + now - begins - 1
                    out[place, g, _WEIGHT] += share
                    out[place, g, _RETURN] += share * excess[at]
                    out[place, g, _MEMBERS] += 1
                    if not np.isnan(size[at]):
                        out[place, g, _SIZE] += size[at]
                        out[place, g, _SIZED] += 1
                    if not np.isnan(known):
                        out[place, g, _BETA] += share * known
                        out[place, g, _WITH_BETA] += share
                    if now == ends:
                        drifted[row] = share * growth[at]
                wealth *= growth[at]
                while year < n_years and renewed[f, year] < now:
                    year += 1
                if year < n_years and renewed[f, year] == now:
                    newer = beta[min(year + 1, len(beta) - 1), at]
                    if not np.isnan(newer):
                        known = newer


@njit(cache=True)
def _assign(
    starts, period, excess, group, formation, formed, last, cells, beta, found
):  # pragma: no cover - compiled
    for security in range(len(starts) - 1):
        end = starts[security + 1]
        total, count = np.zeros(end - starts[security]), np.zeros(end - starts[security])
        for row in range(starts[security], end):
            if group[row] < 0:
                continue
            f = formation[period[row]]
            for at in range(row + 1, end):
                now = period[at]
                if now > last[f]:
                    break
                if now > formed[f] and not np.isnan(excess[at]):
                    given = beta[cells[f] + now - formed[f] - 1, group[row]]
                    if not np.isnan(given):
                        total[at - starts[security]] += given
                        count[at - starts[security]] += 1
        for row in range(starts[security], end):
            if count[row - starts[security]] > 0:
                found[row] = total[row - starts[security]] / count[row - starts[security]]


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
def matched(
    starts, period, other_starts, other_period, other_of, values
):  # pragma: no cover - compiled
    """For each row of a table, the value of another's row of the same security and period, or NaN; (n_rows,).

    Both are sorted by security and period, and parted by `starts` and `other_starts`; `other_of`
    (n_securities,) is the place of each security in the other table, −1 where it has none.
    """
    found = np.full(len(period), np.nan)
    for security in range(len(starts) - 1):
        other = other_of[security]
        if other >= 0:
            at, stop = other_starts[other], other_starts[other + 1]
            for row in range(starts[security], starts[security + 1]):
                while at < stop and other_period[at] < period[row]:
                    at += 1
                if at < stop and other_period[at] == period[row] and period[row] >= 0:
                    found[row] = values[at]
    return found
