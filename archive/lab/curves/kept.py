"""Things worked out from sealed bytes, kept in memory by what they were worked out from, up to a bound.

Sealed bytes never change, so a digest is all that a key needs; the process may hold as many archives as it likes.
"""

from __future__ import annotations

import threading
from collections import OrderedDict
from collections.abc import Callable, Hashable
from typing import Generic, TypeVar

__all__ = ["Kept"]

T = TypeVar("T")


class Kept(Generic[T]):
    """A store in memory that forgets what was not asked for longest.

    Parameters
    ----------
    most : int
        Bytes it may hold.
    size : callable
        Bytes that one thing takes.

    Examples
    --------
    >>> kept = Kept(most=8, size=len)
    >>> kept.get("a", lambda: "12345"), kept.get("b", lambda: "6789"), kept.get("a", lambda: "again")
    ('12345', '6789', 'again')
    """

    def __init__(self, *, most: int, size: Callable[[T], int]) -> None:
        self._most, self._size = most, size
        self._things: OrderedDict[Hashable, T] = OrderedDict()
        self._lock = threading.Lock()
        self._making: dict[Hashable, threading.Lock] = {}
        self._held = 0

    @property
    def held(self) -> int:
        """Bytes it holds."""
        return self._held

    def get(self, key: Hashable, make: Callable[[], T]) -> T:
        """The thing of a key; made if it is not held, by one thread alone while others wait for it."""
        with self._lock:
            if key in self._things:
                self._things.move_to_end(key)
                return self._things[key]
            mine = self._making.setdefault(key, threading.Lock())
        with mine:
            with self._lock:
                if key in self._things:
                    return self._things[key]
            try:
                made = make()
            finally:
                with self._lock:
                    self._making.pop(key, None)
            with self._lock:
                self._things[key] = made
                self._held += self._size(made)
                while self._held > self._most and len(self._things) > 1:
                    _, dropped = self._things.popitem(last=False)
                    self._held -= self._size(dropped)
        return made
