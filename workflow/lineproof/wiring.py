"""What the Snakefile needs to know: the study, the code of each rule, and the options each job depends on.

Options are given to a job as `params` and are also kept as small files that the job takes as input. So the state of
a study is complete in its own folder: a changed option is noticed even when the scheduler's memory was deleted.

Code, pins and raw files come in by the digests of their content, which are kept the same way; so their time stamps,
which mean little for a file that was unpacked, copied or checked out, decide nothing.
"""

from __future__ import annotations

import json
import os
from collections.abc import Iterable
from dataclasses import asdict, dataclass
from functools import cached_property
from pathlib import Path
from typing import Any

from lineproof import store
from lineproof.analyses import ANALYSES
from lineproof.designs import Design
from lineproof.digests import Digests, ModulesNamed
from lineproof.facts import facts
from lineproof.paper import exhibits
from lineproof.provenance import WORKFLOW, code_of
from lineproof.specs import BetaSpec, Study


@dataclass(frozen=True)
class Wiring:
    """Paths, options and code of one study."""

    study: Study

    @cached_property
    def folder(self) -> str:
        return self.study.folder

    def path(self, name: str) -> str:
        """A path inside the study's results."""
        return f"{self.folder}/{name}"

    def code(self, rule: str) -> str:
        """Where the digests of the code a rule depends on are kept."""
        return self.path(f"digests/code-{rule}.json")

    @property
    def pins(self) -> str:
        """Where the digest of the pinned packages is kept, on which every output depends."""
        return self.path("digests/pins.json")

    def raw_digests(self, *places: str) -> list[str]:
        """Where the digests of raw files are kept, by their places in the study file.

        The demo market's files have none: a rule makes them, and what that depends on is known.
        """
        sources = self.study.sources()
        return [
            self.path(f"digests/{place}.json")
            for place in places
            if place in sources and not self.study.is_made(sources[place])
        ]

    def keep_options(self) -> None:
        """Write the options of every job, each file only where it differs from what stands there."""
        for name, options in self._options.items():
            self._keep(options, self.options_file(name))

    def keep_digests(self) -> None:
        """Write the digests of code, pins and raw files, each file of them only where one has changed."""
        digests = Digests(self.path("digests/known.json"))
        named = ModulesNamed(self.path("digests/named.json"), digests)
        for script in (WORKFLOW / "scripts").glob("*.py"):
            files = code_of(script, named.of)
            found = {str(file.relative_to(WORKFLOW)): digests.of(file) for file in files}
            self._keep(found, self.code(script.stem))
        self._keep(digests.of(WORKFLOW / "envs" / "requirements.txt"), self.pins)
        for place, source in self.study.sources().items():
            for kept in self.raw_digests(place):
                self._keep([digests.of(file) for file in source.files], kept)
        digests.keep()
        named.keep()

    def _keep(self, content: Any, file: str) -> None:
        text = json.dumps(content, indent=1, ensure_ascii=False, sort_keys=True) + "\n"
        store.write_if_changed(text, file)

    def options_file(self, name: str) -> str:
        """Where the options of a job are kept."""
        return self.path(f"options/{name}.json")

    def options(self, name: str) -> dict[str, Any]:
        """Exactly the keyword arguments of the function behind a job."""
        return self._options[name]

    @cached_property
    def _options(self) -> dict[str, dict[str, Any]]:
        study = self.study
        found: dict[str, dict[str, Any]] = {
            "validate_returns": self._validation(),
            "cut_subperiods": {
                "frequency": study.frequency,
                "main": study.paper.main,
                "specs": {name: asdict(spec) for name, spec in study.subperiods.items()},
            },
            "price_subperiod": {
                "frequency": study.frequency,
                "level": study.level,
                "hac_lag": study.hac_lag,
                "analyses": list(ANALYSES) if study.analyses == "all" else list(study.analyses),
            },
            "describe_sample": {
                "frequency": study.frequency,
                "hold": {name: spec.hold for name, spec in self.ranked.items()},
            },
            "write_paper": {"facts": facts(study)},
        }
        if study.demo is not None:
            found["make_demo"] = dict(study.demo)
        for name, spec in study.betas.items():
            rule = "estimate_betas" if spec.shrunk is None else "shrink_betas"
            found[f"{rule}-{name}"] = {**_estimation(spec), "dated": study.frequency}
        if study.factors is not None:
            found["read_factors"] = {
                "reading": study.factors.reading(),
                "frequency": study.factors_frequency,
            }
        for name in study.sorts:
            found[f"form_portfolios-{name}"] = self._sort(name)
        return found

    def _validation(self) -> dict[str, Any]:
        study = self.study
        return {
            "frequency": study.frequency,
            "returns": study.returns.reading(),
            "returns_are": study.returns_are,
            "returns_frequency": study.returns_frequency,
            "market_build": study.market_build,
            "series": {
                "market": study.market and study.market.reading(),
                "market_is": study.market_is,
                "market_frequency": study.market_frequency,
                "riskless": study.riskless and study.riskless.reading(),
                "riskless_quoted": study.riskless_quoted,
                "riskless_frequency": study.riskless_frequency,
            },
            "rules": asdict(study.intake),
        }

    @property
    def raw_files(self) -> dict[str, list[str]]:
        """The raw files of returns, market and riskless rate, none where the study has none."""
        study = self.study
        sources = {"returns": study.returns, "market": study.market, "riskless": study.riskless}
        return {name: list(source.files) if source else [] for name, source in sources.items()}

    @property
    def panels(self) -> dict[str, str]:
        """The panel, and the panel of days beside it where a study of months is delivered days; by name."""
        names = (
            ["panel"]
            if self.study.returns_frequency == self.study.frequency
            else ["panel", "daily"]
        )
        return {name: self.path(f"data/{name}.parquet") for name in names}

    @property
    def markets(self) -> dict[str, str]:
        """The market, and the market's days beside it where there are such."""
        study = self.study
        beside = study.returns_frequency != study.frequency and (
            study.market_build is not None or study.market_frequency == "daily"
        )
        names = ["market", "market_daily"] if beside else ["market"]
        return {name: self.path(f"data/{name}.parquet") for name in names}

    def _sort(self, name: str) -> dict[str, Any]:
        spec = self.study.sorts[name]
        if spec.source is not None:
            return {
                "design": spec.design,
                "frequency": self.study.frequency,
                "reading": spec.source.reading(),
                "returns_are": spec.returns_are,
            }
        assert spec.ranked is not None
        return {
            "design": spec.design,
            "frequency": self.study.frequency,
            "estimates": list(spec.estimates),
            **{key: _plain(value) for key, value in asdict(spec.ranked).items()},
        }

    @property
    def estimated(self) -> str:
        """A pattern of the entries under `betas` that are estimated."""
        return _one_of(name for name, spec in self.study.betas.items() if spec.shrunk is None)

    @property
    def shrunk(self) -> str:
        """A pattern of the entries under `betas` that shrink another."""
        return _one_of(name for name, spec in self.study.betas.items() if spec.shrunk is not None)

    def beta_inputs(self, name: str) -> dict[str, str]:
        """The tables that an entry under `betas` is estimated from, or the estimates that it shrinks."""
        study = self.study
        if study.betas[name].shrunk is not None:
            return {"betas": self.path(f"betas/{study.betas[name].shrunk['from']}.parquet")}
        if study.betas[name].returns == study.frequency:
            tables = {"panel": "panel", "market": "market"}
        else:
            tables = {"panel": "daily", "market": "market_daily"}
        if study.betas[name].factors:
            tables["factors"] = "factors"
        return {key: self.path(f"data/{table}.parquet") for key, table in tables.items()}

    def sort_inputs(self, name: str) -> list[str]:
        """The tables or files a set of test assets is made from."""
        spec = self.study.sorts[name]
        if spec.source is not None:
            return list(spec.source.files)
        betas = [self.path(f"betas/{each}.parquet") for each in spec.estimates]
        return [self.path("data/panel.parquet"), *betas]

    @property
    def tables_between(self) -> list[str]:
        """Betas and test assets, inside the study's folder: part of a complete study, so made again when lost."""
        sorts = [
            f"portfolios/{name}/{kind}.parquet"
            for name in self.study.sorts
            for kind in ("members", "returns", "formations", "transitions", "assigned")
        ]
        return [*(f"betas/{name}.parquet" for name in self.study.betas), *sorts]

    @property
    def ranked(self) -> dict[str, Design]:
        """How each set of ranked test assets is formed, by name."""
        return {name: s.ranked for name, s in self.study.sorts.items() if s.ranked is not None}

    @property
    def formed(self) -> list[str]:
        """Formations and transitions of each ranked set, in this order."""
        kinds = ("formations", "transitions")
        return [f"portfolios/{name}/{kind}.parquet" for name in self.ranked for kind in kinds]

    @property
    def main_betas(self) -> list[str]:
        """The first estimate that the main test assets are ranked on, in a list; empty where there is none."""
        return list(self.study.sorts[self.study.paper.main].estimates[:1])

    @cached_property
    def tables(self) -> list[str]:
        """Files of the tables, inside the study's folder."""
        return [f"tables/{name}" for name in exhibits.table_files(facts(self.study))]

    @cached_property
    def figures(self) -> list[str]:
        """Files of the figures, inside the study's folder."""
        return [f"figures/{name}" for name in exhibits.figure_files(facts(self.study))]

    def heal(self) -> None:
        """Forget the list of subperiods when one of its files is gone, so that they are cut again."""
        index = Path(self.path("subperiods/index.json"))
        if not index.exists():
            return
        try:
            names = subperiod_names(index)
            whole = all((index.parent / f"{name}.parquet").exists() for name in names)
        except (ValueError, KeyError, TypeError):
            whole = False
        if not whole:
            index.unlink()


def _one_of(names: Iterable[str]) -> str:
    """A pattern that fits these names, or nothing where there are none."""
    return "|".join(names) or "(?!)"


def _estimation(spec: BetaSpec) -> dict[str, Any]:
    if spec.shrunk is not None:
        return {key: spec.shrunk[key] for key in ("shrink", "own")}
    given = {
        key: getattr(spec, key)
        for key in ("name", "estimator", "returns", "window", "min_obs", "own")
    }
    return {**given, "beside": list(spec.factors)}


def _plain(value: Any) -> Any:
    """A tuple as the list that it is in a file of options."""
    return list(value) if isinstance(value, tuple) else value


def subperiod_names(index: str | os.PathLike) -> list[str]:
    """Names of the subperiods listed in an index file."""
    return [entry["name"] for entry in store.read_json(index)]
