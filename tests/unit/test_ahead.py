"""Reading ahead: the same items, the same errors, and no thread left behind."""

from __future__ import annotations

import threading
from collections.abc import Iterator

import pytest

from lineproof.ahead import ahead


def counting(n: int, closed: list[bool], end: Exception | None = None) -> Iterator[int]:
    try:
        yield from range(n)
        if end is not None:
            raise end
    finally:
        closed.append(True)


@pytest.mark.parametrize("depth", [1, 3])
def test_same_items_in_the_same_order(depth: int) -> None:
    before = threading.active_count()
    assert list(ahead(counting(50, []), depth)) == list(range(50))
    assert threading.active_count() == before


def test_errors_come_after_the_items_before_them() -> None:
    items = ahead(counting(2, [], ValueError("broken")))
    assert [next(items), next(items)] == [0, 1]
    with pytest.raises(ValueError, match="broken"):
        next(items)


def test_a_caller_who_leaves_ends_the_thread() -> None:
    before, closed = threading.active_count(), []
    items = ahead(counting(10**9, closed))
    next(items)
    items.close()
    assert threading.active_count() == before
    del items
    assert closed == [True]
