"""Errors as RFC 9457 has them: which status and title an error gets, and how its members are pointed at (RFC 6901)."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from typing import Any, NamedTuple
from urllib.parse import quote

import orjson

from gasapi.errors import FractionsInvalid, GasapiError, ModelCannotServe, UnknownGas, UnknownModel

__all__ = [
    "KINDS",
    "MEDIA_TYPE",
    "Fault",
    "Path",
    "Problem",
    "body",
    "document",
    "invalid",
    "located",
    "path_of",
    "pointer",
    "shown",
]

MEDIA_TYPE = "application/problem+json"

LARGEST_BODY = 16 * 1024
"""Bytes of an error body at most; a bad request may be huge, the answer to it is not."""

_LONGEST_DETAIL = 1000
_LONGEST_POINTER = 256
_LONGEST_SHOWN = 60
_LONGEST_INSTANCE = 200


Path = tuple[str | int, ...]
"""Where a member stands: the names and indices that lead to it."""


class Kind(NamedTuple):
    """A kind of problem: its name in the OpenAPI document, where ``type`` leads, and a title."""

    component: str
    title: str


KINDS: Mapping[int, Kind] = {
    400: Kind("BadRequest", "The request cannot be read"),
    401: Kind("Unauthorized", "A token is needed"),
    404: Kind("NotFound", "Nothing is found here"),
    405: Kind("MethodNotAllowed", "The method is not allowed here"),
    406: Kind("NotAcceptable", "No acceptable form of the answer"),
    408: Kind("RequestTimeout", "The request took too long to arrive"),
    413: Kind("ContentTooLarge", "The body is too large"),
    415: Kind("UnsupportedMediaType", "The body has the wrong media type"),
    422: Kind("UnprocessableContent", "The question does not make sense"),
    429: Kind("TooManyRequests", "Too many requests"),
    500: Kind("InternalServerError", "The service failed"),
    503: Kind("ServiceUnavailable", "The service cannot answer now"),
}
"""Every status that an error may have."""


class Fault(NamedTuple):
    """What is wrong with one member: a JSON pointer, or the name of a parameter as a pointer, and the words."""

    pointer: str
    detail: str


class Problem(Exception):
    """An error on its way to the caller.

    ``status`` is one of ``KINDS``, ``headers`` are further header fields (``Allow``, ``Retry-After``, ...).
    """

    def __init__(self, status: int, detail: str, faults: Sequence[Fault] = (), headers: Sequence[tuple[str, str]] = ()) -> None:
        self.status = status
        self.detail = detail
        self.faults = tuple(faults)
        self.headers = tuple(headers)
        super().__init__(detail)


def invalid(faults: Sequence[Fault]) -> Problem:
    """Return the problem of a question whose members do not make sense."""
    if len(faults) == 1:
        return Problem(422, f"{faults[0].pointer or 'the body'}: {faults[0].detail}", faults)
    return Problem(422, f"{len(faults)} members do not make sense", faults)


def pointer(path: Iterable[str | int]) -> str:
    """Return the JSON pointer (RFC 6901) of a path of member names and indices."""
    return "".join("/" + str(step).replace("~", "~0").replace("/", "~1") for step in path)


def located(messages: Any) -> list[tuple[Path, str]]:
    """Return every message in a tree of marshmallow messages with the path where it stands, in the order of the tree.

    The key ``_schema`` stands for the member itself.
    """
    found: list[tuple[Path, str]] = []
    stack: list[tuple[Any, Path]] = [(messages, ())]
    while stack:
        node, at = stack.pop()
        if isinstance(node, Mapping):
            stack.extend((node[key], at if key == "_schema" else (*at, key)) for key in reversed(list(node)))
        elif isinstance(node, str):
            found.append((at, node))
        else:
            stack.extend((item, at) for item in reversed(list(node)))
    return found


def path_of(error: GasapiError, *, mixture: bool) -> Path:
    """Return the path of the member of a question that an exception of the service speaks of, empty where there is none.

    :param mixture: whether the gas was given by fractions
    """
    match error:
        case UnknownGas():
            return ("gas", "fractions", error.name) if mixture else ("gas",)
        case FractionsInvalid():
            return ("gas", "fractions") if error.component is None else ("gas", "fractions", error.component)
        case UnknownModel() | ModelCannotServe():
            return ("model",)
    return ()


def shown(value: Any) -> str:
    """Return a value of a request in a form short and plain enough to be shown in an error."""
    if isinstance(value, str):
        return f'"{_clipped(value, _LONGEST_SHOWN)}"'
    if value is None:
        return "null"
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, dict):
        return "an object"
    if isinstance(value, list):
        return "an array"
    try:
        return _clipped(str(value), _LONGEST_SHOWN)
    except ValueError:
        return "a number of thousands of digits"


def document(problem: Problem, instance: str) -> dict[str, Any]:
    """Return the members of a problem document, as many faults in it as ``LARGEST_BODY`` allows.

    :param instance: the path that was asked for, as WSGI has it (bytes in Latin-1)
    """
    kind = KINDS[problem.status]
    members: dict[str, Any] = {
        "type": f"/openapi.json#/components/responses/{kind.component}",
        "title": kind.title,
        "status": problem.status,
        "detail": _clipped(problem.detail, _LONGEST_DETAIL),
        "instance": quote(instance[:_LONGEST_INSTANCE].encode("latin-1", "replace")),
    }
    if problem.faults:
        errors: list[dict[str, str]] = []
        members["errors"] = errors
        room = LARGEST_BODY - 512 - len(orjson.dumps(members))
        for fault in problem.faults:
            error = {
                "pointer": _clipped(fault.pointer, _LONGEST_POINTER),
                "detail": _clipped(fault.detail, _LONGEST_DETAIL),
            }
            room -= len(orjson.dumps(error)) + 1
            if room < 0:
                members["detail"] = f"{len(problem.faults)} members do not make sense; the first {len(errors)} are named"
                break
            errors.append(error)
    return members


def body(problem: Problem, instance: str) -> bytes:
    """Return the body of an error answer, at most ``LARGEST_BODY`` bytes.

    :param instance: the path that was asked for
    """
    return orjson.dumps(document(problem, instance))


def _clipped(text: str, length: int) -> str:
    """Return the text, shortened and freed of lone surrogates, which UTF-8 cannot carry."""
    if len(text) > length:
        text = text[: length - 3] + "..."
    return text.encode("utf-8", "replace").decode("utf-8")
