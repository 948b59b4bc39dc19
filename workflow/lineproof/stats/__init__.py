"""Statistics as pure functions of float64 arrays; returns are decimal per period."""

from __future__ import annotations


class Undefined(ValueError):
    """A statistic does not exist for the data at hand; the message says why in plain English."""
