"""Columns of numbers: members that are checked in one pass of NumPy, since a series has a hundred thousand of them.

A column comes back as a float where one number was given for all rows, and else as an array in which NaN stands for null.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from typing import Any, ClassVar, NamedTuple

import numpy as np
from marshmallow import ValidationError
from marshmallow.types import ErrorMessages

from gasapi.engine.elementary import Array
from gasapi.web.fields import Gas, JsonSchema, Member, Messages, Number, Parameter
from gasapi.web.problems import shown

__all__ = [
    "Column",
    "FractionColumns",
    "SeriesGas",
    "StatusColumn",
    "Timestamps",
    "is_status",
    "lengths",
    "repeated",
    "stacked",
]

_MOST_NAMED = 20
_HIGHEST_STATUS = 0xFFFFFFFF


class Column(Member):
    """An array of numbers and nulls, or one number for all rows."""

    expected: ClassVar[str] = "an array of numbers (null where one is missing), or one number for all rows"
    kind = "number"
    default_error_messages: ErrorMessages = {  # noqa: RUF012
        "empty": "the array is empty; give a number for each row",
        "element": "{value} is not a number; give a number without quotes, or null where it is missing",
    }

    def _read(self, value: Any) -> float | Array:
        kind = type(value)
        if kind is list:
            return self._array(value)
        if kind is not float and kind is not int:
            self.refuse(value)
        return float(value)

    def _array(self, values: list[Any]) -> Array:
        if not values:
            raise self.make_error("empty")
        # text would be read as numbers by NumPy, and true as 1
        if not set(map(type, values)) <= {float, int, type(None)}:
            wrong = (i for i, v in enumerate(values) if type(v) not in (float, int) and v is not None)
            raise ValidationError(_named(wrong, lambda i: self.words("element", value=shown(values[i]))))
        try:
            return np.array(values, dtype=np.float64)
        except OverflowError:
            wrong = (i for i, v in enumerate(values) if type(v) is int and v.bit_length() > 1023)
            raise ValidationError(_named(wrong, lambda i: "this number is beyond the range of a double")) from None

    def _schema(self) -> JsonSchema:
        return {"oneOf": [{"type": "number"}, {"type": "array", "minItems": 1, "items": {"type": ["number", "null"]}}]}

    def parameters(self, name: str) -> list[Parameter]:
        """Return the parameter by which one number is given for all rows of a CSV body."""
        return [Parameter(name, (name,), "number", {"type": "number"})]


class StatusColumn(Column):
    """An array of status codes, whole numbers of 32 bits; null counts as bad."""

    expected: ClassVar[str] = f"an array of whole numbers from 0 to {_HIGHEST_STATUS}, or one for all rows"
    default_error_messages: ErrorMessages = {  # noqa: RUF012
        "range": "{value} is no status code; give a whole number from 0 to " + str(_HIGHEST_STATUS),
    }

    def _read(self, value: Any) -> float | Array:
        read = super()._read(value)
        codes = np.atleast_1d(read)
        wrong = ~is_status(codes) & ~np.isnan(codes)
        if wrong.any():
            if type(read) is float:
                raise self.make_error("range", value=shown(value))
            rows = iter(np.flatnonzero(wrong).tolist())
            raise ValidationError(_named(rows, lambda i: self.words("range", value=shown(value[i]))))
        return read

    def _schema(self) -> JsonSchema:
        code = {"type": "integer", "minimum": 0, "maximum": _HIGHEST_STATUS}
        return {"oneOf": [code, {"type": "array", "minItems": 1, "items": {**code, "type": ["integer", "null"]}}]}

    def parameters(self, name: str) -> list[Parameter]:
        """Return nothing: a status belongs to a row."""
        return []


def is_status(codes: Array) -> Any:
    """Return which numbers are status codes of 32 bits, shape (n,)."""
    with np.errstate(invalid="ignore"):
        return (codes >= 0.0) & (codes <= _HIGHEST_STATUS) & (np.floor(codes) == codes)


class Timestamps(Member):
    """An array of strings, numbers or nulls, returned as it came."""

    expected: ClassVar[str] = "an array of strings or numbers, one for each row"
    default_error_messages: ErrorMessages = {  # noqa: RUF012
        "empty": "the array is empty; give a timestamp for each row",
        "element": "{value} is neither a string nor a number",
    }

    def _read(self, value: Any) -> list[Any]:
        if type(value) is not list:
            self.refuse(value)
        if not value:
            raise self.make_error("empty")
        if not set(map(type, value)) <= {str, float, int, type(None)}:
            wrong = (i for i, v in enumerate(value) if type(v) not in (str, float, int) and v is not None)
            raise ValidationError(_named(wrong, lambda i: self.words("element", value=shown(value[i]))))
        return value

    def _schema(self) -> JsonSchema:
        return {"type": "array", "minItems": 1, "items": {"type": ["string", "number", "null"]}}

    def parameters(self, name: str) -> list[Parameter]:
        """Return nothing: timestamps stand in rows."""
        return []


class FractionColumns(NamedTuple):
    """A gas that changes by the row: names, columns divided by their fraction unit (a float for all rows), basis."""

    names: tuple[str, ...]
    columns: tuple[float | Array, ...]
    basis: Any


class SeriesGas(Gas):
    """A gas as in a state, or one whose fractions are arrays."""

    expected: ClassVar[str] = (
        'the name of a gas, or {"fractions": {"methane": 0.92, "nitrogen": 0.08}}, where a fraction may be an array by the row'
    )
    column: ClassVar[Column] = Column()

    def _read(self, value: Any) -> Any:
        if type(value) is dict:
            fractions = value.get("fractions")
            if type(fractions) is dict and any(type(x) is list for x in fractions.values()):
                return self._columns(value, fractions)
        return super()._read(value)

    def _columns(self, value: Mapping[str, Any], fractions: Mapping[str, Any]) -> FractionColumns:
        errors: Messages = {}
        columns: dict[str, Any] = {}
        for name, column in fractions.items():
            if type(column) is list:
                try:
                    columns[name] = self.column.reader(column)
                except ValidationError as error:
                    errors[name] = error.messages
        # numbers, names and everything else by the rule of a gas that does not change
        plain = {name: 0.0 if name in columns or name in errors else x for name, x in fractions.items()}
        found: Messages = {}
        spec = None
        try:
            spec = self._mixture({**value, "fractions": plain})
        except ValidationError as error:
            found = error.normalized_messages()
        inner = found.get("fractions")
        if errors:
            found["fractions"] = {**(inner if isinstance(inner, dict) else {}), **errors}
        if spec is None or found:
            raise ValidationError(found)
        scale = self.fraction_units[value.get("fraction_unit", "1")]
        assert spec.fractions is not None
        # the same division as for a fraction alone
        return FractionColumns(
            tuple(fractions), tuple(columns[name] / scale if name in columns else x for name, x in spec.fractions), spec.basis
        )

    def _schema(self) -> JsonSchema:
        schema = super()._schema()
        number = Number(least=0.0).json_schema()
        schema["oneOf"][1]["properties"]["fractions"]["additionalProperties"] = {
            "oneOf": [number, {"type": "array", "minItems": 1, "items": {"type": ["number", "null"]}}]
        }
        return schema

    def parameters(self, name: str) -> list[Parameter]:
        """Return the parameters of a gas that does not change, all of them numbers."""
        return [p._replace(schema=Number(least=0.0).json_schema()) if p.open_ended else p for p in super().parameters(name)]


def _named(rows: Iterator[int], words: Any) -> dict[int, list[str]]:
    """Return the messages of the first wrong elements by their index; there may be a hundred thousand of them."""
    found: dict[int, list[str]] = {}
    for i in rows:
        found[i] = [words(i)]
        if len(found) >= _MOST_NAMED:
            break
    return found


def lengths(columns: Mapping[str, Any]) -> dict[str, int]:
    """Return the number of rows of every column that is an array, by name."""
    return {name: len(c) for name, c in columns.items() if isinstance(c, (np.ndarray, list))}


def repeated(column: float | Array, rows: int) -> Array:
    """Return a column as an array of a length."""
    return np.full(rows, column) if isinstance(column, float) else column


def stacked(columns: Sequence[float | Array], rows: int) -> Array:
    """Return columns side by side, shape (rows, columns)."""
    table = np.empty((rows, len(columns)))
    for i, column in enumerate(columns):
        table[:, i] = column
    return table
