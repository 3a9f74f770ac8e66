"""The frozen records in which coefficients and constants reach the engine and the service.

A record holds what a publication or a compilation says and nothing derived from it. Units are SI and molar (K, Pa,
mol/m3, kg/mol, J/mol/K, m3/mol); a field without a unit in its description is dimensionless. Sequences are tuples, so
that records can be shared between threads and used as cache keys.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Literal

__all__ = [
    "BubbleDewCurve",
    "Constant",
    "CubicPair",
    "DensityUncertainty",
    "Departure",
    "FixedPoint",
    "Gas",
    "GergComponent",
    "GergData",
    "GergPair",
    "Hazard",
    "Limits",
    "ReferenceEquation",
    "ResidualTerm",
    "SaturationPiece",
    "SaturationTable",
    "SublimationCurve",
    "Substance",
]


@dataclass(frozen=True, slots=True)
class Constant:
    """One number with its unit and the words that say where it comes from."""

    value: float
    unit: str
    source: str


@dataclass(frozen=True, slots=True)
class Substance:
    """What the generalised equations need of a substance.

    ``molar_mass`` kg/mol, ``critical_temperature`` K, ``critical_pressure`` Pa, ``acentric_factor`` [-],
    ``critical_volume`` m3/mol or None, ``dipole_moment`` debye or None. ``grade`` A to D rates the constants (see the data
    note), ``flags`` holds any of quantum, associating, decomposes. ``triple_temperature`` K and ``triple_pressure`` Pa, or
    None; ``melting_temperature`` K near 1 bar where no triple point is known.
    """

    id: str
    molar_mass: float
    critical_temperature: float
    critical_pressure: float
    acentric_factor: float
    critical_volume: float | None = None
    dipole_moment: float | None = None
    triple_temperature: float | None = None
    triple_pressure: float | None = None
    melting_temperature: float | None = None
    grade: str = "C"
    flags: frozenset[str] = frozenset()


@dataclass(frozen=True, slots=True)
class Hazard:
    """Hazard tags (flammable, toxic, corrosive, oxidizer, asphyxiant, pyrophoric) with their basis, and figures.

    ``figures`` maps a name such as ``lower_flammable_limit`` to a Constant. A missing tag means not known, never safe.
    ``carcinogen_group`` is the IARC group 1, 2A or 2B; ``remarks`` are sentences of common practice.
    """

    tags: tuple[str, ...] = ()
    basis: tuple[tuple[str, str], ...] = ()
    figures: tuple[tuple[str, Constant], ...] = ()
    carcinogen_group: str | None = None
    absorbed_through_skin: bool = False
    remarks: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Gas:
    """A catalogue entry: a pure gas, or a named blend of catalogue gases.

    ``substance`` is None for a blend; ``blend`` is None for a pure gas and else (gas id, mole fraction) pairs that sum to 1.
    ``kind`` is ``pure``, ``blend`` or ``site``. ``constants`` maps critical_temperature, ... to Constants, each with its own
    unit. ``mass_fractions`` are the fractions as given, where a site file gave them by mass; ``blend`` then holds them
    converted with the molar masses of the catalogue.
    """

    id: str
    name: str
    formula: str | None
    cas: str | None
    synonyms: tuple[str, ...]
    kind: Literal["pure", "blend", "site"]
    substance: Substance | None
    blend: tuple[tuple[str, float], ...] | None
    constants: tuple[tuple[str, Constant], ...] = ()
    hazard: Hazard = field(default_factory=Hazard)
    description: str = ""
    mass_fractions: tuple[tuple[str, float], ...] | None = None


@dataclass(frozen=True, slots=True)
class FixedPoint:
    """A point of state: K, Pa or None, mol/m3 or None."""

    temperature: float
    pressure: float | None
    density: float | None = None


@dataclass(frozen=True, slots=True)
class Limits:
    """A range of states: K and Pa; ``basis`` says whose range it is."""

    temperature_min: float
    temperature_max: float
    pressure_max: float
    basis: str = ""


@dataclass(frozen=True, slots=True)
class DensityUncertainty:
    """A relative density uncertainty (k = 2) and the states it holds for; None leaves a side open.

    ``phase`` is ``gas`` (with supercritical states below the critical density) or ``fluid``; ``basis`` is ``publication``,
    ``from memory`` or ``estimate``.
    """

    relative: float
    phase: Literal["gas", "fluid"]
    temperature_min: float | None
    temperature_max: float | None
    pressure_max: float | None
    basis: str


@dataclass(frozen=True, slots=True)
class ResidualTerm:
    """One term n delta^d tau^t F(delta) G(tau) of a reduced residual Helmholtz energy.

    ``kind`` names F and G; ``parameters`` are, in this order:

    ``monomial``             ()                               F = G = 1
    ``damped``               (g, l)                           F = exp(-g delta^l)
    ``damped_both``          (gd, ld, gt, lt)                 F = exp(-gd delta^ld), G = exp(-gt tau^lt)
    ``gaussian``             (eta, epsilon, beta, gamma)      F = exp(-eta (delta - epsilon)^2), G = exp(-beta (tau - gamma)^2)
    ``gaussian_reciprocal``  (eta, epsilon, beta, gamma, b)   F as gaussian, G = exp(1 / (beta (tau - gamma)^2 + b))
    ``density_gaussian``     (eta, epsilon, beta, gamma)      F = exp(-eta (delta - epsilon)^2 - beta (delta - gamma))
    ``nonanalytic``          (a, b, beta, A, B, C, D)         n Delta^b delta exp(-C (delta-1)^2 - D (tau-1)^2), see
                                                              nonanalytic.py; d and t are not used
    """

    kind: str
    n: float
    d: float
    t: float
    parameters: tuple[float, ...] = ()


@dataclass(frozen=True, slots=True)
class SaturationPiece:
    """Chebyshev coefficients of one piece of a saturation curve in s = sqrt(1 - T/Tc), for low <= s <= high."""

    low: float
    high: float
    log_pressure: tuple[float, ...]
    liquid_density: tuple[float, ...]
    log_vapour_density: tuple[float, ...]


@dataclass(frozen=True, slots=True)
class SaturationTable:
    """A saturation curve: p = pc exp((Tc/T) S), rho_liq = rhoc S, rho_vap = rhoc exp((Tc/T) S), with S a Chebyshev sum."""

    critical: FixedPoint
    temperature_min: float
    pieces: tuple[SaturationPiece, ...]


@dataclass(frozen=True, slots=True)
class BubbleDewCurve:
    """The published bubble and dew ancillaries of a pseudo-pure fluid; theta = 1 - T/Tj.

    Pressures: p = pj exp((Tj/T) sum n theta^e). Dew density: rhoj exp(sum n theta^e).
    Bubble density: rhoj (1 + sum n theta^e + n_log ln(T/Tj)). Rows are (n, e).
    """

    reducing: FixedPoint
    temperature_min: float
    temperature_max: float
    bubble_pressure: tuple[tuple[float, float], ...]
    dew_pressure: tuple[tuple[float, float], ...]
    bubble_density: tuple[tuple[float, float], ...]
    bubble_density_log: float
    dew_density: tuple[tuple[float, float], ...]


@dataclass(frozen=True, slots=True)
class SublimationCurve:
    """ln(p/pt) = (Tt/T) sum a f(T)^b with f = 1 - T/Tt (``complement``) or T/Tt (``ratio``); rows are (a, b)."""

    triple: FixedPoint
    argument: Literal["complement", "ratio"]
    terms: tuple[tuple[float, float], ...]
    temperature_min: float
    basis: str


@dataclass(frozen=True, slots=True)
class ReferenceEquation:
    """The published multiparameter equation of one gas.

    ``gas_constant`` J/mol/K and ``molar_mass`` kg/mol are those of the publication; ``critical`` is where the equation itself
    has zero slope and curvature, ``critical_published`` the accepted point. ``kind`` is pure or pseudo-pure (air).
    """

    id: str
    name: str
    kind: Literal["pure", "pseudo-pure"]
    molar_mass: float
    gas_constant: float
    reducing_temperature: float
    reducing_density: float
    terms: tuple[ResidualTerm, ...]
    critical: FixedPoint
    critical_published: FixedPoint
    triple: FixedPoint | None
    acentric_factor: float
    validity: Limits
    extended: Limits
    uncertainties: tuple[DensityUncertainty, ...]
    saturation: SaturationTable | None
    bubble_dew: BubbleDewCurve | None
    sublimation: SublimationCurve | None
    citation: str
    equation_class: str
    notes: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class GergComponent:
    """A component of GERG-2008: kg/mol, K, mol/m3 and its pure-fluid terms."""

    id: str
    molar_mass: float
    critical_temperature: float
    critical_density: float
    terms: tuple[ResidualTerm, ...]


@dataclass(frozen=True, slots=True)
class GergPair:
    """The binary parameters of components i < j, in the order of the component list; ``departure`` is None where F = 0.

    ``basis`` is fitted, linear or lorentz-berthelot: the last two are plain combining rules.
    """

    i: int
    j: int
    beta_v: float
    gamma_v: float
    beta_t: float
    gamma_t: float
    factor: float
    departure: str | None
    basis: str


@dataclass(frozen=True, slots=True)
class Departure:
    """A departure function of GERG-2008."""

    id: str
    terms: tuple[ResidualTerm, ...]


@dataclass(frozen=True, slots=True)
class GergData:
    """All of GERG-2008: components in published order, every pair once, departure functions, ranges, uncertainties."""

    gas_constant: float
    components: tuple[GergComponent, ...]
    pairs: tuple[GergPair, ...]
    departures: tuple[Departure, ...]
    validity: Limits
    extended: Limits
    uncertainties: tuple[DensityUncertainty, ...]
    citation: str


@dataclass(frozen=True, slots=True)
class CubicPair:
    """Binary interaction parameters of a pair: for Peng-Robinson and for Soave-Redlich-Kwong, and where they come from.

    ``group_energy`` holds A and B of the temperature-dependent rule (Pa) where the publication gives them.
    """

    peng_robinson: float
    soave_redlich_kwong: float
    source: str
    group_energy: tuple[float, float] | None = None
