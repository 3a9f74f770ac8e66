"""JSON bodies, strictly: one document, no member twice, every number within double range.

The fast parser reads the body. It keeps the last of two members of one name without a word, so the members that arrived
are counted against the colons in the text: where the numbers agree nothing can have been lost. Where they differ (a colon
may also stand inside a string), and where the fast parser gives up, a second reading with the standard library says what
is wrong and where.
"""

from __future__ import annotations

import json
from collections import Counter
from typing import Any

import orjson

from gasapi.web.problems import Fault, Problem, invalid, pointer, shown

__all__ = ["parse_json"]

_LONGEST_INTEGER = 400  # digits; a double ends at 309


def parse_json(body: bytes, *, repeated_members: bool = False) -> Any:
    """Return the value of a JSON text in UTF-8.

    :param repeated_members: let a member that is given twice pass, the last one counting; for bodies whose strings are
        full of colons
    :raises Problem: 400 where the body is no JSON text; 422 where a member stands twice, or a number is NaN, infinite or
        beyond the range of a double
    """
    try:
        value = orjson.loads(body)
    except orjson.JSONDecodeError as error:
        faults = _faults(body)
        if faults:
            raise invalid(faults) from None
        raise Problem(400, f"the body is not JSON: {error}") from None
    if not repeated_members and _members(value) != body.count(b":"):
        faults = _faults(body)
        if faults:
            raise invalid(faults)
    return value


def _members(value: Any) -> int:
    """Return how many members all objects of a JSON value have together."""
    count = 0
    stack = [value]
    while stack:
        node = stack.pop()
        if type(node) is dict:
            count += len(node)
            stack += node.values()
        elif type(node) is list:
            stack += node
    return count


class _Beyond:
    """Stands for a number that a double cannot hold."""

    def __init__(self, text: str) -> None:
        self.text = text


class _Object(dict[str, Any]):
    """An object that remembers which of its members came more than once."""

    def __init__(self, pairs: list[tuple[str, Any]]) -> None:
        super().__init__(pairs)
        self.repeated: list[str] = []
        if len(self) != len(pairs):
            counts = Counter(name for name, _ in pairs)
            self.repeated = [name for name, count in counts.items() if count > 1]


def _number(text: str) -> float | _Beyond:
    value = float(text)
    return value if value - value == 0.0 else _Beyond(text)


def _integer(text: str) -> float | _Beyond:
    return _Beyond(text) if len(text) > _LONGEST_INTEGER else _number(text)


def _faults(body: bytes) -> list[Fault]:
    """Return what is wrong inside a body that is JSON but for that; nothing where it is no JSON at all."""
    try:
        value = json.loads(
            body.decode("utf-8"),
            object_pairs_hook=_Object,
            parse_constant=_Beyond,
            parse_float=_number,
            parse_int=_integer,
        )
    except (ValueError, RecursionError):
        return []
    found: list[Fault] = []
    stack: list[tuple[Any, tuple[str | int, ...]]] = [(value, ())]
    while stack:
        node, path = stack.pop()
        if isinstance(node, _Object):
            found += [Fault(pointer((*path, name)), "this member is given twice; give it once") for name in node.repeated]
            stack.extend((item, (*path, name)) for name, item in reversed(node.items()))
        elif isinstance(node, list):
            stack.extend((item, (*path, index)) for index, item in reversed(list(enumerate(node))))
        elif isinstance(node, _Beyond):
            text = shown(node.text).strip('"')
            found.append(Fault(pointer(path), f"{text} is no number here; give a JSON number within the range of a double"))
    return found
