"""One line of JSON for each request, on standard output. No composition and no number of a question stands in it."""

from __future__ import annotations

import os
from datetime import UTC, datetime

import orjson

__all__ = ["RequestLog"]


class RequestLog:
    """Writes whole lines, so that those of several workers do not mix.

    :param descriptor: the file descriptor to write to
    """

    def __init__(self, descriptor: int) -> None:
        self._descriptor = descriptor

    def write(self, route: str, method: str, status: str, seconds: float) -> None:
        """Write the line of a request; a log that cannot be written must not cost an answer.

        :param route: the rule of the route, never what a caller typed
        :param status: three digits
        """
        line = {
            "time": datetime.now(UTC),
            "route": route,
            "method": method,
            "status": int(status),
            "seconds": round(seconds, 6),
        }
        try:
            os.write(self._descriptor, orjson.dumps(line, option=orjson.OPT_APPEND_NEWLINE | orjson.OPT_UTC_Z))
        except OSError:
            return
