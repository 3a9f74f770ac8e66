"""What can be asked: frozen, hashable and in SI, so that a question is its own cache key."""

from __future__ import annotations

from typing import Literal, NamedTuple

from gasapi.gases.records import Substance

__all__ = ["GasSpec", "InputUncertainty", "StateQuestion"]


class GasSpec(NamedTuple):
    """The gas as it was named: a name, or fractions of named gases.

    Exactly one of ``name`` and ``fractions`` is given. ``fractions`` are (name, fraction) pairs in the order of the request,
    already divided by their fraction unit; they need not sum to 1 exactly. ``substances`` are those of the question itself.
    """

    name: str | None = None
    fractions: tuple[tuple[str, float], ...] | None = None
    basis: Literal["mole", "mass"] = "mole"
    substances: tuple[Substance, ...] = ()


class InputUncertainty(NamedTuple):
    """Standard uncertainties of the inputs: Pa and K; 0 where none was given."""

    pressure: float = 0.0
    temperature: float = 0.0


class StateQuestion(NamedTuple):
    """One state. ``pressure`` Pa absolute, ``temperature`` K.

    ``ambient_pressure`` is the ambient, in Pa, that was added to a gauge reading without having been given, and None otherwise.
    ``dew_point_margin`` is in K, None for the default of the site. ``accuracy`` is a relative error that a certified table
    may have.
    """

    gas: GasSpec
    pressure: float
    temperature: float
    model: str = "auto"
    ambient_pressure: float | None = None
    accept_two_phase: bool = False
    dew_point_margin: float | None = None
    input_uncertainty: InputUncertainty | None = None
    accuracy: float | None = None
