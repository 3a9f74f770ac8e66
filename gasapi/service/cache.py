"""A bounded memo: the least recently used entry leaves first. The one mutable object of the service.

An entry is a function of its key alone, so whatever is held, evicted or computed twice, answers are the same.
"""

from __future__ import annotations

from collections.abc import Callable, Hashable
from threading import Lock
from typing import Generic, NamedTuple, TypeVar

__all__ = ["BoundedCache", "CacheCounts"]

Key = TypeVar("Key", bound=Hashable)
Value = TypeVar("Value")


class CacheCounts(NamedTuple):
    """How a cache has done: look-ups that found and that did not, entries held, and the bound."""

    hits: int
    misses: int
    held: int
    bound: int


class BoundedCache(Generic[Key, Value]):
    """A thread-safe mapping that holds at most ``bound`` entries.

    :param bound: largest number of entries, at least 1
    """

    def __init__(self, bound: int) -> None:
        if bound < 1:
            raise ValueError("a cache holds at least one entry")
        self._bound = bound
        self._entries: dict[Key, Value] = {}
        self._lock = Lock()
        self._hits = 0
        self._misses = 0

    def get(self, key: Key) -> Value | None:
        """Return the entry of a key, or None."""
        with self._lock:
            entry = self._entries.pop(key, None)
            if entry is None:
                self._misses += 1
                return None
            self._hits += 1
            # a dict keeps the order of insertion: the first is the least recently used
            self._entries[key] = entry
            return entry

    def put(self, key: Key, value: Value) -> None:
        """Hold an entry, and let the oldest go where there are too many."""
        with self._lock:
            self._entries[key] = value
            if len(self._entries) > self._bound:
                del self._entries[next(iter(self._entries))]

    def get_or_make(self, key: Key, make: Callable[[], Value]) -> Value:
        """Return the entry of a key, made first where it is not held; two threads may both make it, alike."""
        entry = self.get(key)
        if entry is None:
            entry = make()
            self.put(key, entry)
        return entry

    def counts(self) -> CacheCounts:
        """Return the counters."""
        with self._lock:
            return CacheCounts(self._hits, self._misses, len(self._entries), self._bound)
