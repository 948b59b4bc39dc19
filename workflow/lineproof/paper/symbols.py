"""Mathematical symbols, each named once, and phrases of text, symbols and numbers.

A phrase keeps text from the data apart from our own wording, so that every renderer escapes it.
"""

from __future__ import annotations

from dataclasses import dataclass
from string import Formatter
from typing import Any


@dataclass(frozen=True)
class Symbol:
    """One symbol as TeX, as HTML and as plain ASCII text."""

    tex: str
    html: str
    plain: str


def _variable(tex: str, html: str, plain: str) -> Symbol:
    return Symbol(f"${tex}$", f"<i>{html}</i>", plain)


SYMBOLS: dict[str, Symbol] = {
    "alpha": _variable(r"\alpha", "α", "alpha"),
    "beta": _variable(r"\beta", "β", "beta"),
    "gamma0": Symbol(r"$\gamma_0$", "<i>γ</i><sub>0</sub>", "gamma0"),
    "gamma1": Symbol(r"$\gamma_1$", "<i>γ</i><sub>1</sub>", "gamma1"),
    "fbar": Symbol(r"$\bar{f}$", '<i class="bar">f</i>', "fbar"),
    "excess_slope": Symbol(
        r"$\gamma_1-\bar{f}$",
        '<span class="nb"><i>γ</i><sub>1</sub> − <i class="bar">f</i></span>',
        "gamma1 - fbar",
    ),
    "r2": Symbol(r"$R^2$", "<i>R</i><sup>2</sup>", "R2"),
    "rho": Symbol(r"$\rho_e$", "<i>ρ<sub>e</sub></i>", "rho_e"),
    "chi2": Symbol(r"$\chi^2$", "<i>χ</i><sup>2</sup>", "chi2"),
    "F": _variable("F", "F", "F"),
    "N": _variable("N", "N", "N"),
    "T": _variable("T", "T", "T"),
    "t": _variable("t", "t", "t"),
    "p": _variable("p", "p", "p"),
    "auto_lag": Symbol(
        r"$\lfloor 4\,(T/100)^{2/9} \rfloor$",
        '<span class="nb">⌊4(<i>T</i>/100)<sup>2/9</sup>⌋</span>',
        "floor(4 (T/100)^(2/9))",
    ),
    "dash": Symbol("--", "–", "-"),
    "equals": Symbol(" $=$ ", "&nbsp;=&nbsp;", " = "),
    "indent": Symbol(r"\quad{}", "&emsp;", "  "),
    "percent": Symbol(r"\,\%", "&#8239;%", "%"),
}


class Phrase(tuple):
    """Parts in order: text (to be escaped), `Symbol`s, and cells of `specification`."""

    __slots__ = ()

    @property
    def length(self) -> int:
        """Characters of its text; a symbol counts as one."""
        return sum(len(part) if isinstance(part, str) else 1 for part in self)

    def __add__(self, other: tuple) -> Phrase:
        return Phrase(tuple.__add__(self, other))


def said(template: str, **parts: Any) -> Phrase:
    """A phrase from our own wording: `{name}` is one of `parts` (text, cell, phrase) or a symbol.

    Raises KeyError for a name that is neither.
    """
    found: list[Any] = []
    for text, name, _, _ in Formatter().parse(template):
        if text:
            found.append(text)
        if name is None:
            continue
        part = parts[name] if name in parts else SYMBOLS[name]
        if isinstance(part, Phrase):
            found.extend(part)
        else:
            found.append(part)
    return Phrase(found)


def joined(phrases: list[Phrase], between: str) -> Phrase:
    """Phrases one after another with text between them."""
    parts: list[Any] = []
    for place, phrase in enumerate(phrases):
        parts += [between, *phrase] if place else [*phrase]
    return Phrase(parts)
