"""The paper's figures: small panels by subperiod on common scales, with their key outside."""

from __future__ import annotations

import textwrap
from collections.abc import Iterable

from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.ticker import MaxNLocator

from lineproof import catalog
from lineproof.paper import exhibits, style
from lineproof.paper.book import Number
from lineproof.paper.context import Context, Subperiod
from lineproof.paper.palette import LIGHT

PERCENT = 100.0
STEPS = [1, 2, 5, 10]  # between ticks, at any power of ten
_POINT = {"marker": "o", "ls": "none", "ms": 3.2, "color": LIGHT["ink"], "mew": 0}
_MARKET = {
    "marker": "D",
    "ls": "none",
    "ms": 4.2,
    "mfc": LIGHT["paper"],
    "mec": LIGHT["ink"],
    "mew": 0.9,
}
FITTED = {"color": LIGHT["first"], "lw": 1.4}
THEORY = {"color": LIGHT["second"], "lw": 1.4, "ls": (0, (4, 2))}
_OUTSIDE = {
    "marker": "o",
    "ms": 3.6,
    "mec": LIGHT["first"],
    "mfc": LIGHT["first"],
    "color": LIGHT["first"],
}
_INSIDE = {**_OUTSIDE, "mfc": LIGHT["paper"]}


def draw_figures(context: Context) -> dict[str, bytes]:
    """File name → bytes of every figure: the names that `exhibits.figure_files` lists."""
    found: dict[str, bytes] = {}
    for exhibit in exhibits.figures(context.facts):
        with style.styled(exhibit.name):
            figure = catalog.load(exhibit.entry)(context, exhibit.sort)
            for form in exhibits.FIGURE_FORMATS:
                found[f"{exhibit.stem}.{form}"] = style.saved(figure, form)
    return found


def market_lines(context: Context, sort: str) -> Figure:
    """Mean excess returns on betas in each subperiod, with the fitted line and the CAPM's."""
    periods = context.periods
    figure, panels = _grid(periods, "Beta", f"Mean excess return, % a {context.period.noun}")
    points = {each.name: _points(context, sort, each) for each in periods}
    betas = [beta for each in points.values() for beta, _ in each]
    right = 1.06 * max([1.0, *betas])
    left = min([0.0, *betas])
    for axes, period in zip(panels, periods, strict=True):
        for beta, mean in points[period.name]:
            axes.plot(beta, mean, **_POINT, zorder=3)
        _draw_lines(axes, context, sort, period, (left, right))
        axes.set_xlim(left, right)
    _one_scale(panels)
    key(
        figure,
        [("Test asset", _POINT), ("Market", _MARKET), ("Fitted line", FITTED), ("CAPM", THEORY)],
    )
    return figure


def alphas(context: Context, sort: str) -> Figure:
    """Alpha of each test asset in each subperiod, with its interval."""
    periods = context.periods
    figure, panels = _grid(periods, "", f"Alpha, % a {context.period.noun}")
    assets = context.assets(sort)
    for axes, period in zip(panels, periods, strict=True):
        axes.axhline(0.0, color=LIGHT["soft"], lw=0.6)
        for place, asset in enumerate(assets, start=1):
            number = _alpha(context, sort, period, asset)
            if number is not None:
                _draw_interval(axes, place, number, context.level)
        axes.set_xlim(0.3, max(len(assets), 1) + 0.7)
    _one_scale(panels)
    _name_assets(figure, panels, context, sort, assets)
    zero = "zero at the level of the tests"
    key(figure, [(f"Differs from {zero}", _OUTSIDE), (f"Cannot be told from {zero}", _INSIDE)])
    return figure


def coverage(context: Context, sort: str) -> Figure:
    """Securities alive in or at the end of each month, and those of them with a beta."""
    figure = Figure(figsize=(style.NARROW, 0.5 * style.NARROW), layout="constrained")
    axes = figure.add_subplot()
    months = context.book.months()
    years = [int(month[:4]) + (int(month[5:]) - 1) / 12 for month in months]
    for term, line in (("n_securities", FITTED), ("n_with_beta", THEORY)):
        keys = [("-", "-", "sample", "month", month, term, "-") for month in months]
        counts = [context.book.at(*each).estimate for each in keys]
        start = next((place for place, count in enumerate(counts) if count), len(counts))
        axes.plot(years[start:], counts[start:], **{**line, "lw": 1.1})
    if years:
        axes.set_xlim(years[0], years[-1] + 1 / 12)
    axes.set_ylim(bottom=0)
    axes.xaxis.set_major_locator(MaxNLocator(8, integer=True, steps=STEPS))
    axes.yaxis.set_major_locator(MaxNLocator(5, integer=True, steps=STEPS))
    axes.set_ylabel("Securities")
    key(figure, [("Alive", FITTED), ("With a beta", THEORY)])
    return figure


def _grid(periods: list[Subperiod], x_label: str, y_label: str) -> tuple[Figure, list[Axes]]:
    """One panel a subperiod on common axes, with tick labels on the outer ones only."""
    count = len(periods)
    n_columns = min(count, 3 if count <= 6 else 4 if count <= 16 else 5)
    n_rows = -(-count // n_columns)
    width = style.WIDE if n_columns > 1 else style.NARROW
    height = 0.75 * width if n_columns == 1 else n_rows * width / n_columns * 0.82
    figure = Figure(figsize=(width, height + 0.55), layout="constrained")
    figure.get_layout_engine().set(w_pad=0.05, h_pad=0.04, wspace=0.01, hspace=0.02)
    grid = figure.subplots(n_rows, n_columns, sharex=True, sharey=True, squeeze=False)
    panels = list(grid.flat)
    for place, axes in enumerate(panels):
        if place >= count:
            axes.remove()
            continue
        axes.set_title(_title(periods[place].title, n_columns))
        axes.tick_params(labelbottom=place + n_columns >= count)
        axes.yaxis.set_major_locator(MaxNLocator(5, steps=STEPS))
        axes.xaxis.set_major_locator(MaxNLocator(4, steps=STEPS))
    figure.supxlabel(x_label, fontsize="medium")
    figure.supylabel(y_label, fontsize="medium")
    return figure, panels[:count]


def _points(context: Context, sort: str, period: Subperiod) -> list[tuple[float, float]]:
    """Beta and mean excess return in per cent of each test asset that has both."""
    errors = context.facts["paper"]["alpha_errors"]
    book, found = context.book, []
    for asset in book.assets(sort, period.name):
        mean_keys = (sort, period.name, "describe", "-", asset, "mean", "-")
        beta_keys = (sort, period.name, "time_series", "market", asset, "beta", errors)
        if not (book.has(*mean_keys) and book.has(*beta_keys)):
            continue
        mean, beta = book.at(*mean_keys), book.at(*beta_keys)
        if mean.defined and beta.defined:
            found.append((beta.estimate, PERCENT * mean.estimate))
    return found


def _draw_lines(
    axes: Axes, context: Context, sort: str, period: Subperiod, ends: tuple[float, float]
) -> None:
    paper, book = context.facts["paper"], context.book
    if not book.ran(sort, period.name, "market_line"):
        return
    market = book.at(sort, period.name, "market_line", "-", "all", "market_mean", "-")
    if market.defined:
        axes.plot(ends, [PERCENT * market.estimate * end for end in ends], **THEORY, zorder=1)
        axes.plot(1.0, PERCENT * market.estimate, **_MARKET, zorder=4)
    start = (sort, period.name, "market_line", paper["line_weights"], "all")
    intercept, slope = (
        book.at(*start, term, paper["line_errors"]) for term in ("intercept", "slope")
    )
    if slope.defined:
        heights = [PERCENT * (intercept.estimate + slope.estimate * end) for end in ends]
        axes.plot(ends, heights, **FITTED, zorder=2)


def _alpha(context: Context, sort: str, period: Subperiod, asset: str) -> Number | None:
    errors = context.facts["paper"]["alpha_errors"]
    keys = (sort, period.name, "time_series", "market", asset, "alpha", errors)
    if not context.book.has(*keys):
        return None
    number = context.book.at(*keys)
    return number if number.defined else None


def _draw_interval(axes: Axes, place: int, number: Number, level: float) -> None:
    reach = number.critical * number.se
    look = _OUTSIDE if number.rejects(level) else _INSIDE
    ends = [PERCENT * (number.estimate - reach), PERCENT * (number.estimate + reach)]
    axes.plot([place, place], ends, color=look["color"], lw=0.9, zorder=2)
    axes.plot(place, PERCENT * number.estimate, **look, ls="none", mew=0.9, zorder=3)


def _name_assets(
    figure: Figure, panels: list[Axes], context: Context, sort: str, assets: list[str]
) -> None:
    labels = [context.label(sort, asset) for asset in assets]
    names = context.facts["sorts"][sort].get("variables", [])
    if len(names) == 2:
        step = context.groups(sort)[1]  # the first of each group of the first variable
        figure.supxlabel(
            f"Group by {names[0]} / by {names[1]}, from low to high", fontsize="medium"
        )
    elif names:
        labels = [str(*context.group(sort, asset)) for asset in assets]  # words have no room
        step = -(-len(assets) // 10)
        figure.supxlabel(f"Group, from lowest to highest {names[0]}", fontsize="medium")
    else:
        step = 1
    shown = range(1, len(assets) + 1, step)
    for axes in panels:
        ticks = [_text(_shortened(labels[at - 1], 16)) for at in shown]
        axes.set_xticks(list(shown), ticks, rotation=0 if context.ranked(sort) else 90)


def _one_scale(panels: Iterable[Axes]) -> None:
    """Limits that hold all panels' data with a little room."""
    for axes in panels:
        axes.margins(y=0.06)
        axes.autoscale(axis="y")


def key(figure: Figure, entries: list[tuple[str, dict]]) -> None:
    handles = [Line2D([], [], **look, label=label) for label, look in entries]
    figure.legend(handles=handles, loc="outside upper center", ncols=len(handles))


def _title(title: str, n_columns: int) -> str:
    most = {1: 70, 2: 46, 3: 34, 4: 26, 5: 21}[n_columns]
    lines = textwrap.wrap(title, most, max_lines=2, placeholder="…")
    return _text("\n".join(lines))


def _shortened(name: str, most: int) -> str:
    return name if len(name) <= most else name[: most - 1] + "…"


def _text(name: str) -> str:
    """A name as plain text: a dollar sign would start a formula."""
    return name.replace("$", r"\$")
