"""The bytes of a request body, within a limit whether or not the length was announced."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from gasapi.web.negotiation import JSON, content_type
from gasapi.web.problems import Problem
from gasapi.web.turns import TICKET

__all__ = ["Environ", "announced_length", "read_body", "require_json"]

_PIECE = 256 * 1024

Environ = dict[str, Any]
"""What WSGI (PEP 3333) tells of a request."""


def announced_length(environ: Environ) -> int | None:
    """Return the length that a request announces for its body, None where it comes in chunks."""
    if environ.get("HTTP_TRANSFER_ENCODING"):
        return None
    text = environ.get("CONTENT_LENGTH") or "0"
    return int(text) if text.isascii() and text.isdigit() else 0


def read_body(environ: Environ, limit: int) -> bytes:
    """Return the body of a request; a large question waits for its turn here, once the body has come.

    :param limit: bytes that it may have
    :raises Problem: 400 where the body breaks off or its chunks are broken; 408 where it does not come; 413 where it is longer
        than the limit; 503 where there are too many large questions
    """
    length = announced_length(environ)
    ticket = environ.get(TICKET)
    hold = ticket.hold if ticket is not None else _hold_all
    try:
        body = (
            _read_announced(environ["wsgi.input"], length, limit, hold)
            if length is not None
            else _read_chunks(environ["wsgi.input"], limit, hold)
        )
    except Problem:
        raise
    except TimeoutError:
        raise Problem(408, "the body did not arrive in time; send it again") from None
    except Exception:
        # each server has exceptions of its own for broken chunks and connections; none is the service's fault
        raise Problem(400, "the body cannot be read: its chunks are broken, or the connection ended") from None
    if ticket is not None:
        ticket.enter()
    return body


def _hold_all(size: int) -> None:
    """Hold a part of a body, of which small ones are not counted."""


def _read_announced(stream: Any, length: int, limit: int, hold: Callable[[int], None]) -> bytes:
    if length > limit:
        raise _too_large(limit)
    # a piece counts once it has come: a client that announces much and sends nothing takes no room from others
    body: bytes = _pieces(stream, length, hold) if length > _PIECE else stream.read(length)
    if len(body) < length:
        raise Problem(400, f"the body ends after {len(body)} of the {length} bytes that were announced")
    return body


def _read_chunks(stream: Any, limit: int, hold: Callable[[int], None]) -> bytes:
    body = _pieces(stream, limit + 1, hold)
    if len(body) > limit:
        raise _too_large(limit)
    return body


def _pieces(stream: Any, most: int, hold: Callable[[int], None]) -> bytes:
    pieces, held = [], 0
    while held < most and (piece := stream.read(min(_PIECE, most - held))):
        hold(len(piece))
        held += len(piece)
        pieces.append(piece)
    return b"".join(pieces)


def require_json(environ: Environ) -> None:
    """Check that a request says that its body is JSON in UTF-8, as it stands.

    :raises Problem: 415 where it does not
    """
    given = environ.get("CONTENT_TYPE", "")
    kind = content_type(given)
    if kind is None or (kind.type, kind.subtype) != (JSON.type, JSON.subtype):
        what = "no Content-Type" if not given else f"Content-Type: {given[:100]}"
        raise Problem(415, f"the request has {what}; send the question with Content-Type: application/json")
    if dict(kind.parameters).get("charset", "utf-8") != "utf-8":
        raise Problem(415, "JSON is UTF-8 here; leave the charset out")
    encoding = environ.get("HTTP_CONTENT_ENCODING", "identity").strip().lower()
    if encoding not in ("", "identity"):
        raise Problem(415, "the body is compressed; send it as it stands", headers=[("Accept-Encoding", "identity")])


def _too_large(limit: int) -> Problem:
    return Problem(413, f"the body is larger than the {limit} bytes that are taken here; split the question")
