"""Read what the paper is written from."""

from __future__ import annotations

from typing import Any

from lineproof import store
from lineproof.paper.context import Context


def open_context(given: Any, options: dict[str, Any]) -> Context:
    """The context from a job's named inputs estimates, index and intake, and its options."""
    return Context(
        estimates=store.read_table(given.estimates),
        subperiods=store.read_json(given.index),
        facts=options["facts"],
        intake=store.read_json(given.intake),
    )
