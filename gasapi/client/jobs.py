"""The jobs around a density as calls of the client."""

from __future__ import annotations

from abc import ABC, abstractmethod
from collections.abc import Mapping, Sequence
from typing import Any, Literal

__all__ = ["JobCalls"]

Gas = str | Mapping[str, Any]
Answer = dict[str, Any]
Range = tuple[float, float] | Sequence[float]


class JobCalls(ABC):
    """What a client asks beside states and series. Every call takes the other members of its question by name.

    All raise ``ServiceProblem`` where the service refused the question, or failed, and ``ServiceUnreachable`` where no answer
    came.
    """

    @abstractmethod
    def ask(self, path: str, question: Mapping[str, Any]) -> Answer:
        """Return the answer to a question that is posted to a path."""

    @abstractmethod
    def ask_text(self, path: str, question: Mapping[str, Any]) -> str:
        """Return the answer to a question as text."""

    def flow(self, gas: Gas, pressure: float, temperature: float, flow: Mapping[str, Any], **members: Any) -> Answer:
        """Return a flow in every measure.

        :param flow: ``{"kind": "actual_volume", "value": 120, "unit": "m3/h"}``
        :param members: such as ``reference``, ``meter`` and ``units``
        """
        return self.ask("/v1/flow", {"gas": gas, "pressure": pressure, "temperature": temperature, "flow": flow, **members})

    def vessel(self, gas: Gas, volume: float, pressure: float, temperature: float, **members: Any) -> Answer:
        """Return what a vessel holds.

        :param members: such as ``reference``, ``later``, ``draw_off`` and ``units``
        """
        return self.ask(
            "/v1/vessel", {"gas": gas, "volume": volume, "pressure": pressure, "temperature": temperature, **members}
        )

    def pressure_decay(
        self, gas: Gas, volume: float, duration: float, start: Mapping[str, float], end: Mapping[str, float], **members: Any
    ) -> Answer:
        """Return what a leak test shows.

        :param start: ``{"pressure": 6.0, "temperature": 21.0}``, for gauge readings with ``ambient_pressure``, Pa
        :param end: likewise
        :param members: such as ``input_uncertainty``, ``correlation``, ``leak_limit``, ``reference`` and ``units``
        """
        question = {"gas": gas, "volume": volume, "duration": duration, "start": start, "end": end}
        return self.ask("/v1/pressure-decay", {**question, **members})

    def fraction_from_density(
        self, first: str, second: str, density: float, pressure: float, temperature: float, **members: Any
    ) -> Answer:
        """Return the mole fraction of the first of two gases."""
        question = {"gases": [first, second], "density": density, "pressure": pressure, "temperature": temperature}
        return self.ask("/v1/fraction-from-density", {**question, **members})

    def molar_mass(self, pressure: float, temperature: float, **members: Any) -> Answer:
        """Return the molar mass and the gases that a reading allows, which proves nothing; toxic candidates count first.

        :param members: ``density``, or ``mass`` and ``volume``; and such as ``like`` and ``input_uncertainty``
        """
        return self.ask("/v1/molar-mass", {"pressure": pressure, "temperature": temperature, **members})

    def comparison(self, gas: Gas, pressure: float, temperature: float, **members: Any) -> Answer:
        """Return one state by every equation that can serve the gas."""
        return self.ask("/v1/comparison", {"gas": gas, "pressure": pressure, "temperature": temperature, **members})

    def phase_boundary(self, gas: Gas, **members: Any) -> Answer:
        """Return where a gas begins to condense."""
        return self.ask("/v1/phase-boundary", {"gas": gas, **members})

    def lookup_table(self, gas: Gas, pressure: Range, temperature: Range, tolerance: float, **members: Any) -> Answer:
        """Return a small table for bilinear interpolation.

        :param pressure: low and high end
        :param temperature: low and high end
        :param tolerance: the largest relative error
        :param members: such as ``property`` and ``units``
        """
        return self.ask("/v1/lookup-table", _table(gas, pressure, temperature, tolerance, "json", members))

    def lookup_table_text(
        self, gas: Gas, pressure: Range, temperature: Range, tolerance: float, format: Literal["csv", "st"], **members: Any
    ) -> str:
        """Return the same as text: CSV, or a function block in Structured Text.

        :param members: such as ``property``, ``name`` and ``units``
        """
        return self.ask_text("/v1/lookup-table", _table(gas, pressure, temperature, tolerance, format, members))


def _table(
    gas: Gas, pressure: Range, temperature: Range, tolerance: float, form: str, members: Mapping[str, Any]
) -> dict[str, Any]:
    return {
        "gas": gas,
        "pressure": list(pressure),
        "temperature": list(temperature),
        "tolerance": tolerance,
        "format": form,
        **members,
    }
