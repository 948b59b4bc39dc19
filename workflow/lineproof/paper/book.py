"""Every number the paper prints, looked up by its address."""

from __future__ import annotations

from dataclasses import dataclass, replace
from difflib import get_close_matches

import pandas as pd

from lineproof.addresses import KEY_COLUMNS, NUMBER_COLUMNS, RESERVED_ASSETS, SEPARATOR, is_spread
from lineproof.analyses import LINE_ERRORS


@dataclass(frozen=True)
class Number:
    """One row of the estimates: decimal per period, NaN where a column does not apply.

    `status` is "ok" or "undefined", and then `reason` says why.
    """

    address: str
    estimate: float
    se: float
    statistic: float
    df1: float
    df2: float
    p: float
    p_one_sided: float
    critical: float
    critical_one_sided: float
    n_periods: int
    n_assets: int
    status: str
    reason: str

    @property
    def defined(self) -> bool:
        """Whether the number exists."""
        return self.status == "ok"

    def rejects(self, level: float) -> bool:
        """Whether the hypothesis is rejected, two-sided or in the upper tail, at `level`."""
        return self.p < level


class Book:
    """The estimates as a dictionary of numbers by address."""

    def __init__(self, estimates: pd.DataFrame) -> None:
        """Index a frame of estimates; raises ValueError if two rows share an address."""
        keys = list(zip(*(estimates[key].tolist() for key in KEY_COLUMNS), strict=True))
        self._places = {SEPARATOR.join(parts): place for place, parts in enumerate(keys)}
        if len(self._places) != len(keys):
            raise ValueError("two rows of the estimates share one address")
        names = [name for name in Number.__dataclass_fields__ if name != "address"]
        self._columns = {name: estimates[name].tolist() for name in names}
        self._assets: dict[tuple[str, str], dict[str, None]] = {}
        self._spreads: dict[tuple[str, str], dict[str, None]] = {}
        self._ran: set[tuple[str, str, str]] = set()
        for sort, subperiod, analysis, _, asset, *_ in keys:
            self._ran.add((sort, subperiod, analysis))
            if "-" not in (sort, subperiod) and asset not in RESERVED_ASSETS:
                kept = self._spreads if is_spread(asset) else self._assets
                kept.setdefault((sort, subperiod), {})[asset] = None

    def at(self, *parts: str) -> Number:
        """The number at an address, given whole or as its seven parts.

        Raises KeyError, naming the nearest address there is.
        """
        address = SEPARATOR.join(parts)
        if address not in self._places:
            raise KeyError(f"no number at {address}; the nearest is {self._nearest(address)}")
        place = self._places[address]
        number = Number(address, **{name: each[place] for name, each in self._columns.items()})
        return _unless_too_short(number)

    def has(self, *parts: str) -> bool:
        """Whether there is a number, defined or not, at an address."""
        return SEPARATOR.join(parts) in self._places

    def ran(self, sort: str, subperiod: str, analysis: str) -> bool:
        """Whether an analysis reports anything for these test assets and months."""
        return (sort, subperiod, analysis) in self._ran

    def assets(self, sort: str, subperiod: str) -> list[str]:
        """Names of the test assets of a sort in a subperiod, without spreads, in the order of the estimates."""
        return list(self._assets.get((sort, subperiod), ()))

    def spreads(self, sort: str, subperiod: str) -> list[str]:
        """Names of the differences of groups of a sort in a subperiod, in the order of the estimates."""
        return list(self._spreads.get((sort, subperiod), ()))

    def months(self) -> list[str]:
        """Months ("1950-01") for which the sample's coverage is reported, in order."""
        return self._months("-", "sample")

    def formations(self, sort: str) -> list[str]:
        """Months ("1950-12") in which a sort forms groups, in order."""
        return self._months(sort, "formations")

    def _months(self, sort: str, analysis: str) -> list[str]:
        start = SEPARATOR.join([sort, "-", analysis, "month", ""])
        found = (address for address in self._places if address.startswith(start))
        return sorted({address.split(SEPARATOR)[4] for address in found})

    def _nearest(self, address: str) -> str:
        """Comparing parts first keeps the comparison of whole texts to a few candidates."""
        wanted = address.split(SEPARATOR)
        shared = {
            known: sum(
                ours == theirs for ours, theirs in zip(wanted, known.split(SEPARATOR), strict=False)
            )
            for known in self._places
        }
        most = max(shared.values(), default=0)
        close = [known for known, count in shared.items() if count == most]
        return (get_close_matches(address, close, n=1, cutoff=0.0) or ["none"])[0]


def _unless_too_short(number: Number) -> Number:
    """A coefficient of the market line is printed only where its periods could support the joint tests.

    With no more periods than assets and market the estimates have standard errors, which the table of estimates keeps;
    but those lean on variances of a handful of periods, and a reader would take their t statistics at face value.
    """
    _, _, analysis, _, _, _, kind = number.address.split(SEPARATOR)
    needed = number.n_assets + 2
    enough = number.n_periods >= needed or not number.defined
    if analysis != "market_line" or kind not in LINE_ERRORS or enough:
        return number
    reason = f"needs at least {needed} periods for {number.n_assets} assets, has {number.n_periods}"
    return replace(
        number, **dict.fromkeys(NUMBER_COLUMNS, float("nan")), status="undefined", reason=reason
    )
