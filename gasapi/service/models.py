"""The table of equations, id to entry, and how an entry is made ready for a gas.

To add an equation: its file in ``gasapi.engine.models`` and one line in ``GENERALISED`` here.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from typing import Any, Final, NamedTuple, Protocol

from gasapi.engine.models import (
    gerg_2008,
    ideal_gas,
    lee_kesler,
    peng_robinson,
    reference,
    soave_redlich_kwong,
    van_der_waals,
    virial,
)
from gasapi.engine.protocol import Fluid
from gasapi.errors import UnknownModel
from gasapi.gases.records import CubicPair, Limits, Substance
from gasapi.service.gas import ResolvedGas

__all__ = ["GENERALISED", "MODEL_IDS", "ReducedRange", "generalised_limits", "known_model", "why_not"]


class ReducedRange(NamedTuple):
    """The range of a generalised equation in reduced temperature and pressure, with what it rests on."""

    temperature_min: float
    temperature_max: float
    pressure_max: float
    basis: str


class GeneralisedModule(Protocol):
    """What a file of a generalised equation offers."""

    ID: str
    NAME: str
    SOURCE: str
    serves: Callable[[Sequence[Substance]], str | None]
    build: Callable[[Sequence[Substance], Sequence[float], Callable[[str, str], CubicPair | None]], Fluid]


class GeneralisedModel(NamedTuple):
    """A line of the table: the file, its working range, whether it has a saturation line of its own and a liquid."""

    module: Any
    range: ReducedRange
    has_saturation: bool
    gas_only: bool
    uses_interaction: bool


# the uncertainty was measured up to 10 times this pressure and counts from 0.4 Tc on; non-quantum gases reach 16 Tc
_WORKING: Final = (
    "range over which the uncertainty was measured against reference equations; above a reduced temperature of 16 for"
    " quantum gases only"
)

GENERALISED: Final[Mapping[str, GeneralisedModel]] = {
    line.module.ID: line
    for line in (
        GeneralisedModel(ideal_gas, ReducedRange(0.4, 100.0, 10.0, _WORKING), False, True, False),
        GeneralisedModel(van_der_waals, ReducedRange(0.4, 100.0, 10.0, _WORKING), True, False, False),
        GeneralisedModel(virial, ReducedRange(0.4, 100.0, 10.0, _WORKING), False, True, False),
        GeneralisedModel(soave_redlich_kwong, ReducedRange(0.4, 100.0, 10.0, _WORKING), True, False, True),
        GeneralisedModel(peng_robinson, ReducedRange(0.4, 100.0, 10.0, _WORKING), True, False, True),
        GeneralisedModel(lee_kesler, ReducedRange(0.3, 4.0, 10.0, "range of the published tables"), False, False, False),
    )
}

MODEL_IDS: Final = (
    "ideal-gas",
    "van-der-waals",
    "virial",
    "soave-redlich-kwong",
    "peng-robinson",
    "lee-kesler",
    reference.ID,
    gerg_2008.ID,
)

# how far beyond its working range a generalised equation still gives a number, with a warning
_EXTENDED_COLD: Final = 0.5
_EXTENDED_HOT: Final = 3.0
_EXTENDED_PRESSURE: Final = 10.0


def known_model(model: str) -> str:
    """Return the id of a model.

    :raises UnknownModel: where no equation has it
    """
    if model not in MODEL_IDS:
        raise UnknownModel(model, MODEL_IDS)
    return model


def why_not(model: str, gas: ResolvedGas) -> str | None:
    """Return why a model cannot serve a gas at all, in words, or None where it can."""
    if model == reference.ID:
        if gas.reference_id is not None:
            return None
        if gas.is_pure:
            return "no reference equation of this gas is held"
        return "a reference equation holds for one pure gas (or dry air), not for a mixture"
    if model == gerg_2008.ID:
        if gas.gerg:
            return None
        return "GERG-2008 knows 21 components only, and this gas has another"
    return GENERALISED[model].module.serves(gas.substances)


def generalised_limits(model: str, substances: Sequence[Substance], fractions: Sequence[float]) -> tuple[Limits, Limits]:
    """Return working and extended range of a generalised equation for a gas; a mixture takes mole-fraction averages."""
    line = GENERALISED[model]
    tc = math.fsum(x * s.critical_temperature for x, s in zip(fractions, substances, strict=True))
    pc = math.fsum(x * s.critical_pressure for x, s in zip(fractions, substances, strict=True))
    r = line.range
    working = Limits(r.temperature_min * tc, r.temperature_max * tc, r.pressure_max * pc, r.basis)
    extended = Limits(
        _EXTENDED_COLD * r.temperature_min * tc,
        _EXTENDED_HOT * r.temperature_max * tc,
        _EXTENDED_PRESSURE * r.pressure_max * pc,
        "extrapolation",
    )
    return working, extended
