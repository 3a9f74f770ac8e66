"""The non-analytic critical terms of the equations for carbon dioxide and water.

A term is n Delta^b delta exp(-C (delta-1)^2 - D (tau-1)^2) with Delta = theta^2 + B ((delta-1)^2)^a and
theta = (1 - tau) + A ((delta-1)^2)^(1/(2 beta)): Span and Wagner, J. Phys. Chem. Ref. Data 25 (1996) 1509, eq. 6.1 and
table 32; Wagner and Pruss, J. Phys. Chem. Ref. Data 31 (2002) 387, eq. 6.6 and table 6.5. Derivatives by the product rule.

The sums are written as straight-line code like all other terms (see ``straight_line``).
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from functools import cached_property
from typing import Any, Final, NamedTuple, cast

import numpy as np

from gasapi.engine.block_code import compile_block
from gasapi.engine.elementary import Array, Real
from gasapi.engine.straight_line import Routine, Writer, compile_float
from gasapi.gases.records import ResidualTerm

__all__ = ["CriticalTermSum"]

# (delta-1)^2 is kept off 0, where the formulas divide by it; the terms themselves are finite there
_NEAREST: Final = 1e-10
_NEAREST_SQUARE: Final = 1e-20
# below this exponent a term is smaller than the rounding of the terms that it is added to
_NEGLIGIBLE: Final = -60.0


class _Term(NamedTuple):
    """One term: n and the parameters a, b, beta, A, B, C and D, [-]."""

    n: float
    a: float
    b: float
    beta: float
    big_a: float
    big_b: float
    big_c: float
    big_d: float


class CriticalTermSum:
    """A sum of non-analytic terms. Immutable.

    Methods take reduced density and inverse reduced temperature, floats or arrays of shape (n,), and return None where every
    term is negligible, at every row of a block.

    :param terms: terms of kind ``nonanalytic``
    """

    def __init__(self, terms: Sequence[ResidualTerm]) -> None:
        self._terms = tuple(_Term(term.n, *term.parameters) for term in terms)
        self._slowest_delta = min((t.big_c for t in self._terms), default=0.0)
        self._slowest_tau = min((t.big_d for t in self._terms), default=0.0)

    def __bool__(self) -> bool:
        return bool(self._terms)

    def euler(self, delta: Real, tau: Real) -> tuple[Real, Real, Real] | None:
        """Return the Euler derivatives in density, (delta d/ddelta)^k of the sum for k of 1, 2 and 3, [-]."""
        return self._evaluate(self._euler_float if type(delta) is float else self._euler_block, delta, tau, 3)

    def value(self, delta: Real, tau: Real) -> Real | None:
        """Return the sum, [-]."""
        found = self._evaluate(self._value_float if type(delta) is float else self._value_block, delta, tau, 1)
        return None if found is None else found[0]

    def first_tau(self, delta: Real, tau: Real) -> Real | None:
        """Return tau d/dtau of delta d/ddelta of the sum, [-]."""
        found = self._evaluate(self._tau_float if type(delta) is float else self._tau_block, delta, tau, 1)
        return None if found is None else found[0]

    def _evaluate(self, routine: Routine, delta: Real, tau: Real, count: int) -> Any:
        offset = delta - 1.0
        cold = tau - 1.0
        square = offset * offset
        exponent = -self._slowest_delta * square - self._slowest_tau * (cold * cold)
        if type(offset) is float:
            if not exponent >= _NEGLIGIBLE:
                return None
            return routine(offset if square >= _NEAREST_SQUARE else _NEAREST, (delta, tau))
        return _evaluate_rows(
            routine,
            cast(Array, offset),
            cast(Array, square),
            cast(Array, exponent),
            cast(Array, delta),
            cast(Array, tau),
            count,
        )

    def _write(self, sums: Callable[[Writer, Sequence[_Term]], list[str]], inline: bool) -> Routine:
        w = Writer(inline)
        w.lines.append("delta, tau = place")
        results = sums(w, self._terms)
        source = w.source("offset, place", f"({', '.join(results)},)")
        return compile_float(source) if inline else compile_block(source)

    @cached_property
    def _euler_float(self) -> Routine:
        return self._write(_write_euler, True)

    @cached_property
    def _euler_block(self) -> Routine:
        return self._write(_write_euler, False)

    @cached_property
    def _value_float(self) -> Routine:
        return self._write(_write_value, True)

    @cached_property
    def _value_block(self) -> Routine:
        return self._write(_write_value, False)

    @cached_property
    def _tau_float(self) -> Routine:
        return self._write(_write_tau, True)

    @cached_property
    def _tau_block(self) -> Routine:
        return self._write(_write_tau, False)


def _evaluate_rows(
    routine: Routine, offset: Array, square: Array, exponent: Array, delta: Array, tau: Array, count: int
) -> tuple[Array, ...] | None:
    """Evaluate the rows at which the terms matter; the others get 0."""
    matters = exponent >= _NEGLIGIBLE
    rows = np.flatnonzero(matters)
    if rows.size == 0:
        return None
    offset = np.where(square < _NEAREST_SQUARE, _NEAREST, offset)
    if rows.size == offset.size:
        return cast("tuple[Array, ...]", routine(offset, (delta, tau)))
    found = routine(offset.take(rows), (delta.take(rows), tau.take(rows)))
    result = tuple(np.zeros(offset.size) for _ in range(count))
    for whole, part in zip(result, found, strict=True):
        whole[rows] = part
    return result


class _Shape(NamedTuple):
    """Names of the distance function of a term and of what its derivatives are made of."""

    theta: str
    distance: str
    power: str
    """Delta^(b-1)."""

    low: str
    """((delta-1)^2)^(1/(2 beta) - 1)."""

    high: str
    """((delta-1)^2)^(a - 1)."""


def _write_shape(w: Writer, term: _Term) -> _Shape:
    square = w.once(("square", 0), lambda: w.put("offset * offset"))
    cold = w.once(("cold", 0), lambda: w.put("tau - 1.0"))
    low = w.power(square, 0.5 / term.beta - 1.0)
    high = w.power(square, term.a - 1.0)
    theta = w.once(("theta", (term.beta, term.big_a)), lambda: w.put(f"{term.big_a!r} * {low} * {square} - {cold}"))

    def write_distance() -> str:
        return w.put(f"{theta} * {theta} + {term.big_b!r} * {high} * {square}")

    distance = w.once(("distance", (term.a, term.beta, term.big_a, term.big_b)), write_distance)
    power = w.once(("power", (distance, term.b)), lambda: w.exponential(f"{term.b - 1.0!r} * {w.logarithm(distance)}"))
    return _Shape(theta, distance, power, low, high)


def _write_weight(w: Writer, term: _Term) -> str:
    """Write n delta exp(-C (delta-1)^2 - D (tau-1)^2)."""
    square, cold = w.once(("square", 0), lambda: ""), w.once(("cold", 0), lambda: "")
    cold_square = w.once(("cold square", 0), lambda: w.put(f"{cold} * {cold}"))

    def write() -> str:
        return w.put(f"delta * {w.exponential(f'{-term.big_c!r} * {square} - {term.big_d!r} * {cold_square}')}")

    return w.put(f"{term.n!r} * {w.once(('damping', (term.big_c, term.big_d)), write)}")


def _write_value(w: Writer, terms: Sequence[_Term]) -> list[str]:
    parts = []
    for term in terms:
        shape = _write_shape(w, term)
        parts.append(w.put(f"{_write_weight(w, term)} * ({shape.power} * {shape.distance})"))
    return [w.total(parts)]


def _write_distance_slopes(w: Writer, term: _Term, shape: _Shape) -> tuple[str, str, str]:
    """Write the first three derivatives of Delta in delta."""
    square = w.once(("square", 0), lambda: "")
    low, high, theta = shape.low, shape.high, shape.theta
    g = 1.0 / term.beta
    key = (term.a, term.beta, term.big_a, term.big_b)
    ratio = w.once(("ratio", 0), lambda: w.put(f"offset / {square}"))
    # derivatives of theta, and of B ((delta-1)^2)^a
    theta_2 = w.once(("theta 2", key), lambda: w.put(f"{term.big_a * g * (g - 1.0)!r} * {low}"))
    theta_1 = w.once(("theta 1", key), lambda: w.put(f"{term.big_a * g!r} * {low} * offset"))
    theta_3 = w.once(("theta 3", key), lambda: w.put(f"{g - 2.0!r} * {theta_2} * {ratio}"))
    p = 2.0 * term.a
    rest_2 = w.once(("rest 2", key), lambda: w.put(f"{term.big_b * p * (p - 1.0)!r} * {high}"))
    slope_1 = w.once(("slope 1", key), lambda: w.put(f"2.0 * {theta} * {theta_1} + {term.big_b * p!r} * {high} * offset"))
    slope_2 = w.once(("slope 2", key), lambda: w.put(f"2.0 * ({theta_1} * {theta_1} + {theta} * {theta_2}) + {rest_2}"))
    slope_3 = w.once(
        ("slope 3", key),
        lambda: w.put(f"6.0 * {theta_1} * {theta_2} + 2.0 * {theta} * {theta_3} + {p - 2.0!r} * {rest_2} * {ratio}"),
    )
    return slope_1, slope_2, slope_3


def _write_pull(w: Writer, c: float) -> str:
    """Write d/ddelta of ln exp(-C (delta-1)^2)."""
    return w.once(("pull", c), lambda: w.put(f"{-2.0 * c!r} * offset"))


def _write_bell_slopes(w: Writer, c: float) -> tuple[str, str, str]:
    """Write the first three derivatives of delta exp(-C (delta-1)^2) over the exponential."""
    square = w.once(("square", 0), lambda: "")
    pull = _write_pull(w, c)
    bend = w.once(("bend", c), lambda: w.put(f"{4.0 * c * c!r} * {square} - {2.0 * c!r}"))
    twist = w.once(("twist", c), lambda: w.put(f"{4.0 * c * c!r} * offset * (3.0 - {2.0 * c!r} * {square})"))
    return (
        w.once(("bell 1", c), lambda: w.put(f"1.0 + delta * {pull}")),
        w.once(("bell 2", c), lambda: w.put(f"2.0 * {pull} + delta * {bend}")),
        w.once(("bell 3", c), lambda: w.put(f"3.0 * {bend} + delta * {twist}")),
    )


def _write_euler(w: Writer, terms: Sequence[_Term]) -> list[str]:
    first, second, third = [], [], []
    for term in terms:
        shape = _write_shape(w, term)
        weight = _write_weight(w, term)
        s1, s2, s3 = _write_distance_slopes(w, term, shape)
        b, c = term.b, term.big_c
        # p0 = Delta^b and its derivatives
        p0 = w.put(f"{shape.power} * {shape.distance}")
        down = w.put(f"{shape.power} / {shape.distance}")
        p1 = w.put(f"{b!r} * {shape.power} * {s1}")
        p2 = w.put(f"{b!r} * ({shape.power} * {s2} + {b - 1.0!r} * {down} * ({s1} * {s1}))")
        p3 = w.put(
            f"{b!r} * ({shape.power} * {s3} + {b - 1.0!r} * {down} * {s1}"
            f" * (3.0 * {s2} + {b - 2.0!r} * ({s1} * {s1}) / {shape.distance}))"
        )
        g1, g2, g3 = _write_bell_slopes(w, c)
        f1 = w.put(f"{p0} * {g1} + delta * {p1}")
        f2 = w.put(f"delta * ({p0} * {g2} + 2.0 * {p1} * {g1} + delta * {p2})")
        square_delta = w.once(("delta square", 0), lambda: w.put("delta * delta"))
        f3 = w.put(f"{square_delta} * ({p0} * {g3} + 3.0 * ({p1} * {g2} + {p2} * {g1}) + delta * {p3})")
        first.append(w.put(f"{weight} * {f1}"))
        second.append(w.put(f"{weight} * ({f1} + {f2})"))
        third.append(w.put(f"{weight} * ({f1} + 3.0 * {f2} + {f3})"))
    return [w.total(first), w.total(second), w.total(third)]


def _write_tau(w: Writer, terms: Sequence[_Term]) -> list[str]:
    parts = []
    for term in terms:
        shape = _write_shape(w, term)
        weight = _write_weight(w, term)
        cold = w.once(("cold", 0), lambda: "")
        s1, _, _ = _write_distance_slopes(w, term, shape)
        b = term.b
        p0 = w.put(f"{shape.power} * {shape.distance}")
        p1 = w.put(f"{b!r} * {shape.power} * {s1}")
        p_tau = w.put(f"{-2.0 * b!r} * {shape.theta} * {shape.power}")
        low_slope = f"{term.big_a / term.beta!r} * {shape.power} * offset * {shape.low}"
        p_both = w.put(
            f"{-2.0 * b!r} * ({low_slope} + {b - 1.0!r} * {shape.theta} * ({shape.power} / {shape.distance}) * {s1})"
        )
        pull_tau = w.put(f"{-2.0 * term.big_d!r} * {cold}")
        pull = _write_pull(w, term.big_c)
        whole = f"({p_tau} + {p0} * {pull_tau}) * (1.0 + delta * {pull}) + delta * ({p_both} + {p1} * {pull_tau})"
        parts.append(w.put(f"{weight} * tau * ({whole})"))
    return [w.total(parts)]
