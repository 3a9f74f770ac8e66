"""How often one caller may ask: a bucket for each holder of a token or each address, shared by all workers.

The generic cell rate algorithm (ITU-T I.371, annex A): of each bucket only the time is kept at which it will be empty. The
times stand in memory that all workers map, in a slot found by a hash of the caller's name; the clock is the monotonic one of
the machine, which no correction of the time of day moves. Two workers that write at the same moment may let one request
too many through.
"""

from __future__ import annotations

import hashlib
import mmap
import os
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any, Final

from gasapi.web.problems import Problem

__all__ = ["RateLimit", "caller_address"]

_SLOTS: Final = 1 << 16
_TIME: Final = 8  # bytes of a double
_SIZE: Final = _SLOTS * _TIME


class RateLimit:
    """Refuses requests beyond a rate.

    :param per_second: requests that a caller may send each second in the long run
    :param burst: requests that may come at once after a rest
    :param file: a file that all workers share; memory of this process alone where there is none
    """

    def __init__(
        self, per_second: float, burst: float, file: Path | None = None, clock: Callable[[], float] = time.monotonic
    ) -> None:
        self._interval = 1.0 / per_second
        self._slack = burst / per_second
        self._clock = clock
        self._memory = _shared(file) if file is not None else mmap.mmap(-1, _SIZE)
        self._times = memoryview(self._memory).cast("d")
        # keyed, so that nobody can look for a name that falls into the slot of another caller
        self._key = _secret(file) if file is not None else os.urandom(16)

    def take(self, caller: str) -> None:
        """Count a request.

        :raises Problem: 429 where it is one too many
        """
        digest = hashlib.blake2b(caller.encode("utf-8", "replace"), digest_size=4, key=self._key).digest()
        slot = int.from_bytes(digest, "little") % _SLOTS
        now = self._clock()
        full_at = max(now, self._times[slot]) + self._interval
        wait = full_at - now - self._slack
        if wait > 1e-9:
            seconds = str(max(1, int(wait + 0.999)))
            raise Problem(
                429,
                f"at most {1.0 / self._interval:g} requests a second are answered to one caller; wait {seconds} s",
                headers=[("Retry-After", seconds)],
            )
        self._times[slot] = full_at


def caller_address(environ: dict[str, Any], proxies: int) -> str:
    """Return the address of the caller.

    :param proxies: how many proxies of one's own stand before the service; each adds an entry to ``X-Forwarded-For``
    """
    if proxies:
        entries = [entry.strip() for entry in environ.get("HTTP_X_FORWARDED_FOR", "").split(",")]
        if len(entries) >= proxies and entries[-proxies]:
            return str(entries[-proxies])
    return str(environ.get("REMOTE_ADDR", ""))


def _shared(file: Path) -> mmap.mmap:
    descriptor = os.open(file, os.O_RDWR | os.O_CREAT, 0o600)
    try:
        # growing a file that is long enough already changes nothing, whichever worker comes first
        os.ftruncate(descriptor, _SIZE + 16)
        return mmap.mmap(descriptor, _SIZE)
    finally:
        os.close(descriptor)


def _secret(file: Path) -> bytes:
    """Return a key that all workers derive alike from what only they can read."""
    return hashlib.blake2b(f"{file.stat().st_ino} {file}".encode(), digest_size=16).digest()
