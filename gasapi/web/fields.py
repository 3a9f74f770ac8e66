"""The members of requests: one class, one rule. Messages are data; what a field gives back is still in the caller's units.

Every field says what it expects in ``expected``, and what it looks like in OpenAPI in ``json_schema``, so that the rule and
its description stand side by side. Fields of objects check the whole object in one pass, and tell all its faults.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from difflib import get_close_matches
from typing import Any, ClassVar, Literal, NamedTuple, Never

from marshmallow import ValidationError
from marshmallow import missing as missing_value
from marshmallow.fields import Field
from marshmallow.types import ErrorMessages

from gasapi.gases.records import Substance
from gasapi.service.questions import GasSpec
from gasapi.units import (
    QUANTITIES,
    REFERENCE_CONDITIONS,
    ReferenceCondition,
    UnitMap,
    UnknownQuantity,
    UnknownUnit,
    unit_map,
)
from gasapi.web.problems import Path, shown

__all__ = [
    "Choice",
    "Flag",
    "Gas",
    "Member",
    "Number",
    "Parameter",
    "Reference",
    "Substances",
    "Text",
    "Uncertainties",
    "Units",
    "unknown_member",
]

_LONGEST_NAME = 200
_MOST_FRACTIONS = 1000

JsonSchema = dict[str, Any]
"""A schema object of OpenAPI 3.1, which is JSON Schema 2020-12."""

Messages = dict[str, Any]
"""Messages by member name, nested as the members are."""


class Parameter(NamedTuple):
    """How a member, or a part of it, is written in a query.

    ``name`` is that of the parameter, or what its name begins with where ``open_ended``; ``path`` leads to the member in the
    body, and what follows an open-ended name is added to it. ``kind`` is the type of a JSON value.
    """

    name: str
    path: Path
    kind: Literal["number", "string", "boolean"]
    schema: JsonSchema
    open_ended: bool = False
    required: bool = False


class Member(Field[Any]):
    """The base: a member that may be left out unless ``required``, and that is never null."""

    expected: ClassVar[str] = "a value"
    kind: ClassVar[Literal["number", "string", "boolean"]] = "string"
    default_error_messages: ErrorMessages = {  # noqa: RUF012
        "required": "this member is missing; give {expected}",
        "null": "null is not taken; give {expected}, or leave the member out",
        "wrong": "{value} is not {expected}",
    }

    def __init__(self, *, required: bool = False, default: Any = None, **metadata: Any) -> None:
        """Take ``metadata`` such as ``description`` and ``examples`` into the OpenAPI document."""
        if required:
            super().__init__(required=True, metadata=metadata)
        else:
            super().__init__(load_default=default, allow_none=False, metadata=metadata)

    def deserialize(self, value: Any, attr: str | None = None, data: Mapping[str, Any] | None = None, **kwargs: Any) -> Any:
        """Return the checked value, or the default where the member is missing.

        :raises ValidationError: the member is missing though required, null, or not what is expected
        """
        if value is missing_value:
            if self.required:
                raise self.make_error("required", expected=self.expected)
            return self.load_default
        if value is None:
            raise self.make_error("null", expected=self.expected)
        return self._read(value)

    @property
    def reader(self) -> Callable[[Any], Any]:
        """What reads a value that is neither missing nor null."""
        return self._read

    def _read(self, value: Any) -> Any:
        """Return what the member means; ``value`` is any JSON value but null.

        :raises ValidationError: it is not what is expected
        """
        raise NotImplementedError

    def json_schema(self) -> JsonSchema:
        """Return the member as OpenAPI has it, its description and examples included."""
        schema = {**self._schema(), **self.metadata}
        if not self.required and type(self.load_default) in (str, bool, float):
            schema["default"] = self.load_default
        return schema

    def _schema(self) -> JsonSchema:
        """Return the rule as JSON Schema."""
        raise NotImplementedError

    def parameters(self, name: str) -> list[Parameter]:
        """Return the parameters by which a query gives the member.

        :param name: the member's name
        """
        return [Parameter(name, (name,), self.kind, self.json_schema(), required=self.required)]

    def words(self, key: str, **values: str) -> str:
        """Return the message of a key with values in it."""
        return str(self.error_messages[key]).format(**values)

    def refuse(self, value: Any) -> Never:
        """Raise the error of a value that is not what is expected."""
        raise self.make_error("wrong", value=shown(value), expected=self.expected)


class Number(Member):
    """A JSON number: no string, no boolean. ``above`` is an open lower bound, ``least`` a closed one, ``most`` an upper one."""

    expected: ClassVar[str] = "a number"
    kind = "number"
    default_error_messages: ErrorMessages = {  # noqa: RUF012
        "text": "{value} is a string; give a number without quotes",
        "range": "{value} is not {bound}",
    }

    def __init__(
        self, *, above: float | None = None, least: float | None = None, most: float | None = None, **kwargs: Any
    ) -> None:
        super().__init__(**kwargs)
        self.above = above
        self.least = least
        self.most = most
        self.bounded = not (above is least is most is None)

    def _read(self, value: Any) -> float:
        kind = type(value)
        if kind is not float:
            if kind is not int:
                if kind is str:
                    raise self.make_error("text", value=shown(value))
                self.refuse(value)
            value = float(value)
        if self.bounded:
            self._check(value)
        return value

    def _check(self, value: float) -> None:
        if self.above is not None and not value > self.above:
            raise self.make_error("range", value=shown(value), bound=f"above {self.above:g}")
        if self.least is not None and not value >= self.least:
            raise self.make_error("range", value=shown(value), bound=f"{self.least:g} or more")
        if self.most is not None and not value <= self.most:
            raise self.make_error("range", value=shown(value), bound=f"{self.most:g} or less")

    def _schema(self) -> JsonSchema:
        schema: JsonSchema = {"type": "number"}
        if self.above is not None:
            schema["exclusiveMinimum"] = self.above
        if self.least is not None:
            schema["minimum"] = self.least
        if self.most is not None:
            schema["maximum"] = self.most
        return schema


class Flag(Member):
    """True or false."""

    expected: ClassVar[str] = "true or false"
    kind = "boolean"

    def _read(self, value: Any) -> bool:
        if value is True or value is False:
            return value
        self.refuse(value)

    def _schema(self) -> JsonSchema:
        return {"type": "boolean"}


class Text(Member):
    """A string that is not empty and no longer than a name can be."""

    expected: ClassVar[str] = "a name: a string of 1 to 200 characters"

    def _read(self, value: Any) -> str:
        if type(value) is str and _is_name(value):
            return value
        self.refuse(value)

    def _schema(self) -> JsonSchema:
        return {"type": "string", "minLength": 1, "maxLength": _LONGEST_NAME}


class Choice(Member):
    """One of a few words."""

    default_error_messages: ErrorMessages = {  # noqa: RUF012
        "wrong": "{value} is not one of: {expected}"
    }

    def __init__(self, words: Iterable[str], **kwargs: Any) -> None:
        super().__init__(**kwargs)
        self.choices = tuple(words)

    @property
    def expected(self) -> str:  # type: ignore[override]
        """The words that are taken."""
        return ", ".join(self.choices)

    def _read(self, value: Any) -> str:
        if type(value) is str and value in self.choices:
            return value
        self.refuse(value)

    def _schema(self) -> JsonSchema:
        return {"type": "string", "enum": list(self.choices)}


class Gas(Member):
    """The name of a gas, or an object with the fractions of a mixture."""

    expected: ClassVar[str] = 'the name of a gas, or {"fractions": {"methane": 0.92, "nitrogen": 0.08}}'
    default_error_messages: ErrorMessages = {  # noqa: RUF012
        "empty": "no fraction is given; give at least one component with its fraction",
        "many": f"more than {_MOST_FRACTIONS} components",
        "fraction": "{value} is not a fraction; give a number of 0 or more",
        "name": "the name of a gas has 1 to 200 characters",
    }
    bases: ClassVar[tuple[str, ...]] = ("mole", "mass")
    fraction_units: ClassVar[Mapping[str, float]] = {"1": 1.0, "%": 100.0, "ppm": 1e6}

    def _read(self, value: Any) -> GasSpec:
        if type(value) is str:
            if _is_name(value):
                return GasSpec(value)
        elif type(value) is dict:
            return self._mixture(value)
        self.refuse(value)

    def _mixture(self, value: Mapping[str, Any]) -> GasSpec:
        errors: Messages = _unknown_members(value, ("fractions", "basis", "fraction_unit"))
        basis = value.get("basis", "mole")
        if basis not in self.bases:
            errors["basis"] = [f"{shown(basis)} is not one of: {', '.join(self.bases)}"]
        unit = value.get("fraction_unit", "1")
        if type(unit) is not str or unit not in self.fraction_units:
            errors["fraction_unit"] = [f"{shown(unit)} is not one of: {', '.join(self.fraction_units)}"]
            unit = "1"
        fractions = value.get("fractions", missing_value)
        if fractions is missing_value:
            errors["fractions"] = [self.words("required", expected="fractions by the names of the gases")]
        elif type(fractions) is not dict:
            errors["fractions"] = [f"{shown(fractions)} is not an object of fractions by the names of the gases"]
        elif not 0 < len(fractions) <= _MOST_FRACTIONS:
            errors["fractions"] = [self.words("many" if fractions else "empty")]
        else:
            wrong = {name: [self.words("fraction", value=shown(x))] for name, x in fractions.items() if not _is_fraction(x)}
            wrong |= {name: [self.words("name")] for name in fractions if not _is_name(name)}
            if wrong:
                errors["fractions"] = wrong
        if errors:
            raise ValidationError(errors)
        scale = self.fraction_units[unit]
        return GasSpec(None, tuple((name, x / scale) for name, x in fractions.items()), basis)

    def _schema(self) -> JsonSchema:
        return {
            "oneOf": [
                {"type": "string", "minLength": 1, "maxLength": _LONGEST_NAME},
                {
                    "type": "object",
                    "additionalProperties": False,
                    "required": ["fractions"],
                    "properties": {
                        "fractions": {
                            "type": "object",
                            "minProperties": 1,
                            "maxProperties": _MOST_FRACTIONS,
                            "additionalProperties": {"type": "number", "minimum": 0.0},
                        },
                        "basis": {"type": "string", "enum": list(self.bases), "default": "mole"},
                        "fraction_unit": {"type": "string", "enum": list(self.fraction_units), "default": "1"},
                    },
                },
            ]
        }

    def parameters(self, name: str) -> list[Parameter]:
        """Return a parameter for the name, and those of a mixture."""
        text, mixture = self._schema()["oneOf"]
        parts = mixture["properties"]
        return [
            Parameter(name, (name,), "string", {**text, "description": "The name of a gas; or give fraction.<name>."}),
            Parameter("fraction.", (name, "fractions"), "number", parts["fractions"]["additionalProperties"], True),
            Parameter("basis", (name, "basis"), "string", parts["basis"]),
            Parameter("fraction_unit", (name, "fraction_unit"), "string", parts["fraction_unit"]),
        ]


class Substances(Member):
    """Substances that the catalogue lacks: name to the four constants that a generalised equation needs."""

    expected: ClassVar[str] = "an object of substances by name"
    most: ClassVar[int] = 50
    constants: ClassVar[Mapping[str, Number]] = {
        "molar_mass": Number(above=0.0, most=5000.0, required=True, description="g/mol"),
        "critical_temperature": Number(above=0.0, most=5000.0, required=True, description="K"),
        "critical_pressure": Number(above=0.0, most=1e9, required=True, description="Pa"),
        "acentric_factor": Number(least=-1.0, most=5.0, required=True, description="1"),
    }

    def _read(self, value: Any) -> tuple[Substance, ...]:
        if type(value) is not dict:
            self.refuse(value)
        if len(value) > self.most:
            raise ValidationError(f"more than {self.most} substances")
        errors: Messages = {}
        found: list[Substance] = []
        seen: set[str] = set()
        for name, constants in value.items():
            try:
                if name.strip().casefold() in seen:
                    raise ValidationError("this name is given twice; names do not heed case")
                seen.add(name.strip().casefold())
                found.append(self._substance(name, constants))
            except ValidationError as error:
                errors[name] = error.messages
        if errors:
            raise ValidationError(errors)
        return tuple(found)

    def _substance(self, name: str, value: Any) -> Substance:
        if not _is_name(name):
            raise ValidationError("the name of a substance has 1 to 200 characters")
        if type(value) is not dict:
            raise ValidationError(f"{shown(value)} is not an object with {', '.join(self.constants)}")
        constants = _read_members(value, self.constants)
        return Substance(name.strip(), constants.pop("molar_mass") / 1000.0, **constants)

    def _schema(self) -> JsonSchema:
        return {
            "type": "object",
            "maxProperties": self.most,
            "additionalProperties": _object_schema(self.constants),
        }

    def parameters(self, name: str) -> list[Parameter]:
        """Return ``substances.<name>.<constant>``, a number each."""
        return [Parameter(f"{name}.", (name,), "number", {"type": "number"}, True)]


class Units(Member):
    """Quantity to unit; quantities that are left out have their default unit."""

    expected: ClassVar[str] = 'an object of units by quantity, such as {"pressure": "barg"}'

    def __init__(self, **metadata: Any) -> None:
        super().__init__(default=unit_map(()), **metadata)

    def _read(self, value: Any) -> UnitMap:
        if type(value) is not dict:
            self.refuse(value)
        try:
            return unit_map(tuple(value.items()))
        except (UnknownQuantity, UnknownUnit, TypeError):
            raise ValidationError(self._faults(value)) from None

    def _faults(self, value: Mapping[str, Any]) -> Messages:
        errors = _unknown_members(value, QUANTITIES)
        for quantity, name in value.items():
            if quantity in QUANTITIES and not (type(name) is str and name in QUANTITIES[quantity]):
                if type(name) is str:
                    errors[quantity] = [str(UnknownUnit(quantity, name[:_LONGEST_NAME], tuple(QUANTITIES[quantity])))]
                else:
                    errors[quantity] = [f"{shown(name)} is not the name of a unit"]
        return errors

    def _schema(self) -> JsonSchema:
        return {
            "type": "object",
            "additionalProperties": False,
            "properties": {
                quantity: {"type": "string", "enum": list(units), "default": self.load_default.names[quantity]}
                for quantity, units in QUANTITIES.items()
            },
        }

    def parameters(self, name: str) -> list[Parameter]:
        """Return ``<quantity>_unit`` for every quantity."""
        properties = self._schema()["properties"]
        return [Parameter(f"{quantity}_unit", (name, quantity), "string", properties[quantity]) for quantity in QUANTITIES]


class Uncertainties(Member):
    """Standard uncertainties of measured quantities, in the units of the request; differences, so never below 0."""

    expected: ClassVar[str] = "an object of standard uncertainties by quantity"

    def __init__(self, quantities: Iterable[str], **kwargs: Any) -> None:
        super().__init__(**kwargs)
        self.members = {quantity: Number(least=0.0) for quantity in quantities}

    def _read(self, value: Any) -> dict[str, float | None]:
        if type(value) is not dict:
            self.refuse(value)
        return _read_members(value, self.members)

    def _schema(self) -> JsonSchema:
        return _object_schema(self.members)

    def parameters(self, name: str) -> list[Parameter]:
        """Return ``<name>.<quantity>`` for every quantity."""
        return [
            Parameter(f"{name}.{quantity}", (name, quantity), "number", member.json_schema())
            for quantity, member in self.members.items()
        ]


class Reference(Member):
    """The name of a reference condition, or its temperature (K) and pressure (Pa)."""

    expected: ClassVar[str] = 'the name of a reference condition, or {"temperature": 273.15, "pressure": 101325} in K and Pa'
    members: ClassVar[Mapping[str, Number]] = {
        "temperature": Number(above=0.0, required=True, description="K"),
        "pressure": Number(above=0.0, required=True, description="Pa"),
    }

    def _read(self, value: Any) -> ReferenceCondition:
        if type(value) is str:
            known = REFERENCE_CONDITIONS.get(value)
            if known is None:
                names = ", ".join(REFERENCE_CONDITIONS)
                raise ValidationError(f"{shown(value)} is no reference condition; known: {names}")
            return known
        if type(value) is not dict:
            self.refuse(value)
        return ReferenceCondition(**_read_members(value, self.members))

    def _schema(self) -> JsonSchema:
        return {"oneOf": [{"type": "string", "enum": list(REFERENCE_CONDITIONS)}, _object_schema(self.members)]}


def unknown_member(name: str, known: Iterable[str]) -> str:
    """Return the words for a member that does not exist, with the names that come nearest."""
    names = list(known)
    near = get_close_matches(name[:60].casefold(), names, n=2, cutoff=0.6)
    if near:
        return f"there is no such member; did you mean {' or '.join(near)}?"
    return f"there is no such member; known: {', '.join(names)}"


def _unknown_members(value: Mapping[str, Any], known: Iterable[str]) -> Messages:
    names = tuple(known)
    return {name: [unknown_member(name, names)] for name in value if name not in names}


def _is_name(text: str) -> bool:
    return len(text) <= _LONGEST_NAME and bool(text.strip())


def _is_fraction(value: Any) -> bool:
    return (type(value) is float or type(value) is int) and value >= 0


def _read_members(value: Mapping[str, Any], members: Mapping[str, Number]) -> Any:
    """Return the numbers of an object by name, all its faults told at once."""
    errors = _unknown_members(value, members)
    found: dict[str, Any] = {}
    for name, member in members.items():
        try:
            found[name] = member.deserialize(value.get(name, missing_value))
        except ValidationError as error:
            errors[name] = error.messages
    if errors:
        raise ValidationError(errors)
    return found


def _object_schema(members: Mapping[str, Member]) -> JsonSchema:
    schema: JsonSchema = {
        "type": "object",
        "additionalProperties": False,
        "properties": {name: member.json_schema() for name, member in members.items()},
    }
    required = [name for name, member in members.items() if member.required]
    if required:
        schema["required"] = required
    return schema
