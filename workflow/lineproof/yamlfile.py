"""Read a YAML file with the line of every key, and every key that stands twice."""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import yaml

from lineproof.problems import KnownProblem, Problem

Place = tuple[str | int, ...]

# The compiled parser where PyYAML has it: the study file is read at every start.
SAFE_LOADER = getattr(yaml, "CSafeLoader", yaml.SafeLoader)


@dataclass
class YamlFile:
    """`content` as plain Python values; `lines` gives the line of each place; `twice` lists repeated keys."""

    path: Path
    content: Any = None
    lines: dict[Place, int] = field(default_factory=dict)
    twice: list[Place] = field(default_factory=list)

    def line(self, place: Place) -> int:
        """Line of a place, or of the part of it that exists."""
        while place and place not in self.lines:
            place = place[:-1]
        return self.lines.get(place, 1)

    def where(self, place: Place) -> str:
        """As in `file, line 12, betas.monthly60.window`."""
        name = ".".join(str(part) for part in place)
        return f"{self.path.name}, line {self.line(place)}" + (f", {name}" if name else "")


def read_yaml(path: Path) -> YamlFile:
    """Parse one YAML document.

    Raises KnownProblem when the file is missing, is not UTF-8 or is not YAML.
    """
    headline = f"The study file {path} cannot be read."
    try:
        text = path.read_text(encoding="utf-8")
    except FileNotFoundError:
        raise KnownProblem(
            headline, [Problem(str(path), "no such file", "check the path")]
        ) from None
    except IsADirectoryError:
        change = "give the study file itself, such as study.yaml in it"
        raise KnownProblem(headline, [Problem(str(path), "a folder", change)]) from None
    except UnicodeDecodeError as error:
        line = error.object[: error.start].count(b"\n") + 1
        found = f"a byte that is not UTF-8: 0x{error.object[error.start]:02x}"
        where, change = f"{path.name}, line {line}", "save the file as UTF-8"
        raise KnownProblem(headline, [Problem(where, found, change)]) from None
    except OSError as error:
        found = error.strerror or str(error)
        problem = Problem(str(path), found, "check the file and its permissions")
        raise KnownProblem(headline, [problem]) from None
    try:
        loader = SAFE_LOADER(text)
        node = loader.get_single_node()
        content = None if node is None else loader.construct_document(node)
    except (yaml.YAMLError, ValueError) as error:
        mark = getattr(error, "problem_mark", None)
        where = f"{path.name}, line {mark.line + 1}" if mark else path.name
        found = getattr(error, "problem", None) or str(error)
        raise KnownProblem(
            headline, [Problem(where, f"not YAML: {found}", "check indentation and quotes there")]
        ) from None
    result = YamlFile(path, content)
    if node is not None:
        _note_lines(node, (), result)
    return result


def _note_lines(node: yaml.Node, place: Place, into: YamlFile) -> None:
    into.lines.setdefault(place, node.start_mark.line + 1)
    if isinstance(node, yaml.MappingNode):
        seen: set[str] = set()
        for key, value in node.value:
            below = (*place, key.value)
            if key.value in seen:
                into.twice.append(below)
            seen.add(key.value)
            into.lines[below] = key.start_mark.line + 1
            _note_lines(value, below, into)
    elif isinstance(node, yaml.SequenceNode):
        for index, value in enumerate(node.value):
            _note_lines(value, (*place, index), into)
