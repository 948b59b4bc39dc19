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
    """

    noun: str
    nouns: str
    adjective: str
    counted: str
    on_a: str
    on_the: str
    a_year: int


FREQUENCIES: dict[str, Frequency] = {
    "monthly": Frequency("month", "months", "monthly", "months", "in a month", "in the month", 12),
    "daily": Frequency("day", "days", "daily", "trading days", "on a day", "on the day", 252),
}
