"""Members that only the jobs around a density have: objects of members, flows, ranges, measures of a vessel or a test."""

from __future__ import annotations

import re
from collections.abc import Mapping
from typing import Any, ClassVar, NamedTuple

from marshmallow import ValidationError
from marshmallow import missing as missing_value
from marshmallow.types import ErrorMessages

from gasapi.service.structured_text import RESERVED
from gasapi.units import UnknownUnit, unit
from gasapi.web import fields
from gasapi.web.fields import JsonSchema, Member, Messages, Number, Text
from gasapi.web.problems import shown

__all__ = [
    "Correlations",
    "DrawOffRate",
    "Duration",
    "Flow",
    "GasPair",
    "Group",
    "Identifier",
    "LeakLimit",
    "Meter",
    "Range",
    "Readings",
    "Tolerance",
    "VesselVolume",
]

_LONGEST_IDENTIFIER = 32


class Group(Member):
    """An object with members of its own, all its faults told at once; what it gives back is a dict by name."""

    expected: ClassVar[str] = "an object"
    members: ClassVar[Mapping[str, Member]] = {}

    def _read(self, value: Any) -> dict[str, Any]:
        """Return the members by name, those left out as their defaults."""
        if type(value) is not dict:
            self.refuse(value)
        errors: Messages = {name: [fields.unknown_member(name, self.members)] for name in value if name not in self.members}
        found: dict[str, Any] = {}
        for name, member in self.members.items():
            try:
                found[name] = member.deserialize(value.get(name, missing_value))
            except ValidationError as error:
                errors[name] = error.messages
        if errors:
            raise ValidationError(errors)
        return found

    def _schema(self) -> JsonSchema:
        schema: JsonSchema = {
            "type": "object",
            "additionalProperties": False,
            "properties": {name: member.json_schema() for name, member in self.members.items()},
        }
        required = [name for name, member in self.members.items() if member.required]
        if required:
            schema["required"] = required
        return schema


class Readings(Group):
    """A pressure and a temperature, in the units of the question, with the ambient pressure for gauge readings, Pa."""

    expected: ClassVar[str] = 'an object such as {"pressure": 8.0, "temperature": 21.5}'
    members: ClassVar[Mapping[str, Member]] = {
        "pressure": Number(required=True, description="In the unit of units.pressure."),
        "temperature": Number(required=True, description="In the unit of units.temperature."),
        "ambient_pressure": Number(
            above=0.0, most=1e6, description="Pa, of this reading, for gauge units; left out: that of the question."
        ),
    }


class Measured(NamedTuple):
    """A value with the quantity that it is of, and the name of its unit, None for that of the question's unit map."""

    kind: str
    quantity: str
    value: float
    unit: str | None
    rest: Mapping[str, Any]


class _Measure(Group):
    """An object with ``kind``, ``value`` and ``unit``, where the kind says which quantity the unit is of."""

    quantities: ClassVar[Mapping[str, str]] = {}

    def _read(self, value: Any) -> Any:
        """Return what is measured."""
        found = super()._read(value)
        kind, name = found.pop("kind"), found.pop("unit")
        quantity = self.quantities[kind]
        if name is not None:
            try:
                unit(quantity, name)
            except UnknownUnit as error:
                raise ValidationError({"unit": [str(error)]}) from None
        return Measured(kind, quantity, found.pop("value"), name, found)


_FLOW_QUANTITIES = {
    "actual_volume": "volume_flow",
    "reference_volume": "volume_flow",
    "mass": "mass_flow",
    "amount": "amount_flow",
}

_UNIT = Text(description="A unit of that quantity; left out: the one of units.", examples=["m3/h", "kg/h"])


class Flow(_Measure):
    """A flow in one of four measures."""

    expected: ClassVar[str] = 'an object such as {"kind": "actual_volume", "value": 120, "unit": "m3/h"}'
    quantities: ClassVar[Mapping[str, str]] = _FLOW_QUANTITIES
    members: ClassVar[Mapping[str, Member]] = {
        "kind": fields.Choice(_FLOW_QUANTITIES, required=True),
        "value": Number(required=True),
        "unit": _UNIT,
    }


class DrawOffRate(_Measure):
    """A steady draw-off from a vessel down to a minimum pressure."""

    expected: ClassVar[str] = (
        'an object such as {"kind": "reference_volume", "value": 10, "unit": "L/min", "minimum_pressure": 5}'
    )
    quantities: ClassVar[Mapping[str, str]] = {k: q for k, q in _FLOW_QUANTITIES.items() if k != "actual_volume"}
    members: ClassVar[Mapping[str, Member]] = {
        "kind": fields.Choice(quantities, required=True),
        "value": Number(above=0.0, required=True),
        "unit": _UNIT,
        "minimum_pressure": Number(required=True, description="In the unit of units.pressure."),
    }


class LeakLimit(Group):
    """A leak rate that a test should resolve: a mass flow, or a throughput."""

    expected: ClassVar[str] = 'an object such as {"value": 0.001, "unit": "mbar L/s"}'
    throughputs: ClassVar[Mapping[str, float]] = {"Pa m3/s": 1.0, "mbar L/s": 0.1}
    members: ClassVar[Mapping[str, Member]] = {
        "value": Number(above=0.0, required=True),
        "unit": Text(required=True, description="A unit of mass_flow, or Pa m3/s, or mbar L/s.", examples=["mbar L/s"]),
    }

    def _read(self, value: Any) -> Any:
        """Return the limit in SI, and whether it is a throughput."""
        found = super()._read(value)
        name = found["unit"]
        if name in self.throughputs:
            return found["value"] * self.throughputs[name], True
        try:
            return unit("mass_flow", name).to_si(found["value"]), False
        except UnknownUnit as error:
            known = ", ".join((*self.throughputs, *error.known))
            raise ValidationError({"unit": [f"{shown(name)} is no unit of a leak rate; known: {known}"]}) from None


class Meter(Group):
    """A flow meter, and the density or the state that it was made for."""

    expected: ClassVar[str] = 'an object such as {"principle": "differential_pressure", "design_density": 40.0}'
    members: ClassVar[Mapping[str, Member]] = {
        "principle": fields.Choice(("differential_pressure", "volumetric"), required=True),
        "design_density": Number(above=0.0, description="In the unit of units.density."),
        "design": Readings(description="The design state, in place of its density."),
    }

    def _read(self, value: Any) -> Any:
        """Return the members; exactly one of the two designs is given."""
        found = super()._read(value)
        if (found["design_density"] is None) == (found["design"] is None):
            raise ValidationError(
                {"design_density": ["give either design_density or design (the pressure and temperature that it was made for)"]}
            )
        return found


class Correlations(Group):
    """Correlation coefficients of two readings of the same instrument."""

    expected: ClassVar[str] = 'an object such as {"pressure": 0.9}'
    members: ClassVar[Mapping[str, Member]] = {
        "pressure": Number(least=-1.0, most=1.0, default=0.0),
        "temperature": Number(least=-1.0, most=1.0, default=0.0),
    }


class VesselVolume(Number):
    """The inner volume of something that is closed."""

    default_error_messages: ErrorMessages = {  # noqa: RUF012
        "range": "{value} is no volume that can hold gas; give the inner (water) volume, a number {bound}"
    }

    def __init__(self, **kwargs: Any) -> None:
        super().__init__(above=0.0, most=1e12, **kwargs)


class Duration(Number):
    """How long a test took."""

    default_error_messages: ErrorMessages = {  # noqa: RUF012
        "range": "{value} is no time between two readings; give the time from the start to the end reading, a number {bound}"
    }

    def __init__(self, **kwargs: Any) -> None:
        super().__init__(above=0.0, most=1e12, **kwargs)


class Tolerance(Number):
    """A relative error that 32-bit arithmetic can keep."""

    default_error_messages: ErrorMessages = {  # noqa: RUF012
        "range": "{value} is not {bound}: 32-bit arithmetic does not reach below 0.00001, and above 0.1 a table is no use"
    }

    def __init__(self, **kwargs: Any) -> None:
        super().__init__(least=1e-5, most=0.1, **kwargs)


class GasPair(Member):
    """The names of two gases."""

    expected: ClassVar[str] = 'the names of two gases, such as ["hydrogen", "nitrogen"]'

    def _read(self, value: Any) -> tuple[str, str]:
        """Return the two names."""
        if type(value) is not list or len(value) != 2:
            self.refuse(value)
        errors: Messages = {}
        names = []
        for place, name in enumerate(value):
            try:
                names.append(_NAME.deserialize(name))
            except ValidationError as error:
                errors[place] = error.messages  # type: ignore[index]
        if errors:
            raise ValidationError(errors)
        return names[0], names[1]

    def _schema(self) -> JsonSchema:
        return {"type": "array", "minItems": 2, "maxItems": 2, "items": _NAME.json_schema()}


_NAME = Text(required=True)


class Range(Member):
    """A low and a high end."""

    expected: ClassVar[str] = "a range: two numbers, the low end first, such as [1, 60]"
    default_error_messages: ErrorMessages = {  # noqa: RUF012
        "order": "the range runs from {low} to {high}; give the low end first and a higher one after it"
    }

    def _read(self, value: Any) -> tuple[float, float]:
        """Return both ends."""
        if type(value) is not list or len(value) != 2:
            self.refuse(value)
        errors: Messages = {}
        ends = []
        for place, end in enumerate(value):
            try:
                ends.append(_END.deserialize(end))
            except ValidationError as error:
                errors[place] = error.messages  # type: ignore[index]
        if errors:
            raise ValidationError(errors)
        low, high = ends
        if not low < high:
            raise self.make_error("order", low=shown(low), high=shown(high))
        return low, high

    def _schema(self) -> JsonSchema:
        return {"type": "array", "minItems": 2, "maxItems": 2, "items": _END.json_schema()}


_END = Number(required=True)


class Identifier(Member):
    """A name as IEC 61131-3 takes it (table 1): letters, digits and single underscores, not a digit first."""

    expected: ClassVar[str] = (
        f"an identifier of IEC 61131-3: 1 to {_LONGEST_IDENTIFIER} of A-Z, a-z, 0-9 and _, "
        "a letter first, no two underscores in a row and none at the end"
    )
    default_error_messages: ErrorMessages = {  # noqa: RUF012
        "reserved": "{value} is a keyword, or names something inside the block; give another name"
    }
    pattern: ClassVar[str] = r"^[A-Za-z](_?[A-Za-z0-9])*$"

    def _read(self, value: Any) -> str:
        """Return the name."""
        if type(value) is str and len(value) <= _LONGEST_IDENTIFIER and re.fullmatch(self.pattern, value):
            lower = value.lower()
            if lower in RESERVED or lower.startswith(("end_", "var_")):
                raise self.make_error("reserved", value=shown(value))
            return value
        self.refuse(value)

    def _schema(self) -> JsonSchema:
        return {"type": "string", "maxLength": _LONGEST_IDENTIFIER, "pattern": self.pattern}
