"""The virial equation truncated after the second coefficient, with Tsonopoulos' correlation of that coefficient.

    Z = 1 + B p/(R T),   so that rho = p/(R T + B p) and p = rho R T/(1 - B rho)

**Why the pressure form.** It is explicit both ways and rises everywhere, and against the reference equations of 22 gases
(up to 0.6 critical densities, T_r 0.6 to 3) it errs less than Z = 1 + B rho wherever T_r > 1: 0.3 % against 0.9 % at T_r = 1.1
to 1.3 and 0.1 critical densities. Only below T_r = 0.9, close to saturation, it errs more: 1.3 % against 0.6 %.

**Where it holds.** The rule of thumb is half the critical density (Prausnitz, Lichtenthaler and de Azevedo, Molecular
Thermodynamics of Fluid-Phase Equilibria, 3rd ed. 1999, chapter 5; Poling, Prausnitz and O'Connell, The Properties of Gases
and Liquids, 5th ed. 2001, section 4-5). Near T_r = 1 that lets errors of 20 % through, so less is served here: up to a quarter
of the critical density and with abs(Z - 1) at most 0.15, where the same comparison gives a median error of 0.2 %, 95 % of the
states within 1.8 % and all within 4 %. Beyond, the status is "not applicable". There is no liquid.

**B of a pure gas** (Tsonopoulos 1974): B pc/(R Tc) = f0 + omega f1 + a/T_r^6 - b/T_r^8, with a and b of the published polar
classes by reduced dipole mu_r = 1e5 mu^2 pc/Tc^2 (debye, atm, K). Polar gases outside these classes, or without a dipole
moment, are taken as non-polar, and ``without_polar_term`` names them. **Quantum gases**: effective critical constants
Tc0/(1 + 21.8/(M T)), pc0/(1 + 44.2/(M T)) and omega = 0, M in g/mol (Gunn, Chueh and Prausnitz, AIChE J. 12 (1966) 937).

**Mixtures** (Prausnitz et al., chapter 5): B = sum x_i x_j B_ij with Tc_ij = sqrt(Tc_i Tc_j) (1 - k_ij), arithmetic means of
Vc^(1/3), Zc and omega, pc_ij = Zc_ij R Tc_ij/Vc_ij, and 1 - k_ij = 8 sqrt(Vc_i Vc_j)/(Vc_i^(1/3) + Vc_j^(1/3))^3 where both
critical volumes are known, else k_ij = 0. a_ij and b_ij are means where both are polar, else 0; 1/M_ij is the mean of 1/M.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from typing import Final, NamedTuple, cast

import numpy as np

from gasapi.engine.elementary import Array, Real
from gasapi.engine.models.cubic import GAS_CONSTANT, refusal
from gasapi.engine.protocol import Branch, Fluid, PressureDerivatives, Root, Status
from gasapi.gases.records import CubicPair, Substance

__all__ = ["DENSITY_LIMIT", "DEPARTURE_LIMIT", "ID", "NAME", "POLAR_CLASSES", "SOURCE", "Virial", "build", "serves"]

ID = "virial"
NAME = "Virial equation with the second coefficient of Tsonopoulos"
SOURCE = (
    "C. Tsonopoulos, AIChE J. 20 (1974) 263, doi 10.1002/aic.690200209; polar classes also 21 (1975) 827, "
    "doi 10.1002/aic.690210432, and C. Tsonopoulos, J. L. Heidman, Fluid Phase Equilib. 57 (1990) 261"
)

DENSITY_LIMIT: Final = 0.25
"""Of the critical density."""

DEPARTURE_LIMIT: Final = 0.15
"""Of Z from 1."""

_ATMOSPHERE: Final = 101325.0
# a dipole moment below this changes B by less than the correlation's own error (a rule of ours)
_POLAR: Final = 0.5

_OXYGENATED: Final = frozenset(
    {
        "acetaldehyde",
        "acetone",
        "acetonitrile",
        "butyraldehyde",
        "butyronitrile",
        "diethyl-ether",
        "diethyl-ketone",
        "diisopropyl-ether",
        "dimethyl-ether",
        "ethyl-acetate",
        "ethyl-formate",
        "formaldehyde",
        "isopropyl-acetate",
        "methyl-acetate",
        "methyl-ethyl-ether",
        "methyl-ethyl-ketone",
        "methyl-formate",
        "methyl-isobutyl-ketone",
        "2-pentanone",
        "n-butyl-acetate",
        "n-propyl-acetate",
        "propionaldehyde",
        "propionitrile",
    }
)
"""Ketones, aldehydes, nitriles, ethers and esters: a = -2.14e-4 mu_r - 4.308e-21 mu_r^8."""

# 1,2-dichloroethane is left out: its moment is that of one conformer, and the term makes its B worse
_HALIDES_AND_SULFIDES: Final = frozenset(
    {
        "1-1-1-trichloroethane",
        "1-1-dichloroethane",
        "1-2-dichloropropane",
        "1-chloropropane",
        "2-chloropropane",
        "chloroform",
        "dichloromethane",
        "diethyl-sulfide",
        "dimethyl-sulfide",
        "ethanethiol",
        "ethyl-bromide",
        "ethyl-chloride",
        "methanethiol",
        "methyl-bromide",
        "methyl-chloride",
        "methyl-iodide",
        "r11",
        "r114",
        "r115",
        "r12",
        "r125",
        "r13",
        "r13b1",
        "r13i1",
        "r142b",
        "r143a",
        "r152a",
        "r161",
        "r21",
        "r22",
        "r22b1",
        "r23",
        "r31",
        "r32",
        "r41",
    }
)
"""Alkyl halides, mercaptans and sulfides: a = -2.188e-11 mu_r^4 - 7.831e-21 mu_r^8."""

_ALKANOLS: Final = frozenset({"1-butanol", "1-pentanol", "1-propanol", "ethanol"})
"""1-Alkanols: a = 0.0878, b = 0.00908 + 0.0006957 mu_r."""

# the rule was made with about this moment for all of them (from memory); tabulated ones are of single conformers
_ALKANOL_DIPOLE: Final = 1.7
_METHANOL: Final = (0.0878, 0.0525)
_WATER: Final = (-0.0109, 0.0)


POLAR_CLASSES: Final = _OXYGENATED | _HALIDES_AND_SULFIDES | _ALKANOLS | {"methanol", "water", "heavy-water"}
"""Ids of the gases that have a polar term."""


class _Quantum(NamedTuple):
    """The classical limit of the critical constants: K, Pa, m3/mol (Prausnitz et al., table 5-4)."""

    temperature: float
    pressure: float
    volume: float


_QUANTUM: Final = {
    "deuterium": _Quantum(43.6, 20.4e5, 51.8e-6),
    "helium": _Quantum(10.47, 6.76e5, 37.5e-6),
    "hydrogen": _Quantum(43.6, 20.5e5, 51.5e-6),
    "neon": _Quantum(45.5, 27.3e5, 40.3e-6),
}


class _Constants(NamedTuple):
    """What the correlation sees of one substance or pair; ``inverse_mass`` is mol/g, 0 without quantum effects."""

    temperature: float
    pressure: float
    volume: float
    volume_known: bool
    acentric_factor: float
    a: float
    b: float
    polar: bool
    quantum: bool
    inverse_mass: float


class _QuantumTerm(NamedTuple):
    """A pair with quantum effects: B = scale (T + c2)/(T + c1) f((T + c1)/tc), f by the seven coefficients in 1/T_r."""

    scale: float
    c1: float
    c2: float
    tc: float
    coefficients: tuple[float, float, float, float, float, float]


def _polar_parameters(substance: Substance) -> tuple[float, float] | None:
    """Return a and b of the published classes, or None for a substance outside them."""
    if substance.id in ("water", "heavy-water"):
        return _WATER
    if substance.id == "methanol":
        return _METHANOL
    dipole = _ALKANOL_DIPOLE if substance.id in _ALKANOLS else substance.dipole_moment
    if dipole is None:
        return None
    reduced = 1e5 * dipole**2 * (substance.critical_pressure / _ATMOSPHERE) / substance.critical_temperature**2
    if substance.id in _ALKANOLS:
        return 0.0878, 0.00908 + 0.0006957 * reduced
    if substance.id in _OXYGENATED:
        return -2.14e-4 * reduced - 4.308e-21 * reduced**8, 0.0
    if substance.id in _HALIDES_AND_SULFIDES:
        return -2.188e-11 * reduced**4 - 7.831e-21 * reduced**8, 0.0
    return None


def _critical_volume(substance: Substance) -> float:
    """Return the critical volume, m3/mol; where unknown, of Zc = 0.291 - 0.080 omega (Prausnitz et al., sect. 5.7)."""
    if substance.critical_volume is not None:
        return substance.critical_volume
    zc = 0.291 - 0.080 * substance.acentric_factor
    return zc * GAS_CONSTANT * substance.critical_temperature / substance.critical_pressure


def _constants(substance: Substance) -> _Constants:
    inverse_mass = 1e-3 / substance.molar_mass
    quantum = _QUANTUM.get(substance.id)
    if quantum is not None:
        return _Constants(*quantum, True, 0.0, 0.0, 0.0, False, True, inverse_mass)
    polar = _polar_parameters(substance)
    a, b = polar if polar is not None else (0.0, 0.0)
    return _Constants(
        substance.critical_temperature,
        substance.critical_pressure,
        _critical_volume(substance),
        substance.critical_volume is not None,
        substance.acentric_factor,
        a,
        b,
        polar is not None,
        False,
        inverse_mass,
    )


def _pair(first: _Constants, second: _Constants) -> _Constants:
    """Return the constants of an unlike pair."""
    roots = first.volume ** (1.0 / 3.0) + second.volume ** (1.0 / 3.0)
    temperature = math.sqrt(first.temperature * second.temperature)
    if first.volume_known and second.volume_known:
        temperature *= 8.0 * math.sqrt(first.volume * second.volume) / roots**3
    # pc_ij = Zc_ij R Tc_ij/Vc_ij with Zc of both: R cancels
    zc_over_r = 0.5 * (first.pressure * first.volume / first.temperature + second.pressure * second.volume / second.temperature)
    volume = roots**3 / 8.0
    both = first.polar and second.polar
    return _Constants(
        temperature,
        zc_over_r * temperature / volume,
        volume,
        True,
        0.5 * (first.acentric_factor + second.acentric_factor),
        0.5 * (first.a + second.a) if both else 0.0,
        0.5 * (first.b + second.b) if both else 0.0,
        both,
        first.quantum or second.quantum,
        0.5 * (first.inverse_mass + second.inverse_mass),
    )


def _coefficients(constants: _Constants) -> tuple[float, float, float, float, float, float]:
    """Return the factors of T_r to the power 0, -1, -2, -3, -6 and -8 in B pc/(R Tc)."""
    w = constants.acentric_factor
    return (
        0.1445 + 0.0637 * w,
        -0.330,
        -0.1385 + 0.331 * w,
        -0.0121 - 0.423 * w,
        constants.a,
        -0.000607 - 0.008 * w - constants.b,
    )


class Virial(Fluid):
    """The truncated virial equation at one composition. Immutable.

    :param substances: the components
    :param fractions: mole fractions in the same order, summing to 1, [-]
    """

    without_polar_term: tuple[str, ...]
    """Ids of components with a dipole moment above 0.5 D, for which no polar term is published."""

    def __init__(self, substances: Sequence[Substance], fractions: Sequence[float]) -> None:
        self.model = ID
        self.gas_constant = GAS_CONSTANT
        self.molar_mass = sum(x * s.molar_mass for x, s in zip(fractions, substances, strict=True))
        self.critical = None
        present = [(x, s, _constants(s)) for x, s in zip(fractions, substances, strict=True) if x > 0.0]
        self.without_polar_term = tuple(
            s.id for _, s, c in present if not c.polar and s.dipole_moment is not None and s.dipole_moment > _POLAR
        )
        self._critical_temperature = sum(x * s.critical_temperature for x, s, _ in present)
        self._density_max = DENSITY_LIMIT / sum(x * _critical_volume(s) for x, s, _ in present)
        classical = [0.0] * 6
        quantum = []
        for i, (xi, _, first) in enumerate(present):
            for j, (xj, _, second) in enumerate(present[: i + 1]):
                weight = xi * xj if i == j else 2.0 * xi * xj
                constants = first if i == j else _pair(first, second)
                scale = weight * GAS_CONSTANT * constants.temperature / constants.pressure
                coefficients = _coefficients(constants)
                if constants.quantum:
                    c1, c2 = 21.8 * constants.inverse_mass, 44.2 * constants.inverse_mass
                    quantum.append(_QuantumTerm(scale, c1, c2, constants.temperature, coefficients))
                else:
                    tc = constants.temperature
                    for k, power in enumerate((0, 1, 2, 3, 6, 8)):
                        classical[k] += scale * coefficients[k] * tc**power
        self._classical = tuple(classical)
        self._quantum = tuple(quantum)

    def second_virial_coefficient(self, temperature: Real) -> tuple[Real, Real]:
        """Return B, m3/mol, and dB/dT, m3/mol/K.

        :param temperature: K, a float or an array of shape (n,)
        """
        value, slope = _series(self._classical, 1.0 / temperature)
        slope = slope * (-1.0 / (temperature * temperature))
        for scale, c1, c2, tc, coefficients in self._quantum:
            shifted = temperature + c1
            inverse = tc / shifted
            f, rate = _series(coefficients, inverse)
            mass = scale * (temperature + c2) / shifted
            value = value + mass * f
            slope = slope + (scale * (c1 - c2) / (shifted * shifted)) * f - mass * rate * (inverse / shifted)
        return value, slope

    def density(self, temperature: Real, pressure: Real, branch: Branch) -> Root[Real]:
        """Return the density, mol/m3; see ``Fluid.density``. Not applicable beyond the limits that the module gives.

        Below the (mole-averaged) critical temperature there is no liquid root.
        """
        if type(temperature) is not float:
            # what overflows is not applicable
            with np.errstate(all="ignore"):
                return cast("Root[Real]", self._density_block(cast(Array, temperature), cast(Array, pressure), branch))
        return cast("Root[Real]", self._density_float(temperature, cast(float, pressure), branch))

    def _density_float(self, temperature: float, pressure: float, branch: Branch) -> Root[float]:
        if branch == Branch.LIQUID and temperature < self._critical_temperature:
            return Root(math.nan, Status.NO_ROOT)
        b, _ = self.second_virial_coefficient(temperature)
        rt = GAS_CONSTANT * temperature
        departure = b * pressure / rt
        if not -DEPARTURE_LIMIT <= departure <= DEPARTURE_LIMIT:
            return Root(math.nan, Status.NOT_APPLICABLE)
        density = pressure / (rt * (1.0 + departure))
        return Root(density, Status.CONVERGED if density <= self._density_max else Status.NOT_APPLICABLE)

    def _density_block(self, temperature: Array, pressure: Array, branch: Branch) -> Root[Array]:
        b, _ = self.second_virial_coefficient(temperature)
        rt = GAS_CONSTANT * temperature
        departure = b * pressure / rt
        near = (departure >= -DEPARTURE_LIMIT) & (departure <= DEPARTURE_LIMIT)
        density = np.where(near, pressure / (rt * (1.0 + departure)), math.nan)
        status = np.where(density <= self._density_max, Status.CONVERGED, Status.NOT_APPLICABLE)
        if branch == Branch.LIQUID:
            none = temperature < self._critical_temperature
            status[none] = Status.NO_ROOT
            density[none] = math.nan
        return Root(density, status.astype(np.int8))

    def pressure(self, temperature: Real, density: Real) -> PressureDerivatives[Real]:
        """Return pressure and its derivatives; see ``Fluid.pressure``. B rho must be below 1."""
        b, slope = self.second_virial_coefficient(temperature)
        rt = GAS_CONSTANT * temperature
        z = 1.0 / (1.0 - b * density)
        return PressureDerivatives(
            density * rt * z, rt * (z * z), density * GAS_CONSTANT * (z + temperature * slope * density * (z * z))
        )

    def residual_gibbs(self, temperature: Real, density: Real) -> Real:
        """Return B p/(R T), [-]; see ``Fluid.residual_gibbs``."""
        b, _ = self.second_virial_coefficient(temperature)
        return b * density / (1.0 - b * density)


def _series(coefficients: Sequence[float], x: Real) -> tuple[Real, Real]:
    """Return k0 + k1 x + k2 x^2 + k3 x^3 + k6 x^6 + k8 x^8 and its derivative."""
    k0, k1, k2, k3, k6, k8 = coefficients
    x2 = x * x
    x3 = x2 * x
    value = k0 + x * (k1 + x * (k2 + x * (k3 + x3 * (k6 + x2 * k8))))
    slope = k1 + x * (2.0 * k2 + x * (3.0 * k3 + x3 * (6.0 * k6 + x2 * (8.0 * k8))))
    return value, slope


def serves(substances: Sequence[Substance]) -> str | None:
    """Return why these substances cannot be served, or None.

    Vapours that associate are refused: their second virial coefficient has nothing to do with corresponding states.
    """
    for substance in substances:
        if "associating" in substance.flags:
            return f"{substance.id} associates in the vapour, which no second virial coefficient describes"
    return refusal(substances, NAME)


def build(
    substances: Sequence[Substance],
    fractions: Sequence[float],
    interaction: Callable[[str, str], CubicPair | None],
) -> Virial:
    """Return the equation at one composition.

    :param substances: the components
    :param fractions: mole fractions in the same order, summing to 1, [-]
    :param interaction: not used: k_ij follows from the critical volumes
    """
    return Virial(substances, fractions)
