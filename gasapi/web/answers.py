"""Answers in the caller's units, written down: the JSON and the one-line form of a state. Nothing is computed here.

The members are built and written directly; the schemas in ``answer_schemas`` describe them and the tests compare the two.
"""

from __future__ import annotations

from functools import lru_cache
from typing import Any

import orjson

from gasapi import __version__
from gasapi.service.answers import PhasePart
from gasapi.service.state import Answered
from gasapi.units import UnitMap
from gasapi.web.questions import Asked

__all__ = ["remembered_form", "state_json", "state_line", "state_members"]

_KEPT_MAPS = 512


def state_members(asked: Asked, answered: Answered) -> dict[str, Any]:
    """Return the members of a state answer, in the order and by the names of the contract."""
    answer, units = answered.answer, asked.units
    gas, phase, model, quality = answer.gas, answer.phase, answer.model, answer.quality
    density, temperature = units.density, units.temperature
    result: dict[str, Any] = {
        "density": None if answer.density is None else density.from_si(answer.density),
        "compressibility_factor": answer.compressibility_factor,
        "molar_volume": None if answer.molar_volume is None else units.molar_volume.from_si(answer.molar_volume),
    }
    if asked.question.input_uncertainty is not None:
        expanded = answer.density_expanded_uncertainty
        result["density_expanded_uncertainty"] = None if expanded is None else density.difference_from_si(expanded)
    phase_members: dict[str, Any] = {
        "region": phase.region,
        "dew_point_temperature": (
            None if phase.dew_point_temperature is None else temperature.from_si(phase.dew_point_temperature)
        ),
        "margin_temperature": (
            None if phase.margin_temperature is None else temperature.difference_from_si(phase.margin_temperature)
        ),
        "margin_pressure": (
            None if phase.margin_pressure is None else units.pressure.difference_from_si(phase.margin_pressure)
        ),
        "model": phase.model,
        "warnings": [{"code": code, "message": message} for code, message in phase.warnings],
    }
    if answer.two_phase is not None:
        phase_members["vapour"] = _part(answer.two_phase.vapour, units)
        phase_members["liquid"] = _part(answer.two_phase.liquid, units)
    return {
        "gas": {"id": gas.id, "fractions": dict(gas.fractions), "molar_mass": units.molar_mass.from_si(gas.molar_mass)},
        "state": {"pressure": answer.pressure, "temperature": answer.temperature},
        "result": result,
        "units": _written_names(units),
        "phase": phase_members,
        "model": {
            "id": model.id,
            "name": model.name,
            "source": model.source,
            "validity": {"temperature": model.validity_temperature, "pressure": model.validity_pressure},
            "inside_validity": model.inside_validity,
            "relative_uncertainty": model.relative_uncertainty,
            "uncertainty_basis": model.uncertainty_basis,
            "selected_because": model.selected_because,
        },
        "sensitivity": {
            "density_pressure": (
                None if answer.density_pressure is None else units.ratio_from_si("density", "pressure", answer.density_pressure)
            ),
            "density_temperature": (
                None
                if answer.density_temperature is None
                else units.ratio_from_si("density", "temperature", answer.density_temperature)
            ),
        },
        "quality": {
            "level": quality.level,
            "status_code": quality.status_code,
            "symbol": quality.symbol,
            "reasons": quality.reasons,
        },
        "cautions": answer.cautions,
        "trace": {"cached": answered.cached, "version": __version__, "data": answer.data},
    }


def state_json(asked: Asked, answered: Answered) -> bytes:
    """Return a state answer as JSON; every number in the shortest form that reads back to the same bits."""
    return orjson.dumps(state_members(asked, answered))


def state_line(asked: Asked, answered: Answered) -> bytes:
    """Return a state answer as one CSV record (RFC 4180): status code, density, Z, molar volume, region; empty where null."""
    answer, units = answered.answer, asked.units
    density, molar_volume = answer.density, answer.molar_volume
    numbers = (
        None if density is None else units.density.from_si(density),
        answer.compressibility_factor,
        None if molar_volume is None else units.molar_volume.from_si(molar_volume),
    )
    texts = ["" if number is None else repr(number) for number in numbers]
    return f"{answer.quality.status_code},{','.join(texts)},{answer.phase.region}\r\n".encode("ascii")


def remembered_form(body: bytes, answered: Answered) -> bytes:
    """Return the JSON of an answer as it is given again later: the same but for ``trace.cached``."""
    if answered.cached:
        return body
    data = answered.answer.data
    return body.removesuffix(_trace_end(data, False)) + _trace_end(data, True)


@lru_cache(maxsize=4)
def _trace_end(data: str, cached: bool) -> bytes:
    trace = {"trace": {"cached": cached, "version": __version__, "data": data}}
    return orjson.dumps(trace).removeprefix(b"{")


@lru_cache(maxsize=_KEPT_MAPS)
def _written_names(units: UnitMap) -> orjson.Fragment:
    return orjson.Fragment(orjson.dumps(dict(units.names)))


def _part(part: PhasePart, units: UnitMap) -> dict[str, Any]:
    return {
        "phase_fraction": part.phase_fraction,
        "density": units.density.from_si(part.density),
        "fractions": dict(part.fractions),
    }
