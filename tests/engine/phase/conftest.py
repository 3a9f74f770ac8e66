"""Reference gases ready for phase tests, and the same gases in an independent library."""

import json
from collections.abc import Callable
from functools import cache
from typing import NamedTuple

import CoolProp.CoolProp
import pytest
from CoolProp import AbstractState

from gasapi.engine.models.reference import ReferenceFluid
from gasapi.engine.phase.saturation import SaturationCurve
from gasapi.gases.equation_files import load_reference
from gasapi.gases.records import ReferenceEquation

_LIBRARY_NAMES = {
    "carbon-monoxide": "CarbonMonoxide",
    "carbonyl-sulfide": "CarbonylSulfide",
    "dimethyl-ether": "DimethylEther",
    "ethylene-oxide": "EthyleneOxide",
    "hydrogen-chloride": "HydrogenChloride",
    "hydrogen-sulfide": "HydrogenSulfide",
    "methyl-chloride": "R40",
    "nitrous-oxide": "NitrousOxide",
    "r1233zd-e": "R1233zd(E)",
    "r1234ze-e": "R1234ze(E)",
    "sulfur-dioxide": "SulfurDioxide",
    "sulfur-hexafluoride": "SulfurHexafluoride",
    "vinyl-chloride": "VinylChloride",
    "carbon-dioxide": "CarbonDioxide",
}

_SECOND_EQUATION = ("n-hexane", "n-octane", "n-pentane", "neon")
"""Gases whose published equation, the one held here, is the library's second."""


class ReferenceGas(NamedTuple):
    """A record with the equation and the curve built from it."""

    equation: ReferenceEquation
    fluid: ReferenceFluid
    curve: SaturationCurve


@cache
def _reference_gas(id: str) -> ReferenceGas:
    equation = load_reference(id)
    assert equation.saturation is not None
    curve = SaturationCurve(equation.saturation)
    return ReferenceGas(equation, ReferenceFluid(equation, curve), curve)


@cache
def _library_state(id: str) -> AbstractState:
    name = _LIBRARY_NAMES.get(id, id.upper())
    if id not in _SECOND_EQUATION:
        return AbstractState("HEOS", name)
    (fluid,) = json.loads(CoolProp.CoolProp.get_fluid_param_string(name, "JSON"))
    fluid["EOS"] = [fluid["EOS"][1]]
    fluid["INFO"] |= {"NAME": f"{id} second", "ALIASES": [], "CAS": f"{id} second", "REFPROP_NAME": "N/A"}
    CoolProp.CoolProp.add_fluids_as_JSON("HEOS", json.dumps([fluid]))
    return AbstractState("HEOS", f"{id} second")


@pytest.fixture(scope="session")
def reference_gas() -> Callable[[str], ReferenceGas]:
    """Return what builds a reference gas from its id."""
    return _reference_gas


@pytest.fixture(scope="session")
def library_state() -> Callable[[str], AbstractState]:
    """Return what builds the library's gas of the same id."""
    return _library_state
