"""The two fluids of Lee and Kesler: critical point, branch ends, roots, in long arithmetic and bit for bit."""

from __future__ import annotations

from decimal import Decimal, localcontext

import numpy as np
import pytest

from gasapi.engine.models.lee_kesler import REFERENCE, SIMPLE
from gasapi.engine.protocol import Branch, Status
from gasapi.engine.reduced_bwr import ReducedFluid, terms

CONSTANTS = {"simple": SIMPLE, "reference": REFERENCE}
FLUIDS = {name: ReducedFluid(constants) for name, constants in CONSTANTS.items()}
EVERY_FLUID = pytest.mark.parametrize("name", FLUIDS)


def long_terms(k, t_r, d):
    """F, F' and the size of the terms of F in the precision of the context."""
    t, x = 1 / Decimal(t_r), Decimal(d)
    b = Decimal(k.b1) - Decimal(k.b2) * t - Decimal(k.b3) * t**2 - Decimal(k.b4) * t**3
    c = Decimal(k.c1) - Decimal(k.c2) * t + Decimal(k.c3) * t**3
    dd = Decimal(k.d1) + Decimal(k.d2) * t
    beta, gamma = Decimal(k.beta), Decimal(k.gamma)
    g = gamma * x**2
    tail = Decimal(k.c4) * t**3 * x**2 * (-g).exp()
    f = x * (1 + b * x + c * x**2 + dd * x**5 + tail * (beta + g))
    slope = 1 + 2 * b * x + 3 * c * x**2 + 6 * dd * x**5 + tail * (3 * beta + g * (5 - 2 * beta - 2 * g))
    size = x * (1 + abs(b) * x + abs(c) * x**2 + dd * x**5 + tail * (beta + g))
    return f, slope, size


def random_states(count, seed):
    """A third below T_r = 1.2, a third far above, a third around the critical point down to 1e-13 of it."""
    random = np.random.default_rng(seed)
    sign = random.choice([-1.0, 1.0], count)
    t = [random.uniform(0.2, 1.2, count), 10.0 ** random.uniform(0.0, 1.8, count)]
    t.append(1.0 + sign * 10.0 ** random.uniform(-13.0, -1.0, count))
    p = [10.0 ** random.uniform(-12.0, 3.0, count), 10.0 ** random.uniform(-12.0, 4.5, count)]
    p.append(1.0 + sign * 10.0 ** random.uniform(-13.0, -0.3, count))
    return np.concatenate(t), np.concatenate(p)


@EVERY_FLUID
def test_the_critical_point_was_put_at_one(name):
    """The authors constrained the fit: T_r, p_r and Z at the critical point are 1, 1 and about 0.2905 - 0.085 omega."""
    fluid = FLUIDS[name]
    t_c = 1.0 - 2e-7
    f, slope, half, _ = terms(fluid.isotherm(t_c), fluid.critical_density)
    assert f * t_c == pytest.approx(1.0, abs=2e-6)
    assert slope == pytest.approx(0.0, abs=1e-5)
    assert half == pytest.approx(0.0, abs=1e-5)
    expected = 0.2905 - 0.085 * CONSTANTS[name].acentric_factor
    assert f / fluid.critical_density == pytest.approx(expected, abs=8e-4)


@EVERY_FLUID
def test_branches_end_at_the_outermost_turning_points(name):
    """A fine walk along each isotherm finds the same first and last zero of the slope; above T_r = 1 there is none."""
    fluid = FLUIDS[name]
    walk = np.linspace(1e-3, 30.0, 60001)
    for t_r in (0.2, 0.25, 0.3, 0.42, 0.53, 0.7, 0.9, 0.99, 0.9999):
        isotherm = fluid.isotherm(np.full(walk.shape, t_r))
        slopes = terms(isotherm, walk)[1]
        turning = np.flatnonzero(np.diff(np.sign(slopes)))
        assert fluid.branch_end(t_r, Branch.GAS) == pytest.approx(walk[turning[0]], abs=6e-4)
        assert fluid.branch_end(t_r, Branch.LIQUID) == pytest.approx(walk[turning[-1]], abs=6e-4)
        for branch in Branch:
            _, slope, half, _ = terms(fluid.isotherm(t_r), fluid.branch_end(t_r, branch))
            assert slope / (2.0 * half * walk[turning[0]]) == pytest.approx(0.0, abs=1e-8)
    for t_r in (1.0, 1.0001, 1.05, 2.0, 60.0):
        assert fluid.branch_end(t_r, Branch.GAS) is None
        assert np.all(terms(fluid.isotherm(np.full(walk.shape, t_r)), walk)[1] > 0.0)


@EVERY_FLUID
def test_roots_are_exact_to_rounding(name):
    """In 50-digit arithmetic F is met to 1e-12 of the slope or to the rounding of its terms, on rising isotherms."""
    fluid = FLUIDS[name]
    t, p = random_states(150, seed=1)
    with localcontext() as context:
        context.prec = 50
        for row in range(t.size):
            for branch in Branch:
                root = fluid.root(float(t[row]), float(p[row]), branch)
                assert root.status != Status.NOT_CONVERGED
                if root.status == Status.CONVERGED:
                    f, slope, size = long_terms(CONSTANTS[name], float(t[row]), root.density)
                    target = Decimal(float(p[row])) / Decimal(float(t[row]))
                    allowed = Decimal("1e-12") * Decimal(root.density) * abs(slope) + Decimal("1e-15") * (size + target)
                    assert abs(f - target) <= allowed, (t[row], p[row], branch)
                    assert slope > -Decimal("1e-7")


@EVERY_FLUID
@pytest.mark.parametrize("branch", list(Branch))
def test_the_same_bits_alone_and_in_a_block(name, branch):
    """Density, slope and status of thousands of states are those of the state alone."""
    fluid = FLUIDS[name]
    t, p = random_states(1200, seed=3)
    block = fluid.roots(t, p, branch)
    part = fluid.roots(t[100:900], p[100:900], branch)
    assert np.array_equal(part.density, block.density[100:900])
    for row in range(t.size):
        single = fluid.root(float(t[row]), float(p[row]), branch)
        assert single == (block.density[row], block.slope[row], block.status[row])
    assert set(block.status.tolist()) == {Status.CONVERGED, Status.NO_ROOT}


@EVERY_FLUID
def test_a_branch_ends_where_it_says(name):
    """A hair below the pressure at its end a branch has a root close to the end, a hair beyond it has none."""
    fluid = FLUIDS[name]
    for t_r in (0.3, 0.6, 0.9, 0.99):
        for branch, sign in ((Branch.GAS, 1.0), (Branch.LIQUID, -1.0)):
            end = fluid.branch_end(t_r, branch)
            assert end is not None
            p_end = terms(fluid.isotherm(t_r), end)[0] * t_r
            if p_end > 0.0:
                inside = fluid.root(t_r, p_end * (1.0 - sign * 1e-10), branch)
                beyond = fluid.root(t_r, p_end * (1.0 + sign * 1e-10), branch)
                assert (inside.status, beyond.status) == (Status.CONVERGED, Status.NO_ROOT)
                assert inside.density == pytest.approx(end, rel=1e-3)


def test_fugacity_coefficients_against_quadrature():
    """ln(phi) is the integral of (Z - 1)/p dp along the isotherm, done here by Gauss's rule in ln p."""
    nodes, weights = np.polynomial.legendre.leggauss(60)
    for fluid in FLUIDS.values():
        t_r, p_r = 1.1, 0.9
        low = 1e-7
        points = np.exp(0.5 * (np.log(p_r / low) * nodes + np.log(p_r * low)))
        z = points / (t_r * fluid.roots(np.full(points.shape, t_r), points, Branch.GAS).density)
        integral = 0.5 * np.log(p_r / low) * float(weights @ (z - 1.0))
        found = fluid.log_fugacity_coefficient(t_r, fluid.root(t_r, p_r, Branch.GAS).density)
        assert found == pytest.approx(integral, abs=1e-7)
