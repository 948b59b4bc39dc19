"""The study file as frozen dataclasses; every problem in it is reported at once, before any job."""

from __future__ import annotations

import os
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from lineproof.cross_checks import CHECKS, results_folder
from lineproof.problems import KnownProblem, Problem
from lineproof.schema import as_problems, schema_findings, with_defaults
from lineproof.yamlfile import read_yaml


@dataclass(frozen=True)
class Source:
    """A raw file and how to read it; `label` is the path as written in the study file."""

    file: str
    label: str
    columns: dict[str, str]
    unit: str
    missing: tuple[str, ...]
    dates: str
    separator: str | None
    source: str
    access: str
    may_share: bool

    def reading(self) -> dict[str, Any]:
        """What a reader needs to know, as plain values."""
        return {
            "label": self.label,
            "columns": self.columns,
            "unit": self.unit,
            "missing": list(self.missing),
            "dates": self.dates,
            "separator": self.separator,
        }


@dataclass(frozen=True)
class BetaSpec:
    """Options of one rolling estimate of beta; `window` and `min_obs` in months."""

    name: str
    estimator: str
    window: int
    min_obs: int


@dataclass(frozen=True)
class SortSpec:
    """Options of one set of test assets."""

    name: str
    title: str
    design: str
    rank_on: str | None
    groups: int
    weights: str
    form_month: int
    hold: int
    returns_are: str
    source: Source | None


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
    demo: dict[str, Any] | None
    returns: Source
    market: Source
    market_is: str
    riskless: Source
    riskless_quoted: str
    screens: tuple[dict[str, Any], ...]
    missing_final_return: float | None
    same_month_rows: str
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
        return self.demo is not None and Path(source.file).parent == Path(self.raw)

    def sources(self) -> dict[str, Source]:
        """Every raw file by its place in the study file."""
        supplied = {f"portfolios.{n}": s.source for n, s in self.sorts.items() if s.source}
        core = {"returns": self.returns, "market": self.market, "riskless": self.riskless}
        return {**{f"data.{name}": source for name, source in core.items()}, **supplied}


def load_study(path: str | os.PathLike) -> Study:
    """Read and check a study file.

    Raises KnownProblem with every problem found: each with its line, what was found and what to change.
    """
    file = read_yaml(Path(path))
    headline = f"The study file {path} has problems; nothing was run."
    if not isinstance(file.content, dict):
        empty = Problem(file.where(()), "not a mapping of keys", "see config/kestrel.yaml")
        raise KnownProblem(headline, [empty])
    findings = schema_findings(file)
    unsound = {place[0] if place else "" for place, _, _ in findings}
    filled = with_defaults(file.content) if "" not in unsound else {}
    for sections, check in CHECKS:
        if sections.isdisjoint(unsound) and filled:
            findings += check(filled, file)
    if findings:
        raise KnownProblem(headline, as_problems(findings, file))
    return _build(filled, file.path)


def _build(content: dict[str, Any], path: Path) -> Study:
    data, intake, paper = content["data"], content["intake"], content["paper"]
    missing_final = intake["delisting"]["missing_final_return"]
    lag = content["pricing"]["hac_lag"]
    run = content["pricing"]["run"]
    return Study(
        path=path,
        **{key: content["study"][key] for key in ("name", "title", "market_name", "level")},
        demo=content.get("demo"),
        returns=_source(data["returns"], path),
        market=_source(data["market"], path),
        market_is=data["market"]["is"],
        riskless=_source(data["riskless"], path),
        riskless_quoted=data["riskless"]["quoted"],
        screens=tuple(intake["screens"]),
        missing_final_return=None if missing_final == "leave" else float(missing_final),
        same_month_rows=intake["same_month_rows"],
        betas={
            name: BetaSpec(name, o["estimator"], o["window"], o["min"])
            for name, o in content["betas"].items()
        },
        sorts={name: _sort(name, options, path) for name, options in content["portfolios"].items()},
        subperiods={
            name: SubperiodSpec(
                name, o["from"], o["to"], o.get("split"), o.get("every"), o.get("title")
            )
            for name, o in content["subperiods"].items()
        },
        analyses=run if run == "all" else tuple(run),
        hac_lag=None if lag == "auto" else lag,
        paper=PaperSpec(
            authors=tuple(paper["authors"]),
            main=paper.get("main") or next(iter(content["portfolios"])),
            main_subperiod=paper.get("main_subperiod") or next(iter(content["subperiods"])),
            **{key: paper[key] for key in ("alpha_errors", "line_weights", "line_errors")},
            **{key: _choice(paper[key]) for key in ("tables", "figures")},
        ),
    )


def _choice(value: str | list[str]) -> str | tuple[str, ...]:
    return value if isinstance(value, str) else tuple(value)


def _sort(name: str, options: dict[str, Any], path: Path) -> SortSpec:
    supplied = options["design"] == "supplied"
    weighted = "size-weighted" if options["weights"] == "size" else "equally weighted"
    title = options.get("title") or (
        f"Supplied assets {name}" if supplied else f"{options['groups']} groups, {weighted}"
    )
    return SortSpec(
        name=name,
        title=title,
        design=options["design"],
        rank_on=options.get("rank_on"),
        groups=options["groups"],
        weights=options["weights"],
        form_month=options["form_month"],
        hold=options["hold"],
        returns_are=options["is"],
        source=_source(options, path) if supplied else None,
    )


def _source(options: dict[str, Any], path: Path) -> Source:
    return Source(
        file=_from_here((path.parent / options["file"]).resolve()),
        label=options["file"],
        columns=dict(options["columns"]),
        unit=options["unit"],
        missing=tuple(options["missing"]),
        dates=options["dates"],
        separator=options.get("separator"),
        source=options["source"],
        access=options["access"],
        may_share=options["may_share"],
    )


def _from_here(path: Path) -> str:
    """Relative to the working folder where the file lies in it, else absolute."""
    here = Path.cwd().resolve()
    return str(path.relative_to(here)) if path.is_relative_to(here) else str(path)
