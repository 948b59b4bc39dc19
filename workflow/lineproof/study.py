"""Read a study file; every problem in it is reported at once, before any job."""

from __future__ import annotations

import os
from dataclasses import replace
from pathlib import Path
from typing import Any

from lineproof.cross_checks import CHECKS, beta_returns
from lineproof.designs import FORM_EACH, HOLD_BLOCKS, Design
from lineproof.estimators import OWN_OPTIONS
from lineproof.intake.formats import given_files, members
from lineproof.problems import KnownProblem, Problem
from lineproof.schema import as_problems, schema_findings, with_defaults
from lineproof.source_checks import results_folder
from lineproof.specs import (
    BetaSpec,
    IntakeSpec,
    PaperSpec,
    SortSpec,
    Source,
    Study,
    SubperiodSpec,
)
from lineproof.yamlfile import read_yaml


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


_SAME_NAME = ("name", "title", "market_name", "level", "frequency")


def _build(content: dict[str, Any], path: Path) -> Study:
    data, paper = content["data"], content["paper"]
    lag = content["pricing"]["hac_lag"]
    run = content["pricing"]["run"]
    return Study(
        path=path,
        **{key: content["study"][key] for key in _SAME_NAME},
        demo=content.get("demo"),
        returns=_source(data["returns"], path, content["study"]["name"], "returns"),
        **_series(data, path, content["study"]["name"], content["study"]["frequency"]),
        intake=_intake(content["intake"]),
        betas={name: _beta(name, content) for name in content["betas"]},
        sorts={
            name: _sort(name, options, content["betas"], path, content["study"]["name"])
            for name, options in content["portfolios"].items()
        },
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


_KEYWORDS = {"volatility_min": "volatility_min_obs"}  # where the function has another name


def _beta(name: str, content: dict[str, Any]) -> BetaSpec:
    options = content["betas"][name]
    if "from" in options:
        method = options["shrink"]
        own = {key: options[key] for key in OWN_OPTIONS.get(method, {})}
        shrunk = {"from": options["from"], "shrink": method, "own": own}
        return replace(_beta(options["from"], content), name=name, shrunk=shrunk)
    keys = [key for key in OWN_OPTIONS.get(options["estimator"], {}) if key != "factors"]
    return BetaSpec(
        name=name,
        estimator=options["estimator"],
        returns=beta_returns(options, content),
        window=options["window"],
        min_obs=options["min"],
        factors=tuple(options.get("factors", ())),
        own={_KEYWORDS.get(key, key): options[key] for key in keys},
    )


def _series(data: dict[str, Any], path: Path, study: str, frequency: str) -> dict[str, Any]:
    """What the study says of the market, the riskless rate, and which returns are in excess of it."""
    market, riskless, factors = data["market"], data.get("riskless"), data.get("factors")
    returns_are = data["returns"]["is"]
    delivered = data["returns"].get("frequency", frequency)
    return {
        "returns_are": returns_are,
        "returns_frequency": delivered,
        "market": None if "build" in market else _source(market, path, study, "market"),
        "market_is": returns_are if "build" in market else market["is"],
        "market_build": market.get("build"),
        "market_frequency": market.get("frequency", delivered),
        "riskless": None if riskless is None else _source(riskless, path, study, "riskless"),
        "riskless_quoted": "period_return" if riskless is None else riskless["quoted"],
        "riskless_frequency": (riskless or {}).get("frequency", delivered),
        "factors": None if factors is None else _source(factors, path, study, "factors"),
        "factors_frequency": (factors or {}).get("frequency", delivered),
    }


def _intake(options: dict[str, Any]) -> IntakeSpec:
    leaving = options["delisting"]
    missing = leaving["missing_final_return"]
    return IntakeSpec(
        screens=tuple(options["screens"]),
        outliers=dict(options["outliers"]),
        stale_run=options.get("stale_prices", {}).get("run"),
        missing_final_return=None if missing == "leave" else float(missing),
        final_return_by_reason={str(code): float(r) for code, r in leaving["by_reason"].items()},
        other_unit_stop_above=float(options["other_unit_stop_above"]),
        **{
            key: options[key]
            for key in ("return_after_hole", "allow_partial_last_month", "same_month_rows")
        },
    )


def _choice(value: str | list[str]) -> str | tuple[str, ...]:
    return value if isinstance(value, str) else tuple(value)


def _sort(
    name: str, options: dict[str, Any], betas: dict[str, Any], path: Path, study: str
) -> SortSpec:
    supplied = options["design"] == "supplied"
    ranked = None if supplied else _design(name, options, betas)
    variables = () if ranked is None else (*ranked.rank_on, *ranked.ante_betas)
    tables = dict.fromkeys(each.partition(".")[0] for each in variables)
    return SortSpec(
        name=name,
        title=options.get("title") or (_title(ranked) if ranked else f"Supplied assets {name}"),
        design=options["design"],
        returns_are=options["is"],
        source=_source(options, path, study, name) if supplied else None,
        ranked=ranked,
        estimates=tuple(table for table in tables if table in betas),
    )


def _several(value: Any) -> tuple:
    return tuple(value) if isinstance(value, list) else (value,)


_SAME_IN_DESIGN = (
    *("weights", "form_month", "form_each", "rule", "dependent", "overlap", "spread"),
    "assign_betas",
)


def _design(name: str, options: dict[str, Any], betas: dict[str, Any]) -> Design:
    """How groups are ranked, formed and held, what is left to the other options filled in."""
    blocks = options["design"] == "three_windows"
    rank_on = _several(options["rank_on"])
    tables = [table for each in rank_on if (table := each.partition(".")[0]) in betas]
    return Design(
        name=name,
        rank_on=rank_on,
        groups=_several(options["groups"]),
        ante_betas=_several(options["ante_betas"])
        if "ante_betas" in options
        else tuple(tables[:1]),
        hold=options.get("hold", HOLD_BLOCKS if blocks else FORM_EACH[options["form_each"]]),
        in_blocks=blocks,
        renews=blocks or len(_several(options.get("ante_betas", ""))) > 1,
        estimation=options["estimation"] if blocks else 0,
        first_formation=options.get("first_formation"),
        breakpoints=options.get("breakpoints"),
        **{key: options[key] for key in _SAME_IN_DESIGN},
    )


_WEIGHTED = {
    "equal": "equally weighted",
    "buy_and_hold": "bought and held",
    "size": "size-weighted",
}


def _title(ranked: Design) -> str:
    return f"{' × '.join(map(str, ranked.groups))} groups, {_WEIGHTED[ranked.weights]}"


def _source(options: dict[str, Any], path: Path, study: str, name: str) -> Source:
    """A source as the study file gives it, by its name; `study` is the name of the study."""
    columns = dict(options["columns"])
    computed = columns.pop("return")["from"] if isinstance(columns.get("return"), dict) else None
    if "query" in options:
        label = f"query {name}"
        found = [(Path(results_folder(study)) / "extracts" / f"{name}.parquet", label)]
    else:
        given = given_files(options["file"])
        found = [m for each in given for m in members(path.resolve().parent / each, each)]
        label = ", ".join(given)
    return Source(
        files=tuple(_from_here(file.parent.resolve() / file.name) for file, _ in found),
        labels=tuple(label for _, label in found),
        label=label,
        query=options.get("query"),
        connection=options.get("connection"),
        columns=columns,
        names="asset" if "design" in options else "security",
        layout=options.get("layout", "long"),
        leave_out=tuple(options.get("leave_out", ())),
        unit=options["unit"],
        missing=tuple(options["missing"]),
        dates=options.get("dates"),
        return_from=computed,
        source=options["source"],
        access=options["access"],
        may_share=options["may_share"],
        decimal=options["decimal"],
        **{key: options.get(key) for key in ("separator", "encoding", "sheet")},
    )


def _from_here(path: Path) -> str:
    """Relative to the working folder where the file lies in it, else absolute."""
    here = Path.cwd().resolve()
    return str(path.relative_to(here)) if path.is_relative_to(here) else str(path)
