"""Sums of terms of a reduced residual Helmholtz energy, arranged so that an isotherm is cheap to follow.

Every term but the non-analytic ones factors as n * B(tau) * delta^d * F(delta). A ``TermLayout`` sorts the terms once:
equal B are evaluated once a temperature, and terms with equal d and F share one slot, whose coefficient is the sum of
n B(tau). At a fixed temperature only the slots are left: a polynomial in delta for each distinct F.

Derivatives in density are Euler derivatives, D = delta d/d(delta), since D delta^k = k delta^k whatever k is, zero
included: with alpha_r the residual energy, Z = 1 + D alpha_r and dp/drho = R T (1 + D alpha_r + D^2 alpha_r).
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, Generic, NamedTuple, cast

import numpy as np
from numpy.typing import NDArray

from gasapi.engine.elementary import Array, Real, exp
from gasapi.engine.nonanalytic import CriticalTermSum
from gasapi.engine.powers import PowerList
from gasapi.gases.records import ResidualTerm

__all__ = ["Isotherm", "TermLayout", "TermSum"]

_PLAIN, _DAMPED, _GAUSSIAN = range(3)

# the start of a sum over floats or over blocks alike
_ZERO: Any = 0.0

_TauFactor = tuple[float, str, tuple[float, ...]]
_DeltaFactor = tuple[int, tuple[float, ...]]


def _factors(term: ResidualTerm) -> tuple[_TauFactor, _DeltaFactor]:
    """Split a term into its factor of tau (exponent, kind, parameters) and its factor of delta (kind, parameters)."""
    p = term.parameters
    match term.kind:
        case "monomial":
            return (term.t, "", ()), (_PLAIN, ())
        case "damped":
            return (term.t, "", ()), (_DAMPED, (p[0], p[1]))
        case "damped_both":
            return (term.t, "damped", (p[2], p[3])), (_DAMPED, (p[0], p[1]))
        case "gaussian":
            return (term.t, "gaussian", (p[2], p[3])), (_GAUSSIAN, (p[0], p[1], 0.0, 0.0))
        case "gaussian_reciprocal":
            return (term.t, "reciprocal", (p[2], p[3], p[4])), (_GAUSSIAN, (p[0], p[1], 0.0, 0.0))
        case "density_gaussian":
            eta, epsilon, beta, gamma = p
            if eta == 0.0 and beta == 0.0:
                return (term.t, "", ()), (_PLAIN, ())
            return (term.t, "", ()), (_GAUSSIAN, (eta, epsilon, beta, gamma))
    raise ValueError(f"no residual term is called {term.kind!r}")


class _Group(NamedTuple):
    """The slots that share a factor of delta: its kind and parameters, and (index, exponent) of each slot's power of delta."""

    kind: int
    parameters: tuple[float, ...]
    degrees: tuple[tuple[int, float], ...]
    damping_index: int


class TermLayout:
    """The arrangement of a list of terms, without their coefficients. Immutable.

    :param terms: residual terms of any kind; ``n`` is not used, except in the non-analytic ones
    """

    __slots__ = (
        "_degree_list",
        "_entries",
        "_tau_factors",
        "_tau_powers",
        "_whole_degrees",
        "critical_terms",
        "entry_of_term",
        "groups",
        "n_entries",
    )

    def __init__(self, terms: Sequence[ResidualTerm]) -> None:
        self.critical_terms = CriticalTermSum([t for t in terms if t.kind == "nonanalytic"])
        taus: dict[_TauFactor, int] = {}
        slots: dict[_DeltaFactor, dict[float, int]] = {}
        pairs: list[tuple[_DeltaFactor, float, int]] = []
        for term in terms:
            if term.kind == "nonanalytic":
                continue
            tau, delta = _factors(term)
            basis = taus.setdefault(tau, len(taus))
            slots.setdefault(delta, {}).setdefault(term.d, 0)
            pairs.append((delta, term.d, basis))

        order = sorted(slots)
        degrees = {d for group in slots.values() for d in group}
        degrees |= {delta[1][1] for delta in order if delta[0] == _DAMPED}
        self._whole_degrees = all(d == int(d) and d >= 0 for d in degrees)
        self._degree_list = PowerList(sorted(degrees))
        index = {d: int(d) if self._whole_degrees else i for i, d in enumerate(sorted(degrees))}

        groups: list[_Group] = []
        slot_number: dict[tuple[_DeltaFactor, float], int] = {}
        for delta in order:
            members = sorted(slots[delta])
            for d in members:
                slot_number[delta, d] = len(slot_number)
            kind, parameters = delta
            if kind == _GAUSSIAN:
                eta, epsilon, beta, _ = parameters
                # D ln F = a delta^2 + b delta
                parameters = (*parameters, -2.0 * eta, 2.0 * eta * epsilon - beta)
            groups.append(
                _Group(
                    kind,
                    parameters,
                    tuple((index[d], d) for d in members),
                    index[parameters[1]] if kind == _DAMPED else 0,
                )
            )
        self.groups = tuple(groups)

        cells: dict[tuple[int, int], int] = {}
        for delta, d, basis in pairs:
            cells.setdefault((slot_number[delta, d], basis), 0)
        ordered = sorted(cells)
        number = {cell: i for i, cell in enumerate(ordered)}
        self.n_entries = len(ordered)
        # for each slot the (entry, basis) pairs that add up to its coefficient
        self._entries = tuple(
            tuple((number[cell], cell[1]) for cell in ordered if cell[0] == slot) for slot in range(len(slot_number))
        )
        self.entry_of_term: NDArray[np.intp] = np.array(
            [number[slot_number[delta, d], basis] for delta, d, basis in pairs], dtype=np.intp
        )
        self._tau_powers = PowerList([t for t, _, _ in taus])
        self._tau_factors = tuple((i, t, kind, p) for i, (t, kind, p) in enumerate(taus))

    def amplitudes(self, coefficients: Array) -> list[float]:
        """Return the coefficients of merged terms from those of the single ones.

        :param coefficients: n of each term that is not non-analytic, shape (n_terms,), [-]
        """
        merged = np.bincount(self.entry_of_term, weights=coefficients, minlength=self.n_entries)
        return cast("list[float]", merged.tolist())

    def _tau_basis(self, tau: Real) -> list[Real]:
        basis = self._tau_powers.of(tau)
        shared: dict[tuple[str, tuple[float, ...]], Real] = {}
        for i, _, kind, p in self._tau_factors:
            if not kind:
                continue
            factor = shared.get((kind, p))
            if factor is None:
                factor = shared[kind, p] = exp(_tau_exponent(kind, p, tau))
            basis[i] = basis[i] * factor
        return basis

    def _tau_slopes(self, tau: Real, basis: list[Real]) -> list[Real]:
        """Return tau dB/dtau for each B."""
        slopes = []
        for i, t, kind, p in self._tau_factors:
            growth = t * basis[i]
            if kind:
                growth = growth + _tau_exponent_slope(kind, p, tau) * basis[i]
            slopes.append(growth)
        return slopes

    def _slot_coefficients(self, amplitudes: Sequence[float], basis: list[Real]) -> list[Real]:
        coefficients = []
        for entries in self._entries:
            (entry, k), *rest = entries
            total = amplitudes[entry] * basis[k]
            for entry, k in rest:
                total = total + amplitudes[entry] * basis[k]
            coefficients.append(total)
        return coefficients

    def delta_powers(self, delta: Real) -> list[Real]:
        """Return the powers of delta that the slots name by index."""
        if not self._whole_degrees:
            return self._degree_list.of(delta)
        powers: list[Real] = [delta / delta, delta]
        last = delta
        for _ in range(int(self._degree_list.exponents[-1]) - 1):
            last = last * delta
            powers.append(last)
        return powers


def _tau_exponent(kind: str, p: tuple[float, ...], tau: Real) -> Real:
    if kind == "damped":
        return -p[0] * PowerList([p[1]]).of(tau)[0]
    offset = tau - p[1]
    if kind == "gaussian":
        return -p[0] * (offset * offset)
    return 1.0 / (p[0] * (offset * offset) + p[2])


def _tau_exponent_slope(kind: str, p: tuple[float, ...], tau: Real) -> Real:
    """Return tau times the derivative of the exponent."""
    if kind == "damped":
        return -p[0] * p[1] * PowerList([p[1]]).of(tau)[0]
    offset = tau - p[1]
    if kind == "gaussian":
        return -2.0 * p[0] * offset * tau
    width = p[0] * (offset * offset) + p[2]
    return -2.0 * p[0] * offset * tau / (width * width)


class TermSum:
    """A residual Helmholtz energy alpha_r(tau, delta): a layout with coefficients. Immutable.

    :param layout: the arrangement of the terms
    :param coefficients: n of each term that is not non-analytic, shape (n_terms,), [-]
    """

    __slots__ = ("_amplitudes", "layout")

    def __init__(self, layout: TermLayout, coefficients: Array) -> None:
        self.layout = layout
        self._amplitudes = layout.amplitudes(coefficients)

    @classmethod
    def of(cls, terms: Sequence[ResidualTerm]) -> TermSum:
        """Return the sum of a list of terms."""
        return cls(TermLayout(terms), np.array([t.n for t in terms if t.kind != "nonanalytic"], dtype=np.float64))

    def isotherm(self, tau: Real) -> Isotherm[Real]:
        """Return the energy as a function of density alone.

        :param tau: inverse reduced temperature, a float or an array of shape (n,), [-]
        """
        basis = self.layout._tau_basis(tau)
        return Isotherm(self.layout, tau, self.layout._slot_coefficients(self._amplitudes, basis))

    def first_tau(self, tau: Real, delta: Real) -> Real:
        """Return tau d/dtau of D alpha_r, [-].

        :param tau: inverse reduced temperature, a float or an array of shape (n,), [-]
        :param delta: reduced density, of the same kind and shape, [-]
        """
        layout = self.layout
        slopes = layout._tau_slopes(tau, layout._tau_basis(tau))
        isotherm = Isotherm(layout, tau, layout._slot_coefficients(self._amplitudes, slopes))
        total = isotherm._analytic_first(delta)
        if layout.critical_terms:
            critical = layout.critical_terms.evaluate(delta, tau)
            if critical is not None:
                total = total + cast(Real, critical.first_tau)
        return total

    def value_tau(self, tau: Real, delta: Real) -> Real:
        """Return tau d alpha_r/dtau without non-analytic terms, [-] (the residual internal energy over R T)."""
        layout = self.layout
        slopes = layout._tau_slopes(tau, layout._tau_basis(tau))
        return Isotherm(layout, tau, layout._slot_coefficients(self._amplitudes, slopes))._analytic_value(delta)


class Isotherm(Generic[Real]):
    """A residual Helmholtz energy at fixed temperature, as a function of reduced density."""

    __slots__ = ("_coefficients", "_layout", "_tau")

    def __init__(self, layout: TermLayout, tau: Real, coefficients: list[Real]) -> None:
        self._layout = layout
        self._tau: Real = tau
        self._coefficients: list[Real] = coefficients

    @property
    def exact_third(self) -> bool:
        """Whether the third derivative is complete; that of non-analytic terms is left out."""
        return not self._layout.critical_terms

    def take(self, rows: NDArray[np.intp]) -> Isotherm[Array]:
        """Return the isotherms of some rows only."""
        coefficients = cast("list[Array]", self._coefficients)
        return Isotherm(self._layout, cast(Array, self._tau).take(rows), [c.take(rows) for c in coefficients])

    def euler(self, delta: Real) -> tuple[Real, Real, Real]:
        """Return D alpha_r, D^2 alpha_r and D^3 alpha_r, [-].

        :param delta: reduced density, a float or an array of the isotherm's shape, [-]
        """
        powers = self._layout.delta_powers(delta)
        coefficients = self._coefficients
        first = second = third = _ZERO
        slot = 0
        for kind, parameters, degrees, damping_index in self._layout.groups:
            sum_0 = sum_1 = sum_2 = sum_3 = _ZERO
            if kind == _PLAIN:
                for index, k in degrees:
                    term = coefficients[slot] * powers[index]
                    slot += 1
                    term = term * k
                    sum_1 = sum_1 + term
                    term = term * k
                    sum_2 = sum_2 + term
                    term = term * k
                    sum_3 = sum_3 + term
                first = first + sum_1
                second = second + sum_2
                third = third + sum_3
                continue
            for index, k in degrees:
                term = coefficients[slot] * powers[index]
                slot += 1
                sum_0 = sum_0 + term
                term = term * k
                sum_1 = sum_1 + term
                term = term * k
                sum_2 = sum_2 + term
                term = term * k
                sum_3 = sum_3 + term
            # u = D ln F, v = D u, w = D v
            if kind == _DAMPED:
                g, power = parameters
                exponent = -g * powers[damping_index]
                factor = exp(exponent)
                u = power * exponent
                v = power * u
                w = power * v
            else:
                eta, epsilon, beta, gamma, a, b = parameters
                offset = delta - epsilon
                exponent = -eta * (offset * offset)
                if beta:
                    exponent = exponent - beta * (delta - gamma)
                factor = exp(exponent)
                square = a * (delta * delta)
                linear = b * delta
                u = square + linear
                v = 2.0 * square + linear
                w = 4.0 * square + linear
            quadratic = u * u + v
            first = first + factor * (sum_1 + u * sum_0)
            second = second + factor * (sum_2 + 2.0 * u * sum_1 + quadratic * sum_0)
            third = third + factor * (
                sum_3 + 3.0 * u * sum_2 + 3.0 * quadratic * sum_1 + (u * (quadratic + 2.0 * v) + w) * sum_0
            )
        if self._layout.critical_terms:
            critical = self._layout.critical_terms.evaluate(delta, self._tau)
            if critical is not None:
                first = first + cast(Real, critical.first)
                second = second + cast(Real, critical.second)
        return first, second, third

    def value(self, delta: Real) -> Real:
        """Return alpha_r, [-].

        :param delta: reduced density, a float or an array of the isotherm's shape, [-]
        """
        total = self._analytic_value(delta)
        if self._layout.critical_terms:
            critical = self._layout.critical_terms.evaluate(delta, self._tau)
            if critical is not None:
                total = total + cast(Real, critical.value)
        return total

    def _sums(self, delta: Real) -> list[tuple[Real, Real, Real]]:
        """Return for each group its factor of delta times its sum, D of that factor over itself, and D of its sum."""
        powers = self._layout.delta_powers(delta)
        result = []
        slot = 0
        for kind, parameters, degrees, damping_index in self._layout.groups:
            sum_0 = sum_1 = _ZERO
            for index, k in degrees:
                term = self._coefficients[slot] * powers[index]
                slot += 1
                sum_0 = sum_0 + term
                sum_1 = sum_1 + term * k
            if kind == _PLAIN:
                result.append((sum_0, _ZERO, sum_1))
                continue
            if kind == _DAMPED:
                g, power = parameters
                exponent = -g * powers[damping_index]
                u = power * exponent
            else:
                eta, epsilon, beta, gamma, a, b = parameters
                offset = delta - epsilon
                exponent = -eta * (offset * offset)
                if beta:
                    exponent = exponent - beta * (delta - gamma)
                u = a * (delta * delta) + b * delta
            factor = exp(exponent)
            result.append((factor * sum_0, u, factor * sum_1))
        return result

    def _analytic_value(self, delta: Real) -> Real:
        total = _ZERO
        for energy, _, _ in self._sums(delta):
            total = total + energy
        return total

    def _analytic_first(self, delta: Real) -> Real:
        total = _ZERO
        for energy, pull, growth in self._sums(delta):
            total = total + (growth + pull * energy)
        return total
