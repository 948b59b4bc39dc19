"""The schema of a study file: loading it, filling in defaults, and saying what is wrong in plain words."""

from __future__ import annotations

import copy
import datetime
import math
from collections.abc import Iterator
from difflib import get_close_matches
from functools import lru_cache
from pathlib import Path
from typing import Any

import yaml
from jsonschema import Draft202012Validator, validators
from jsonschema.exceptions import ValidationError

from lineproof import catalog
from lineproof.problems import Problem
from lineproof.yamlfile import SAFE_LOADER, Place, YamlFile

SCHEMA_FILE = Path(__file__).parent.parent / "schemas" / "study.schema.yaml"


@lru_cache(maxsize=1)
def study_schema() -> dict[str, Any]:
    """The schema, with `$ref` resolved and the values a registry allows filled in."""
    raw = yaml.load(SCHEMA_FILE.read_text(encoding="utf-8"), Loader=SAFE_LOADER)
    resolved = _resolve(raw, raw["$defs"])
    del resolved["$defs"]
    return resolved


def _resolve(part: Any, definitions: dict[str, Any]) -> Any:
    if isinstance(part, list):
        return [_resolve(item, definitions) for item in part]
    if not isinstance(part, dict):
        return part
    if "$ref" in part:
        base = definitions[part["$ref"].rsplit("/", 1)[1]]
        part = {**base, **{k: v for k, v in part.items() if k != "$ref"}}
    if set(part) == {"registry"}:
        return catalog.keys(part["registry"])
    return {key: _resolve(value, definitions) for key, value in part.items()}


def with_defaults(content: Any, schema: dict[str, Any] | None = None) -> Any:
    """A copy of `content` in which every absent option has the schema's default."""
    schema = study_schema() if schema is None else schema
    if isinstance(content, list) and "items" in schema:
        return [with_defaults(item, schema["items"]) for item in content]
    if not isinstance(content, dict):
        return copy.deepcopy(content)
    filled = {key: with_defaults(value, _below(schema, key)) for key, value in content.items()}
    for key, below in schema.get("properties", {}).items():
        if key in filled:
            continue
        if "default" in below:
            filled[key] = copy.deepcopy(below["default"])
        elif below.get("type") == "object" and not below.get("required") and key != "demo":
            filled[key] = with_defaults({}, below)
    return filled


def _below(schema: dict[str, Any], key: str) -> dict[str, Any]:
    extra = schema.get("additionalProperties")
    return schema.get("properties", {}).get(key) or (extra if isinstance(extra, dict) else {})


Finding = tuple[Place, str, str]  # place, what was found, what to change


def schema_findings(file: YamlFile) -> list[Finding]:
    """Every way in which the file breaks the schema."""
    found = [(place, "this key stands twice", "keep one of the two") for place in file.twice]
    endless = set(_not_finite(file.content))
    found += [(place, "not a finite number", "give a finite number") for place in endless]
    for error in _VALIDATOR(study_schema()).iter_errors(file.content):
        if tuple(error.absolute_path) not in endless:
            found += _in_words(error)
    return found


def _is_whole(_: Any, value: Any) -> bool:
    """JSON Schema takes 60.0 for a whole number; a job that counts with it would not."""
    return isinstance(value, int) and not isinstance(value, bool)


_VALIDATOR = validators.extend(
    Draft202012Validator,
    type_checker=Draft202012Validator.TYPE_CHECKER.redefine("integer", _is_whole),
)


def _not_finite(content: Any, place: Place = ()) -> Iterator[Place]:
    """Where `.nan` or `.inf` stands: comparisons with limits let the first of them pass."""
    if isinstance(content, float) and not math.isfinite(content):
        yield place
    elif isinstance(content, dict | list):
        inside = content.items() if isinstance(content, dict) else enumerate(content)
        for key, value in inside:
            yield from _not_finite(value, (*place, key))


def as_problems(findings: list[Finding], file: YamlFile) -> list[Problem]:
    """Findings in the order of the file's lines, for readers."""
    ordered = sorted(findings, key=lambda finding: (file.line(finding[0]), str(finding)))
    return [Problem(file.where(place), said, change) for place, said, change in ordered]


def nearest(word: str, allowed: list[str]) -> str:
    """A sentence that names the nearest allowed word, or all of them."""
    close = get_close_matches(str(word), allowed, n=1, cutoff=0.6)
    if close:
        return f"did you mean {close[0]}?"
    return f"allowed here: {', '.join(allowed)}" if allowed else "nothing is allowed here"


def _in_words(error: ValidationError) -> list[Finding]:
    """One (place, what was found, what to change) for each thing a schema error holds."""
    place = tuple(error.absolute_path)
    value, rule, schema = error.instance, error.validator_value, error.schema
    match error.validator:
        case "additionalProperties":
            allowed = list(schema.get("properties", {}))
            unknown = [key for key in value if key not in allowed]
            return [((*place, k), f"unknown key {k!r}", nearest(k, allowed)) for k in unknown]
        case "required":
            missing = [key for key in rule if key not in value]
            key = next(k for k in missing if repr(k) in error.message)
            note = schema.get("properties", {}).get(key, {}).get("description", "")
            return [(place, f"the key {key!r} is missing", f"add it: {note}".strip(": "))]
        case "enum":
            return [
                (
                    place,
                    f"{value!r} is not one of the choices",
                    nearest(value, [str(v) for v in rule]),
                )
            ]
        case "type":
            kinds = [rule] if isinstance(rule, str) else rule
            wanted = f"give {' or '.join(_KINDS[kind] for kind in kinds)}"
            if place[-1:] == ("return",) and isinstance(value, dict):
                wanted = "name a column of returns; only those of data.returns are made from prices"
            if "pattern" in schema and "description" in schema:
                wanted = schema["description"]
            shown = "something else" if schema.get("is_secret") else _shown(value)
            return [(place, f"found {shown}", wanted)]
        case "minimum" | "exclusiveMinimum" | "maximum" | "exclusiveMaximum":
            return [(place, f"{value} is out of range", _range(schema))]
        case "pattern":
            return [_pattern(error, place)]
        case "uniqueItems":
            twice = next(item for item in value if value.count(item) > 1)
            return [(place, f"{twice!r} stands twice", "name each once")]
        case "minItems" | "minProperties" | "minLength":
            return [(place, "nothing is given here", schema.get("description", ""))]
        case _:
            return [(place, error.message, schema.get("description", ""))]


_KINDS = {
    "object": "a mapping of keys",
    "array": "a list",
    "string": "text",
    "number": "a number",
    "integer": "a whole number",
    "boolean": "yes or no",
}


def _shown(value: Any) -> str:
    if value is None:
        return "nothing"
    if isinstance(value, bool):
        return "yes or no"
    if isinstance(value, dict):
        return "a mapping"
    if isinstance(value, datetime.date):
        return value.isoformat()
    return f"the list {value!r}" if isinstance(value, list) else repr(value)


def _range(schema: dict[str, Any]) -> str:
    parts = [
        ("minimum", "at least"),
        ("exclusiveMinimum", "more than"),
        ("maximum", "at most"),
        ("exclusiveMaximum", "less than"),
    ]
    said = " and ".join(f"{words} {schema[key]}" for key, words in parts if key in schema)
    return f"give {said}" + (f" {schema['unit']}" if "unit" in schema else "")


def _pattern(error: ValidationError, place: Place) -> Finding:
    value = error.instance
    if "description" not in error.schema:  # the name of something, as in `betas:`
        named = place if place and place[-1] == value else (*place, value)
        hint = "a name starts with a small letter, then small letters, digits, _ or - only"
        return named, f"{value!r} cannot be a name", hint
    choices = error.schema["description"]
    return place, f"{value!r} does not fit", choices
