"""A checked study as frozen dataclasses."""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from lineproof.designs import Design
from lineproof.source_checks import results_folder


@dataclass(frozen=True)
class Source:
    """Raw data and how to read them: files, or the result of a query.

    `label` is what the study file says, and `labels` is what messages call each of the `files`. `connection` names the
    environment variable with the way to the database; `names` is what a column of a wide file is, security or asset.
    `dates` is None where their format is to be found out. `return_from` names the column that returns are computed
    from, and then `columns` has no return.
    """

    files: tuple[str, ...]
    labels: tuple[str, ...]
    label: str
    query: str | None
    connection: str | None
    columns: dict[str, str]
    names: str
    layout: str
    leave_out: tuple[str, ...]
    decimal: str
    encoding: str | None
    sheet: str | None
    unit: str
    missing: tuple[str, ...]
    dates: str | None
    separator: str | None
    source: str
    access: str
    may_share: bool
    return_from: str | None = None

    def reading(self) -> dict[str, Any]:
        """What a reader needs to know, as plain values."""
        return {
            "label": self.label,
            "columns": self.columns,
            "unit": self.unit,
            "missing": list(self.missing),
            "dates": self.dates,
            "separator": self.separator,
            "return_from": self.return_from,
            "decimal": self.decimal,
            "encoding": self.encoding,
            "sheet": self.sheet,
            "layout": self.layout,
            "leave_out": list(self.leave_out),
            "names": self.names,
            "labels": list(self.labels),
            "query": self.query,
        }


@dataclass(frozen=True)
class IntakeSpec:
    """What becomes of questionable rows: the keyword arguments of the validation, all returns decimal.

    `stale_run` is the length of a run of zero returns from which rows are not eligible, None for no such screen;
    `final_return_by_reason` goes before `missing_final_return`, which is None to leave a last return as it is.
    """

    screens: tuple[dict[str, Any], ...]
    outliers: dict[str, str]
    return_after_hole: str
    stale_run: int | None
    missing_final_return: float | None
    final_return_by_reason: dict[str, float]
    allow_partial_last_month: bool
    other_unit_stop_above: float
    same_month_rows: str


@dataclass(frozen=True)
class BetaSpec:
    """Options of one rolling estimate of beta; `window` and `min_obs` in periods of `returns`, "monthly" or "daily".

    `factors` stand beside the market, and `own` are the keyword arguments of the estimator alone. `shrunk` is None, or
    says how the estimates of the entry `shrunk["from"]` are shrunk: then all else is that entry's.
    """

    name: str
    estimator: str
    returns: str
    window: int
    min_obs: int
    factors: tuple[str, ...] = ()
    own: dict[str, Any] = field(default_factory=dict)
    shrunk: dict[str, Any] | None = None


@dataclass(frozen=True)
class SortSpec:
    """Options of one set of test assets: a `source` where they are supplied; else how they are `ranked`, with the
    names of the `estimates` that takes, those it ranks on first."""

    name: str
    title: str
    design: str
    returns_are: str
    source: Source | None
    ranked: Design | None
    estimates: tuple[str, ...]


@dataclass(frozen=True)
class SubperiodSpec:
    """One entry under `subperiods`; `split` and `every` make several subperiods of it."""

    name: str
    first: str
    last: str
    split: int | None
    every: int | None
    title: str | None


@dataclass(frozen=True)
class PaperSpec:
    """What tables and figures show."""

    authors: tuple[str, ...]
    main: str
    main_subperiod: str
    alpha_errors: str
    line_weights: str
    line_errors: str
    tables: str | tuple[str, ...]
    figures: str | tuple[str, ...]


@dataclass(frozen=True)
class Study:
    """A complete study, checked."""

    path: Path
    name: str
    title: str
    market_name: str
    level: float
    frequency: str
    demo: dict[str, Any] | None
    returns: Source
    returns_are: str
    returns_frequency: str
    market: Source | None  # None where it is built from the returns
    market_is: str
    market_build: str | None
    market_frequency: str
    riskless: Source | None  # None where every return is in excess of it already
    riskless_quoted: str
    riskless_frequency: str
    factors: Source | None
    factors_frequency: str
    intake: IntakeSpec
    betas: dict[str, BetaSpec]
    sorts: dict[str, SortSpec]
    subperiods: dict[str, SubperiodSpec]
    analyses: str | tuple[str, ...]
    hac_lag: int | None
    paper: PaperSpec

    @property
    def folder(self) -> str:
        """Folder of the study's results, relative to the working folder."""
        return results_folder(self.name)

    @property
    def raw(self) -> str:
        """Folder into which the demo market's raw files are written."""
        return f"{self.folder}/raw"

    def is_made(self, source: Source) -> bool:
        """Whether the demo market makes this raw file."""
        made = Path(self.raw)
        return self.demo is not None and all(Path(file).parent == made for file in source.files)

    def sources(self) -> dict[str, Source]:
        """Every raw file by its place in the study file."""
        supplied = {f"portfolios.{n}": s.source for n, s in self.sorts.items() if s.source}
        core = {name: getattr(self, name) for name in ("returns", "market", "riskless", "factors")}
        named = {f"data.{name}": source for name, source in core.items() if source is not None}
        return {**named, **supplied}
