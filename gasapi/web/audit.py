"""A line for each question that was answered: what was asked, what was answered, by which data, as hashes.

``question`` is the SHA-256 of method, path, query, media types and body, ``answer`` that of its body as it was first
given (``trace.cached`` false): the same question has the same two hashes for as long as ``data`` is the same, and an answer
on file can be shown to be the one that was given.
"""

from __future__ import annotations

import hashlib
import logging
import os
from collections.abc import Callable, Iterable, Iterator
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

import orjson

__all__ = ["Audit", "answer_hash", "question_hash"]

_ASKED = "/v1/"
_FIRST, _AGAIN = b'"trace":{"cached":false,', b'"trace":{"cached":true,'

_log = logging.getLogger("gasapi")


class _Read:
    """An input stream that hashes what is read from it."""

    def __init__(self, stream: Any, digest: Any) -> None:
        self._stream = stream
        self._digest = digest

    def read(self, *size: int) -> bytes:
        data: bytes = self._stream.read(*size)
        self._digest.update(data)
        return data

    def __getattr__(self, name: str) -> Any:
        return getattr(self._stream, name)


class _Sent:
    """An answer that is hashed on its way out; the line is written once it has ended."""

    def __init__(self, body: Iterable[bytes], write: Callable[[str], None]) -> None:
        self._body = body
        self._blocks = iter(body)
        self._write = write
        self._digest = hashlib.sha256()
        self._ended = False

    def __iter__(self) -> Iterator[bytes]:
        return self

    def __next__(self) -> bytes:
        try:
            block = next(self._blocks)
        except StopIteration:
            self._ended = True
            raise
        self._digest.update(block.replace(_AGAIN, _FIRST))
        return block

    def close(self) -> None:
        close: Any = getattr(self._body, "close", None)
        if close is not None:
            close()
        # an answer that the client did not take to its end has no hash
        self._write(f"sha256:{self._digest.hexdigest()}" if self._ended else "not taken")


class Audit:
    """Writes the lines.

    :param file: where to; lines are added, whole, so that several workers may write to one file
    :param data: hash of the data and the engine
    :param failed: called where a line could not be written, as on a full disk; the answer is given all the same
    """

    def __init__(self, file: Path, data: str, failed: Callable[[], None]) -> None:
        self._descriptor = os.open(file, os.O_WRONLY | os.O_APPEND | os.O_CREAT, 0o640)
        self._data = data
        self._failed = failed

    def listen(self, environ: dict[str, Any]) -> Any | None:
        """Return a digest of the question that follows its body as it is read, None where the request is no question."""
        if not environ["PATH_INFO"].startswith(_ASKED):
            return None
        digest = hashlib.sha256(_head(environ))
        environ["wsgi.input"] = _Read(environ["wsgi.input"], digest)
        return digest

    def record(self, digest: Any, request: dict[str, Any], body: Iterable[bytes]) -> Iterable[bytes]:
        """Return an answer whose line is written when it has left.

        :param request: further members of the line: request id, holder, route, status
        """

        def write(answer: str) -> None:
            line = {
                "time": datetime.now(UTC),
                **request,
                "question": f"sha256:{digest.hexdigest()}",
                "answer": answer,
                "data": self._data,
            }
            try:
                os.write(self._descriptor, orjson.dumps(line, option=orjson.OPT_APPEND_NEWLINE | orjson.OPT_UTC_Z))
            except OSError as error:
                self._failed()
                _log.error("a line of the audit file could not be written: %s", error.strerror)

        return _Sent(body, write)


def _head(environ: dict[str, Any]) -> bytes:
    names = ("REQUEST_METHOD", "PATH_INFO", "QUERY_STRING", "CONTENT_TYPE", "HTTP_ACCEPT")
    return "".join(f"{environ.get(name, '')}\n" for name in names).encode("utf-8", "surrogateescape")


def question_hash(method: str, path: str, query: str, content_type: str, accept: str, body: bytes) -> str:
    """Return the hash that a line has for a question, to find it by."""
    head = "".join(f"{text}\n" for text in (method, path, query, content_type, accept)).encode("utf-8", "surrogateescape")
    return f"sha256:{hashlib.sha256(head + body).hexdigest()}"


def answer_hash(body: bytes) -> str:
    """Return the hash that a line has for the body of an answer."""
    return f"sha256:{hashlib.sha256(body.replace(_AGAIN, _FIRST)).hexdigest()}"
