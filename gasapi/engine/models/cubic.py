"""What the two-parameter cubic equations share: van der Waals, Soave-Redlich-Kwong and Peng-Robinson sit on it.

    p = R T/(v - b) - a(T)/((v + delta1 b)(v + delta2 b))

Mixtures by van der Waals' one-fluid rules, b = sum x_i b_i and a = sum_ij x_i x_j sqrt(a_i a_j) (1 - k_ij), with

    sqrt(a_i) = sqrt(a_ci) |1 + m_i (1 - sqrt(T/T_ci))| = |c_i - d_i sqrt(T)|,

so that at a fixed composition a(T) = A0 - A1 sqrt(T) + A2 T between the temperatures at which some c_i - d_i sqrt(T)
changes its sign (thousands of kelvin for common gases): one composition costs no more than a pure gas.
The root is chosen by branch, see ``gasapi.engine.cubic_roots``. k_ij is one number for a pair: where its publication lets it
depend on temperature, the value tabulated for 298.15 K is used at all of them.
"""

from __future__ import annotations

import math
from bisect import bisect_right
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import NamedTuple, cast

import numpy as np
from numpy.typing import NDArray

from gasapi.engine.cubic_roots import CubicRoots
from gasapi.engine.elementary import Array, Real, log, sqrt
from gasapi.engine.protocol import Branch, CriticalPoint, Fluid, PressureDerivatives, Root, Status
from gasapi.gases.records import CubicPair, Substance

__all__ = [
    "ACENTRIC_FACTOR_MAX",
    "ACENTRIC_FACTOR_MIN",
    "GAS_CONSTANT",
    "CubicComponent",
    "CubicFluid",
    "CubicForm",
    "CubicMixture",
    "refusal",
]

GAS_CONSTANT = 8.314462618
"""J/mol/K, CODATA 2018."""

ACENTRIC_FACTOR_MIN = -0.5
ACENTRIC_FACTOR_MAX = 2.0
"""Beyond these the published m(omega) was never compared with anything (helium has -0.38, a C30 alkane 1.3); our choice."""

# rows solved together: their temporaries stay in the processor's second-level cache
_BLOCK_ROWS = 4096


class CubicComponent(NamedTuple):
    """One substance in a cubic: sqrt(a) = abs(``constant`` - ``slope`` sqrt(T)), and ``covolume`` b in m3/mol."""

    constant: float
    slope: float
    covolume: float


@dataclass(frozen=True, slots=True)
class CubicForm:
    """One member of the family.

    a_c = ``omega_a`` R^2 Tc^2/pc and b = ``omega_b`` R Tc/pc; ``critical_packing`` is b rho at the critical point;
    ``temperature_slope`` is m(omega), None where a does not depend on temperature; ``interaction`` reads k_ij from a pair.
    """

    model: str
    delta1: float
    delta2: float
    omega_a: float
    omega_b: float
    critical_packing: float
    temperature_slope: Callable[[float], float] | None
    interaction: Callable[[CubicPair], float]

    @property
    def critical_compressibility(self) -> float:
        """Return Z at the critical point, [-]."""
        return self.omega_b / self.critical_packing

    def roots(self) -> CubicRoots:
        """Return the root finder of this form."""
        return CubicRoots(self.delta1, self.delta2, self.critical_packing, self.omega_a / self.omega_b)

    def component(self, substance: Substance) -> CubicComponent:
        """Return the parameters of a substance."""
        tc = substance.critical_temperature
        rt = GAS_CONSTANT * tc
        root = math.sqrt(self.omega_a / substance.critical_pressure) * rt
        m = 0.0 if self.temperature_slope is None else self.temperature_slope(substance.acentric_factor)
        return CubicComponent(root * (1.0 + m), root * m / math.sqrt(tc), self.omega_b * rt / substance.critical_pressure)

    def critical_point(self, temperature: float, pressure: float) -> CriticalPoint:
        """Return the critical point of a pure gas, which is at the temperature, K, and pressure, Pa, of its parameters."""
        density = pressure / (self.critical_compressibility * GAS_CONSTANT * temperature)
        return CriticalPoint(temperature, pressure, density)

    def attraction_integral(self, packing: Real) -> Real:
        """Return ln((1 + delta1 eta)/(1 + delta2 eta))/(delta1 - delta2), or its limit eta where both are zero, [-]."""
        if self.delta1 == self.delta2:
            return packing / (1.0 + self.delta1 * packing)
        ratio = (1.0 + self.delta1 * packing) / (1.0 + self.delta2 * packing)
        return log(ratio) / (self.delta1 - self.delta2)


class _Piece(NamedTuple):
    """The mixing rule between two sign changes: a = a0 - a1 sqrt(T) + a2 T, and for each component the two factors of
    sum_j x_j a_ij = (constant - slope sqrt(T)) (partner_constant - partner_slope sqrt(T)).
    """

    a0: float
    a1: float
    a2: float
    constants: tuple[float, ...]
    slopes: tuple[float, ...]
    partner_constants: tuple[float, ...]
    partner_slopes: tuple[float, ...]


def _pieces(
    components: Sequence[CubicComponent], fractions: Sequence[float], attraction_factors: Sequence[Sequence[float]]
) -> tuple[list[float], list[_Piece]]:
    """Return the values of sqrt(T) at which a component changes sign, rising, and the pieces around them.

    From one piece to the next only the terms of the components that change are taken anew.
    """
    sign = [1.0 if c.constant >= 0.0 else -1.0 for c in components]
    constants = [s * c.constant for s, c in zip(sign, components, strict=True)]
    slopes = [s * c.slope for s, c in zip(sign, components, strict=True)]
    weights = [[factor * x for factor, x in zip(row, fractions, strict=True)] for row in attraction_factors]
    partner_constants = [sum(w * c for w, c in zip(row, constants, strict=True)) for row in weights]
    partner_slopes = [sum(w * d for w, d in zip(row, slopes, strict=True)) for row in weights]
    turns: dict[float, list[int]] = {}
    for i, c in enumerate(components):
        if c.slope != 0.0 and c.constant / c.slope > 0.0:
            turns.setdefault(c.constant / c.slope, []).append(i)
    crossings = sorted(turns)
    pieces = [_piece(fractions, constants, slopes, partner_constants, partner_slopes)]
    for crossing in crossings:
        for i in turns[crossing]:
            constants[i], slopes[i] = -constants[i], -slopes[i]
            for k, row in enumerate(weights):
                partner_constants[k] += 2.0 * row[i] * constants[i]
                partner_slopes[k] += 2.0 * row[i] * slopes[i]
        pieces.append(_piece(fractions, constants, slopes, partner_constants, partner_slopes))
    return crossings, pieces


def _piece(
    fractions: Sequence[float],
    constants: Sequence[float],
    slopes: Sequence[float],
    partner_constants: Sequence[float],
    partner_slopes: Sequence[float],
) -> _Piece:
    a0 = a1 = a2 = 0.0
    for x, c, d, pc, pd in zip(fractions, constants, slopes, partner_constants, partner_slopes, strict=True):
        a0 += x * (c * pc)
        a1 += x * (c * pd + d * pc)
        a2 += x * (d * pd)
    return _Piece(a0, a1, a2, tuple(constants), tuple(slopes), tuple(partner_constants), tuple(partner_slopes))


class CubicFluid(Fluid):
    """A cubic equation at one composition. Immutable.

    :param form: which equation
    :param components: parameters of the substances
    :param fractions: mole fractions in the same order, summing to 1, [-]
    :param attraction_factors: 1 - k_ij, a symmetric matrix, [-]
    :param molar_mass: kg/mol
    :param critical: the critical point of a pure gas, else None
    :param missing_pairs: see ``missing_pairs``
    """

    missing_pairs: tuple[tuple[str, str], ...]
    """Pairs of ids present in the mixture for which no k_ij is published, so that 0 was used."""

    def __init__(
        self,
        form: CubicForm,
        components: Sequence[CubicComponent],
        fractions: Sequence[float],
        attraction_factors: Sequence[Sequence[float]],
        molar_mass: float,
        critical: CriticalPoint | None,
        missing_pairs: tuple[tuple[str, str], ...] = (),
    ) -> None:
        self.model = form.model
        self.gas_constant = GAS_CONSTANT
        self.molar_mass = molar_mass
        self.missing_pairs = missing_pairs
        self._form = form
        self._roots = form.roots()
        self._u = form.delta1 + form.delta2
        self._w = form.delta1 * form.delta2
        self._covolumes = tuple(c.covolume for c in components)
        self._covolume = sum(x * b for x, b in zip(fractions, self._covolumes, strict=True))
        self._crossings, self._pieces = _pieces(components, fractions, attraction_factors)
        self._crossings_array = np.array(self._crossings)
        self._piece_arrays = tuple(np.array([piece[:3] for piece in self._pieces]).T)
        self._component_arrays = [
            tuple(
                np.array([(p.constants[i], p.slopes[i], p.partner_constants[i], p.partner_slopes[i]) for p in self._pieces]).T
            )
            for i in range(len(components))
        ]
        self.critical = critical

    def _coefficients(self, root: Real) -> tuple[Real, Real, Real]:
        """Return A0, A1 and A2 at sqrt(T)."""
        if len(self._pieces) == 1 or type(root) is float:
            number = 0 if len(self._pieces) == 1 else bisect_right(self._crossings, cast(float, root))
            piece = self._pieces[number]
            return cast("tuple[Real, Real, Real]", (piece.a0, piece.a1, piece.a2))
        which = np.searchsorted(self._crossings_array, cast(Array, root), side="right")
        a0, a1, a2 = self._piece_arrays
        return cast("tuple[Real, Real, Real]", (a0.take(which), a1.take(which), a2.take(which)))

    def density(self, temperature: Real, pressure: Real, branch: Branch) -> Root[Real]:
        """Return the density root of a branch; see ``Fluid.density``.

        Converged means to 1e-12 or to the rounding of the pressure, whichever is larger. Arguments are positive and finite.
        """
        if type(temperature) is float:
            t, p = temperature, cast(float, pressure)
            rt = GAS_CONSTANT * t
            q = math.sqrt(t)
            a0, a1, a2 = self._coefficients(q)
            b = self._covolume
            packing, status = self._roots.packing((a0 - a1 * q + a2 * t) / (b * rt), b * p / rt, branch)
            return cast("Root[Real]", Root(packing / b, status))
        ts, ps = cast(Array, temperature), cast(Array, pressure)
        density = np.empty(ts.shape)
        statuses = np.empty(ts.shape, dtype=np.int8)
        with np.errstate(all="ignore"):
            for start in range(0, ts.size, _BLOCK_ROWS):
                part = slice(start, start + _BLOCK_ROWS)
                density[part], statuses[part] = self._density_block(ts[part], ps[part], branch)
        return cast("Root[Real]", Root(density, statuses))

    def _density_block(self, temperature: Array, pressure: Array, branch: Branch) -> tuple[Array, NDArray[np.int8]]:
        rt = GAS_CONSTANT * temperature
        q = np.sqrt(temperature)
        a0, a1, a2 = self._coefficients(q)
        b = self._covolume
        packing, status = self._roots.packing_block((a0 - a1 * q + a2 * temperature) / (b * rt), b * pressure / rt, branch)
        return packing / b, status

    def pressure(self, temperature: Real, density: Real) -> PressureDerivatives[Real]:
        """Return pressure and its derivatives; see ``Fluid.pressure``. The density must be below 1/b."""
        q = sqrt(temperature)
        a0, a1, a2 = self._coefficients(q)
        a = a0 - a1 * q + a2 * temperature
        slope = a2 - 0.5 * a1 / q
        rt = GAS_CONSTANT * temperature
        packing = self._covolume * density
        free = 1.0 - packing
        form = 1.0 + (self._u + self._w * packing) * packing
        repulsion = density / free
        attraction = density * density / form
        return PressureDerivatives(
            rt * repulsion - a * attraction,
            rt / (free * free) - a * density * (2.0 + self._u * packing) / (form * form),
            GAS_CONSTANT * repulsion - slope * attraction,
        )

    def residual_gibbs(self, temperature: Real, density: Real) -> Real:
        """Return alpha_r + Z - 1 - ln Z, [-]; see ``Fluid.residual_gibbs``."""
        q = sqrt(temperature)
        a0, a1, a2 = self._coefficients(q)
        packing = self._covolume * density
        theta = (a0 - a1 * q + a2 * temperature) / (self._covolume * GAS_CONSTANT * temperature)
        z_minus_1 = packing / (1.0 - packing) - theta * packing / (1.0 + (self._u + self._w * packing) * packing)
        # -ln(1 - eta) - ln Z taken together: the product is positive wherever the pressure is
        return z_minus_1 - log((1.0 + z_minus_1) * (1.0 - packing)) - theta * self._form.attraction_integral(packing)

    def log_fugacity_coefficients(self, temperature: Real, density: Real) -> tuple[Real, ...]:
        """Return ln(phi_i) of every component in the order of the composition, [-].

        :param temperature: K, a float or an array of shape (n,)
        :param density: mol/m3, of the same kind and shape
        """
        q = sqrt(temperature)
        a0, a1, a2 = self._coefficients(q)
        a = a0 - a1 * q + a2 * temperature
        b = self._covolume
        packing = b * density
        theta = a / (b * GAS_CONSTANT * temperature)
        z_minus_1 = packing / (1.0 - packing) - theta * packing / (1.0 + (self._u + self._w * packing) * packing)
        common = log((1.0 + z_minus_1) * (1.0 - packing))
        energy = theta * self._form.attraction_integral(packing)
        result = []
        for covolume, cross in zip(self._covolumes, self._cross_attractions(q), strict=True):
            share = covolume / b
            result.append(share * z_minus_1 - common - energy * (2.0 * cross / a - share))
        return tuple(result)

    def _cross_attractions(self, root: Real) -> list[Real]:
        """Return sum_j x_j a_ij for every component, Pa m6/mol2."""
        if len(self._pieces) == 1 or type(root) is float:
            number = 0 if len(self._pieces) == 1 else bisect_right(self._crossings, cast(float, root))
            _, _, _, *columns = self._pieces[number]
            return [(c - d * root) * (pc - pd * root) for c, d, pc, pd in zip(*columns, strict=True)]
        which = np.searchsorted(self._crossings_array, cast(Array, root), side="right")
        result = []
        for i in range(len(self._covolumes)):
            c, d, pc, pd = (column.take(which) for column in self._component_arrays[i])
            result.append((c - d * root) * (pc - pd * root))
        return cast("list[Real]", result)


class CubicMixture:
    """A cubic equation for a set of components, ready for many compositions. Immutable.

    :param form: which equation
    :param substances: the components; their order is that of every composition
    :param interaction: returns the published parameters of a pair of ids, or None; asked once a pair
    """

    def __init__(
        self,
        form: CubicForm,
        substances: Sequence[Substance],
        interaction: Callable[[str, str], CubicPair | None],
    ) -> None:
        self.form = form
        self.substances = tuple(substances)
        self._components = tuple(form.component(substance) for substance in substances)
        self._missing: set[tuple[int, int]] = set()
        n = len(self.substances)
        self._factors = [[1.0] * n for _ in range(n)]
        for i in range(n):
            for j in range(i + 1, n):
                pair = interaction(self.substances[i].id, self.substances[j].id)
                if pair is None:
                    self._missing.add((i, j))
                else:
                    self._factors[i][j] = self._factors[j][i] = 1.0 - form.interaction(pair)
        self._constants = np.array([c.constant for c in self._components])
        self._slopes = np.array([c.slope for c in self._components])
        self._covolumes = np.array([c.covolume for c in self._components])
        self._factors_array = np.array(self._factors)
        self._roots = form.roots()

    @property
    def interaction_parameters(self) -> NDArray[np.float64]:
        """Return k_ij, shape (n, n), [-]; 0 where none is published."""
        return 1.0 - self._factors_array

    def fluid(self, fractions: Sequence[float]) -> CubicFluid:
        """Return the equation at one composition.

        :param fractions: mole fractions in the order of the substances, summing to 1, [-]
        """
        present = [x > 0.0 for x in fractions]
        missing = tuple(
            (self.substances[i].id, self.substances[j].id) for i, j in sorted(self._missing) if present[i] and present[j]
        )
        molar_mass = sum(x * substance.molar_mass for x, substance in zip(fractions, self.substances, strict=True))
        critical = None
        if max(fractions) == 1.0:
            pure = self.substances[list(fractions).index(1.0)]
            critical = self.form.critical_point(pure.critical_temperature, pure.critical_pressure)
        return CubicFluid(self.form, self._components, fractions, self._factors, molar_mass, critical, missing)

    def log_fugacity(
        self, temperature: float, pressure: float, fractions: NDArray[np.float64], branch: Branch | None
    ) -> NDArray[np.float64]:
        """Return ln(phi_i) of many trial compositions at one temperature and pressure, shape (m, n), [-].

        Ordinary NumPy: the last bits may depend on m. A row whose branch has no root is NaN.

        :param temperature: K
        :param pressure: Pa
        :param fractions: mole fractions, shape (m, n), [-]
        :param branch: the branch of all rows; None takes for each row the root with the lower Gibbs energy
        """
        rt = GAS_CONSTANT * temperature
        roots_a = np.abs(self._constants - self._slopes * math.sqrt(temperature))
        cross = fractions @ (self._factors_array * (roots_a[:, None] * roots_a))
        a = (fractions * cross).sum(axis=1)
        b = fractions @ self._covolumes
        theta = a / (b * rt)
        share = self._covolumes / b[:, None]
        reduced = b * (pressure / rt)
        tilt = theta[:, None] * (2.0 * cross / a[:, None] - share)
        if branch is not None:
            return self._log_fugacity(theta, reduced, share, tilt, branch)
        gas = self._log_fugacity(theta, reduced, share, tilt, Branch.GAS)
        liquid = self._log_fugacity(theta, reduced, share, tilt, Branch.LIQUID)
        gibbs = (fractions * (liquid - gas)).sum(axis=1)
        take_liquid = (gibbs < 0.0) | np.isnan(gas[:, 0])
        return np.where(take_liquid[:, None], liquid, gas)

    def _log_fugacity(
        self,
        theta: Array,
        reduced: Array,
        share: NDArray[np.float64],
        tilt: NDArray[np.float64],
        branch: Branch,
    ) -> NDArray[np.float64]:
        packing, status = self._roots.packing_block(theta, reduced, branch)
        packing = np.where(status == Status.CONVERGED, packing, np.nan)
        z = reduced / packing
        d1, d2 = self.form.delta1, self.form.delta2
        if d1 == d2:
            integral = packing / (1.0 + d1 * packing)
        else:
            integral = np.log((1.0 + d1 * packing) / (1.0 + d2 * packing)) / (d1 - d2)
        common = np.log(z * (1.0 - packing))
        return cast(
            "NDArray[np.float64]",
            share * (z - 1.0)[:, None] - common[:, None] - tilt * integral[:, None],
        )


def refusal(substances: Sequence[Substance], model: str) -> str | None:
    """Return why an equation that rests on the acentric factor cannot serve these substances, or None."""
    for substance in substances:
        if not ACENTRIC_FACTOR_MIN <= substance.acentric_factor <= ACENTRIC_FACTOR_MAX:
            return (
                f"{model} is not known to hold for an acentric factor of {substance.acentric_factor:g} ({substance.id}); "
                f"it takes {ACENTRIC_FACTOR_MIN:g} to {ACENTRIC_FACTOR_MAX:g}"
            )
    return None
