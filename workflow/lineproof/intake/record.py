"""The shape of `data/intake.json`: what the intake found, as the data report, the paper and `make check` read it.

Counts are integers, returns decimal a period, periods and dates ISO text ("2001-05", "2001-05-31"). Every key of
`Intake` marked NotRequired may be absent, in a file of an earlier version or because the study has nothing of the kind:
a reader then leaves that part out.
"""

from __future__ import annotations

from typing import Any, Literal, NotRequired, TypedDict

Answer = Literal["stop", "set aside", "repair", "flag"]


class FileRecord(TypedDict):
    """One raw file; rows_read = rows_kept + rows_set_aside + exact_duplicates + rows_unused (see `check_conserved`).

    Rows are rows as delivered, before daily rows become months.
    """

    place: str  # where the study file names it: data.returns, data.market, data.riskless
    label: str  # its name for readers
    rows_read: int
    rows_kept: int
    rows_set_aside: int
    exact_duplicates: int
    rows_unused: NotRequired[
        int
    ]  # of a series: without a value, or in periods that the other series lacks


class SeriesRecord(TypedDict):
    """The market in excess of the riskless rate, or the riskless return, in the periods of the study.

    `source` says in words where it comes from; the standard deviation divides by n − 1.
    """

    place: str  # as in `FileRecord`
    source: str
    period: Literal["month", "day"]
    first: str
    last: str
    n_periods: int
    mean: float
    sd: float | None
    min: float
    max: float


class FaultRecord(TypedDict):
    """One fault met; see `faults.FAULTS`."""

    number: int
    label: str
    answer: Answer
    note: str
    n: int
    kinds: dict[str, int]
    examples: list[str]


class ScreenRecord(TypedDict):
    """What one screen took from the rows that passed those above it."""

    label: str
    n_rows: int
    n_securities: int


class AsideExample(TypedDict):
    """One row set aside; `raw` is its text as it stands in the file, never cleaned."""

    file: str
    line: int
    reason: str
    raw: str


class AsideRecord(TypedDict):
    """The rows set aside for one fault, by the first fault of each row; the first few as examples."""

    number: int
    label: str
    n: int
    examples: list[AsideExample]


class ReasonRecord(TypedDict):
    """Leavers of one reason: n = n_with + n_without. `stand_in` stood for a missing final return, or nothing did."""

    n: int
    n_with: int
    n_without: int
    stand_in: float | None


class DelistingRecord(TypedDict):
    """Securities that leave before the last period: n_with had a final return in the file, n_without had none.

    `mean_with` and `mean_without` are the equally weighted mean return of all securities a period, averaged over the
    periods, with final returns (given or standing in) and without any; None where there is no return.
    """

    n_with: int
    n_without: int
    by_reason: dict[str, ReasonRecord]  # by the text of the reason, "" where none is given
    mean_with: float | None
    mean_without: float | None


class AliveEvidence(TypedDict):
    """`alive[i]` rows have a return in the period named `periods[i]`; entries and exits by calendar year."""

    periods: list[str]
    alive: list[int]
    years: list[int]
    entries: list[int]
    exits: list[int]


class CoverageEvidence(TypedDict):
    """Rows by calendar year, and how many of them have a value, by column."""

    years: list[int]
    n_rows: list[int]
    columns: dict[str, list[int]]


class DecadeEvidence(TypedDict):
    """Total returns of one decade. `n` have a return, `n_missing` none, `n_zero` of the n are exactly zero.

    `quantiles` are keyed by share ("0.01"): the smallest return that at least this share do not exceed, cut off after
    four significant digits, so that rounding to three prints the right ones.
    """

    decade: int
    n: int
    n_missing: int
    n_zero: int
    mean: float | None
    sd: float | None
    min: float | None
    max: float | None
    quantiles: dict[str, float | None]


class NeighbourRow(TypedDict):
    """The row before or after; `price` only where the study has prices."""

    date: str
    return_: float | None
    price: NotRequired[float | None]


class LargeReturn(TypedDict):
    """One of the largest returns, as `NeighbourRow`, with the rows before and after of the same security."""

    security: str
    date: str
    return_: float
    price: NotRequired[float | None]
    before: NeighbourRow | None
    after: NeighbourRow | None


class LargestEvidence(TypedDict):
    """The twenty largest gains and losses, each from the largest down; ties by security and date."""

    positive: list[LargeReturn]
    negative: list[LargeReturn]


class ScaleRecord(TypedDict):
    """One check of units and scale: what was looked at, what was found, and the verdict, each in words.

    `series` may show the evidence: a label and pairs of a period or quantile and its value, decimal.
    """

    what: str
    found: str
    verdict: str
    series: NotRequired[ScaleSeries]


class ScaleSeries(TypedDict):
    """Numbers behind a check of scale."""

    label: str
    points: list[tuple[str, float | None]]


class Evidence(TypedDict, total=False):
    """Results of `intake.observers` by name, and the checks of scale."""

    alive: AliveEvidence
    coverage: CoverageEvidence
    distribution: list[DecadeEvidence]
    largest: LargestEvidence
    scale: list[ScaleRecord]


class Intake(TypedDict):
    """The whole of `data/intake.json`; the counts at the top level are those of the returns."""

    file: str
    first: str
    last: str
    rows_read: int
    rows_kept: int
    rows_set_aside: int
    exact_duplicates: int
    rows_screened: int
    n_securities: int
    n_missing_returns: int
    faults: list[FaultRecord]
    screens: list[ScreenRecord]
    span: list[str]  # sentences, where returns reach beyond the market or the riskless rate
    period: NotRequired[Literal["month", "day"]]  # month where absent
    files: NotRequired[list[FileRecord]]
    series: NotRequired[list[SeriesRecord]]
    set_aside: NotRequired[list[AsideRecord]]
    delisting: NotRequired[DelistingRecord]
    evidence: NotRequired[Evidence]


SURVIVORS_ONLY = 26  # the fault that no security ever leaves


def returns_in_all(intake: Intake) -> FileRecord:
    """The rows of all files of returns together. Raises ValueError when they do not add up."""
    together: Any = {"place": "data.returns", "label": intake["file"]}
    for key in ("rows_read", "rows_kept", "rows_set_aside", "exact_duplicates"):
        together[key] = intake[key]
    check_conserved(together)
    return together


def files_of(intake: Intake) -> list[FileRecord]:
    """The raw files of an intake; one of an earlier version knows the returns only.

    Raises ValueError when a file's rows do not add up.
    """
    files = intake.get("files") or [returns_in_all(intake)]
    for file in files:
        check_conserved(file)
    return files


def check_conserved(file: FileRecord) -> None:
    """Raises ValueError when rows read are not rows kept, set aside, dropped and unused."""
    parts = [file["rows_kept"], file["rows_set_aside"], file["exact_duplicates"]]
    parts.append(file.get("rows_unused", 0))
    if file["rows_read"] != sum(parts):
        said = " + ".join(f"{part:,}" for part in parts)
        raise ValueError(f"rows of {file['label']} do not add up: {file['rows_read']:,} ≠ {said}")


def survivors_only(intake: Intake) -> bool:
    """Whether no security ever leaves."""
    return any(fault["number"] == SURVIVORS_ONLY for fault in intake["faults"])


ANSWERS: dict[Answer, str] = {  # what a reader is told became of the rows
    "flag": "kept, flagged",
    "repair": "read without them",
    "set aside": "set aside",
    "stop": "stopped",
}
