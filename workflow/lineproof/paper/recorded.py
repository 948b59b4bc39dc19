"""Numbers of the intake as printed, each with its place in intake.json as a JSON Pointer (RFC 6901)."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from functools import partial
from html import escape
from typing import Any

from lineproof.paper.rounding import DASH, as_given, part, printed, significant

FORMS: dict[str, Callable[[Any], str]] = {
    "count": partial(printed, name="count"),
    "percent": partial(printed, name="percent"),
    "fine_percent": partial(printed, name="fine_percent"),
    "digits": partial(significant, digits=3, shift=2),  # per cent
    "as_given": as_given,
}


@dataclass(frozen=True)
class Value:
    """One number of the record: how it prints, and where it stands."""

    text: str
    pointer: str

    def __html__(self) -> str:
        return f'<span class="n" title="{escape(self.pointer)}">{escape(self.text)}</span>'


@dataclass(frozen=True)
class Record:
    """The intake, read by place, and the signs of its raw files in their order."""

    intake: Mapping[str, Any]
    raw_files: Sequence[Mapping[str, Any]] = ()

    def get(self, *path: str | int) -> Any:
        """What stands at a place; raises KeyError or IndexError where nothing does."""
        found: Any = self.intake
        for key in path:
            found = found[key]
        return found

    def at(self, *path: str | int, form: str = "count") -> Value:
        """The number at a place, as one of `FORMS` prints it; a number that does not exist is a dash."""
        value = self.get(*path)
        return Value(typeset(DASH if value is None else FORMS[form](value)), pointer(path))

    def share(self, path: tuple[str | int, ...], whole: tuple[str | int, ...]) -> Value:
        """One count as per cent of another."""
        return Value(typeset(part(self.get(*path), self.get(*whole))), pointer(path))


def pointer(path: tuple[str | int, ...]) -> str:
    """A place as a JSON Pointer."""
    return "".join("/" + str(key).replace("~", "~0").replace("/", "~1") for key in path)


def typeset(text: str) -> str:
    """With a proper minus sign, and an en dash for what does not exist."""
    return "–" if text == DASH else text.replace("-", "−")
