"""Work on the next item while the caller works on this one."""

from __future__ import annotations

from collections.abc import Iterator
from queue import Empty, Full, Queue
from threading import Event, Thread
from typing import TypeVar

Item = TypeVar("Item")
_PATIENCE = 0.05  # seconds between looks whether the caller has left


def ahead(items: Iterator[Item], depth: int = 1) -> Iterator[Item]:
    """The same items in the same order, made in a thread that is up to `depth` items ahead.

    What the thread raises is raised here, after the items before it. When the caller leaves, the thread ends.
    """
    made: Queue[tuple[Item | None, BaseException | None]] = Queue(depth)
    left = Event()

    def offer(entry: tuple[Item | None, BaseException | None]) -> None:
        while not left.is_set():
            try:
                return made.put(entry, timeout=_PATIENCE)
            except Full:
                continue

    def work() -> None:
        end: BaseException = StopIteration()
        try:
            for item in items:
                offer((item, None))
                if left.is_set():
                    break
        except BaseException as error:
            end = error
        offer((None, end))

    thread = Thread(target=work, daemon=True)
    thread.start()
    try:
        while True:
            item, end = made.get()
            if isinstance(end, StopIteration):
                return
            if end is not None:
                raise end
            yield item
    finally:
        left.set()
        while True:  # an item that is waited for in vain holds memory
            try:
                made.get_nowait()
            except Empty:
                break
        thread.join()
