"""Deviations of the generalised equations from reference equations (pure gases) and from GERG-2008 (mixtures).

A deviation is (density of the truth - density of the equation)/density of the equation, at equal temperature and pressure
and on the same branch, both densities molar and divided by their own gas constant, so that at low pressure it vanishes.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from functools import cache
from typing import Final, NamedTuple

import numpy as np
from numpy.typing import NDArray

from gasapi.engine.models.gerg_2008 import GergSystem
from gasapi.engine.models.lee_kesler import reduced_vapour_pressure
from gasapi.engine.models.reference import ReferenceFluid
from gasapi.engine.phase.saturation import SaturationCurve
from gasapi.engine.protocol import Branch, Fluid
from gasapi.gases.catalogue import Catalogue
from gasapi.gases.loader import load_gerg, load_interaction, load_reference
from gasapi.gases.records import CubicPair, Substance
from gasapi.service.models import GENERALISED

Array = NDArray[np.float64]

MODELS: Final = tuple(GENERALISED)
BRANCHES: Final = {"gas": Branch.GAS, "liquid": Branch.LIQUID}


class Truth(NamedTuple):
    """A gas with its reference equation."""

    substance: Substance
    fluid: ReferenceFluid


@cache
def catalogue() -> Catalogue:
    """Return the catalogue of the package."""
    return Catalogue.load()


@cache
def substances() -> tuple[Substance, ...]:
    """Return every substance of the catalogue."""
    return tuple(gas.substance for gas in catalogue().gases if gas.substance is not None)


@cache
def truths() -> tuple[Truth, ...]:
    """Return all pure gases with a reference equation."""
    found = []
    for substance in substances():
        id = catalogue().reference_id(substance.id)
        if id is not None:
            equation = load_reference(id)
            curve = None if equation.saturation is None else SaturationCurve(equation.saturation)
            found.append(Truth(substance, ReferenceFluid(equation, curve)))
    return tuple(found)


def interaction(first: str, second: str) -> CubicPair | None:
    """Return the published interaction parameters of a pair."""
    return load_interaction().get((min(first, second), max(first, second)))


def no_interaction(first: str, second: str) -> None:
    """Return that none is published, for any pair."""


def build(model: str, parts: Sequence[Substance], fractions: Sequence[float], known: bool = True) -> Fluid | None:
    """Return a generalised equation, None where it cannot serve."""
    module = GENERALISED[model].module
    if module.serves(parts) is not None:
        return None
    return module.build(parts, fractions, interaction if known else no_interaction)


def scale_pressure(temperature: Array, acentric_factor: float) -> Array:
    """Return what the gas's pressures are counted in, p_sat/pc by Lee and Kesler's correlation and 1 above Tc."""
    cold = np.minimum(temperature, 1.0)
    return np.where(temperature < 1.0, reduced_vapour_pressure(cold, acentric_factor), 1.0)


def compressibility(fluid: Fluid, t: Array, p: Array, branch: Branch) -> Array:
    """Return Z of a branch, NaN without a root."""
    root = fluid.density(t, p, branch)
    good = root.status == 0
    return np.where(good, p / (np.where(good, root.density, 1.0) * fluid.gas_constant * t), np.nan)


def truth_compressibility(truth: Truth, t: Array, p: Array, branch: Branch) -> Array:
    """Return Z by the reference equation, NaN outside its range. It may run to higher temperatures, as its authors let it."""
    limits = truth.fluid.equation
    inside = (t >= limits.validity.temperature_min) & (t <= limits.extended.temperature_max)
    inside &= p <= limits.validity.pressure_max
    z = np.full(t.size, np.nan)
    rows = np.flatnonzero(inside)
    if rows.size:
        z[rows] = compressibility(truth.fluid, t[rows], p[rows], branch)
    return z


def deviations(model: str, truth: Truth, t: Array, p: Array, branch: Branch) -> Array:
    """Return the deviations of an equation for one gas, NaN where either has no root.

    :param t: K, shape (n,)
    :param p: Pa, shape (n,)
    """
    fluid = build(model, [truth.substance], [1.0])
    if fluid is None:
        return np.full(t.size, np.nan)
    return compressibility(fluid, t, p, branch) / truth_compressibility(truth, t, p, branch) - 1.0


class Mixture(NamedTuple):
    """A mixture of GERG-2008 components with its mole-fraction averages of Tc (K), pc (Pa) and omega."""

    parts: tuple[Substance, ...]
    fractions: tuple[float, ...]
    critical_temperature: float
    critical_pressure: float
    acentric_factor: float

    @property
    def unlike_share(self) -> float:
        """Return the share of unlike pairs, 1 - sum of squared fractions."""
        return 1.0 - sum(x * x for x in self.fractions)


def random_mixtures(n: int, seed: int) -> list[Mixture]:
    """Return mixtures of two to five components of GERG-2008, every other one of components with Tc within a factor of 1.7.

    Alkanes above heptane are rare in gases and left out; water is a tenth at most, since GERG-2008 knows it as a trace.
    """
    rng = np.random.default_rng(seed)
    heavy = {"n-octane", "n-nonane", "n-decane"}
    parts = [catalogue().substance(c.id) for c in load_gerg().components if c.id not in heavy]
    mixtures: list[Mixture] = []
    while len(mixtures) < n:
        first = parts[int(rng.integers(len(parts)))]
        near = len(mixtures) % 2 == 0
        others = [s for s in parts if s is not first and (not near or _ratio(s, first) < 1.7)]
        count = min(int(rng.integers(1, 5)), len(others))
        if count == 0:
            continue
        chosen = [first, *(others[i] for i in rng.choice(len(others), size=count, replace=False))]
        weights = rng.dirichlet(np.full(len(chosen), 1.0))
        dry = sum(float(w) for s, w in zip(chosen, weights, strict=True) if s.id != "water")
        weights = np.array([min(w, dry / 9.0) if s.id == "water" else w for s, w in zip(chosen, weights, strict=True)])
        mixtures.append(mixture(chosen, [float(w) for w in weights / weights.sum()]))
    return mixtures


def _ratio(first: Substance, second: Substance) -> float:
    a, b = first.critical_temperature, second.critical_temperature
    return max(a, b) / min(a, b)


def mixture(parts: Sequence[Substance], fractions: Sequence[float]) -> Mixture:
    """Return a mixture with its averages."""
    pairs = list(zip(fractions, parts, strict=True))
    return Mixture(
        tuple(parts),
        tuple(fractions),
        sum(x * s.critical_temperature for x, s in pairs),
        sum(x * s.critical_pressure for x, s in pairs),
        sum(x * s.acentric_factor for x, s in pairs),
    )


def _wilson(substance: Substance, t: Array) -> Array:
    """Return a rough vapour pressure, Pa (Wilson 1968), also above the critical temperature."""
    exponent = 5.373 * (1.0 + substance.acentric_factor) * (1.0 - substance.critical_temperature / t)
    return substance.critical_pressure * np.exp(exponent)


def surely_gas(m: Mixture, t: Array, p: Array) -> NDArray[np.bool_]:
    """Return where a mixture is one gas beyond doubt: hotter than every component's Tc, or well below a rough dew pressure."""
    dew = 1.0 / sum(x / _wilson(s, t) for x, s in zip(m.fractions, m.parts, strict=True))
    return (t > max(s.critical_temperature for s in m.parts)) | (p < 0.6 * dew)


def gerg_compressibility(m: Mixture, t: Array, p: Array) -> Array:
    """Return Z of a gas mixture by GERG-2008, NaN outside its extended limits and where it may not be one gas."""
    data = load_gerg()
    inside = (t >= data.extended.temperature_min) & (t <= data.extended.temperature_max) & (p <= data.extended.pressure_max)
    inside &= surely_gas(m, t, p)
    z = np.full(t.size, np.nan)
    rows = np.flatnonzero(inside)
    if rows.size:
        fluid = GergSystem(data, [s.id for s in m.parts]).fluid(m.fractions)
        z[rows] = compressibility(fluid, t[rows], p[rows], Branch.GAS)
    return z


def mixture_deviations(models: Sequence[str], m: Mixture, t: Array, p: Array) -> Mapping[str, Array]:
    """Return the deviations of equations for one mixture; NaN as for a pure gas."""
    truth = gerg_compressibility(m, t, p)
    found = {}
    for model in models:
        fluid = build(model, m.parts, m.fractions)
        found[model] = np.full(t.size, np.nan) if fluid is None else compressibility(fluid, t, p, Branch.GAS) / truth - 1.0
    return found
