"""Pages of other origins (the CORS protocol of the Fetch standard): refused by the browser unless the site names them."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

__all__ = ["Origins"]

_METHODS = "GET, HEAD, POST"
_REQUEST_FIELDS = "Authorization, Content-Type, Accept, If-None-Match, Prefer, X-Request-ID, traceparent"
_ANSWER_FIELDS = "ETag, Retry-After, WWW-Authenticate, X-Request-ID"
_KEPT = "600"  # s for which a browser keeps the answer to its first inquiry

Fields = list[tuple[str, str]]


class Origins:
    """The origins whose pages may ask. No cookies are used, so that credentials are never allowed.

    :param allowed: origins as a browser sends them, as in ``https://hmi.plant.example``
    """

    def __init__(self, allowed: Iterable[str]) -> None:
        self._allowed = frozenset(allowed)

    def fields(self, environ: dict[str, Any]) -> Fields:
        """Return the header fields that an answer needs; empty for an origin that is not named."""
        origin = environ.get("HTTP_ORIGIN")
        if origin not in self._allowed:
            return [("Vary", "Origin")]
        return [
            ("Access-Control-Allow-Origin", origin),
            ("Access-Control-Expose-Headers", _ANSWER_FIELDS),
            ("Vary", "Origin"),
        ]

    def inquiry(self, environ: dict[str, Any]) -> Fields | None:
        """Return the fields that answer a browser's inquiry before a request, None where the request is none."""
        if environ["REQUEST_METHOD"] != "OPTIONS" or "HTTP_ACCESS_CONTROL_REQUEST_METHOD" not in environ:
            return None
        if environ.get("HTTP_ORIGIN") not in self._allowed:
            return []
        return [
            ("Access-Control-Allow-Methods", _METHODS),
            ("Access-Control-Allow-Headers", _REQUEST_FIELDS),
            ("Access-Control-Max-Age", _KEPT),
        ]
