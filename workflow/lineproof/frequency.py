"""How often returns are measured, and what readers call one period of it."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Frequency:
    """Words and numbers that hang on the length of a period.

    `noun` and `nouns` are what a period is called; `counted` what many of them are called where they
    make up a window. `on_a` and `on_the` place something within one: "in a month", "on the day".
    `a_year` is the number of periods by which a mean is put on a yearly scale; 252 trading days is
    common practice.
    `mean_format` is how mean returns are printed, a key of `paper.rounding.FORMATS`: what is earned
    in a day is some twentieth of what is earned in a month, and needs the digits.
    """

    noun: str
    nouns: str
    adjective: str
    counted: str
    on_a: str
    on_the: str
    a_year: int
    mean_format: str


FREQUENCIES: dict[str, Frequency] = {
    "monthly": Frequency(
        noun="month",
        nouns="months",
        adjective="monthly",
        counted="months",
        on_a="in a month",
        on_the="in the month",
        a_year=12,
        mean_format="percent",
    ),
    "daily": Frequency(
        noun="day",
        nouns="days",
        adjective="daily",
        counted="trading days",
        on_a="on a day",
        on_the="on the day",
        a_year=252,
        mean_format="fine_percent",
    ),
}
