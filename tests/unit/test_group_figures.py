"""Figures of ranked groups: what is drawn is what the estimates say."""

from __future__ import annotations

import numpy as np
import pytest
from matplotlib.colors import to_rgba
from tests.unit import paper_examples as examples

from lineproof.paper import figures, group_figures, style
from lineproof.paper.palette import LIGHT


def test_squares_are_the_mean_shares() -> None:
    context = examples.usual()
    with style.styled("test"):
        axes = group_figures.moves(context, "ten").axes[0]
    (drawn,) = axes.collections
    corners = [path.get_extents() for path in drawn.get_paths()]
    places = [(round(c.intervalx.mean(), 6), round(c.intervaly.mean(), 6)) for c in corners]
    squares = dict(zip(places, drawn.get_facecolor(), strict=True))
    shares = {
        (before, after): context.book.at(f"ten/-/transitions/-/p{before:02d}/{to}/-").estimate
        for before in range(1, 11)
        for after, to in enumerate([*examples.groups(10), "out"], start=1)
    }
    largest = max(shares.values())
    for (before, after), share in shares.items():
        place = (after - 1 + (0.2 if after == 11 else 0.0), before - 1.0)
        if share == 0:
            assert place not in squares
            continue
        shade = group_figures.DARKEST * share / largest
        assert squares[place] == pytest.approx(to_rgba(LIGHT["first"], shade), abs=1e-12)
    assert len(squares) == sum(share > 0 for share in shares.values())
    assert len(axes.texts) == len(shares)
    texts = {text.get_position(): text.get_text() for text in axes.texts}
    assert texts[(2.0, 3.0)] == f"{100 * shares[4, 3]:.1f}"


def test_many_groups_are_shaded_without_numbers() -> None:
    with style.styled("test"):
        axes = group_figures.moves(examples.many(), "many").axes[0]
    assert list(axes.texts) == []
    labels = [label.get_text() for label in axes.get_yticklabels()]
    assert labels[:3] == ["Low", "3", "5"]


def test_lines_are_the_shares_of_each_formation() -> None:
    context = examples.usual()
    with style.styled("test"):
        above, below = group_figures.staying(context, "ten").axes
    stay, leave = above.lines
    months = context.book.formations("ten")
    assert months == [f"{year}-12" for year in range(1990, 2010)]
    for line, term in ((stay, "stay_share"), (leave, "leave_share")):
        x, y = line.get_data()
        assert np.isnan(y[0])  # nothing comes before the first formation
        for year, value, month in list(zip(x, y, months, strict=True))[1:]:
            number = context.book.at(f"ten/-/formations/month/{month}/{term}/-")
            assert (year, value) == (int(month[:4]) + 1, 100 * number.estimate)
    low, high = (line.get_ydata() for line in below.lines)
    assert low[3] == context.book.at("ten/-/formations/month/1993-12/min_members/-").estimate
    assert high[3] == context.book.at("ten/-/formations/month/1993-12/max_members/-").estimate


def test_groups_of_two_variables_are_named_by_both() -> None:
    context = examples.double()
    with style.styled("test"):
        moves = group_figures.moves(context, "double").axes[0]
        alphas = figures.alphas(context, "double")
    assert [label.get_text() for label in moves.get_yticklabels()][:5] == [
        *("1 / 1", "1 / 2", "1 / 3", "1 / 4", "2 / 1"),
    ]
    panel = alphas.axes[0]
    assert [label.get_text() for label in panel.get_xticklabels()] == ["1 / 1", "2 / 1", "3 / 1"]
    assert len([line for line in panel.lines if line.get_marker() == "o"]) == 12  # no spread
    assert alphas.get_supxlabel() == "Group by size / by beta, from low to high"


@pytest.mark.parametrize("count", [1, 2])
def test_few_formations_are_drawn_without_a_warning(
    count: int, recwarn: pytest.WarningsRecorder
) -> None:
    last = f"{1989 + count}-12"
    context = examples.study(
        {"two": (examples.ranked_facts("2 groups", 2), examples.groups(2))},
        [examples.subperiod("full", "1990-01", last)],
    )
    drawn = figures.draw_figures(context)
    assert all(drawn.values())
    assert [str(each.message) for each in recwarn] == []
