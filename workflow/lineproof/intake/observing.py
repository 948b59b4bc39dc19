"""Observers see the panel a chunk at a time and add up what the data report shows; none keeps the rows."""

from __future__ import annotations

from typing import Any, Protocol

from lineproof.intake.chunk import Chunk


class Observer(Protocol):
    """Sees every chunk once, in the order of the securities; memory must not grow with the number of rows."""

    def see(self, chunk: Chunk) -> None:
        """Take in one chunk; `chunk.values["total_return"]` is known."""

    def result(self) -> Any:
        """What was found, as JSON can hold it: the same whatever the cut into chunks."""
