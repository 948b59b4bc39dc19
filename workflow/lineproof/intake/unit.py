"""Is the file, a stretch of time, or a security in another unit than the study file declares?

How the limits were set. Monthly returns of single securities have a median size of 1 % in the quietest markets and 25 %
in the wildest; over a day they are about √21 times smaller, a month having some 21 trading days. Read in the wrong
unit they are 100 times too large or too small. The limits stand between: no sound market comes near them, quiet or
wild, and nearly every misread one lies far beyond. With few returns a quantile further out must pass the limit
too, so that chance does not. What no return can be is evidence as well: a loss of more than everything.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from lineproof.intake.faults import N_EXAMPLES, Flag
from lineproof.intake.headers import where_is
from lineproof.intake.scale import ScaleEvidence
from lineproof.intake.stopping import counted, stop
from lineproof.periods import Months

_FEWEST = 30  # returns on which to judge a file
_LARGE_MIDDLE = 0.5  # a month; half of the returns exceed it: not decimal
_SMALL_TAIL = 0.005  # a month; not one in twenty exceeds it: not in per cent
_UNSIGNED_MIDDLE, _FEWEST_UNSIGNED = 0.15, 100  # a month; if hardly any is negative
_RARELY_NEGATIVE = 0.01
_SHARE_IMPOSSIBLE, _FEWEST_IMPOSSIBLE, _ONE_CODE = 0.01, 20, 0.5  # losses of more than everything
_PRICES = (
    "hardly any is negative: does the column hold prices, or 1 + return? "
    "For prices, name their column under price: and set return: {from: price}"
)
_WIDE_PRICES = (
    "hardly any is negative: do the cells hold prices, or 1 + return? "
    "For prices, set return: {from: price} under columns"
)
_SCALE = {"monthly": 1.0, "daily": 21**-0.5}

OTHER_UNIT = 30.0  # ratio; a crisis multiplies sizes by ten at most, another unit by 100
_FEWEST_A_MONTH, _FEWEST_MONTHS = 10, 12
_N_AROUND = 12  # months on either side to which a stretch is compared


def judge_scale(
    evidence: ScaleEvidence, reading: dict[str, Any], frequency: str, stop_above: float
) -> Flag:
    """Both judges of the file: stretches first, since a mixture of units is no matter of `unit:`."""
    flag = judge_stretches(evidence, reading["label"], stop_above)
    judge_unit(evidence, reading, frequency)
    return flag


def scale_findings(
    evidence: ScaleEvidence, reading: dict[str, Any], stretches: Flag
) -> list[dict[str, str]]:
    """What the judges looked at, in words for the data report: what, found, verdict. `stretches` is their flag."""
    found = said_quantiles(evidence) if evidence.n else "no return but zeros"
    found = f"read as {reading['unit']}, {found}"
    verdict = "too few to judge" if evidence.n < _FEWEST else f"{reading['unit']}, as declared"
    if reading.get("return_from"):
        found = f"computed from the {reading['return_from']}"
        return [{"what": "unit of the returns", "found": found, "verdict": "no unit to judge"}]
    return [
        {"what": "unit of the returns", "found": found, "verdict": verdict},
        {
            "what": "the same unit in every month",
            "found": "; ".join(stretches.examples) or "no month stands out",
            "verdict": "to be looked at" if stretches.n else "one unit throughout",
        },
    ]


def judge_unit(
    evidence: ScaleEvidence, reading: dict[str, Any], frequency: str = "monthly"
) -> None:
    """Stop when typical returns are too large or too small for the declared unit (faults 17 and 39).

    `frequency` is that of the returns in the file, "monthly" or "daily". Raises KnownProblem with the quantiles.
    """
    if evidence.n < _FEWEST:
        return
    change = _unit_to_set(evidence, reading["unit"] == "decimal", _SCALE[frequency])
    if change == _PRICES and reading.get("layout") == "wide":
        change = _WIDE_PRICES
    if change:
        where = where_is(reading, "return")
        raise stop(
            where, f"read as {reading['unit']}, {said_quantiles(evidence, frequency)}", change
        )


def said_quantiles(evidence: ScaleEvidence, frequency: str = "monthly") -> str:
    """The quantiles by which a unit is judged, in words; with the impossible losses where only they tell."""
    middle, high = (evidence.quantile(level) for level in (0.5, 0.95))
    said = f"half of all returns exceed {100 * middle:.3g} % in size and one in twenty exceeds {100 * high:.3g} %"
    n_impossible, _ = evidence.below(1.0)
    if n_impossible <= _SHARE_IMPOSSIBLE * evidence.n or middle > _LARGE_MIDDLE * _SCALE[frequency]:
        return said
    return f"{said}; {n_impossible:,} of {evidence.n:,} lie below −100 %"


def _unit_to_set(evidence: ScaleEvidence, is_decimal: bool, scale: float) -> str:
    """What to change, empty if nothing."""
    n, middle = evidence.n, evidence.quantile(0.5)
    unsigned = evidence.share_negative < _RARELY_NEGATIVE
    # The ends of intervals that hold the true quantiles with a probability of about 99.7 %.
    surely_above = evidence.quantile(max(0.0, 0.5 - 1.5 / n**0.5)) > _LARGE_MIDDLE * scale
    high = evidence.quantile(min(1.0, 0.95 + 0.65 / n**0.5))
    if unsigned and (surely_above or (n >= _FEWEST_UNSIGNED and middle > _UNSIGNED_MIDDLE * scale)):
        return _PRICES
    n_impossible, in_one = evidence.below(1.0)
    impossible = (
        n_impossible > max(_SHARE_IMPOSSIBLE * n, _FEWEST_IMPOSSIBLE) and in_one < _ONE_CODE
    )
    if surely_above or impossible:
        return "set unit: percent" if is_decimal else "is this the column of the returns?"
    return "set unit: decimal" if high < _SMALL_TAIL * scale and not is_decimal else ""


def judge_stretches(evidence: ScaleEvidence, label: str, stop_above: float) -> Flag:
    """Months whose returns are some 100 times, or a hundredth, of the size of those around (fault 18).

    Raises KnownProblem when they are more than the share `stop_above` of the months that can be judged; those have at
    least ten returns that are not zero.
    """
    month, n, middle = evidence.by_month()
    judged = n >= _FEWEST_A_MONTH
    month, n, middle = month[judged], n[judged], middle[judged]
    nothing = Flag(18, 0, [], {})
    if len(month) < _FEWEST_MONTHS:
        return nothing
    usual = np.sort(middle)[(len(middle) - 1) // 2]
    off = is_other(middle / usual)
    found = [
        (a, b, ratio)
        for a, b in _runs(off)
        if is_other(ratio := _against_neighbours(a, b, middle, off))
    ]
    if not found:
        return nothing
    said = [_stretch(month[a], month[b - 1], ratio) for a, b, ratio in found]
    n_off = sum(b - a for a, b, _ in found)
    if n_off > stop_above * len(month):
        raise stop(
            label,
            f"{n_off:,} of {counted(len(month), 'month')} seem to be in another unit: {few(said)}",
            mend("the months"),
        )
    kinds = {"in months some 100 times larger": 0, "in months some 100 times smaller": 0}
    for a, b, ratio in found:
        kinds[list(kinds)[ratio < 1]] += int(n[a:b].sum())
    return Flag(18, sum(kinds.values()), said[:N_EXAMPLES], kinds)


def is_other(ratio: Any) -> Any:
    """Whether sizes in this ratio can hardly be in one unit."""
    return (ratio > OTHER_UNIT) | (ratio < 1 / OTHER_UNIT)


def _runs(mask: np.ndarray) -> list[tuple[int, int]]:
    """Where runs of True begin, and where they have ended."""
    turns = np.flatnonzero(np.diff(mask.astype(np.int8), prepend=0, append=0))
    return [(int(a), int(b)) for a, b in turns.reshape(-1, 2)]


def _against_neighbours(a: int, b: int, middle: np.ndarray, off: np.ndarray) -> float:
    """Typical size in months a to b relative to that of the nearest sound months around."""
    before = np.flatnonzero(~off[:a])[-_N_AROUND:]
    after = b + np.flatnonzero(~off[b:])[:_N_AROUND]
    return float(np.median(middle[a:b]) / np.median(middle[np.append(before, after)]))


def _stretch(first: int, last: int, ratio: float) -> str:
    name = Months().name
    when = f"{name(first)} to {name(last)}" if first != last else name(first)
    return f"{when}, {said_ratio(ratio)} of the months around"


def said_ratio(ratio: float) -> str:
    """As in `98 times the size` or `1/103 of the size`."""
    return f"{ratio:.0f} times the size" if ratio > 1 else f"1/{1 / ratio:.0f} of the size"


def few(said: list[str]) -> str:
    """The first few of some findings, and how many more there are."""
    more = f"; and {len(said) - N_EXAMPLES} more" if len(said) > N_EXAMPLES else ""
    return "; ".join(said[:N_EXAMPLES]) + more


def mend(what: str) -> str:
    """What to change when too much is in another unit."""
    return f"bring {what} to one unit, or raise other_unit_stop_above: under intake"
