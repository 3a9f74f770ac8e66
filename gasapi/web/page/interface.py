"""The OpenAPI document as plain lists, for a page that reads without scripts."""

from __future__ import annotations

import json
import re
from collections.abc import Mapping
from typing import Any, NamedTuple

__all__ = ["Call", "Schema", "calls_of", "schemas_of"]

_METHODS = ("get", "post", "put", "patch", "delete")
_DEEPEST = 6


class Line(NamedTuple):
    """A member of a body, or a parameter: its depth below the body, name, kind in words, and what is said about it."""

    depth: int
    name: str
    kind: str
    required: bool
    description: str
    refers_to: str


class Body(NamedTuple):
    """A body in one media type, with its members and examples as text."""

    media_type: str
    lines: list[Line]
    kind: str
    refers_to: str
    examples: list[tuple[str, str]]


class Answer(NamedTuple):
    """What is answered with one status."""

    status: str
    description: str
    bodies: list[Body]


class Call(NamedTuple):
    """One method of one path."""

    anchor: str
    method: str
    path: str
    summary: str
    paragraphs: list[str]
    parameters: list[Line]
    bodies: list[Body]
    answers: list[Answer]
    refusals: list[Answer]


class Schema(NamedTuple):
    """A schema that has a name."""

    name: str
    paragraphs: list[str]
    kind: str
    lines: list[Line]


def calls_of(document: Mapping[str, Any]) -> list[Call]:
    """Return the calls of an OpenAPI document, in its order."""
    calls = []
    for path, item in document.get("paths", {}).items():
        for method in _METHODS:
            if method in item:
                calls.append(_call(document, path, method, item[method], item.get("parameters", [])))
    return calls


def schemas_of(document: Mapping[str, Any]) -> list[Schema]:
    """Return the named schemas of an OpenAPI document."""
    named = document.get("components", {}).get("schemas", {})
    return [
        Schema(name, _paragraphs(schema.get("description", "")), _kind(schema), _members(schema))
        for name, schema in named.items()
    ]


def _call(document: Mapping[str, Any], path: str, method: str, operation: Mapping[str, Any], shared: list[Any]) -> Call:
    parameters = [_resolved(document, parameter) for parameter in (*shared, *operation.get("parameters", []))]
    request = _resolved(document, operation.get("requestBody", {}))
    answers: list[Answer] = []
    refusals: list[Answer] = []
    for status, response in operation.get("responses", {}).items():
        found = _resolved(document, response)
        answer = Answer(status, found.get("description", ""), _bodies({}, found.get("content", {})))
        (answers if status < "4" else refusals).append(answer)
    return Call(
        _anchor(method, path),
        method.upper(),
        path,
        operation.get("summary", ""),
        _paragraphs(operation.get("description", "")),
        [_parameter(parameter) for parameter in parameters],
        _bodies(document, request.get("content", {})),
        answers,
        refusals,
    )


def _resolved(document: Mapping[str, Any], part: Mapping[str, Any]) -> Mapping[str, Any]:
    """Return the part that a reference within the document means, or the part itself."""
    reference = part.get("$ref")
    if reference is None:
        return part
    found: Any = document
    for step in reference.removeprefix("#/").split("/"):
        found = found[step.replace("~1", "/").replace("~0", "~")]
    return found


def _anchor(method: str, path: str) -> str:
    return f"{method}{re.sub('[^a-z0-9]+', '-', path.lower()).rstrip('-')}" if path != "/" else f"{method}-page"


def _paragraphs(text: str) -> list[str]:
    return [" ".join(part.split()) for part in text.split("\n\n") if part.strip()]


def _parameter(parameter: Mapping[str, Any]) -> Line:
    schema = parameter.get("schema", {})
    words = f"{_kind(schema)}, in the {parameter.get('in', 'query')}"
    return Line(0, parameter.get("name", ""), words, bool(parameter.get("required")), _told(parameter, schema), _target(schema))


def _bodies(document: Mapping[str, Any], content: Mapping[str, Any]) -> list[Body]:
    """Return the bodies; the members of a named schema stand there only where a document to find it in is given."""
    bodies = []
    for media_type, part in content.items():
        schema = part.get("schema", {})
        examples = [(name, _text(example.get("value"))) for name, example in part.get("examples", {}).items()]
        if "example" in part:
            examples.append(("", _text(part["example"])))
        lines = _members(_resolved(document, schema)) if document else _members(schema)
        bodies.append(Body(media_type, lines, _kind(schema), _target(schema), examples))
    return bodies


def _text(example: Any) -> str:
    return example if isinstance(example, str) else json.dumps(example, indent=2, ensure_ascii=False)


def _members(schema: Mapping[str, Any], depth: int = 0) -> list[Line]:
    """Return the members of an object or of the items of an array, those of objects within it indented below them."""
    lines: list[Line] = []
    if depth >= _DEEPEST:
        return lines
    for part in schema.get("allOf", ()):
        lines += _members(part, depth)
    required = schema.get("required", ())
    for name, member in schema.get("properties", {}).items():
        lines.append(Line(depth, name, _kind(member), name in required, _told(member, member), _target(member)))
        lines += _members(member, depth + 1)
    if isinstance(schema.get("items"), Mapping):
        lines += _members(schema["items"], depth)
    return lines


def _told(described: Mapping[str, Any], schema: Mapping[str, Any]) -> str:
    """Return the description, with what the schema limits the value to."""
    words = [" ".join(described.get("description", "").split())]
    if "enum" in schema and len(schema["enum"]) <= 12:
        words.append("One of: " + ", ".join(str(value) for value in schema["enum"]) + ".")
    if "default" in schema:
        words.append(f"Left out: {json.dumps(schema['default'])}.")
    return " ".join(word for word in words if word)


def _target(schema: Mapping[str, Any]) -> str:
    """Return the name of the schema that this one refers to, for itself or its items."""
    for part in (schema, schema.get("items", {}), *schema.get("anyOf", ()), *schema.get("oneOf", ())):
        if isinstance(part, Mapping) and "$ref" in part:
            return str(part["$ref"]).rpartition("/")[2]
    return ""


def _kind(schema: Mapping[str, Any]) -> str:
    """Return the type of a value in words."""
    if "$ref" in schema:
        return str(schema["$ref"]).rpartition("/")[2]
    for word in ("oneOf", "anyOf"):
        if word in schema:
            return " or ".join(dict.fromkeys(_kind(part) for part in schema[word]))
    kinds = schema.get("type", "object" if "properties" in schema else "any value")
    if isinstance(kinds, str):
        kinds = [kinds]
    items = schema.get("items")
    named = [f"array of {_kind(items)}" if kind == "array" and isinstance(items, Mapping) else str(kind) for kind in kinds]
    return " or ".join(named)
