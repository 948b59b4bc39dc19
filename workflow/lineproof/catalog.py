"""What a registry is made of: an entry names its function without importing it.

The study file is checked before any job, and that check must stay quick; so the dictionaries that say what exists
hold the place of each function as text, and the function is imported only where it is called.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from importlib import import_module


@dataclass(frozen=True)
class Entry:
    """One thing a registry offers: `function` as "package.module:name", `label` for readers."""

    function: str
    label: str
    note: str = ""


def load(entry: Entry) -> Callable:
    """Import and return the function an entry names."""
    module, name = entry.function.split(":")
    return getattr(import_module(module), name)


def keys(place: str) -> list[str]:
    """Names in the registry at "package.module:DICTIONARY", in its order."""
    module, name = place.split(":")
    registry: Mapping[str, object] = getattr(import_module(module), name)
    return list(registry)
