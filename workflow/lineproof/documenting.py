"""Write what describes a study file, from the schema: `make docs`.

config/README.md describes every option for readers; config/study.schema.json is the schema with everything resolved,
for editors.
"""

from __future__ import annotations

import json
from collections.abc import Iterator
from typing import Any

from lineproof import store
from lineproof.provenance import WORKFLOW
from lineproof.schema import study_schema

CONFIG = WORKFLOW.parent / "config"

_HEAD = """\
# The study file

Written from `workflow/schemas/study.schema.yaml` by `make docs`; edit the schema, not this file.

{description} An option that has a default may be left out.
`config/kestrel.yaml` is a complete example. An editor that knows YAML schemas completes and checks a study file when
its first line is:

```yaml
# yaml-language-server: $schema=study.schema.json
```

Unknown keys are refused. Months are written `YYYY-MM`. Names of your choice (a study, betas, portfolios, subperiods)
start with a small letter, followed by small letters, digits, `_` or `-`.
"""


def options_text() -> str:
    """The whole text of config/README.md."""
    schema = study_schema()
    parts = [_HEAD.format(description=schema["description"])]
    for key, section in schema["properties"].items():
        parts.append(f"## `{key}`\n\n{_sentence(section)}\n")
        parts.append(_table(section, ""))
    return "\n".join(parts)


def documents() -> dict[str, str]:
    """The files to write, by name."""
    schema = json.dumps(study_schema(), indent=1, ensure_ascii=False) + "\n"
    return {"README.md": options_text(), "study.schema.json": schema}


def _sentence(section: dict[str, Any]) -> str:
    return section["description"].strip()


def _table(section: dict[str, Any], prefix: str) -> str:
    lines = ["| option | what it is | values | default |", "| --- | --- | --- | --- |"]
    for name, option in _flat(section, prefix):
        cells = (f"`{name}`", _sentence(option), _values(option), _default(option, name))
        lines.append(
            "| " + " | ".join(cell.replace("|", "\\|").replace("\n", " ") for cell in cells) + " |"
        )
    return "\n".join(lines) + "\n"


def _flat(section: dict[str, Any], prefix: str) -> Iterator[tuple[str, dict[str, Any]]]:
    """Every option below a section as dotted name and schema; `<name>` and `[]` stand for names and list items."""
    required = section.get("required", [])
    for key, option in section.get("properties", {}).items():
        yield f"{prefix}{key}", {**option, "is_required": key in required}
        yield from _flat(option, f"{prefix}{key}.")
    extra = section.get("additionalProperties")
    if isinstance(extra, dict) and "properties" in extra:
        yield from _flat(extra, f"{prefix}<name>.")
    items = section.get("items")
    if isinstance(items, dict) and "properties" in items:
        yield from _flat(items, f"{prefix}[].")


_KINDS = {
    "string": "text",
    "integer": "whole number",
    "number": "number",
    "boolean": "yes or no",
    "array": "list",
    "object": "keys below",
}


def _values(option: dict[str, Any]) -> str:
    if "enum" in option:
        return ", ".join(f"`{value}`" for value in option["enum"])
    kinds = option.get("type", "object")
    said = " or ".join(_KINDS[kind] for kind in ([kinds] if isinstance(kinds, str) else kinds))
    items = option.get("items", {})
    if "enum" in items:
        said += " of " + ", ".join(f"`{value}`" for value in items["enum"])
    bounds = [
        f"{words} {option[key]}"
        for key, words in (
            ("minimum", "from"),
            ("exclusiveMinimum", "above"),
            ("maximum", "to"),
            ("exclusiveMaximum", "below"),
        )
        if key in option
    ]
    unit = f" {option['unit']}" if "unit" in option else ""
    return " ".join([said, *bounds]) + unit


def _default(option: dict[str, Any], name: str) -> str:
    if "default" in option and option["default"] not in ([], {}):
        value = option["default"]
        shown = {True: "yes", False: "no"}.get(value, value) if isinstance(value, bool) else value
        return f"`{shown}`" if shown != "" else "empty"
    if option.get("is_required"):
        return "required"
    return "none"


def main() -> None:
    """Write the files."""
    store.write_files(documents(), CONFIG)


if __name__ == "__main__":
    main()
