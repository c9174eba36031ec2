"""Work beside the thread that reads a folder: the next block of a table, and digests.

Both are done by libraries that let other threads run meanwhile. Neither changes a result: blocks come in their order, and a
digest gets its bytes in the order in which they were handed over.
"""

from __future__ import annotations

import hashlib
from collections import deque
from collections.abc import Iterator
from concurrent.futures import Future, ThreadPoolExecutor
from contextlib import ExitStack
from typing import Any, Self, TypeVar

__all__ = ["Beside", "Digest"]

Item = TypeVar("Item")
_WAITING = 64  # pieces that are still to be digested before whoever hands over another has to wait


class Digest:
    """A SHA-256 that another thread works out."""

    def __init__(self, thread: ThreadPoolExecutor) -> None:
        self._thread = thread
        self._digest = hashlib.sha256()
        self._waiting: deque[Future[None]] = deque()

    def update(self, data: Any) -> None:
        """Take more bytes, or an array of them, which nobody changes afterwards."""
        self._waiting.append(self._thread.submit(self._digest.update, data))
        while len(self._waiting) > _WAITING:
            self._waiting.popleft().result()

    def hexdigest(self) -> str:
        """Return the digest of all that was taken."""
        while self._waiting:
            self._waiting.popleft().result()
        return self._digest.hexdigest()


class Beside:
    """Two threads beside the one that reads: for the block to come, and for digests; a context."""

    def __init__(self) -> None:
        self._held = ExitStack()
        self._reading = self._held.enter_context(ThreadPoolExecutor(1, "stillroom-reading"))
        self._digesting = self._held.enter_context(ThreadPoolExecutor(1, "stillroom-digesting"))

    def digest(self) -> Digest:
        """Return a new SHA-256."""
        return Digest(self._digesting)

    def ahead(self, items: Iterator[Item]) -> Iterator[Item]:
        """Yield items in order, the next one being made while one is used."""
        end = object()
        coming: Future[Any] = self._reading.submit(next, items, end)
        try:
            while (item := coming.result()) is not end:
                coming = self._reading.submit(next, items, end)
                yield item
        finally:
            coming.exception()  # whoever stops early may close what the items are read from

    def __enter__(self) -> Self:
        """Return itself."""
        return self

    def __exit__(self, *exception: object) -> None:
        """Wait for both threads and end them."""
        self._held.close()
