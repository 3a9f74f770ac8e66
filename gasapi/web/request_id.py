"""The id of a request, and the trace that it belongs to (W3C Trace Context)."""

from __future__ import annotations

import os
import re
from itertools import count
from typing import Any

__all__ = ["RequestIds", "trace_parent"]

_ID = re.compile(r"[A-Za-z0-9._:/+=@-]{1,128}")

# version 00; a trace or parent of zeros only is invalid (Trace Context, sections 3.2.2.3 and 3.2.2.4)
_PARENT = re.compile(r"00-(?!0{32})[0-9a-f]{32}-(?!0{16})[0-9a-f]{16}-[0-9a-f]{2}")


class RequestIds:
    """Takes the id that a request brings, or makes one: the worker's own random part, and a number."""

    def __init__(self) -> None:
        self._prefix = os.urandom(6).hex()
        self._numbers = count(1)

    def of(self, environ: dict[str, Any]) -> str:
        """Return the id of a request; one that is long or not plain is not taken, since it goes into logs and headers."""
        given: str | None = environ.get("HTTP_X_REQUEST_ID")
        if given is not None and _ID.fullmatch(given):
            return given
        return f"{self._prefix}-{next(self._numbers):x}"


def trace_parent(environ: dict[str, Any]) -> str | None:
    """Return the ``traceparent`` of a request, None where there is none or it is not valid."""
    given: str | None = environ.get("HTTP_TRACEPARENT")
    return given if given is not None and _PARENT.fullmatch(given) else None
