"""The faults that raw data can have, and what becomes of each: one line a fault.

Answers: "stop" writes nothing and says what to change; "set aside" moves the row to `set_aside` with its reason;
"repair" acts only as the study file says; "flag" keeps the row, counts it and shows it in the data report.
"""

from __future__ import annotations

from dataclasses import dataclass, field


@dataclass(frozen=True)
class Fault:
    """`label` completes the sentence "rows with …"; `answer` as above."""

    label: str
    answer: str


FAULTS: dict[int, Fault] = {
    5: Fault("too many or too few fields, or an unbalanced quote", "set aside"),
    7: Fault("blanks around a value, or thousands separators", "repair"),
    8: Fault("a date that does not parse, or outside 1800–2200", "set aside"),
    12: Fault("a code for a missing value", "flag"),
    13: Fault("text in a number column", "set aside"),
    14: Fault("a value that is infinite or not a number", "set aside"),
    15: Fault("a return below −100 %", "set aside"),
    16: Fault("a return of exactly −100 %", "flag"),
    19: Fault("another, different row of the same security and month", "set aside"),
    20: Fault("months missing inside a security's history", "flag"),
    21: Fault("runs of three or more zero returns", "flag"),
    22: Fault("a jump over 300 % that reverses in the next month", "flag"),
    23: Fault("a blank identifier", "set aside"),
    24: Fault("a size that is zero, negative or missing", "flag"),
    25: Fault("a security that leaves without a final return", "flag"),
    26: Fault("no security ever leaves the file", "flag"),
    28: Fault("no market or riskless return in that month", "set aside"),
}


@dataclass
class Tally:
    """Counts of faults met so far, with the places of the first few."""

    counts: dict[int, int] = field(default_factory=dict)
    examples: dict[int, list[str]] = field(default_factory=dict)

    def add(self, number: int, n: int, examples: list[str] | None = None) -> None:
        """Count `n` more of a fault; keeps the first three examples."""
        if n > 0:
            self.counts[number] = self.counts.get(number, 0) + int(n)
            self.examples.setdefault(number, []).extend(examples or [])

    def report(self) -> list[dict[str, object]]:
        """One entry a fault met, by number."""
        return [
            {
                "number": number,
                "label": FAULTS[number].label,
                "answer": FAULTS[number].answer,
                "n": self.counts[number],
                "examples": self.examples[number][:3],
            }
            for number in sorted(self.counts)
        ]
