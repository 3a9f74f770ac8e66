"""The non-analytic critical terms of the equations for carbon dioxide and water.

A term is n Delta^b delta exp(-C (delta-1)^2 - D (tau-1)^2) with Delta = theta^2 + B ((delta-1)^2)^a and
theta = (1 - tau) + A ((delta-1)^2)^(1/(2 beta)): Span and Wagner, J. Phys. Chem. Ref. Data 25 (1996) 1509, eq. 6.1 and
table 32; Wagner and Pruss, J. Phys. Chem. Ref. Data 31 (2002) 387, eq. 6.6 and table 6.5.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple, cast

import numpy as np

from gasapi.engine.elementary import Array, Real, exp, log
from gasapi.gases.records import ResidualTerm

__all__ = ["CriticalTermSum", "CriticalTermValues"]

# (delta-1)^2 is kept off 0, where the formulas divide by it; the terms themselves are finite there
_NEAREST_SQUARE = 1e-20
# below this exponent a term is smaller than the rounding of the terms that it is added to
_NEGLIGIBLE = -60.0


class CriticalTermValues(NamedTuple):
    """The sum and its Euler derivatives: delta d/dd, (delta d/dd)^2, and tau d/dtau of delta d/dd; all dimensionless."""

    value: Array | float
    first: Array | float
    second: Array | float
    first_tau: Array | float


class CriticalTermSum:
    """A sum of non-analytic terms. Immutable.

    :param terms: terms of kind ``nonanalytic``
    """

    __slots__ = ("_terms",)

    def __init__(self, terms: Sequence[ResidualTerm]) -> None:
        self._terms = tuple((term.n, *term.parameters) for term in terms)

    def __bool__(self) -> bool:
        return bool(self._terms)

    def evaluate(self, delta: Real, tau: Real) -> CriticalTermValues | None:
        """Return the sum and its derivatives, or None where every term is negligible.

        :param delta: reduced density, a float or an array of shape (n,), [-]
        :param tau: inverse reduced temperature, of the same kind and shape, [-]
        """
        offset = delta - 1.0
        square = offset * offset
        if type(square) is float:
            if square < _NEAREST_SQUARE:
                square, offset = _NEAREST_SQUARE, 1e-10
        else:
            close = square < _NEAREST_SQUARE
            square = cast(Real, np.where(close, _NEAREST_SQUARE, square))
            offset = cast(Real, np.where(close, 1e-10, offset))
        cold = tau - 1.0
        logarithm: Real | None = None
        value = first = second = first_tau = 0.0 * delta
        any_term = False
        for n, a, b, beta, big_a, big_b, big_c, big_d in self._terms:
            exponent = -big_c * square - big_d * (cold * cold)
            if (exponent if type(exponent) is float else float(np.max(exponent))) < _NEGLIGIBLE:
                continue
            any_term = True
            if logarithm is None:
                logarithm = log(square)
            half = 0.5 / beta
            low_power = exp((half - 1.0) * logarithm)
            high_power = exp((a - 1.0) * logarithm)
            theta = big_a * low_power * square - cold
            distance = theta * theta + big_b * high_power * square
            slope_over_offset = big_a * theta * (2.0 / beta) * low_power + 2.0 * big_b * a * high_power
            slope = offset * slope_over_offset
            # y * y^(k-2) is written as y^(k-1), so that nothing is divided by y
            bend = slope_over_offset + (
                4.0 * big_b * a * (a - 1.0) * high_power
                + 2.0 * (big_a / beta) * (big_a / beta) * (low_power * low_power) * square
                + big_a * theta * (4.0 / beta) * (half - 1.0) * low_power
            )
            damping = n * exp(exponent)
            power_1 = exp((b - 1.0) * log(distance))
            power_0 = power_1 * distance
            power_2 = power_1 / distance
            delta_1 = b * power_1 * slope
            delta_2 = b * (power_1 * bend + (b - 1.0) * power_2 * (slope * slope))
            tau_1 = -2.0 * b * theta * power_1
            delta_tau = -b * (big_a * (2.0 / beta) * power_1 * offset * low_power + 2.0 * (b - 1.0) * theta * power_2 * slope)
            pull = -2.0 * big_c * offset
            pull_2 = 2.0 * big_c * (2.0 * big_c * square - 1.0)
            pull_tau = -2.0 * big_d * cold
            # phi = Delta^b delta psi; products with delta written out, psi taken out of the bracket
            term_1 = power_0 * (1.0 + delta * pull) + delta * delta_1
            term_2 = power_0 * (2.0 * pull + delta * pull_2) + 2.0 * delta_1 * (1.0 + delta * pull) + delta * delta_2
            term_1_tau = (tau_1 + power_0 * pull_tau) * (1.0 + delta * pull) + delta * (delta_tau + delta_1 * pull_tau)
            weight = damping * delta
            value = value + weight * power_0
            first = first + weight * term_1
            second = second + weight * (term_1 + delta * term_2)
            first_tau = first_tau + weight * tau * term_1_tau
        if not any_term:
            return None
        return CriticalTermValues(value, first, second, first_tau)
