"""The outermost layer: who may ask, what was answered already, and the count of all requests.

It stands before Flask, so that a question that was answered in this worker costs neither routing nor validation.
"""

from __future__ import annotations

import logging
from collections.abc import Callable, Iterable
from http import HTTPStatus
from io import BytesIO
from time import perf_counter
from typing import Any, NamedTuple

from gasapi.web import problems
from gasapi.web.body import announced_length, read_body
from gasapi.web.memo import Memo, Remembered
from gasapi.web.metrics import Metrics
from gasapi.web.problems import Problem
from gasapi.web.tokens import TokenList

__all__ = ["BODY", "OPEN_PATHS", "ROUTE", "Edge", "remember", "status_line"]

BODY = "gasapi.body"
"""Key of the environ under which a body that was read already stands."""

ROUTE = "gasapi.route"
"""Key of the environ under which the rule of the route stands once it is known."""

OPEN_PATHS = frozenset({"/", "/livez", "/readyz"})
"""What is answered without a token: health, and the page for people, which asks for the token."""

_OPEN_PREFIX = "/assets/"
_MEMO = "gasapi.memo"
_MEMO_PATH = "/v1/state"
_LONGEST_KEY = 8 * 1024
_KNOWN_METHODS = frozenset({"GET", "HEAD", "POST", "OPTIONS", "PUT", "PATCH", "DELETE"})

_log = logging.getLogger(__name__)

Environ = dict[str, Any]
StartResponse = Callable[..., Any]
Application = Callable[[Environ, StartResponse], Iterable[bytes]]


class _Place(NamedTuple):
    """Where the answer to a request is to be remembered."""

    memo: Memo
    key: tuple[str, str, str, str, bytes]

    @property
    def size(self) -> int:
        return sum(map(len, self.key))


class Edge:
    """A WSGI application around another one.

    :param tokens: those that are good, None where no token is asked for
    """

    def __init__(self, application: Application, tokens: TokenList | None, memo: Memo, metrics: Metrics) -> None:
        self._application = application
        self._tokens = tokens
        self._memo = memo
        self._metrics = metrics

    def __call__(self, environ: Environ, start_response: StartResponse) -> Iterable[bytes]:
        """Answer a request."""
        start = perf_counter()
        answered = "500"

        def started(status: str, headers: list[tuple[str, str]], exc_info: Any = None) -> Any:
            nonlocal answered
            answered = status[:3]
            return start_response(status, headers, exc_info) if exc_info else start_response(status, headers)

        try:
            return self._answer(environ, started)
        except Problem as problem:
            return _refuse(problem, environ, started)
        finally:
            method = environ["REQUEST_METHOD"]
            self._metrics.request(
                environ.get(ROUTE, "none"),
                method if method in _KNOWN_METHODS else "other",
                answered,
                perf_counter() - start,
            )

    def _answer(self, environ: Environ, start_response: StartResponse) -> Iterable[bytes]:
        path = environ["PATH_INFO"]
        if self._tokens is not None and path not in OPEN_PATHS and not path.startswith(_OPEN_PREFIX):
            self._admit(environ, self._tokens)
        if path == _MEMO_PATH:
            place = self._place(environ)
            if place is not None:
                remembered = self._memo.get(place.key)
                self._metrics.memo(remembered is not None)
                if remembered is not None:
                    environ[ROUTE] = _MEMO_PATH
                    start_response("200 OK", list(remembered.headers))
                    return (remembered.body,)
                environ[_MEMO] = place
        return self._application(environ, start_response)

    def _admit(self, environ: Environ, tokens: TokenList) -> None:
        authorization = environ.get("HTTP_AUTHORIZATION", "")
        if tokens.holder(authorization) is None:
            if authorization:
                challenge, detail = 'Bearer realm="gasapi", error="invalid_token"', "the token is not good here"
            else:
                challenge, detail = 'Bearer realm="gasapi"', "send a token as Authorization: Bearer <token>"
            raise Problem(401, detail, headers=[("WWW-Authenticate", challenge)])

    def _place(self, environ: Environ) -> _Place | None:
        """Return where the answer would be remembered; None where the request is too long for that, or asks otherwise."""
        method = environ["REQUEST_METHOD"]
        body = b""
        if method == "POST":
            length = announced_length(environ)
            if length is None or not 0 < length <= _LONGEST_KEY:
                return None
            body = environ[BODY] = read_body(environ, _LONGEST_KEY)
            # Flask finds the stream unread, should anything look for it there
            environ["wsgi.input"] = BytesIO(body)
        elif method != "GET":
            return None
        query = environ["QUERY_STRING"]
        if len(query) > _LONGEST_KEY:
            return None
        # the encoding of the content counts as part of its type: either makes another request of the same bytes
        content = environ.get("CONTENT_TYPE", "") + "\n" + environ.get("HTTP_CONTENT_ENCODING", "")
        return _Place(self._memo, (method, environ.get("HTTP_ACCEPT", ""), content, query, body))


def remember(environ: Environ, headers: list[tuple[str, str]], body: bytes) -> None:
    """Keep an answer for the next request of the same bytes, where there is a place for it."""
    place: _Place | None = environ.get(_MEMO)
    if place is not None:
        place.memo.put(place.key, place.size, Remembered(headers, body))


def status_line(status: int) -> str:
    """Return a status with its phrase."""
    return f"{status} {HTTPStatus(status).phrase}"


def _refuse(problem: Problem, environ: Environ, start_response: StartResponse) -> Iterable[bytes]:
    body = problems.body(problem, environ["PATH_INFO"])
    headers = [("Content-Type", problems.MEDIA_TYPE), ("Content-Length", str(len(body))), *problem.headers]
    start_response(status_line(problem.status), headers)
    return () if environ["REQUEST_METHOD"] == "HEAD" else (body,)
