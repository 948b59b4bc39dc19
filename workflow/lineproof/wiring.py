"""What the Snakefile needs to know: the study, the code of each rule, and the options each job depends on.

Options are given to a job as `params` and are also kept as small files that the job takes as input. So the state of
a study is complete in its own folder: a changed option is noticed even when the scheduler's memory was deleted.

Code, pins and raw files come in by the digests of their content, which are kept the same way; so their time stamps,
which mean little for a file that was unpacked, copied or checked out, decide nothing.
"""

from __future__ import annotations

import json
import os
from dataclasses import asdict, dataclass
from functools import cached_property
from pathlib import Path
from typing import Any

from lineproof import store
from lineproof.analyses import ANALYSES
from lineproof.digests import Digests
from lineproof.facts import facts
from lineproof.paper import exhibits
from lineproof.provenance import WORKFLOW, code_of
from lineproof.study import Source, Study


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
            if not self.study.is_made(sources[place])
        ]

    def keep_options(self) -> None:
        """Write the options of every job, each file only where it differs from what stands there."""
        for name, options in self._options.items():
            self._keep(options, self.options_file(name))

    def keep_digests(self) -> None:
        """Write the digests of code, pins and raw files, each file of them only where one has changed."""
        digests = Digests(self.path("digests/known.json"))
        for script in (WORKFLOW / "scripts").glob("*.py"):
            files = code_of(script)
            found = {str(file.relative_to(WORKFLOW)): digests.of(file) for file in files}
            self._keep(found, self.code(script.stem))
        self._keep(digests.of(WORKFLOW / "envs" / "requirements.txt"), self.pins)
        for place, source in self.study.sources().items():
            for kept in self.raw_digests(place):
                self._keep([digests.of(file) for file in raw_files(source)], kept)
        digests.keep()

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
                "main": study.paper.main,
                "specs": {name: asdict(spec) for name, spec in study.subperiods.items()},
            },
            "price_subperiod": {
                "level": study.level,
                "hac_lag": study.hac_lag,
                "analyses": list(ANALYSES) if study.analyses == "all" else list(study.analyses),
            },
            "write_paper": {"facts": facts(study)},
        }
        if study.demo is not None:
            found["make_demo"] = dict(study.demo)
        for name, spec in study.betas.items():
            found[f"estimate_betas-{name}"] = asdict(spec)
        for name in study.sorts:
            found[f"form_portfolios-{name}"] = self._sort(name)
        return found

    def _validation(self) -> dict[str, Any]:
        study = self.study
        return {
            "returns": study.returns.reading(),
            "market": study.market.reading(),
            "market_is": study.market_is,
            "riskless": study.riskless.reading(),
            "riskless_quoted": study.riskless_quoted,
            "rules": {
                "screens": list(study.screens),
                "missing_final_return": study.missing_final_return,
                "final_return_by_reason": {},
                "same_month_rows": study.same_month_rows,
                "stale_run": None,
                "return_after_hole": "keep",
                "jump_and_reversal": "flag",
            },
        }

    def _sort(self, name: str) -> dict[str, Any]:
        spec = self.study.sorts[name]
        if spec.source is not None:
            return {
                "design": spec.design,
                "reading": spec.source.reading(),
                "returns_are": spec.returns_are,
            }
        return {
            "design": spec.design,
            "name": name,
            **{key: getattr(spec, key) for key in ("groups", "weights", "form_month", "hold")},
        }

    def sort_inputs(self, name: str) -> dict[str, str]:
        """The tables or files a set of test assets is made from."""
        spec = self.study.sorts[name]
        if spec.source is not None:
            return {"supplied": spec.source.file}
        return {
            "panel": self.path("data/panel.parquet"),
            "betas": self.path(f"betas/{spec.rank_on}.parquet"),
        }

    @property
    def tables_between(self) -> list[str]:
        """Betas and test assets, inside the study's folder: part of a complete study, so made again when lost."""
        sorts = [
            f"portfolios/{name}/{kind}.parquet"
            for name in self.study.sorts
            for kind in ("members", "returns")
        ]
        return [*(f"betas/{name}.parquet" for name in self.study.betas), *sorts]

    @property
    def main_betas(self) -> list[str]:
        """The estimate that the main test assets are ranked on, in a list; empty where they are supplied."""
        ranked_on = self.study.sorts[self.study.paper.main].rank_on
        return [] if ranked_on is None else [ranked_on]

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


def raw_files(source: Source) -> list[str]:
    """The raw files of one source, in order."""
    return [source.file]


def subperiod_names(index: str | os.PathLike) -> list[str]:
    """Names of the subperiods listed in an index file."""
    return [entry["name"] for entry in store.read_json(index)]
