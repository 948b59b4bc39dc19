"""Colours of the figures by what they mean; they differ in lightness as well as in hue.

Figures are drawn in `LIGHT`; the report puts `DARK` in its place for readers of dark pages.
"""

from __future__ import annotations

LIGHT: dict[str, str] = {
    "paper": "#ffffff",
    "ink": "#1b1b1f",
    "soft": "#5d5e66",
    "rule": "#c4c4ca",
    "first": "#1a4f8f",
    "second": "#d9822b",
}
DARK: dict[str, str] = {
    "paper": "#15171b",
    "ink": "#e6e4df",
    "soft": "#a5a6ad",
    "rule": "#43464e",
    "first": "#8fbcf2",
    "second": "#cf7a2b",
}
