"""Statistics as pure functions of float64 arrays; returns are decimal per period."""

from __future__ import annotations

PERIOD = "{period}"  # stands for the name of a period in the message of an `Undefined`


class Undefined(ValueError):
    """A statistic does not exist for the data at hand; the message says why in plain English."""

    def reason(self, noun: str) -> str:
        """The message for readers who call a period `noun`, such as "month"."""
        return str(self.args[0]).replace(PERIOD, noun)

    def __str__(self) -> str:
        return self.reason("period")
