"""The faults that raw data can have, and what becomes of each: one line a fault.

Answers: "stop" writes nothing and says what to change; "set aside" moves the row to `set_aside` with its reason;
"repair" acts only as the study file says; "flag" keeps the row, counts it and shows it in the data report; "handled"
is no fault of a row: the note says what happens.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Literal, NamedTuple

Answer = Literal["stop", "set aside", "repair", "flag", "handled"]


@dataclass(frozen=True)
class Fault:
    """`label` names the fault as a noun, with {period} for a month or a day (see `label_of`); `answer` as above; `note`
    says what a reader should make of it."""

    label: str
    answer: Answer
    note: str = ""


FAULTS: dict[int, Fault] = {
    1: Fault("a file that is missing, empty, cut off, or not what its ending says", "stop"),
    2: Fault("text in another encoding than the study file says", "stop"),
    3: Fault("a column that is not there", "stop"),
    4: Fault("two columns of one name", "stop"),
    5: Fault("too many or too few fields, or a stray quote", "set aside"),
    6: Fault("another separator or decimal mark than the study file says", "stop"),
    7: Fault("blanks or quotes around a value, or thousands separators", "repair"),
    8: Fault("a date that does not parse, or outside 1800–2200", "set aside"),
    9: Fault("dates whose order of day and month is ambiguous", "stop"),
    10: Fault("a date written as a whole number", "handled", "it is read as a date"),
    11: Fault(
        "a date that is not the last day of its month",
        "handled",
        "in a monthly study the month is what counts",
    ),
    12: Fault("a missing return", "flag", "it stays missing; it is never taken as zero"),
    13: Fault("text in a number column", "set aside"),
    14: Fault("an infinite value, or one spelt nan", "set aside"),
    15: Fault("a return below −100 %", "set aside"),
    16: Fault("a return of exactly −100 %", "flag"),
    17: Fault("a file in per cent declared decimal, or the reverse", "stop"),
    18: Fault(
        "a return in a stretch of time, or of a security, that seems to be in another unit",
        "flag",
        "too many of them stop the study",
    ),
    19: Fault("another, different row of the same security and {period}", "set aside"),
    20: Fault("a {period} missing inside a security's history", "flag"),
    21: Fault("a run of three or more zero returns", "flag", "the price may be stale"),
    22: Fault(
        "a jump over 300 % that reverses in the next {period}", "flag", "Ince and Porter 2006"
    ),
    23: Fault("a blank identifier", "set aside"),
    24: Fault("a size that is zero, negative or missing", "flag", "the size is taken as missing"),
    25: Fault(
        "a security that leaves without a final return",
        "flag",
        "for a failure, a final return of −30 % is the usual assumption (Shumway 1997)",
    ),
    26: Fault("no security ever leaves", "flag", "a file of survivors only flatters every return"),
    27: Fault("periods missing inside the market or riskless series", "stop"),
    28: Fault("no market or riskless return in that {period}", "set aside"),
    29: Fault("a riskless rate that is implausible as it is said to be quoted", "stop"),
    30: Fault(
        "a market declared total that looks like one in excess of the riskless rate, or the reverse",
        "flag",
    ),
    31: Fault("periods that stand twice in the market or riskless series", "stop"),
    32: Fault(
        "a period with under a tenth of the securities of those around",
        "flag",
        "it may have been delivered in part; at the end of the data it stops the study",
    ),
    33: Fault("a study file that contradicts itself, or the data", "stop"),
    34: Fault("a subperiod too short for a test", "handled", "that test is not defined there"),
    35: Fault("a full disk, or a results folder that cannot be written", "stop"),
    36: Fault("a run that is killed", "handled", "the same command finishes it"),
    37: Fault("a second run of the same study at the same time", "stop"),
    38: Fault("a name that looks like markup or a formula", "handled", "it is shown as text"),
    39: Fault("prices delivered as returns", "stop"),
    40: Fault("daily data declared monthly, or the reverse", "stop"),
    41: Fault(
        "an identifier that returns after more than 36 months",
        "flag",
        "it may have been given to another security",
    ),
    42: Fault(
        "a final return although the security goes on",
        "flag",
        "it is not used; a final return belongs in the last row before a security leaves",
    ),
}
N_EXAMPLES = 3


def label_of(number: int, noun: str = "month") -> str:
    """What a fault is called where a period of the raw returns is a month, or a day."""
    return FAULTS[number].label.format(period=noun)


class Flag(NamedTuple):
    """What a judge of the whole file found, as `Tally.add` takes it: `n` is 0 where nothing was found."""

    number: int
    n: int
    examples: list[str]
    kinds: dict[str, int]


@dataclass
class Tally:
    """Counts of faults met so far, with the places of the first few, and counts by kind.

    `noun` is what a period of the raw returns is called.
    """

    noun: str = "month"
    counts: dict[int, int] = field(default_factory=dict)
    examples: dict[int, list[str]] = field(default_factory=dict)
    kinds: dict[int, dict[str, int]] = field(default_factory=dict)

    def add(
        self,
        number: int,
        n: int,
        examples: Sequence[str] = (),
        kinds: dict[str, int] | None = None,
    ) -> None:
        """Count `n` more of a fault, of them so many of each kind; keeps the first few examples."""
        if n > 0:
            self.counts[number] = self.counts.get(number, 0) + int(n)
            self.examples.setdefault(number, []).extend(examples)
            by_kind = self.kinds.setdefault(number, {})
            for kind, of_kind in (kinds or {}).items():
                if of_kind > 0:
                    by_kind[kind] = by_kind.get(kind, 0) + int(of_kind)

    def report(self, chosen: Mapping[int, str] | None = None) -> list[dict[str, object]]:
        """One entry a fault met, by number; `chosen` has the answers that differ from the usual ones."""
        return [
            {
                "number": number,
                "label": label_of(number, self.noun),
                "answer": (chosen or {}).get(number, FAULTS[number].answer),
                "note": FAULTS[number].note,
                "n": self.counts[number],
                "kinds": self.kinds[number],
                "examples": self.examples[number][:N_EXAMPLES],
            }
            for number in sorted(self.counts)
        ]
