"""The bodies of requests: which members there are. The fields say what each must look like."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any, Never

from marshmallow import RAISE, Schema, ValidationError

from gasapi.web import fields

__all__ = ["QuestionSchema", "RequestSchema", "StateSchema"]


class RequestSchema(Schema):
    """The base of all requests: an object, members that are not known refused with the nearest name."""

    class Meta:
        """Unknown members are refused, in bodies and in queries alike."""

        unknown = RAISE

    error_messages: dict[str, str] = {  # noqa: RUF012
        "type": "the body is not an object; give the members of the question in { }",
    }

    def __init__(self, **options: Any) -> None:
        super().__init__(**options)
        self._readers = [
            (name, field.reader, field.required, field.load_default)
            for name, field in self.load_fields.items()
            if isinstance(field, fields.Member)
        ]
        self._plain = len(self._readers) == len(self.load_fields) and not options

    def load(self, data: Any, **options: Any) -> Any:
        """Return the members of a request, those that are missing by their defaults.

        A request without a fault is read in one pass, which takes a third of the time of marshmallow's own; any other goes
        there, where all its faults are gathered.

        :raises ValidationError: with every fault
        """
        if self._plain and not options and type(data) is dict:
            loaded: dict[str, Any] = {}
            present = 0
            try:
                for name, read, required, default in self._readers:
                    value = data.get(name)
                    if value is not None:
                        loaded[name] = read(value)
                        present += 1
                    elif required:
                        break
                    else:
                        loaded[name] = default
                else:
                    # a null and an unknown member both make the numbers differ
                    if present == len(data):
                        return loaded
            except ValidationError:
                pass
        return super().load(data, **options)

    def handle_error(self, error: ValidationError, data: Any, *, many: bool, **kwargs: Any) -> Never:
        """Put the nearest names into the messages of unknown members."""
        if isinstance(error.messages, dict) and isinstance(data, Mapping):
            for name in error.messages.keys() & data.keys() - self.fields.keys():
                error.messages[name] = [fields.unknown_member(name, self.fields)]
        raise error


class QuestionSchema(RequestSchema):
    """What every question about a gas has: the gas, the equation, and the units of all numbers."""

    gas = fields.Gas(
        required=True,
        description="Id, name, synonym, formula or CAS number of a gas, or fractions by such names.",
        examples=["nitrogen", {"fractions": {"methane": 0.92, "nitrogen": 0.08}}],
    )
    substances = fields.Substances(description="Substances that the catalogue lacks, by a name used in this question.")
    model = fields.Text(
        default="auto",
        description="auto, or the id of an equation of state as GET /v1/models lists them.",
        examples=["auto", "reference", "gerg-2008"],
    )
    units = fields.Units(description="Units by quantity, for inputs and outputs alike; left out: the defaults.")
    ambient_pressure = fields.Number(
        above=0.0, most=1e6, description="Pa, for gauge units; left out: 101325, and the answer says that it was assumed."
    )


class StateSchema(QuestionSchema):
    """One state: the gas at a pressure and a temperature."""

    pressure = fields.Number(required=True, description="In the unit of units.pressure.", examples=[4101325.0])
    temperature = fields.Number(required=True, description="In the unit of units.temperature.", examples=[298.15])
    accept_two_phase = fields.Flag(
        default=False, description="Give the density of a two-phase mixture as uncertain in place of a bad answer."
    )
    dew_point_margin = fields.Number(
        least=0.0, most=1000.0, description="K; how near to the dew point the answer says near_dew_point. Left out: 5."
    )
    input_uncertainty = fields.Uncertainties(
        ("pressure", "temperature"), description="Standard uncertainties, in the units of the question."
    )
    accuracy = fields.Number(
        least=1e-12, most=0.1, description="A relative error that allows a certified table in place of the exact solve."
    )
