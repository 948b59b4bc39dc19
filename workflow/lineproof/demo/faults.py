"""Plants faults in the lines of the demo's returns file and records where each one lies.

A fault is a function from the clean lines of a stretch of one security's history to the lines
that stand there instead; `marks` pairs each faulty line's offset in the new lines with the
offset of the clean line whose security and date it concerns.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass
from itertools import cycle, islice

import numpy as np
import pandas as pd

from lineproof.demo.files import RETURN_COLUMNS

STRETCH = 12  # lines set apart for one fault
RATE = 0.0002  # planted faults of one number, as a share of all lines
RARE = 0.00002  # for jumps: one of +400 % outweighs a thousand monthly premiums
LEAVERS_RATE = 0.1

FIELD = {name: position for position, name in enumerate(RETURN_COLUMNS)}


@dataclass(frozen=True)
class Spoilt:
    """Lines that replace a stretch, and (new offset, clean offset) of each faulty one."""

    lines: list[str]
    marks: tuple[tuple[int, int], ...] = ((0, 0),)


Spoiler = Callable[[list[str]], Spoilt]


@dataclass(frozen=True)
class Fault:
    """One way to spoil a stretch: its number and name, and how often it is planted."""

    number: int
    kind: str
    spoil: Spoiler
    rate: float = RATE


@dataclass(frozen=True)
class Plant:
    """A fault and the stretch of clean lines it takes."""

    start: int
    length: int
    fault: Fault


def with_field(line: str, column: str, text: str) -> str:
    """The line with one field replaced."""
    fields = line.split(",")
    fields[FIELD[column]] = text
    return ",".join(fields)


def first_line(change: Callable[[str], str]) -> Spoiler:
    """Spoil only the first line of the stretch."""
    return lambda lines: Spoilt([change(lines[0]), *lines[1:]])


def replace(column: str, text: str) -> Spoiler:
    """Put a text in one field of the first line."""
    return first_line(lambda line: with_field(line, column, text))


def impossible_day(line: str) -> str:
    """Turn the date into the thirtieth of February of its year."""
    return with_field(line, "date", line.split(",")[FIELD["date"]][:4] + "-02-30")


def spaced_identifier(line: str) -> str:
    """Put blanks around the identifier."""
    return with_field(line, "security", f" {line.split(',')[FIELD['security']]} ")


def repeat(lines: list[str]) -> Spoilt:
    """Deliver the first line twice; the second is the fault."""
    return Spoilt([lines[0], *lines], ((1, 0),))


def contradict(lines: list[str]) -> Spoilt:
    """Deliver the first line a second time with another return; neither can be trusted."""
    other = f"{float(lines[0].split(',')[FIELD['ret']]) + 0.05:.6f}"
    return Spoilt([lines[0], with_field(lines[0], "ret", other), *lines[1:]], ((0, 0), (1, 0)))


def hole(n_months: int) -> Spoiler:
    """Leave out months after the first line; the line after the hole is marked."""
    return lambda lines: Spoilt([lines[0], *lines[1 + n_months :]], ((1, 1 + n_months),))


def stale(n_months: int) -> Spoiler:
    """Repeat the first line's price with zero returns; the first of the run is marked."""

    def spoil(lines: list[str]) -> Spoilt:
        price = lines[0].split(",")[FIELD["price"]]
        run = [
            with_field(with_field(line, "price", price), "ret", "0.000000")
            for line in lines[1 : 1 + n_months]
        ]
        return Spoilt([lines[0], *run, *lines[1 + n_months :]], ((1, 1),))

    return spoil


def jump(lines: list[str]) -> Spoilt:
    """A price five times too high for one month: +400 %, then -80 %; the jump is marked."""
    price = lines[0].split(",")[FIELD["price"]]
    up = with_field(lines[1], "ret", "4.000000")
    up = with_field(up, "price", f"{5.0 * float(price):.3f}")
    down = with_field(with_field(lines[2], "ret", "-0.800000"), "price", price)
    return Spoilt([lines[0], up, down, *lines[3:]], ((1, 1),))


def total_loss(column: str) -> Spoiler:
    """Make a leaver's final return, or its last one, exactly -100 %."""

    def change(line: str) -> str:
        line = with_field(with_field(line, "final_ret", "0.000000"), "exit_code", "FAIL")
        return with_field(line, column, "-1.000000")

    return first_line(change)


INSIDE: tuple[Fault, ...] = (
    Fault(5, "too many fields", first_line(lambda line: line + ",revised")),
    Fault(5, "decimal comma", first_line(lambda line: line.replace(".", ",", 1))),
    Fault(5, "too few fields", first_line(lambda line: line.rsplit(",", 3)[0])),
    Fault(7, "trailing blanks", first_line(lambda line: line + "   ")),
    Fault(8, "impossible day", first_line(impossible_day)),
    Fault(8, "outside 1800-2200", replace("date", "9999-12-31")),
    Fault(12, "empty return", replace("ret", "")),
    Fault(12, "code NA", replace("ret", "NA")),
    Fault(12, "code -99", replace("ret", "-99")),
    Fault(13, "text as return", replace("ret", "halted")),
    Fault(13, "text as price", replace("price", "see note")),
    Fault(14, "infinite", replace("ret", "inf")),
    Fault(14, "not a number", replace("ret", "nan")),
    Fault(14, "overflow", replace("ret", "1e400")),
    Fault(15, "code -66", replace("ret", "-66")),
    Fault(15, "code -77", replace("ret", "-77")),
    Fault(15, "code -88", replace("ret", "-88")),
    Fault(15, "below -100 %", replace("ret", "-1.400000")),
    Fault(19, "identical", repeat),
    Fault(19, "different", contradict),
    Fault(20, "hole of 1", hole(1)),
    Fault(20, "hole of 4", hole(4)),
    Fault(21, "run of 4", stale(4)),
    Fault(21, "run of 8", stale(8)),
    Fault(22, "jump and reversal", jump, RARE),
    Fault(23, "blanks around", first_line(spaced_identifier)),
    Fault(23, "blank identifier", replace("security", "")),
    Fault(24, "zero", replace("size", "0")),
    Fault(24, "negative", replace("size", "-12.500")),
    Fault(24, "missing", replace("size", "")),
)
AT_EXIT: tuple[Fault, ...] = (
    Fault(16, "final return", total_loss("final_ret"), LEAVERS_RATE / 10),
    Fault(16, "return", total_loss("ret"), LEAVERS_RATE / 10),
    Fault(25, "no final return", replace("final_ret", ""), LEAVERS_RATE),
)


def often(faults: Iterable[Fault], n_lines: int) -> list[Fault]:
    """Each kind once, and kinds of a number in turn until its share of the lines is reached."""
    by_number: dict[int, list[Fault]] = {}
    for fault in faults:
        by_number.setdefault(fault.number, []).append(fault)
    chosen: list[Fault] = []
    for kinds in by_number.values():
        wanted = max(len(kinds), round(kinds[0].rate * n_lines))
        chosen += islice(cycle(kinds), wanted)
    return chosen


def choose_places(rng: np.random.Generator, rows: pd.DataFrame) -> list[Plant]:
    """Draw a place for every fault, none overlapping, in order of the file.

    Stretches lie strictly inside a security's history; faults at exit take a leaver's last row.
    """
    inner = ~(rows["is_first"] | rows["is_last"]).to_numpy()
    n_stretches = len(rows) // STRETCH
    whole = inner[: n_stretches * STRETCH].reshape(n_stretches, STRETCH).all(axis=1)
    stretches = np.flatnonzero(whole) * STRETCH
    leavers = np.flatnonzero(rows["exit_code"] != "")
    plants: list[Plant] = []
    for faults, places, length, n_lines in (
        (INSIDE, stretches, STRETCH, len(rows)),
        (AT_EXIT, leavers, 1, len(leavers)),
    ):
        chosen = often(faults, n_lines)
        if len(chosen) > len(places):
            raise ValueError(
                f"the market is too small: {len(chosen)} faults but {len(places)} places"
            )
        drawn = rng.permutation(places)[: len(chosen)].tolist()
        plants += [Plant(start, length, fault) for start, fault in zip(drawn, chosen, strict=True)]
    return sorted(plants, key=lambda plant: plant.start)


def plant_faults(
    lines: list[str], rows: pd.DataFrame, plants: list[Plant]
) -> tuple[list[str], pd.DataFrame]:
    """Splice the faults into the clean lines; return all lines and the record of faulty ones.

    The record has one row a faulty line: fault, kind, line (from 1, the header being line 1),
    security and date (as they should read), raw (the line as it stands). Only the last of two
    identical lines is recorded, both of two contradicting ones, the first line of a run of zero
    returns, the jump but not its reversal, and the first line after a hole.
    """
    out: list[str] = []
    records: list[tuple[int, str, int, str, str, str]] = []
    names, dates = rows["security"].tolist(), rows["date"].tolist()
    done = 0
    for plant in plants:
        out += lines[done : plant.start]
        done = plant.start + plant.length
        spoilt = plant.fault.spoil(lines[plant.start : done])
        for new, clean in spoilt.marks:
            at = plant.start + clean
            place = (len(out) + new + 2, names[at], dates[at], spoilt.lines[new])
            records.append((plant.fault.number, plant.fault.kind, *place))
        out += spoilt.lines
    out += lines[done:]
    columns = ["fault", "kind", "line", "security", "date", "raw"]
    return out, pd.DataFrame(records, columns=columns)
