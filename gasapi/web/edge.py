"""The outermost layer: who may ask and how often, what was answered already, and the count of all requests.

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
from gasapi.web.audit import Audit
from gasapi.web.body import Environ, announced_length, read_body
from gasapi.web.caching import CACHING, Caching, Freshness, matches
from gasapi.web.memo import Memo
from gasapi.web.metrics import Metrics
from gasapi.web.origins import Origins
from gasapi.web.problems import Problem
from gasapi.web.rate_limit import RateLimit, caller_address
from gasapi.web.request_id import RequestIds, trace_parent
from gasapi.web.request_log import RequestLog
from gasapi.web.tokens import TokenList
from gasapi.web.turns import TICKET, Gate, Ticket, current, wished_wait

__all__ = ["BODY", "HOLDER", "LARGE", "OPEN_PATHS", "ROUTE", "Edge", "House", "remember", "status_line"]

BODY = "gasapi.body"
"""Key of the environ under which a body that was read already stands."""

ROUTE = "gasapi.route"
"""Key of the environ under which the rule of the route stands once it is known."""

OPEN_PATHS = frozenset({"/", "/catalogue", "/guide", "/interface", "/livez", "/readyz"})
"""What is answered without a token: health, and the page for people with its papers, which asks for the token."""

HOLDER = "gasapi.holder"
"""Key of the environ under which the name of the holder of the token stands."""

LARGE = frozenset({"/v1/lookup-table", "/v1/phase-boundary", "/v1/series", "/v1/states"})
"""The questions that may be large: a share of each worker is theirs (see ``turns``)."""

LONGEST_REMEMBERED = 8 * 1024
"""Bytes of a body or a query up to which its answer is remembered."""

_OPEN_PREFIX = "/assets/"
_MEMO = "gasapi.memo"
FAILURE = "the service failed to answer this question; its log tells why"
"""All that a caller is told of an exception that nobody foresaw."""

_NO_SNIFFING = ("X-Content-Type-Options", "nosniff")
_NOT_KEPT = ("Cache-Control", "no-store")
_VARY = ("Vary", "Accept")

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


class House(NamedTuple):
    """The rules of the house.

    ``gate`` is that of large questions, ``limit`` how often one caller may ask, ``origins`` whose pages may; ``freshness`` is
    how long answers keep, ``audit`` where they are recorded, ``proxies`` how many of one's own stand before the service. None
    stands for no such rule.
    """

    freshness: Freshness
    gate: Gate
    limit: RateLimit | None = None
    origins: Origins | None = None
    audit: Audit | None = None
    proxies: int = 0


class Edge:
    """A WSGI application around another one.

    :param tokens: those that are good, None where no token is asked for
    :param house: the rules of the house
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
        house: House,
        log: RequestLog | None = None,
        direct: Mapping[str, Direct] | None = None,
        longest: int = LONGEST_REMEMBERED,
    ) -> None:
        self._application = application
        self._tokens = tokens
        self._memo = memo
        self._metrics = metrics
        self._house = house
        self._ids = RequestIds()
        self._log = log
        self._direct = direct or {}
        self._longest = min(longest, LONGEST_REMEMBERED)

    def __call__(self, environ: Environ, start_response: StartResponse) -> Iterable[bytes]:
        """Answer a request."""
        start = perf_counter()
        answered = "500"
        request_id = self._ids.of(environ)

        def started(status: str, headers: list[tuple[str, str]], exc_info: Any = None) -> Any:
            nonlocal answered
            answered = status[:3]
            headers = [*headers, *self._further(environ, answered, headers), ("X-Request-ID", request_id)]
            return start_response(status, headers, exc_info) if exc_info else start_response(status, headers)

        try:
            audit = self._house.audit
            digest = audit.listen(environ) if audit is not None else None
            body = self._answer(environ, started)
            if digest is None or audit is None or answered != "200":
                return body
            line = {"request_id": request_id, "holder": environ.get(HOLDER), "route": environ.get(ROUTE, "none")}
            return audit.record(digest, line, body)
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
                self._log.write(route, method, answered, seconds, request_id, environ)

    def _further(self, environ: Environ, answered: str, headers: list[tuple[str, str]]) -> Iterable[tuple[str, str]]:
        """Return the header fields that every answer has, those for caches, and those for pages of other origins."""
        if answered[0] in "45":
            further = [_NO_SNIFFING, _NOT_KEPT]
        elif environ["REQUEST_METHOD"] == "POST":
            further = [_NO_SNIFFING]
        else:
            names = {name for name, _ in headers}
            further = [] if _NO_SNIFFING[0] in names else [_NO_SNIFFING]
            caching: Caching | None = environ.get(CACHING)
            if caching is not None and answered == "200" and "ETag" not in names:
                further += caching.fields(environ)
                if "Vary" not in names:
                    further.append(_VARY)
            elif "Cache-Control" not in names:
                further.append(_NOT_KEPT)
        if self._house.origins is not None:
            further += self._house.origins.fields(environ)
        parent = trace_parent(environ)
        if parent is not None:
            further.append(("traceparent", parent))
        return further

    def _answer(self, environ: Environ, start_response: StartResponse) -> Iterable[bytes]:
        path = environ["PATH_INFO"]
        method = environ["REQUEST_METHOD"]
        house = self._house
        if house.origins is not None:
            inquiry = house.origins.inquiry(environ)
            if inquiry is not None:
                start_response("204 No Content", inquiry)
                return ()
        if path not in OPEN_PATHS and not path.startswith(_OPEN_PREFIX):
            holder = None
            if self._tokens is not None:
                holder = environ[HOLDER] = self._admit(environ, self._tokens)
            if house.limit is not None:
                house.limit.take(holder or caller_address(environ, house.proxies))
        if method in ("GET", "HEAD"):
            caching = house.freshness.of(path, environ["QUERY_STRING"], environ.get("HTTP_ACCEPT", ""))
            if caching is not None:
                environ[CACHING] = caching
                unchanged = matches(environ["HTTP_IF_NONE_MATCH"], caching) if "HTTP_IF_NONE_MATCH" in environ else None
                if unchanged is not None:
                    start_response("304 Not Modified", [*unchanged, _VARY])
                    return ()
        direct = self._direct.get(path)
        if direct is None or method not in ("GET", "POST"):
            return self._by_application(environ, start_response, path)
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

    def _by_application(self, environ: Environ, start_response: StartResponse, path: str) -> Iterable[bytes]:
        """Answer by the application, a question that may be large in the share that is theirs."""
        if path not in LARGE:
            return self._application(environ, start_response)
        ticket = environ[TICKET] = Ticket(self._house.gate, wished_wait(environ.get("HTTP_PREFER", "")))
        streams = False

        def started(status: str, headers: list[tuple[str, str]], exc_info: Any = None) -> Any:
            nonlocal streams
            streams = all(name.lower() != "content-length" for name, _ in headers)
            return start_response(status, headers, exc_info) if exc_info else start_response(status, headers)

        known = current.set(ticket)
        self._metrics.large(1)
        try:
            body = self._application(environ, started)
            if streams:
                body = ticket.blocks(body)
        except BaseException:
            streams = False
            raise
        finally:
            current.reset(known)
            self._metrics.large(-1)
            if not streams:
                ticket.close()
        return body

    def _admit(self, environ: Environ, tokens: TokenList) -> str:
        authorization = environ.get("HTTP_AUTHORIZATION", "")
        holder = tokens.holder(authorization)
        if holder is None:
            if authorization:
                challenge, detail = 'Bearer realm="gasapi", error="invalid_token"', "the token is not good here"
            else:
                challenge, detail = 'Bearer realm="gasapi"', "send a token as Authorization: Bearer <token>"
            raise Problem(401, detail, headers=[("WWW-Authenticate", challenge)])
        return holder

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
        caching: Caching | None = environ.get(CACHING)
        if caching is not None:
            headers = [*headers, *caching.fields(environ)]
        place.memo.put(place.key, place.size, Reply(headers, body))


def status_line(status: int) -> str:
    """Return a status with its phrase."""
    return f"{status} {HTTPStatus(status).phrase}"


def _refuse(problem: Problem, environ: Environ, start_response: StartResponse) -> Iterable[bytes]:
    body = problems.body(problem, environ["PATH_INFO"])
    headers = [("Content-Type", problems.MEDIA_TYPE), ("Content-Length", str(len(body))), *problem.headers]
    start_response(status_line(problem.status), headers)
    return () if environ["REQUEST_METHOD"] == "HEAD" else (body,)
