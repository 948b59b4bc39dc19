"""The house rules that a reader relies on, enforced: where things lie, what they are called, what they may do."""

from __future__ import annotations

import ast
import re
from pathlib import Path

import pytest

from lineproof import catalog
from lineproof.documenting import CONFIG, documents
from lineproof.provenance import PACKAGE, WORKFLOW

ROOT = WORKFLOW.parent
RULES = sorted((WORKFLOW / "rules").glob("*.smk"))
SCRIPTS = sorted((WORKFLOW / "scripts").glob("*.py"))
REGISTRIES = (
    "lineproof.estimators:ESTIMATORS",
    "lineproof.designs:DESIGNS",
    "lineproof.designs:WEIGHTS",
    "lineproof.analyses:ANALYSES",
    "lineproof.quotings:QUOTINGS",
    "lineproof.paper.exhibits:TABLES",
    "lineproof.paper.exhibits:FIGURES",
    "lineproof.intake.observers:OBSERVERS",
)


def modules(folder: Path) -> list[Path]:
    return sorted(folder.rglob("*.py"))


def rules_with_scripts() -> dict[str, str]:
    """Each rule's name and the script it runs."""
    found = {}
    for file in RULES:
        for block in re.split(r"^\s*(?:rule|checkpoint) ", file.read_text(), flags=re.MULTILINE)[
            1:
        ]:
            name = block.split(":")[0]
            script = re.search(r'script:\s+"\.\./scripts/(\w+)\.py"', block)
            assert script, f"{name} runs no script"
            found[name] = script[1]
    return found


def imported(file: Path) -> set[str]:
    names: set[str] = set()
    for node in ast.walk(ast.parse(file.read_text())):
        if isinstance(node, ast.Import):
            names |= {alias.name for alias in node.names}
        elif isinstance(node, ast.ImportFrom):
            names.add(node.module or "")
    return names


def called(file: Path) -> set[str]:
    return {
        node.func.id if isinstance(node.func, ast.Name) else node.func.attr
        for node in ast.walk(ast.parse(file.read_text()))
        if isinstance(node, ast.Call) and isinstance(node.func, ast.Name | ast.Attribute)
    }


def test_a_rule_and_its_script_share_a_name() -> None:
    found = rules_with_scripts()
    assert found
    assert {name: script for name, script in found.items() if name != script} == {}
    assert sorted(found) == [script.stem for script in SCRIPTS]


@pytest.mark.parametrize("script", SCRIPTS, ids=lambda path: path.stem)
def test_a_script_is_thin_and_calls_the_function_of_its_name(script: Path) -> None:
    statements = [line for line in script.read_text().splitlines() if line.strip()]
    assert len(statements) <= 15
    renamed = {
        "write_tables": "make_tables",
        "write_report": "make_report",
        "write_data_report": "make_data_report",
    }
    assert renamed.get(script.stem, script.stem) in called(script)
    assert not imported(script) & {"pandas", "numpy"}


@pytest.mark.parametrize("file", [ROOT / "Snakefile", *RULES], ids=lambda path: path.name)
def test_no_rule_has_a_run_block(file: Path) -> None:
    assert not re.search(r"^\s+run:", file.read_text(), flags=re.MULTILINE)


def test_scripts_never_read_the_configuration() -> None:
    assert [script.name for script in SCRIPTS if "snakemake.config" in script.read_text()] == []


@pytest.mark.parametrize("module", modules(PACKAGE / "stats"), ids=lambda path: path.stem)
def test_statistics_do_no_input_or_output_and_know_no_study(module: Path) -> None:
    allowed = {
        "__future__",
        "collections",
        "dataclasses",
        "functools",
        "typing",
        "math",
        "numpy",
        "scipy",
        "numba",
    }
    outside = {name for name in imported(module) if name.split(".")[0] not in allowed}
    assert {name for name in outside if not name.startswith("lineproof.stats")} == set()
    assert not called(module) & {
        "open",
        "print",
        "read_text",
        "write_text",
        "read_bytes",
        "write_bytes",
    }


def test_files_are_written_in_one_place() -> None:
    """joblog and store_files of a run's own logs aside, only `store` writes."""
    writing = {"write_text", "write_bytes", "to_csv", "to_parquet", "savefig", "write_table"}
    may_write = {"store.py", "joblog.py"}
    found = {
        module.name: sorted(
            node.func.attr
            for node in ast.walk(ast.parse(module.read_text()))
            if isinstance(node, ast.Call)
            and isinstance(node.func, ast.Attribute)
            and node.func.attr in writing
            and not (isinstance(node.func.value, ast.Name) and node.func.value.id == "store")
        )
        for module in modules(PACKAGE)
        if module.name not in may_write
    }
    in_memory = {"to_csv", "savefig"}  # into text or a buffer
    assert {name: calls for name, calls in found.items() if set(calls) - in_memory} == {}


@pytest.mark.parametrize("place", REGISTRIES)
def test_every_entry_of_a_registry_leads_to_a_function(place: str) -> None:
    module, name = place.split(":")
    registry = getattr(__import__(module, fromlist=[name]), name)
    assert registry
    for entry in registry.values():
        assert callable(catalog.load(entry))
        assert catalog.load(entry).__doc__
        assert entry.label


def test_the_documents_of_the_study_file_are_in_step_with_the_schema() -> None:
    for name, text in documents().items():
        assert (CONFIG / name).read_text(encoding="utf-8") == text, (
            f"config/{name} is out of step with workflow/schemas/study.schema.yaml: run `make docs` and commit it"
        )


def test_the_top_level_holds_nothing_unexpected() -> None:
    expected = {
        *(
            "README.md",
            "DEVELOPERS.md",
            "Snakefile",
            "config",
            "workflow",
            "tests",
            "results",
            "docs",
        ),
        *("pyproject.toml", "Makefile", "LICENSE", "CITATION.cff", ".ci", ".gitignore"),
    }
    ignored = {
        ".git",
        ".venv",
        ".snakemake",
        ".ruff_cache",
        ".hypothesis",
        ".pytest_cache",
        "__pycache__",
    }
    assert {path.name for path in ROOT.iterdir()} - ignored - expected == set()


def test_the_pins_name_no_address() -> None:
    for pins in (WORKFLOW / "envs").glob("requirements*.txt"):
        text = pins.read_text()
        assert "://" not in text
        assert "--index" not in text
        assert "--hash=sha256:" in text
