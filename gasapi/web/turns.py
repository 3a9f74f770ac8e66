"""The share of large questions: how many are worked on at a time, how many wait, how long, and in how much memory.

A small question is answered within its turn of the event loop. A large one enters a gate first, so that few are worked on at
once, and gives way between blocks of rows. What must wait too long, and what finds the line full, is told so (503) instead
of being kept; a deadline is looked at between blocks, so that work that nobody waits for any longer stops.

The gate is entered when the body is there: a client that sends slowly waits in nobody's way. An answer that leaves block by
block holds the gate only while a block is worked on, not while a slow client takes it.
"""

from __future__ import annotations

import re
import threading
import time
from collections import deque
from collections.abc import Iterable, Iterator
from contextvars import ContextVar
from typing import Any, Final, NamedTuple

from gasapi.web.problems import Problem

__all__ = ["TICKET", "Gate", "Share", "Ticket", "current", "give_way", "wished_wait"]

TICKET: Final = "gasapi.ticket"
"""Key of the environ under which the ``Ticket`` of a large question stands."""

_MEBIBYTE: Final = 1024 * 1024
_RETRY_AFTER: Final = "1"
_LONGEST_WAIT: Final = 3600.0

# RFC 7240, section 4.3: delta-seconds
_WAIT: Final = re.compile(r'(?:^|[,;])\s*wait\s*=\s*"?([0-9]{1,9})"?\s*(?=[,;]|$)', re.IGNORECASE)


class Share(NamedTuple):
    """What large questions may take of a worker.

    ``active`` are worked on at a time, ``waiting`` stand in line, each for ``seconds`` in all unless it wishes less; their
    bodies take at most ``body_bytes`` together.
    """

    active: int = 2
    waiting: int = 64
    seconds: float = 60.0
    body_bytes: int = 192 * _MEBIBYTE


def _unavailable(detail: str) -> Problem:
    return Problem(503, detail, headers=[("Retry-After", _RETRY_AFTER)])


def wished_wait(prefer: str) -> float | None:
    """Return the seconds that a client is willing to wait (``Prefer: wait=2``, RFC 7240), None where it does not say."""
    found = _WAIT.search(prefer[:1000])
    return min(float(found[1]), _LONGEST_WAIT) if found else None


class Gate:
    """Lets ``share.active`` through at a time, in the order of their coming. Safe to share between threads."""

    def __init__(self, share: Share) -> None:
        self.share = share
        # made here and not on import: a worker may have put locks of its own kind in place by now
        self._lock = threading.Lock()
        self._free = share.active
        self._line: deque[threading.Event] = deque()
        self._body_bytes = 0

    @property
    def is_full(self) -> bool:
        """Whether one who comes now is sent away."""
        return len(self._line) >= self.share.waiting

    @property
    def waiting(self) -> int:
        """How many stand in line."""
        return len(self._line)

    def enter(self, until: float, *, expected: bool = False) -> None:
        """Wait for a turn; ``leave`` must follow.

        :param until: by the monotonic clock
        :param expected: whether the place in line was promised before, as to an answer that has begun
        :raises Problem: 503 where the line is full or the wait too long
        """
        with self._lock:
            if self._free and not self._line:
                self._free -= 1
                return
            if self.is_full and not expected:
                raise _unavailable(f"{len(self._line)} large questions wait already; ask again")
            turn = threading.Event()
            self._line.append(turn)
        try:
            come = turn.wait(max(0.0, until - time.monotonic()))
        except BaseException:
            self._give_up(turn)
            raise
        if not come and not self._give_up(turn, pass_on=False):
            raise _unavailable("large questions ahead of this one took all the time that it had; ask again")

    def _give_up(self, turn: threading.Event, *, pass_on: bool = True) -> bool:
        """Leave the line; return whether the turn had come meanwhile, and pass it on unless it is to be kept."""
        with self._lock:
            if not turn.is_set():
                self._line.remove(turn)
                return False
        if pass_on:
            self.leave()
        return True

    def leave(self) -> None:
        """Let the next one through."""
        with self._lock:
            if self._line:
                self._line.popleft().set()
            else:
                self._free += 1

    def hold(self, size: int) -> None:
        """Count bytes of bodies that are held, or let go where negative.

        :raises Problem: 503 where there are too many
        """
        with self._lock:
            if size > 0 and self._body_bytes + size > self.share.body_bytes:
                raise _unavailable("the bodies of large questions take all the memory that they may; ask again")
            self._body_bytes += size


class Ticket:
    """A large question on its way through the gate. For one request, in one thread.

    :param wish: s that the client is willing to wait, None for the common bound
    """

    def __init__(self, gate: Gate, wish: float | None = None) -> None:
        self._gate = gate
        seconds = gate.share.seconds if wish is None else min(wish, gate.share.seconds)
        self._seconds = seconds
        self._until = time.monotonic() + seconds
        self._inside = False
        self._held = 0

    def hold(self, size: int) -> None:
        """Count bytes of the body; raises as ``Gate.hold`` does."""
        self._gate.hold(size)
        self._held += size

    def enter(self) -> None:
        """Wait for the turn; to be called when the body is there. Raises as ``Gate.enter`` does."""
        if not self._inside:
            self._gate.enter(self._until)
            self._inside = True

    def check(self) -> None:
        """Look at the clock.

        :raises Problem: 503 where the time is over
        """
        if time.monotonic() > self._until:
            raise _unavailable(f"the answer was not ready within {self._seconds:g} s; ask for fewer rows, or wait longer")

    def leave(self) -> None:
        """Let the next one through; the body is still held."""
        if self._inside:
            self._inside = False
            self._gate.leave()

    def close(self) -> None:
        """Leave for good."""
        self.leave()
        if self._held:
            held, self._held = self._held, 0
            self._gate.hold(-held)

    def blocks(self, body: Iterable[bytes]) -> Iterable[bytes]:
        """Return an answer that leaves block by block, each worked on in a turn of its own."""
        self.leave()
        return _Blocks(self._gate, self, body)


class _Blocks:
    """The blocks of an answer; closes it, and the ticket, at the end."""

    def __init__(self, gate: Gate, ticket: Ticket, body: Iterable[bytes]) -> None:
        self._gate = gate
        self._ticket = ticket
        self._body = body
        self._blocks: Iterator[bytes] = iter(body)

    def __iter__(self) -> Iterator[bytes]:
        return self

    def __next__(self) -> bytes:
        # what has begun is finished, however long the line
        self._gate.enter(time.monotonic() + 1e6, expected=True)
        try:
            return next(self._blocks)
        finally:
            self._gate.leave()

    def close(self) -> None:
        close: Any = getattr(self._body, "close", None)
        try:
            if close is not None:
                close()
        finally:
            self._ticket.close()


current: ContextVar[Ticket | None] = ContextVar("ticket", default=None)
"""The ticket of the request that is being answered, for those who are too deep to be handed it."""


def give_way() -> None:
    """Let other requests of this worker have their turn, and stop where the deadline has passed.

    ``time.sleep`` is looked up at the call, since a worker may have put its own in place.

    :raises Problem: 503 where the time is over
    """
    ticket = current.get()
    if ticket is not None:
        ticket.check()
    time.sleep(0)
