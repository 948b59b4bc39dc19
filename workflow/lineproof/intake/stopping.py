"""Stops: what is raised when a raw file as a whole cannot be used."""

from __future__ import annotations

from collections.abc import Iterable

from lineproof.problems import KnownProblem, Problem

N_SHOWN = 12  # of a long list in a message
UNUSABLE = "The raw data cannot be used; nothing was written."


def stop(where: str, found: str, change: str, headline: str = UNUSABLE) -> KnownProblem:
    """The error to raise for one fault: where it is, what was found, what to change."""
    return KnownProblem(headline, [Problem(where, found, change)])


def counted(n: int, noun: str) -> str:
    """A number with its noun, as in `1 month`, `1,200 months` or `3 securities`."""
    if n == 1:
        return f"{n:,} {noun}"
    ends_in_ies = noun.endswith("y") and noun[-2] not in "aeiou"
    return f"{n:,} {noun[:-1]}ies" if ends_in_ies else f"{n:,} {noun}s"


def few(names: Iterable[str]) -> str:
    """The first dozen names, and how many more there are."""
    listed = list(names)
    more = f" and {len(listed) - N_SHOWN:,} more" if len(listed) > N_SHOWN else ""
    return ", ".join(listed[:N_SHOWN]) + more
