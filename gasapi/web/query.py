"""Questions in the query of a GET: parameters into the members of a body, so that one schema judges both forms."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Mapping
from typing import Any, NamedTuple
from urllib.parse import parse_qsl

from marshmallow import Schema

from gasapi.web.fields import Member, Parameter, unknown_member
from gasapi.web.problems import Fault, Path, Problem, invalid, pointer, shown

__all__ = ["QueryForm", "QueryRead", "parameter_pairs"]

_MOST_PARAMETERS = 2000

# RFC 8259, section 6
_JSON_NUMBER = re.compile(r"-?(0|[1-9][0-9]*)(\.[0-9]+)?([eE][+-]?[0-9]+)?")


class QueryRead(NamedTuple):
    """The members of a query as a body would have them, and the faults found on the way, by path."""

    members: dict[str, Any]
    faults: dict[Path, Fault]


class QueryForm:
    """The query form of a request: which parameters stand for the members of a schema."""

    def __init__(self, schema: Schema) -> None:
        parameters = [
            parameter
            for name, field in schema.fields.items()
            if isinstance(field, Member)
            for parameter in field.parameters(name)
        ]
        self.parameters = tuple(parameters)
        self._named = {p.name: p for p in parameters if not p.open_ended}
        self._open_ended = [p for p in parameters if p.open_ended]

    def read(self, query: str) -> QueryRead:
        """Return what a query says.

        :param query: the query of the address, percent-encoded
        :raises Problem: 400 where it cannot be decoded; 422 where a parameter is unknown or given twice
        """
        pairs = parameter_pairs(query)
        members: dict[str, Any] = {}
        faults: dict[Path, Fault] = {}
        unknown: list[Fault] = []
        for name, text in pairs.items():
            found = self._find(name)
            if found is None:
                unknown.append(Fault(pointer((name,)), unknown_member(name, self._names())))
                continue
            parameter, path = found
            try:
                _put(members, path, _value(parameter, text))
            except ValueError as error:
                faults[path] = Fault(pointer((name,)), str(error))
        if unknown:
            raise invalid([*unknown, *faults.values()])
        return QueryRead(members, faults)

    def parameter_of(self, path: Path) -> str:
        """Return the name of the parameter that gives the member at a path, or the one that comes nearest to it."""
        for length in range(len(path), 0, -1):
            for parameter in self.parameters:
                if parameter.path == path[:length] and not parameter.open_ended:
                    return parameter.name
                if parameter.open_ended and length > len(parameter.path) and parameter.path == path[: len(parameter.path)]:
                    return parameter.name + ".".join(str(step) for step in path[len(parameter.path) :])
        return str(path[0]) if path else ""

    def _find(self, name: str) -> tuple[Parameter, Path] | None:
        parameter = self._named.get(name)
        if parameter is not None:
            return parameter, parameter.path
        for parameter in self._open_ended:
            rest = name.removeprefix(parameter.name)
            if rest and rest != name:
                # a substance has a name, which may hold dots, and a constant after it
                steps = (rest,) if len(parameter.path) > 1 else tuple(rest.rsplit(".", 1))
                return parameter, (*parameter.path, *steps)
        return None

    def _names(self) -> list[str]:
        return [p.name + ("<name>" if p.open_ended else "") for p in self.parameters]


def parameter_pairs(query: str) -> Mapping[str, str]:
    """Return the parameters of a query by name.

    :param query: the query of the address, percent-encoded
    :raises Problem: 400 where it cannot be decoded; 422 where a parameter is given twice
    """
    try:
        found = parse_qsl(query, keep_blank_values=True, errors="strict", max_num_fields=_MOST_PARAMETERS)
    except ValueError:
        raise Problem(
            400, f"the query cannot be read: give at most {_MOST_PARAMETERS} parameters, percent-encoded in UTF-8"
        ) from None
    pairs = dict(found)
    if len(pairs) != len(found):
        counts = Counter(name for name, _ in found)
        raise invalid([Fault(pointer((n,)), "this parameter is given twice; give it once") for n in counts if counts[n] > 1])
    return pairs


def _value(parameter: Parameter, text: str) -> Any:
    """Return the JSON value of a parameter.

    :raises ValueError: it has none, with the words
    """
    if parameter.kind == "string":
        return text
    if parameter.kind == "boolean":
        if text not in ("true", "false"):
            raise ValueError(f"{shown(text)} is not true or false")
        return text == "true"
    if not _JSON_NUMBER.fullmatch(text):
        hint = "; write the plus sign of an exponent as %2B" if " " in text else ""
        raise ValueError(f"{shown(text)} is not a number; give one such as 40, -12.5 or 1e5{hint}")
    number = float(text)
    if number - number != 0.0:
        raise ValueError(f"{shown(text)} is beyond the range of a double")
    return number


def _put(members: dict[str, Any], path: Path, value: Any) -> None:
    """Set a member, the objects that lead to it included.

    :raises ValueError: something else stands on the way, as where both ``gas`` and ``fraction.<name>`` are given
    """
    node = members
    for step in path[:-1]:
        node = node.setdefault(str(step), {})
        if not isinstance(node, dict):
            raise ValueError("give gas or fraction.<name> and what belongs to it, not both")
    if isinstance(node.get(str(path[-1])), dict):
        raise ValueError("give gas or fraction.<name> and what belongs to it, not both")
    node[str(path[-1])] = value
