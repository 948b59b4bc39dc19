"""Figures: same bytes every time, sizes, and colours everyone can tell apart."""

from __future__ import annotations

import re
import struct
from itertools import combinations

import numpy as np
import pytest
from tests.unit import paper_examples as examples

from lineproof.paper import exhibits, figures, style
from lineproof.paper.context import Context
from lineproof.paper.inline import inline_svg
from lineproof.paper.palette import DARK, LIGHT

# Machado, Oliveira and Fernandes 2009, severity 1, on linear RGB (from memory; rows sum to one).
DEFICIENCIES = {
    "none": np.eye(3),
    "protanopia": [
        [0.152286, 1.052583, -0.204868],
        [0.114503, 0.786281, 0.099216],
        [-0.003882, -0.048116, 1.051998],
    ],
    "deuteranopia": [
        [0.367322, 0.860646, -0.227968],
        [0.280085, 0.672501, 0.047413],
        [-0.011820, 0.042940, 0.968881],
    ],
    "tritanopia": [
        [1.255528, -0.076749, -0.178779],
        [-0.078411, 0.930809, 0.147602],
        [0.004733, 0.691367, 0.303900],
    ],
    "greyscale": np.tile([0.2126, 0.7152, 0.0722], (3, 1)),
}
MARKS = ("ink", "first", "second")


@pytest.fixture(scope="module")
def drawn() -> dict[str, bytes]:
    return figures.draw_figures(examples.usual())


def linear(colour: str) -> np.ndarray:
    """Linear RGB of a colour such as #1b1b1f."""
    channels = np.array([int(colour[place : place + 2], 16) for place in (1, 3, 5)]) / 255
    return np.where(channels <= 0.04045, channels / 12.92, ((channels + 0.055) / 1.055) ** 2.4)


def lab(rgb: np.ndarray) -> np.ndarray:
    """CIE L*a*b* (white of D65) of a linear RGB colour."""
    to_xyz = np.array(
        [[0.4124, 0.3576, 0.1805], [0.2126, 0.7152, 0.0722], [0.0193, 0.1192, 0.9505]]
    )
    scaled = to_xyz @ np.clip(rgb, 0, 1) / to_xyz.sum(axis=1)
    cube = np.where(scaled > (6 / 29) ** 3, np.cbrt(scaled), scaled * (29 / 6) ** 2 / 3 + 4 / 29)
    x, y, z = cube
    return np.array([116 * y - 16, 500 * (x - y), 200 * (y - z)])


@pytest.mark.parametrize("palette", [LIGHT, DARK], ids=["light", "dark"])
@pytest.mark.parametrize("deficiency", DEFICIENCIES)
def test_marks_are_told_apart(palette: dict[str, str], deficiency: str) -> None:
    """A colour difference of 10 is about four times what is just noticed side by side."""
    seen = {
        name: lab(np.asarray(DEFICIENCIES[deficiency]) @ linear(palette[name]))
        for name in (*MARKS, "paper")
    }
    for one, other in combinations(seen, 2):
        assert np.linalg.norm(seen[one] - seen[other]) > 10, (one, other)


@pytest.mark.parametrize("palette", [LIGHT, DARK], ids=["light", "dark"])
def test_text_and_lines_contrast_with_the_page(palette: dict[str, str]) -> None:
    """Contrast of 4.5 for text and 2.7 for lines, by the luminance ratio of WCAG 2."""

    def contrast(name: str) -> float:
        light = [
            float(linear(palette[each]) @ [0.2126, 0.7152, 0.0722]) for each in (name, "paper")
        ]
        return (max(light) + 0.05) / (min(light) + 0.05)

    assert min(contrast("ink"), contrast("soft")) > 4.5
    assert min(contrast("first"), contrast("second")) > 2.7


def test_two_draws_give_the_same_bytes(drawn: dict[str, bytes]) -> None:
    again = figures.draw_figures(examples.usual())
    assert list(drawn) == exhibits.figure_files(examples.usual().facts)
    assert {name for name in drawn if drawn[name] != again[name]} == set()


def test_no_file_tells_when_or_by_what_it_was_made(drawn: dict[str, bytes]) -> None:
    for content in drawn.values():
        assert not re.search(rb"CreationDate|<dc:date>|Matplotlib v|Software", content)


def test_png_is_as_wide_as_said(drawn: dict[str, bytes]) -> None:
    for name, width in (("market_lines", style.WIDE), ("coverage", style.NARROW)):
        pixels = struct.unpack(">I", drawn[f"{name}.png"][16:20])[0]
        assert pixels == pytest.approx(300 * width, abs=1)  # whole pixels


@pytest.mark.parametrize("make", [examples.hostile, lambda: short(1), lambda: short(2)])
def test_odd_studies_draw_without_a_warning(make: object, recwarn: pytest.WarningsRecorder) -> None:
    drawn = figures.draw_figures(make())
    assert all(drawn.values())
    assert [str(each.message) for each in recwarn] == []


def test_undefined_lines_are_left_out() -> None:
    with style.styled("test"):
        defined = figures.market_lines(short(4), "given").axes[0]
        undefined = figures.market_lines(short(2), "given").axes[0]
    colours = [[line.get_color() for line in axes.lines] for axes in (defined, undefined)]
    assert LIGHT["first"] in colours[0]
    assert LIGHT["first"] not in colours[1]


def test_points_are_the_estimates() -> None:
    context = short(4)
    with style.styled("test"):
        axes = figures.market_lines(context, "given").axes[0]
    points = [line.get_xydata()[0] for line in axes.lines if line.get_marker() == "o"]
    for asset, point in zip(context.assets("given"), points, strict=True):
        beta = context.book.at(f"given/full/time_series/market/{asset}/beta/hac").estimate
        mean = context.book.at(f"given/full/describe/-/{asset}/mean/-").estimate
        assert tuple(point) == (beta, 100 * mean)


def test_settings_of_the_machine_are_left_alone() -> None:
    import matplotlib as mpl

    before = dict(mpl.rcParams)
    with style.styled("test"):
        assert mpl.rcParams["svg.hashsalt"] == "test"
    assert dict(mpl.rcParams) == before


def test_inlined_figures_share_no_id_and_take_the_page_colours(drawn: dict[str, bytes]) -> None:
    text = inline_svg(drawn["alphas.svg"], "fig", "A <title>", "Said & done")
    assert "A &lt;title&gt;" in text
    assert "Said &amp; done" in text
    ids = re.findall(r'\bid="([^"]+)"', text)
    assert len(ids) == len(set(ids))
    assert all(each.startswith("fig-") for each in ids)
    assert set(re.findall(r'(?:url\(|href=")#([^")]+)', text)) <= set(ids)
    assert "<style" not in text
    assert not any(colour in text for colour in LIGHT.values())
    with pytest.raises(ValueError, match="view box"):
        inline_svg(b"<p>", "fig", "", "")


def short(assets: int) -> Context:
    """A study of a few supplied assets over one year."""
    names = [f"Asset {place}" for place in range(1, assets + 1)]
    return examples.study(
        {"given": ({"title": "Given", "design": "supplied"}, names)},
        [examples.subperiod("full", "1990-01", "1990-12")],
    )
