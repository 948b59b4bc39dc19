"""Numbers as printed text: rounded once, half up, from their shortest exact decimal form."""

from __future__ import annotations

import decimal
import math
from dataclasses import dataclass
from decimal import ROUND_HALF_UP, Decimal

DASH = "-"  # what an undefined number prints as; renderers set it as an en dash


@dataclass(frozen=True)
class Format:
    """How a number is printed.

    Attributes:
        places: digits after the decimal point.
        shift: power of ten it is multiplied with first: 2 prints a decimal as per cent.
        grouped: whether thousands are set apart by commas.
        bounded: whether a positive number that rounds to zero prints as below the smallest one
            that does not.
    """

    places: int
    shift: int = 0
    grouped: bool = False
    bounded: bool = False


FORMATS: dict[str, Format] = {
    "percent": Format(places=2, shift=2),
    "fine_percent": Format(places=4, shift=2),
    "share": Format(places=1, shift=2),
    "number": Format(places=2),
    "p": Format(places=3, bounded=True),
    "average": Format(places=1, grouped=True),
    "count": Format(places=0, grouped=True),
}


def printed(value: float | None, name: str) -> str:
    """A number in the format of that name, with an ASCII minus sign.

    None, where there is no number, gives ""; NaN or infinity, undefined, gives `DASH`; and
    nothing is ever printed as minus zero. Raises KeyError for an unknown format.
    """
    style = FORMATS[name]
    if value is None:
        return ""
    if not math.isfinite(value):
        return DASH
    unit = Decimal(1).scaleb(-style.places)
    exact = Decimal(repr(float(value))).scaleb(style.shift)
    rounded = _quantized(exact, unit)
    if style.bounded and exact > 0 and rounded == 0:
        return f"<{unit}"
    rounded = abs(rounded) if rounded == 0 else rounded
    return f"{rounded:,f}" if style.grouped else f"{rounded:f}"


def _quantized(exact: Decimal, unit: Decimal) -> Decimal:
    """`quantize` refuses results of over 28 digits; a number that long is printed in full."""
    if exact.adjusted() - unit.adjusted() >= 27:
        return exact.to_integral_value()
    return exact.quantize(unit, rounding=ROUND_HALF_UP)


def share(value: float) -> str:
    """A share such as a level in per cent, without trailing zeros: 0.05 gives "5"."""
    return f"{Decimal(repr(float(value))).scaleb(2).normalize():f}".replace("-", "−")


def significant(value: float | None, digits: int, shift: int = 0) -> str:
    """A number times ten to the power `shift`, rounded half up to so many significant digits and written out.

    As `printed`: "" for None, `DASH` for what is not finite, an ASCII minus sign; thousands are set apart by commas.
    """
    if value is None:
        return ""
    if not math.isfinite(value):
        return DASH
    rounded = _kept(Decimal(repr(float(value))).scaleb(shift), digits)
    places = max(digits - 1 - rounded.adjusted(), 0) if rounded else 0
    return f"{rounded:,.{places}f}"


def as_given(value: float, digits: int = 10) -> str:
    """A number as it was delivered, without trailing zeros; one of more than so many digits is rounded to them."""
    return f"{_kept(Decimal(repr(float(value))), digits).normalize():,f}"


def _kept(exact: Decimal, digits: int) -> Decimal:
    rounded = decimal.Context(prec=digits, rounding=ROUND_HALF_UP).plus(exact)
    return rounded if rounded else abs(rounded)  # nothing is ever printed as minus zero


def part(n: int, whole: int) -> str:
    """A count as per cent of a whole with one digit after the point; only none prints as 0 and only all as 100."""
    if not whole:
        return DASH
    if n in (0, whole):
        return "100" if n else "0"
    exact = Decimal(100) * n / whole
    rounded = exact.quantize(Decimal("0.1"), rounding=ROUND_HALF_UP)
    return "<0.1" if not rounded else ">99.9" if rounded == 100 else f"{rounded}"
