"""The outermost layer: who may ask, what was answered already, and the count of all requests.

It stands before Flask. A question that was answered in this worker costs neither routing nor validation, and a route that
is asked at scan rate can be answered directly.
"""

from __future__ import annotations

import logging
from collections.abc import Callable, Iterable, Mapping
from http import HTTPStatus
from time import perf_counter
from typing import Any, NamedTuple

from gasapi.web import problems
from gasapi.web.body import Environ, announced_length, read_body
from gasapi.web.memo import Memo
from gasapi.web.metrics import Metrics
from gasapi.web.problems import Problem
from gasapi.web.request_log import RequestLog
from gasapi.web.tokens import TokenList

__all__ = ["BODY", "OPEN_PATHS", "ROUTE", "Edge", "remember", "status_line"]

BODY = "gasapi.body"
"""Key of the environ under which a body that was read already stands."""

ROUTE = "gasapi.route"
"""Key of the environ under which the rule of the route stands once it is known."""

OPEN_PATHS = frozenset({"/", "/catalogue", "/guide", "/interface", "/livez", "/readyz"})
"""What is answered without a token: health, and the page for people with its papers, which asks for the token."""

LONGEST_REMEMBERED = 8 * 1024
"""Bytes of a body or a query up to which its answer is remembered."""

_OPEN_PREFIX = "/assets/"
_MEMO = "gasapi.memo"
FAILURE = "the service failed to answer this question; its log tells why"
"""All that a caller is told of an exception that nobody foresaw."""

_KNOWN_METHODS = frozenset({"GET", "HEAD", "POST", "OPTIONS", "PUT", "PATCH", "DELETE"})

_log = logging.getLogger("gasapi")

StartResponse = Callable[..., Any]
Application = Callable[[Environ, StartResponse], Iterable[bytes]]


class Reply(NamedTuple):
    """An answer with status 200: its headers, the length among them, and its body."""

    headers: list[tuple[str, str]]
    body: bytes


Direct = Callable[[Environ], Reply]
"""What answers a GET or POST from its environ alone; it raises a Problem where there is no answer."""


class _Place(NamedTuple):
    """Where the answer to a request is to be remembered."""

    memo: Memo
    key: tuple[str, str, str, str, str, bytes]

    @property
    def size(self) -> int:
        return sum(map(len, self.key))


class Edge:
    """A WSGI application around another one.

    :param tokens: those that are good, None where no token is asked for
    :param direct: what answers GET and POST by path, memo included, without the application
    :param longest: bytes that a body may have at most to be read here
    :param log: where a line is written for each request, None where none is wanted
    """

    def __init__(
        self,
        application: Application,
        tokens: TokenList | None,
        memo: Memo,
        metrics: Metrics,
        log: RequestLog | None = None,
        direct: Mapping[str, Direct] | None = None,
        longest: int = LONGEST_REMEMBERED,
    ) -> None:
        self._application = application
        self._tokens = tokens
        self._memo = memo
        self._metrics = metrics
        self._log = log
        self._direct = direct or {}
        self._longest = min(longest, LONGEST_REMEMBERED)

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
        except Exception:
            _log.exception("a request failed")
            return _refuse(Problem(500, FAILURE), environ, started)
        finally:
            route = environ.get(ROUTE, "none")
            method = environ["REQUEST_METHOD"]
            if method not in _KNOWN_METHODS:
                method = "other"
            seconds = perf_counter() - start
            self._metrics.request(route, method, answered, seconds)
            if self._log is not None:
                self._log.write(route, method, answered, seconds)

    def _answer(self, environ: Environ, start_response: StartResponse) -> Iterable[bytes]:
        path = environ["PATH_INFO"]
        if self._tokens is not None and path not in OPEN_PATHS and not path.startswith(_OPEN_PREFIX):
            self._admit(environ, self._tokens)
        direct = self._direct.get(path)
        if direct is None or environ["REQUEST_METHOD"] not in ("GET", "POST"):
            return self._application(environ, start_response)
        environ[ROUTE] = path
        place = self._place(path, environ)
        if place is not None:
            remembered = self._memo.get(place.key)
            self._metrics.memo(remembered is not None)
            if remembered is not None:
                start_response("200 OK", list(remembered.headers))
                return (remembered.body,)
            environ[_MEMO] = place
        reply = direct(environ)
        start_response("200 OK", reply.headers)
        return (reply.body,)

    def _admit(self, environ: Environ, tokens: TokenList) -> None:
        authorization = environ.get("HTTP_AUTHORIZATION", "")
        if tokens.holder(authorization) is None:
            if authorization:
                challenge, detail = 'Bearer realm="gasapi", error="invalid_token"', "the token is not good here"
            else:
                challenge, detail = 'Bearer realm="gasapi"', "send a token as Authorization: Bearer <token>"
            raise Problem(401, detail, headers=[("WWW-Authenticate", challenge)])

    def _place(self, path: str, environ: Environ) -> _Place | None:
        """Return where the answer to a GET or POST would be remembered; None where the request is too long for that."""
        method = environ["REQUEST_METHOD"]
        body = b""
        if method == "POST":
            length = announced_length(environ)
            if length is None or not 0 < length <= self._longest:
                return None
            body = environ[BODY] = read_body(environ, self._longest)
        query = environ["QUERY_STRING"]
        if len(query) > LONGEST_REMEMBERED:
            return None
        # the encoding of the content counts as part of its type: either makes another request of the same bytes
        content = environ.get("CONTENT_TYPE", "") + "\n" + environ.get("HTTP_CONTENT_ENCODING", "")
        return _Place(self._memo, (path, method, environ.get("HTTP_ACCEPT", ""), content, query, body))


def remember(environ: Environ, headers: list[tuple[str, str]], body: bytes) -> None:
    """Keep an answer for the next request of the same bytes, where there is a place for it."""
    place: _Place | None = environ.get(_MEMO)
    if place is not None:
        place.memo.put(place.key, place.size, Reply(headers, body))


def status_line(status: int) -> str:
    """Return a status with its phrase."""
    return f"{status} {HTTPStatus(status).phrase}"


def _refuse(problem: Problem, environ: Environ, start_response: StartResponse) -> Iterable[bytes]:
    body = problems.body(problem, environ["PATH_INFO"])
    headers = [("Content-Type", problems.MEDIA_TYPE), ("Content-Length", str(len(body))), *problem.headers]
    start_response(status_line(problem.status), headers)
    return () if environ["REQUEST_METHOD"] == "HEAD" else (body,)
