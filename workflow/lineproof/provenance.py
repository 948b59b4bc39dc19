"""Which code a rule depends on, so that an edit re-runs what it bears on and nothing else."""

from __future__ import annotations

import ast
import re
from collections.abc import Callable
from functools import cache
from pathlib import Path

PACKAGE = Path(__file__).parent
WORKFLOW = PACKAGE.parent
_PLACE = re.compile(r"^lineproof(?:\.\w+)+:\w+$")


def code_of(script: Path, names_in: Callable[[Path], list[str]] | None = None) -> list[Path]:
    """The modules and templates a script reaches, itself included, sorted.

    Imports are followed wherever they stand, and so are registry entries ("lineproof.module:name"). A module of
    a package that holds a folder `templates` depends on the templates as well. `names_in` gives the modules of ours
    that a file names, where they are known already; by default it is read.
    """
    names_in = names_in or modules_named
    seen: set[Path] = set()
    waiting = [script]
    while waiting:
        file = waiting.pop()
        if file not in seen:
            seen.add(file)
            waiting += [path for name in names_in(file) for path in _files(name)]
    for folder in {file.parent / "templates" for file in seen}:
        if folder.is_dir():
            seen.update(path for path in folder.rglob("*") if path.is_file())
    return sorted(seen)


@cache
def modules_named(file: Path) -> list[str]:
    """The modules of ours that a file imports, or names in a registry, sorted."""
    names: set[str] = set()
    for node in ast.walk(ast.parse(file.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Import):
            names.update(alias.name for alias in node.names)
        elif isinstance(node, ast.ImportFrom) and node.module and not node.level:
            names.add(node.module)
            names.update(f"{node.module}.{alias.name}" for alias in node.names)
        elif (
            isinstance(node, ast.Constant)
            and isinstance(node.value, str)
            and _PLACE.match(node.value)
        ):
            names.add(node.value.split(":")[0])
    return sorted(name for name in names if name.split(".")[0] == "lineproof")


@cache
def _files(name: str) -> list[Path]:
    """The module's file and the `__init__` of each package above it."""
    parts = name.split(".")
    found = [WORKFLOW.joinpath(*parts[:depth], "__init__.py") for depth in range(1, len(parts) + 1)]
    found.append(WORKFLOW.joinpath(*parts).with_suffix(".py"))
    return [path for path in found if path.is_file()]
