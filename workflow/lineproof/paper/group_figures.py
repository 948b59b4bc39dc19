"""Figures of ranked groups: where their members go, and who stays."""

from __future__ import annotations

import numpy as np
from matplotlib.axes import Axes
from matplotlib.collections import PolyCollection
from matplotlib.figure import Figure
from matplotlib.ticker import MaxNLocator

from lineproof.addresses import OUT
from lineproof.paper import figures, style
from lineproof.paper.context import Context
from lineproof.paper.palette import LIGHT
from lineproof.paper.rounding import printed

DARKEST = 0.5  # so that ink stays legible on it, on light pages and dark
MOST_WRITTEN = 13  # columns in which numbers can be read
_TICKS = 13


def moves(context: Context, sort: str) -> Figure:
    """Mean share of each group's members by the group after: one shaded square each."""
    assets = context.group_assets(sort)
    shares = _shares(context, sort, assets)
    wide = 0.75 * style.NARROW
    figure = Figure(figsize=(wide, 0.86 * wide), layout="constrained")
    axes = figure.add_subplot()
    _shade(axes, shares)
    if shares.shape[1] <= MOST_WRITTEN:
        _write(axes, shares)
    axes.set_xlim(-0.5, len(assets) + 0.7)
    axes.set_ylim(len(assets) - 0.5, -0.5)
    axes.set_aspect("equal")
    labels = [context.label(sort, asset) for asset in assets]
    step = -(-len(assets) // _TICKS)
    if len(context.groups(sort)) == 2 and step > 1:
        step = context.groups(sort)[1]  # the first of each group of the first variable
    shown = range(0, len(assets), step)
    turned = 90 if max(map(len, labels), default=0) > 4 and len(assets) > 5 else 0
    names = [labels[at] for at in shown]
    axes.set_xticks([*shown, len(assets) + 0.2], [*names, "Out"], rotation=turned)
    axes.set_yticks(list(shown), names)
    axes.tick_params(length=0)
    axes.spines[:].set_visible(False)
    axes.set_xlabel("Group at the next formation")
    axes.set_ylabel("Group")
    return figure


def _shares(context: Context, sort: str, assets: list[str]) -> np.ndarray:
    """(n_groups, n_groups + 1) shares, `out` last; NaN where one is not defined or not reported."""
    found = np.full((len(assets), len(assets) + 1), np.nan)
    for row, before in enumerate(assets):
        for column, after in enumerate([*assets, OUT]):
            keys = (sort, "-", "transitions", "-", before, after, "-")
            if context.book.has(*keys):
                found[row, column] = context.book.at(*keys).estimate
    return found


def _shade(axes: Axes, shares: np.ndarray) -> None:
    """The darker, the larger; the largest is as dark as `DARKEST`. Squares that nobody goes to stay empty."""
    rows, columns = np.nonzero(np.nan_to_num(shares) > 0)
    values = shares[rows, columns]
    x = columns + 0.2 * (columns == shares.shape[1] - 1)
    corners = np.array([(-0.5, -0.5), (0.5, -0.5), (0.5, 0.5), (-0.5, 0.5)])
    squares = np.stack([x, rows], axis=1)[:, None, :] + 0.96 * corners
    largest = values.max(initial=0.0)
    alpha = DARKEST * values / largest if largest > 0 else values
    colour = LIGHT["first"]
    axes.add_collection(
        PolyCollection(squares, facecolors=[(colour, a) for a in alpha], edgecolors="none")
    )


def _write(axes: Axes, shares: np.ndarray) -> None:
    for (row, column), value in np.ndenumerate(shares):
        at = column + (0.2 if column == shares.shape[1] - 1 else 0.0)
        text = printed(float(value), "share").replace("-", "–")
        axes.text(at, row, text, ha="center", va="center_baseline", fontsize=7)


def staying(context: Context, sort: str) -> Figure:
    """By formation: which part of all members stays in its group and leaves, and the members of a group."""
    figure = Figure(figsize=(style.NARROW, 0.62 * style.NARROW), layout="constrained")
    above, below = figure.subplots(2, 1, sharex=True, height_ratios=(3, 2))
    months = context.book.formations(sort)
    years = np.array([int(month[:4]) + int(month[5:]) / 12 for month in months])
    looks = (("stay_share", figures.FITTED), ("leave_share", figures.THEORY))
    for term, look in looks:
        values = figures.PERCENT * _by_month(context, sort, months, term)
        above.plot(years, values, **{**look, "lw": 1.1}, **_MARK)
    low, high = (_by_month(context, sort, months, f"{end}_members") for end in ("min", "max"))
    below.fill_between(years, low, high, color=LIGHT["first"], alpha=0.3, lw=0)
    for values in (low, high):
        below.plot(years, values, color=LIGHT["first"], lw=0.8, **_MARK)
    for axes, name in ((above, "Members, %"), (below, "Members of a group")):
        axes.set_ylim(bottom=0)
        axes.set_ylabel(name)
        axes.yaxis.set_major_locator(MaxNLocator(4, integer=True, steps=figures.STEPS))
    below.xaxis.set_major_locator(MaxNLocator(8, integer=True, steps=figures.STEPS))
    figures.key(figure, [("In the same group", figures.FITTED), ("In no group", figures.THEORY)])
    return figure


_MARK = {"marker": ".", "ms": 2.5, "mew": 0}


def _by_month(context: Context, sort: str, months: list[str], term: str) -> np.ndarray:
    """(n_formations,) values, NaN where there is none, as at the first formation."""
    keys = [(sort, "-", "formations", "month", month, term, "-") for month in months]
    book = context.book
    return np.array([book.at(*each).estimate if book.has(*each) else np.nan for each in keys])
