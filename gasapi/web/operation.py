"""A route as the OpenAPI document has it."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any, NamedTuple

from marshmallow import Schema

from gasapi.web.negotiation import JSON
from gasapi.web.query import QueryForm

__all__ = ["Example", "Operation"]

_JSON = str(JSON)


class Example(NamedTuple):
    """A worked example: a body, or the query of an address; its answer is asked of the service when the document is made."""

    name: str
    summary: str
    body: Any = None
    query: str = ""
    accept: str = _JSON


class Operation(NamedTuple):
    """A route as the document has it."""

    method: str
    path: str
    id: str
    tag: str
    summary: str
    description: str
    answer: Mapping[str, Any]
    """Schema, or JSON schema, by media type."""

    body: type[Schema] | None = None
    other_bodies: Mapping[str, Mapping[str, Any]] = {}
    """Content by media type, for what may be sent in place of JSON."""

    query: QueryForm | None = None
    parameters: Sequence[Mapping[str, Any]] = ()
    refusals: tuple[int, ...] = ()
    examples: tuple[Example, ...] = ()
    open: bool = False
    """Whether it is answered without a token."""
