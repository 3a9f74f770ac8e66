"""The density search on isotherms made for it."""

from __future__ import annotations

import math

import numpy as np
import pytest

from gasapi.engine.density import solve_block, solve_float
from gasapi.engine.protocol import Status


class Cubic:
    """delta (1 + D) = delta + a delta^2 + b delta^3: an isotherm whose roots and spinodals are known by hand."""

    exact_third = True

    def __init__(self, a, b):
        self.a, self.b = a, b

    def euler(self, x):
        one, two = self.a * x, self.b * x * x
        return one + two, one + 2.0 * two, one + 4.0 * two

    def take(self, rows):
        return Cubic(self.a[rows], self.b[rows])


class Shifted(Cubic):
    """The same, but with a third derivative that is wrong: steps are then Newton's at best."""

    exact_third = False

    def euler(self, x):
        first, second, _ = super().euler(x)
        return first, second, 0.0 * x

    def take(self, rows):
        return Shifted(self.a[rows], self.b[rows])


# slope 1 + 2 a x + 3 b x^2 is zero at x = 0.5 and 1.5 for these: a loop with a maximum of p at 0.5
LOOP = (-4.0 / 3.0, 4.0 / 9.0)
MAXIMUM = 0.5 + LOOP[0] * 0.25 + LOOP[1] * 0.125
MINIMUM = 1.5 + LOOP[0] * 2.25 + LOOP[1] * 3.375


@pytest.mark.parametrize("kind", [Cubic, Shifted])
def test_the_gas_root_of_a_loop_is_found_from_zero_density(kind):
    """Up to the spinodal, and no root of the other branch beyond it."""
    isotherm = kind(*LOOP)
    for share in (1e-9, 0.1, 0.5, 0.9, 0.999):
        target = share * MAXIMUM
        root = solve_float(isotherm, target, min(target, 0.15), 0.0, math.inf, True)
        assert root.status == Status.CONVERGED
        assert 0.0 < root.density < 0.5
        assert root.density * (1.0 + isotherm.euler(root.density)[0]) == pytest.approx(target, rel=1e-13)
    for share in (1.0001, 1.5, 5.0):
        assert solve_float(isotherm, share * MAXIMUM, 0.15, 0.0, math.inf, True).status == Status.NO_ROOT


def test_the_liquid_root_of_a_loop_is_found_from_high_density():
    """Down to the spinodal, and no root of the other branch below it."""
    isotherm = Cubic(*LOOP)
    for target in (MINIMUM + 1e-6, MINIMUM + 0.05, MINIMUM + 1.0):
        root = solve_float(isotherm, target, 2.4, 0.0, math.inf, True)
        assert root.status == Status.CONVERGED
        assert root.density > 1.5
    assert solve_float(isotherm, MINIMUM - 1e-3, 2.4, 0.0, math.inf, True).status == Status.NO_ROOT


def test_a_flat_inflection_is_solved():
    """At a critical isotherm (a = -1, b = 1/3) the slope is zero at the root; the bracket closes."""
    isotherm = Cubic(-1.0, 1.0 / 3.0)
    root = solve_float(isotherm, 1.0 / 3.0, 0.4, 0.0, math.inf, False)
    assert root.status == Status.CONVERGED
    assert root.density == pytest.approx(1.0, abs=2e-5)


def test_rows_that_stop_differently_stop_as_they_do_alone():
    """One block in which rows converge at once, late, run out of branch, or sit at an inflection: bit for bit as alone."""
    rng = np.random.default_rng(7)
    n = 3000
    a = rng.uniform(-1.6, 0.5, n)
    b = rng.uniform(0.2, 0.6, n)
    a[:50], b[:50] = -1.0, 1.0 / 3.0
    target = rng.uniform(1e-12, 1.0, n)
    target[:50] = 1.0 / 3.0 + rng.uniform(-1e-12, 1e-12, 50)
    guarded = rng.random(n) < 0.5
    start = np.where(guarded, np.minimum(target, 0.15), rng.uniform(0.05, 2.0, n))
    low = np.zeros(n)
    high = np.full(n, math.inf)
    block = solve_block(Cubic(a, b), target, start, low, high, guarded)
    kinds = set()
    for i in range(n):
        alone = solve_float(Cubic(float(a[i]), float(b[i])), float(target[i]), float(start[i]), 0.0, math.inf, bool(guarded[i]))
        assert (alone.density, int(alone.status)) == (block.density[i], int(block.status[i]))
        kinds.add(int(alone.status))
    assert {int(Status.CONVERGED), int(Status.NO_ROOT)} <= kinds


def test_what_does_not_converge_says_so():
    """An isotherm that answers NaN ends in not_converged, alone and in a block, with its neighbours untouched."""
    nan = Cubic(math.nan, 0.0)
    assert solve_float(nan, 0.5, 0.5, 0.0, math.inf, False).status == Status.NOT_CONVERGED
    a = np.array([0.0, math.nan, 0.1])
    block = solve_block(
        Cubic(a, np.zeros(3)), np.full(3, 0.5), np.full(3, 0.5), np.zeros(3), np.full(3, math.inf), np.zeros(3, bool)
    )
    assert block.status.tolist() == [Status.CONVERGED, Status.NOT_CONVERGED, Status.CONVERGED]


def test_an_empty_block_is_an_empty_answer():
    """No rows, no faults."""
    empty = np.zeros(0)
    root = solve_block(Cubic(empty, empty), empty, empty, empty, empty, np.zeros(0, bool))
    assert root.density.size == root.status.size == 0
