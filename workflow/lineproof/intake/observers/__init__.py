"""What the data report shows of the panel, added up a chunk at a time: one observer a file, one line each here."""

from __future__ import annotations

from typing import Any

from lineproof import catalog
from lineproof.catalog import Entry
from lineproof.intake.observing import Observer
from lineproof.periods import Periods

OBSERVERS: dict[str, Entry] = {
    "alive": Entry("lineproof.intake.observers.alive:Alive", "securities alive over time"),
    "coverage": Entry(
        "lineproof.intake.observers.coverage:Coverage", "coverage by column and year"
    ),
    "distribution": Entry(
        "lineproof.intake.observers.distribution:Distribution", "returns by decade"
    ),
    "largest": Entry("lineproof.intake.observers.largest:Largest", "the largest returns"),
}


def start_observers(periods: Periods) -> dict[str, Observer]:
    """A fresh observer of each kind, by name; each is to see every chunk once, in the order of the securities."""
    return {name: catalog.load(entry)(periods) for name, entry in OBSERVERS.items()}


def evidence(observers: dict[str, Observer]) -> dict[str, Any]:
    """The result of each observer by name, as `record.Evidence` holds them."""
    return {name: observer.result() for name, observer in observers.items()}
