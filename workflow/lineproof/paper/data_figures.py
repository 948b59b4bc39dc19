"""Figures of the data report, drawn from the evidence of the intake."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.ticker import FuncFormatter, MaxNLocator

from lineproof.intake.record import AliveEvidence, DecadeEvidence, ScaleSeries
from lineproof.paper import style
from lineproof.paper.figures import PERCENT
from lineproof.paper.palette import LIGHT

_STEPS = [1, 2, 5, 10]
_COUNT = FuncFormatter(lambda count, _: f"{abs(count):,.0f}")
_SPANS = (("0.01", "0.99", 0.9), ("0.05", "0.95", 2.6), ("0.25", "0.75", 6.5))


def drawn(name: str, draw: Callable[..., Figure], *given: Any) -> bytes:
    """A figure as SVG: the same evidence gives the same bytes."""
    with style.styled(name):
        return style.saved(draw(*given), "svg")


def alive(evidence: AliveEvidence) -> Figure:
    """Securities with a return in each period."""
    figure, axes = _start(0.42)
    days = np.array(evidence["periods"], "datetime64[D]")
    at = 1970 + days.astype(float) / 365.2425
    axes.plot(at, evidence["alive"], color=LIGHT["first"], lw=1.2)
    if len(at):
        axes.set_xlim(at[0], max(at[-1], at[0] + 1 / 12))
    _count_axes(axes)
    axes.set_ylim(bottom=0)
    axes.set_ylabel("Securities")
    return figure


def entries_exits(evidence: AliveEvidence) -> Figure:
    """Entries above the line, exits below it, by year."""
    figure, axes = _start(0.42)
    years = np.array(evidence["years"])
    axes.bar(years, evidence["entries"], width=0.72, color=LIGHT["first"], label="Entries")
    down = -np.array(evidence["exits"])
    axes.bar(years, down, width=0.72, color=LIGHT["second"], label="Exits")
    axes.axhline(0, color=LIGHT["soft"], lw=0.6)
    _count_axes(axes)
    axes.set_ylabel("Securities a year")
    figure.legend(loc="outside upper center", ncols=2)
    return figure


def distribution(evidence: list[DecadeEvidence]) -> Figure:
    """Medians of each decade, and the ranges that hold 50, 90 and 98 per cent of its returns."""
    figure, axes = _start(0.42)
    held = [each for each in evidence if each["n"]]
    for place, each in enumerate(held):
        shares = {key: PERCENT * value for key, value in each["quantiles"].items()}
        for low, high, width in _SPANS:
            ends = [shares[low], shares[high]]
            axes.plot(
                [place] * 2, ends, color=LIGHT["first"], lw=width, solid_capstyle="butt", zorder=2
            )
        axes.plot(place, shares["0.5"], "o", ms=3.4, mew=0.8, mec=LIGHT["ink"], mfc=LIGHT["paper"])
    axes.axhline(0, color=LIGHT["rule"], lw=0.6, zorder=1)
    axes.set_xlim(-0.6, max(len(held), 1) - 0.4)
    axes.set_xticks(range(len(held)), [f"{each['decade']}s" for each in held])
    axes.yaxis.set_major_locator(MaxNLocator(6, steps=_STEPS))
    axes.set_ylabel("Return, %")
    return figure


def scale(series: ScaleSeries) -> Figure:
    """The numbers behind a check of scale, in their order, on a logarithmic scale."""
    figure, axes = _start(0.36)
    values = [np.nan if value is None else value for _, value in series["points"]]
    axes.plot(range(len(values)), values, color=LIGHT["first"], lw=1.0)
    if np.nanmin([*values, 1.0]) > 0:
        axes.set_yscale("log")
    shown = range(0, len(values), max(1, -(-len(values) // 8)))
    axes.set_xticks(list(shown), [_plain(series["points"][at][0]) for at in shown])
    axes.set_ylabel(_plain(series["label"]))
    return figure


def _start(height: float) -> tuple[Figure, Axes]:
    figure = Figure(figsize=(style.NARROW, height * style.NARROW), layout="constrained")
    return figure, figure.add_subplot()


def _count_axes(axes: Axes) -> None:
    axes.xaxis.set_major_locator(MaxNLocator(8, integer=True, steps=_STEPS))
    axes.yaxis.set_major_locator(MaxNLocator(5, integer=True, steps=_STEPS))
    axes.yaxis.set_major_formatter(_COUNT)


def _plain(name: str) -> str:
    """A name as plain text: a dollar sign would start a formula."""
    return name.replace("$", r"\$")
