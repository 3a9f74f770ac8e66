"""One line of JSON for each request, on standard output. Nothing of a question stands in it unless the site asks for that."""

from __future__ import annotations

import os
from datetime import UTC, datetime
from typing import Any

import orjson

from gasapi.web.request_id import trace_parent

__all__ = ["RequestLog"]

_LONGEST = 2000


class RequestLog:
    """Writes whole lines, so that those of several workers do not mix.

    :param descriptor: the file descriptor to write to
    :param questions: whether the query, and a short body, are written down as well
    """

    def __init__(self, descriptor: int, questions: bool = False) -> None:
        self._descriptor = descriptor
        self._questions = questions

    def write(self, route: str, method: str, status: str, seconds: float, request_id: str, environ: dict[str, Any]) -> None:
        """Write the line of a request; a log that cannot be written must not cost an answer.

        :param route: the rule of the route, never what a caller typed
        :param status: three digits
        """
        line: dict[str, Any] = {
            "time": datetime.now(UTC),
            "route": route,
            "method": method,
            "status": int(status),
            "seconds": round(seconds, 6),
            "request_id": request_id,
        }
        parent = trace_parent(environ)
        if parent is not None:
            line["trace_id"] = parent[3:35]
        if self._questions:
            line["query"] = environ["QUERY_STRING"][:_LONGEST].encode("latin-1", "replace").decode("latin-1")
            line["body"] = environ.get("gasapi.body", b"")[:_LONGEST].decode("utf-8", "replace")
        try:
            os.write(self._descriptor, orjson.dumps(line, option=orjson.OPT_APPEND_NEWLINE | orjson.OPT_UTC_Z))
        except OSError:
            return
