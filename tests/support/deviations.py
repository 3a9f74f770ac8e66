"""Compares the reference equations and GERG-2008 with independent general libraries (CoolProp, teqp) at random states.

The measure is |p - p_library| / (rho dp/drho): the relative density error that the pressure difference amounts to. As a
command, ``python tests/support/deviations.py [states]`` prints the table of worst deviations, one line a gas and one a pair.
"""

from __future__ import annotations

import json
import sys
from collections.abc import Callable, Iterator
from functools import cache
from typing import NamedTuple

import CoolProp.CoolProp as CoolProp
import numpy as np
import teqp

from gasapi.engine.models.gerg_2008 import GergSystem
from gasapi.engine.models.reference import ReferenceFluid
from gasapi.engine.phase.saturation import SaturationCurve
from gasapi.engine.protocol import Branch
from gasapi.gases.loader import load_gerg, load_reference, reference_ids

SECOND_EQUATION = ("n-pentane", "n-hexane", "n-octane", "neon")
"""Gases for which the library's first equation has no refereed publication; its second one is the published one here."""

LOOSE = {"ammonia": 1e-6}
"""The library follows a draft of the ammonia equation with another gas constant."""

LIMIT = 1e-8
NEAR_CRITICAL = 1e-4

# library names that neither id nor name nor alias gives
_NAMES = {"hydrogen": "Hydrogen", "deuterium": "Deuterium", "parahydrogen": "ParaHydrogen", "air": "Air"}


class Deviation(NamedTuple):
    """The worst of the states compared: deviation, temperature (K) and density (mol/m3) of it, number of states."""

    worst: float
    temperature: float
    density: float
    states: int


@cache
def _library_names() -> dict[str, str]:
    names = {}
    for name in CoolProp.get_global_param_string("FluidsList").split(","):
        names.setdefault(CoolProp.get_fluid_param_string(name, "CAS"), name)
    return names


def library_name(gas: str) -> str:
    """Return what CoolProp calls a gas."""
    if gas in _NAMES:
        return _NAMES[gas]
    return _library_names()[_cas(gas)]


@cache
def _cas_numbers() -> dict[str, str]:
    from gasapi.gases.catalogue import Catalogue

    catalogue = Catalogue.load()
    return {catalogue.reference_id(g.id): g.cas for g in catalogue.gases if catalogue.reference_id(g.id) and g.cas}


def _cas(gas: str) -> str:
    return _cas_numbers()[gas]


def reference_fluid(gas: str) -> ReferenceFluid:
    """Return a gas by its reference equation, made from the data alone."""
    equation = load_reference(gas)
    return ReferenceFluid(equation, None if equation.saturation is None else SaturationCurve(equation.saturation))


def library_pressure(gas: str) -> Callable[[float, float], float]:
    """Return the library's p(T, rho) for a gas, Pa."""
    name = library_name(gas)
    if gas in SECOND_EQUATION:
        fluid = json.loads(CoolProp.get_fluid_param_string(name, "JSON"))[0]
        fluid["EOS"] = fluid["EOS"][1:]
        model = teqp.make_model({"kind": "multifluid", "model": {"components": [fluid], "BIP": [], "departure": []}})
        z = np.array([1.0])

        def pressure(t: float, rho: float) -> float:
            return rho * model.get_R(z) * t * (1.0 + model.get_Ar01(t, rho, z))

        return pressure
    state = CoolProp.AbstractState("HEOS", name)
    state.specify_phase(CoolProp.iphase_gas)

    def pressure(t: float, rho: float) -> float:
        state.update(CoolProp.DmolarT_INPUTS, rho, t)
        return state.p()

    return pressure


def random_states(fluid: ReferenceFluid, n: int, seed: int) -> tuple[np.ndarray, np.ndarray]:
    """Return temperatures and densities of stable states over the whole range of an equation."""
    rng = np.random.default_rng(seed)
    limits = fluid.equation.validity
    t = rng.uniform(limits.temperature_min, limits.temperature_max, n)
    p = np.exp(rng.uniform(np.log(1e3), np.log(limits.pressure_max), n))
    rho = np.empty(n)
    keep = np.zeros(n, dtype=bool)
    if fluid.saturation is None:
        liquid = t < fluid.critical.temperature
        liquid &= p > 4e6
    else:
        below = t < fluid.critical.temperature
        liquid = np.zeros(n, dtype=bool)
        liquid[below] = p[below] > fluid.saturation.pressure(t[below])
    for branch, rows in ((Branch.GAS, ~liquid), (Branch.LIQUID, liquid)):
        root = fluid.density(t[rows], p[rows], branch)
        rho[rows] = root.density
        keep[rows] = root.status == 0
    keep &= np.abs(t / fluid.critical.temperature - 1.0) > NEAR_CRITICAL
    return t[keep], rho[keep]


def _worst(deviation: np.ndarray, t: np.ndarray, rho: np.ndarray) -> Deviation:
    i = int(np.argmax(deviation))
    return Deviation(float(deviation[i]), float(t[i]), float(rho[i]), t.size)


def reference_deviation(gas: str, n: int, seed: int = 20) -> Deviation:
    """Return the worst deviation of a reference equation at random states."""
    fluid = reference_fluid(gas)
    t, rho = random_states(fluid, n, seed)
    ours = fluid.pressure(t, rho)
    library = library_pressure(gas)
    theirs = np.array([library(float(a), float(b)) for a, b in zip(t, rho, strict=True)])
    return _worst(np.abs(ours.pressure - theirs) / (rho * ours.density_derivative), t, rho)


def gerg_deviation(ids: tuple[str, ...], fractions: np.ndarray, n: int, seed: int = 21) -> Deviation:
    """Return the worst deviation of GERG-2008 from teqp at random one-phase-like states (dp/drho > 0 from the outside)."""
    data = load_gerg()
    fluid = GergSystem(data, ids).fluid(fractions.tolist())
    rng = np.random.default_rng(seed)
    low, high = data.extended.temperature_min, data.extended.temperature_max
    t = rng.uniform(low, high, n)
    p = np.exp(rng.uniform(np.log(1e4), np.log(data.extended.pressure_max), n))
    parts = [fluid.density(t, p, branch) for branch in Branch]
    t = np.concatenate([t[part.status == 0] for part in parts])
    rho = np.concatenate([part.density[part.status == 0] for part in parts])
    if fluid.critical is not None:
        keep = np.abs(t / fluid.critical.temperature - 1.0) > NEAR_CRITICAL
        t, rho = t[keep], rho[keep]
    names = [_GERG_NAMES.get(i, i.replace("-", "")) for i in ids]
    model = teqp.make_model({"kind": "GERG2008resid", "model": {"names": names}})
    r = model.get_R(fractions)
    theirs = np.array([b * r * a * (1.0 + model.get_Ar01(float(a), float(b), fractions)) for a, b in zip(t, rho, strict=True)])
    ours = fluid.pressure(t, rho)
    return _worst(np.abs(ours.pressure - theirs) / (rho * ours.density_derivative), t, rho)


_GERG_NAMES = {
    "carbon-dioxide": "carbondioxide",
    "carbon-monoxide": "carbonmonoxide",
    "hydrogen-sulfide": "hydrogensulfide",
    "n-butane": "n-butane",
    "n-pentane": "n-pentane",
    "n-hexane": "n-hexane",
    "n-heptane": "n-heptane",
    "n-octane": "n-octane",
    "n-nonane": "n-nonane",
    "n-decane": "n-decane",
}


def gerg_pairs() -> Iterator[tuple[str, str]]:
    """Yield the ids of every pair of GERG-2008."""
    data = load_gerg()
    for pair in data.pairs:
        yield data.components[pair.i].id, data.components[pair.j].id


def main() -> None:
    """Print the table of worst deviations."""
    n = int(sys.argv[1]) if len(sys.argv) > 1 else 400
    print(f"{'equation':<52}{'worst':>10}{'T / K':>10}{'rho / mol/m3':>15}{'states':>8}")
    for gas in reference_ids():
        d = reference_deviation(gas, n)
        note = " (library's second equation)" if gas in SECOND_EQUATION else ""
        print(f"{'reference ' + gas + note:<52}{d.worst:>10.1e}{d.temperature:>10.2f}{d.density:>15.5g}{d.states:>8}")
    for c in load_gerg().components:
        d = gerg_deviation((c.id,), np.array([1.0]), n)
        print(f"{'gerg-2008 ' + c.id:<52}{d.worst:>10.1e}{d.temperature:>10.2f}{d.density:>15.5g}{d.states:>8}")
    rng = np.random.default_rng(5)
    for pair in gerg_pairs():
        x = rng.uniform(0.05, 0.95)
        d = gerg_deviation(pair, np.array([x, 1.0 - x]), max(20, n // 4))
        name = f"gerg-2008 {pair[0]} + {pair[1]}"
        print(f"{name:<52}{d.worst:>10.1e}{d.temperature:>10.2f}{d.density:>15.5g}{d.states:>8}")


if __name__ == "__main__":
    main()
