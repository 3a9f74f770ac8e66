"""A bounded memo from the bytes of a request to the bytes of its answer, ahead of all validation; one for each worker.

An answer depends on nothing but the question and the data that the worker holds, so it may be given again for as long as
the worker lives. The least recently used entry makes room for a new one.
"""

from __future__ import annotations

from collections import OrderedDict
from collections.abc import Hashable
from threading import Lock
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from gasapi.web.edge import Reply

__all__ = ["Memo"]

_OVERHEAD = 400  # bytes that an entry costs besides its key and its body, roughly


class Memo:
    """At most ``entries`` answers in at most ``size`` bytes, keys included. Safe to share between threads."""

    def __init__(self, entries: int, size: int) -> None:
        self._entries = entries
        self._size = size
        self._held = 0
        self._answers: OrderedDict[Hashable, tuple[Reply, int]] = OrderedDict()
        self._lock = Lock()

    def get(self, key: Hashable) -> Reply | None:
        """Return the answer to a request, None where it is not held."""
        with self._lock:
            found = self._answers.get(key)
            if found is None:
                return None
            self._answers.move_to_end(key)
        return found[0]

    def put(self, key: Hashable, key_size: int, answer: Reply) -> None:
        """Hold an answer, unless it alone would fill a hundredth of the memo.

        :param key_size: bytes that the key takes
        """
        size = key_size + len(answer.body) + _OVERHEAD
        if size * 100 > self._size:
            return
        with self._lock:
            old = self._answers.pop(key, None)
            if old is not None:
                self._held -= old[1]
            self._answers[key] = (answer, size)
            self._held += size
            while self._held > self._size or len(self._answers) > self._entries:
                self._held -= self._answers.popitem(last=False)[1][1]

    @property
    def entries(self) -> int:
        """How many answers are held."""
        return len(self._answers)

    @property
    def size(self) -> int:
        """How many bytes they take."""
        return self._held
