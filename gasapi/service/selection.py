"""Which equation answers, and why, in words. Ranges are compared; no equation is evaluated."""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple, Protocol

import numpy as np

from gasapi.engine.elementary import Array
from gasapi.engine.models import gerg_2008, reference
from gasapi.errors import ModelCannotServe
from gasapi.gases.records import Limits
from gasapi.service.gas import ResolvedGas
from gasapi.service.models import known_model, why_not

__all__ = ["Candidates", "Choice", "choose", "choose_for_rows"]

AUTO = "auto"

_PUBLISHED = (reference.ID, gerg_2008.ID)
# in order of preference where stated uncertainties are equal
_GENERALISED = ("lee-kesler", "soave-redlich-kwong", "peng-robinson", "virial")

_WORDS = {
    reference.ID: "the published multiparameter equation of this gas",
    gerg_2008.ID: "the published equation for mixtures of these components",
}


class Choice(NamedTuple):
    """A model id, None where no equation serves the gas, and the reason in words."""

    model: str | None
    because: str


class Candidates(Protocol):
    """What selection asks about a gas: ranges of its published equations, and the stated uncertainty of the others."""

    gas: ResolvedGas

    def limits(self, model: str) -> tuple[Limits, Limits]:
        """Return validity and extended limits of a model that can serve the gas."""
        ...

    def expected_uncertainty(self, model: str, temperature: float, pressure: float) -> float:
        """Return the stated uncertainty of a generalised model, before any density is known."""
        ...

    def vapour_below_triple(self, temperature: float, pressure: float) -> bool:
        """Return whether the state is known to be vapour below the triple point."""
        ...


def _inside(limits: Limits, temperature: float, pressure: float) -> bool:
    return limits.temperature_min <= temperature <= limits.temperature_max and pressure <= limits.pressure_max


def _requested(candidates: Candidates, model: str) -> Choice:
    why = why_not(known_model(model), candidates.gas)
    if why is not None:
        raise ModelCannotServe(model, candidates.gas.id or "this mixture", why)
    return Choice(model, "asked for by name")


def _published(gas: ResolvedGas) -> list[str]:
    return [m for m in _PUBLISHED if why_not(m, gas) is None]


def _generalised(gas: ResolvedGas) -> list[str]:
    return [m for m in _GENERALISED if why_not(m, gas) is None]


def _least_uncertain(candidates: Candidates, models: Sequence[str], temperature: float, pressure: float) -> str:
    def rank(model: str) -> tuple[bool, float]:
        return (
            not _inside(candidates.limits(model)[0], temperature, pressure),
            candidates.expected_uncertainty(model, temperature, pressure),
        )

    return min(models, key=rank)


def choose(candidates: Candidates, requested: str, temperature: float, pressure: float) -> Choice:
    """Return the equation for one state.

    :param candidates: the gas and its ranges
    :param requested: ``auto`` or a model id
    :param temperature: K
    :param pressure: Pa
    :raises UnknownModel: for an id that no equation has
    :raises ModelCannotServe: for an equation asked for by name that cannot serve the gas at all
    """
    if requested != AUTO:
        return _requested(candidates, requested)
    gas = candidates.gas
    published = _published(gas)
    for model in published:
        if _inside(candidates.limits(model)[0], temperature, pressure):
            return Choice(model, f"{_WORDS[model]}, and the state lies in its range")
    for model in published:
        if _inside(candidates.limits(model)[1], temperature, pressure):
            return Choice(model, f"{_WORDS[model]}; the state lies outside its range but inside its extended limits")
    generalised = _generalised(gas)
    if published:
        if generalised and candidates.vapour_below_triple(temperature, pressure):
            best = _least_uncertain(candidates, generalised, temperature, pressure)
            return Choice(
                best, "the published equation ends at the triple point; for vapour below it the least uncertain general one"
            )
        return Choice(published[0], f"{_WORDS[published[0]]}; the state lies outside its extended limits")
    if not generalised:
        return Choice(None, "no equation can serve this gas")
    best = _least_uncertain(candidates, generalised, temperature, pressure)
    return Choice(best, "no published equation covers this gas; of the general ones this is the least uncertain at this state")


def choose_for_rows(candidates: Candidates, requested: str, temperature: Array, pressure: Array) -> Choice:
    """Return the one equation for a series: the one whose range holds most rows, so that no step appears where a range ends.

    :param candidates: the gas and its ranges
    :param requested: ``auto`` or a model id
    :param temperature: K, usable rows only, shape (n,)
    :param pressure: Pa, shape (n,)
    :raises UnknownModel: for an id that no equation has
    :raises ModelCannotServe: for an equation asked for by name that cannot serve the gas at all
    """
    if requested != AUTO:
        return _requested(candidates, requested)
    gas = candidates.gas
    published = _published(gas)
    if temperature.size == 0:
        return choose(candidates, requested, 293.15, 101325.0)
    if published:

        def held(model: str, which: int) -> int:
            r = candidates.limits(model)[which]
            inside = (temperature >= r.temperature_min) & (temperature <= r.temperature_max) & (pressure <= r.pressure_max)
            return int(np.count_nonzero(inside))

        best = max(published, key=lambda m: (held(m, 0), held(m, 1)))
        return Choice(best, f"{_WORDS[best]}; its range holds the most rows of the series")
    if not _generalised(gas):
        return Choice(None, "no equation can serve this gas")
    middle = choose(candidates, requested, float(np.median(temperature)), float(np.median(pressure)))
    return Choice(middle.model, "of the general equations the least uncertain at the middle of the series")
