"""Sums of terms of a reduced residual Helmholtz energy, arranged so that an isotherm is cheap to follow.

Every term but the non-analytic ones factors as n * B(tau) * delta^d * F(delta). A ``TermLayout`` sorts the terms once:
equal B are evaluated once a temperature, and terms with equal d and F share one slot, whose coefficient is the sum of
n B(tau). At a fixed temperature only the slots are left: a polynomial in delta for each distinct F.

Derivatives in density are Euler derivatives, D = delta d/d(delta), since D delta^k = k delta^k whatever k is, zero
included: with alpha_r the residual energy, Z = 1 + D alpha_r and dp/drho = R T (1 + D alpha_r + D^2 alpha_r).
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, Generic, cast

import numpy as np
from numpy.typing import NDArray

from gasapi.engine.elementary import Array, Real
from gasapi.engine.nonanalytic import CriticalTermSum
from gasapi.engine.straight_line import Group, Routines, TauFactor
from gasapi.gases.records import ResidualTerm

__all__ = ["Isotherm", "TermLayout", "TermSum"]

_DeltaFactor = tuple[str, tuple[float, ...]]


def _factors(term: ResidualTerm) -> tuple[TauFactor, _DeltaFactor]:
    """Split a term into its factor of tau (exponent, kind, parameters) and its factor of delta (kind, parameters)."""
    p = term.parameters
    match term.kind:
        case "monomial":
            return TauFactor(term.t, "", ()), ("", ())
        case "damped":
            return TauFactor(term.t, "", ()), ("damped", (p[0], p[1]))
        case "damped_both":
            return TauFactor(term.t, "damped", (p[2], p[3])), ("damped", (p[0], p[1]))
        case "gaussian":
            return TauFactor(term.t, "gaussian", (p[2], p[3])), ("gaussian", (p[0], p[1], 0.0, 0.0))
        case "gaussian_reciprocal":
            return TauFactor(term.t, "reciprocal", (p[2], p[3], p[4])), ("gaussian", (p[0], p[1], 0.0, 0.0))
        case "density_gaussian":
            if p[0] == 0.0 and p[2] == 0.0:
                return TauFactor(term.t, "", ()), ("", ())
            return TauFactor(term.t, "", ()), ("gaussian", (p[0], p[1], p[2], p[3]))
    raise ValueError(f"no residual term is called {term.kind!r}")


class TermLayout:
    """The arrangement of a list of terms, without their coefficients. Immutable.

    :param terms: residual terms of any kind; ``n`` is not used, except in the non-analytic ones
    """

    __slots__ = ("_entry_of_term", "critical_terms", "n_entries", "n_slots", "routines")

    def __init__(self, terms: Sequence[ResidualTerm]) -> None:
        self.critical_terms = CriticalTermSum([t for t in terms if t.kind == "nonanalytic"])
        taus: dict[TauFactor, int] = {}
        slots: dict[tuple[_DeltaFactor, float], int] = {}
        triples: list[tuple[_DeltaFactor, float, int]] = []
        for term in terms:
            if term.kind == "nonanalytic":
                continue
            tau, delta = _factors(term)
            triples.append((delta, term.d, taus.setdefault(tau, len(taus))))
            slots.setdefault((delta, term.d), 0)
        for number, key in enumerate(sorted(slots)):
            slots[key] = number
        cells = sorted({(slots[delta, d], basis) for delta, d, basis in triples})
        entry = {cell: i for i, cell in enumerate(cells)}
        self.n_entries = len(cells)
        self.n_slots = len(slots)
        self._entry_of_term: NDArray[np.intp] = np.array(
            [entry[slots[delta, d], basis] for delta, d, basis in triples], dtype=np.intp
        )
        groups = [
            Group(kind, parameters, tuple((slots[k], k[1]) for k in sorted(slots) if k[0] == (kind, parameters)))
            for kind, parameters in sorted({delta for delta, _ in slots})
        ]
        self.routines = Routines(tuple(taus), groups, cells)

    def amplitudes(self, coefficients: Array) -> list[float]:
        """Return the coefficients of merged terms from those of the single ones.

        :param coefficients: n of each term that is not non-analytic, shape (n_terms,), [-]
        """
        merged = np.bincount(self._entry_of_term, weights=coefficients, minlength=self.n_entries)
        return cast("list[float]", merged.tolist())


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
        routines = self.layout.routines
        temper = routines.temper_float if type(tau) is float else routines.temper_block
        return Isotherm(self.layout, tau, temper(tau, self._amplitudes))

    def with_slopes(self, tau: Real) -> tuple[Isotherm[Real], Isotherm[Real]]:
        """Return the energy at a temperature, and tau d/dtau of it without non-analytic terms, as functions of density.

        :param tau: inverse reduced temperature, a float or an array of shape (n,), [-]
        """
        routines = self.layout.routines
        temper = routines.temper_slopes_float if type(tau) is float else routines.temper_slopes_block
        values, slopes = temper(tau, self._amplitudes)
        return Isotherm(self.layout, tau, values), Isotherm(self.layout, tau, slopes)

    def first_tau(self, tau: Real, delta: Real) -> Real:
        """Return tau d/dtau of D alpha_r, [-].

        :param tau: inverse reduced temperature, a float or an array of shape (n,), [-]
        :param delta: reduced density, of the same kind and shape, [-]
        """
        return self.with_slopes(tau)[1].first_of_slope(delta)


class Isotherm(Generic[Real]):
    """A residual Helmholtz energy at fixed temperature, as a function of reduced density.

    :param layout: the arrangement of the terms
    :param tau: inverse reduced temperature, [-]
    :param coefficients: of each slot, [-]
    """

    __slots__ = ("_coefficients", "_layout", "_tau")

    def __init__(self, layout: TermLayout, tau: Real, coefficients: tuple[Real, ...]) -> None:
        self._layout = layout
        self._tau: Real = tau
        self._coefficients: tuple[Real, ...] = coefficients

    @property
    def exact_third(self) -> bool:
        """Whether the third derivative is complete: it always is."""
        return True

    def take(self, rows: NDArray[np.intp]) -> Isotherm[Array]:
        """Return the isotherms of some rows only."""
        coefficients = cast("tuple[Array, ...]", self._coefficients)
        return Isotherm(self._layout, cast(Array, self._tau).take(rows), tuple(c.take(rows) for c in coefficients))

    def euler(self, delta: Real) -> tuple[Real, Real, Real]:
        """Return D alpha_r, D^2 alpha_r and D^3 alpha_r, [-].

        :param delta: reduced density, a float or an array of the isotherm's shape, [-]
        """
        layout = self._layout
        routine: Any = layout.routines.euler_float if type(delta) is float else layout.routines.euler_block
        first, second, third = routine(delta, self._coefficients)
        if layout.critical_terms:
            critical = layout.critical_terms.euler(delta, self._tau)
            if critical is not None:
                first = first + critical[0]
                second = second + critical[1]
                third = third + critical[2]
        return first, second, third

    def first_of_slope(self, delta: Real) -> Real:
        """Return tau d/dtau of D alpha_r, where this is the slope of an isotherm; with the non-analytic terms, [-].

        :param delta: reduced density, a float or an array of the isotherm's shape, [-]
        """
        layout = self._layout
        routine: Any = layout.routines.first_float if type(delta) is float else layout.routines.first_block
        total = routine(delta, self._coefficients)
        if layout.critical_terms:
            critical = layout.critical_terms.first_tau(delta, self._tau)
            if critical is not None:
                total = total + critical
        return cast(Real, total)

    def value(self, delta: Real) -> Real:
        """Return alpha_r, [-].

        :param delta: reduced density, a float or an array of the isotherm's shape, [-]
        """
        layout = self._layout
        routine: Any = layout.routines.value_float if type(delta) is float else layout.routines.value_block
        total = routine(delta, self._coefficients)
        if layout.critical_terms:
            critical = layout.critical_terms.value(delta, self._tau)
            if critical is not None:
                total = total + critical
        return cast(Real, total)
