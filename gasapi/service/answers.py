"""What is answered: plain tuples in SI, reasons included; no formatting and no units of a caller.

``NamedTuple`` rather than dataclass, since a state builds eight of them and each is read once.
"""

from __future__ import annotations

from typing import NamedTuple

__all__ = [
    "GasAnswer",
    "ModelAnswer",
    "PhaseAnswer",
    "PhasePart",
    "PhaseWarning",
    "QualityAnswer",
    "StateAnswer",
    "TwoPhaseAnswer",
]


class GasAnswer(NamedTuple):
    """The gas as it was understood: mole fractions by catalogue id, and the molar mass that the model used, kg/mol."""

    id: str | None
    fractions: tuple[tuple[str, float], ...]
    molar_mass: float


class PhaseWarning(NamedTuple):
    """A phase warning: a snake_case code and a sentence. The numbers in the sentence carry their own units."""

    code: str
    message: str


class PhaseAnswer(NamedTuple):
    """Region and margins: K, K (a difference) and Pa (a difference), positive on the gas side; None where there is none."""

    region: str
    dew_point_temperature: float | None
    margin_temperature: float | None
    margin_pressure: float | None
    model: str | None
    warnings: tuple[PhaseWarning, ...]


class ModelAnswer(NamedTuple):
    """The equation behind the numbers: its published range (K and Pa), its uncertainty at this state (relative, k = 2)."""

    id: str
    name: str
    source: str
    validity_temperature: tuple[float, float]
    validity_pressure: tuple[float, float]
    inside_validity: bool
    relative_uncertainty: float | None
    uncertainty_basis: str
    selected_because: str


class QualityAnswer(NamedTuple):
    """Quality after OPC UA (IEC 62541-4 and -8)."""

    level: str
    status_code: int
    symbol: str
    reasons: tuple[str, ...]


class PhasePart(NamedTuple):
    """One phase of two: mole fraction of the whole, density in kg/m3, mole fractions by catalogue id."""

    phase_fraction: float
    density: float
    fractions: tuple[tuple[str, float], ...]


class TwoPhaseAnswer(NamedTuple):
    """A flash: the vapour and the liquid part."""

    vapour: PhasePart
    liquid: PhasePart


class StateAnswer(NamedTuple):
    """One state, in SI: density kg/m3, molar volume m3/mol, derivatives kg/m3/Pa and kg/m3/K; None where nothing can be said.

    ``density_expanded_uncertainty`` (kg/m3, k = 2) is given only where the question states input uncertainties (and is then
    a member of ``result``, null in a bad answer).
    """

    gas: GasAnswer
    pressure: float
    temperature: float
    density: float | None
    compressibility_factor: float | None
    molar_volume: float | None
    density_pressure: float | None
    density_temperature: float | None
    density_expanded_uncertainty: float | None
    phase: PhaseAnswer
    model: ModelAnswer
    quality: QualityAnswer
    cautions: tuple[str, ...]
    data: str
    two_phase: TwoPhaseAnswer | None = None
