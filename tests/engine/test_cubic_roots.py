"""The root finder of cubic equations against brute force, long arithmetic and itself."""

from __future__ import annotations

import math
from decimal import Decimal, localcontext

import numpy as np
import pytest

from gasapi.engine.cubic_roots import CubicRoots
from gasapi.engine.models import peng_robinson, soave_redlich_kwong, van_der_waals
from gasapi.engine.protocol import Branch, Status

FORMS = {module.ID: module.FORM for module in (van_der_waals, soave_redlich_kwong, peng_robinson)}
EVERY_FORM = pytest.mark.parametrize("name", FORMS)


def reduced_pressure(form, theta, eta):
    return eta / (1.0 - eta) - theta * eta * eta / ((1.0 + form.delta1 * eta) * (1.0 + form.delta2 * eta))


def reduced_slope(form, theta, eta):
    u = form.delta1 + form.delta2
    d = (1.0 + form.delta1 * eta) * (1.0 + form.delta2 * eta)
    return 1.0 / (1.0 - eta) ** 2 - theta * eta * (2.0 + u * eta) / d**2


def critical(form):
    theta = form.omega_a / form.omega_b
    return theta, form.omega_b


def random_states(form, count, seed):
    """Half of the states anywhere, half around the critical point, down to 1e-13 of it."""
    random = np.random.default_rng(seed)
    theta_c, b_c = critical(form)
    sign = random.choice([-1.0, 1.0], count)
    theta = [10.0 ** random.uniform(-2.0, 2.0, count), 1.0 + sign * 10.0 ** random.uniform(-13.0, -1.0, count)]
    b = [10.0 ** random.uniform(-14.0, 4.0, count), 1.0 + sign * 10.0 ** random.uniform(-13.0, -0.5, count)]
    return theta_c * np.concatenate(theta), b_c * np.concatenate(b)


@EVERY_FORM
def test_the_critical_point_is_where_slope_and_curvature_vanish(name):
    """The packing and attraction held for the critical point make it one, and pc is met there."""
    form = FORMS[name]
    theta, b = critical(form)
    eta = form.critical_packing
    h = 1e-4
    curvature = (reduced_slope(form, theta, eta + h) - reduced_slope(form, theta, eta - h)) / (2.0 * h)
    assert reduced_slope(form, theta, eta) == pytest.approx(0.0, abs=1e-13)
    assert curvature == pytest.approx(0.0, abs=1e-5)
    assert reduced_pressure(form, theta, eta) == pytest.approx(b, rel=1e-13)


@EVERY_FORM
def test_roots_agree_with_brute_force(name):
    """The outermost polynomial roots, judged by walking the isotherm in from either end, are the ones returned."""
    form = FORMS[name]
    roots = form.roots()
    random = np.random.default_rng(17)
    theta_c, b_c = critical(form)
    u, w = form.delta1 + form.delta2, form.delta1 * form.delta2
    seen = set()
    for _ in range(400):
        theta = theta_c * random.uniform(0.5, 3.0)
        b = b_c * 10.0 ** random.uniform(-3.0, 1.0)
        polynomial = [w + theta + w * b, u - theta - (w - u) * b, 1.0 - (u - 1.0) * b, -b]
        physical = sorted(float(z.real) for z in np.roots(polynomial) if abs(z.imag) < 1e-9 and 0.0 < z.real < 1.0)
        walk = np.linspace(0.0, 1.0, 4001)[1:-1]
        slopes = reduced_slope(form, theta, walk)
        falling = np.flatnonzero(slopes <= 0.0)
        for branch, eta in ((Branch.GAS, physical[0]), (Branch.LIQUID, physical[-1])):
            if not falling.size:
                expected = Status.CONVERGED
            elif branch == Branch.GAS:
                expected = Status.CONVERGED if eta <= walk[falling[0]] else Status.NO_ROOT
            else:
                expected = Status.CONVERGED if eta >= walk[falling[-1]] else Status.NO_ROOT
            found = roots.packing(theta, b, branch)
            seen.add((branch, expected, bool(falling.size)))
            assert found.status == expected, (theta, b, branch)
            if expected == Status.CONVERGED:
                assert found.packing == pytest.approx(eta, rel=1e-8)
    assert len(seen) == 6


@EVERY_FORM
def test_densities_are_exact_to_rounding(name):
    """In 60-digit arithmetic the returned packing meets the pressure to 1e-12 of the slope or to the rounding of its terms."""
    form = FORMS[name]
    roots = form.roots()
    theta, b = random_states(form, 400, seed=2)
    with localcontext() as context:
        context.prec = 60
        d1, d2 = Decimal(form.delta1), Decimal(form.delta2)
        for row in range(theta.size):
            for branch in Branch:
                root = roots.packing(float(theta[row]), float(b[row]), branch)
                assert root.status != Status.NOT_CONVERGED
                if root.status == Status.CONVERGED:
                    t, eta = Decimal(float(theta[row])), Decimal(root.packing)
                    d = (1 + d1 * eta) * (1 + d2 * eta)
                    repulsion, attraction = eta / (1 - eta), t * eta * eta / d
                    slope = 1 / (1 - eta) ** 2 - t * eta * (2 + (d1 + d2) * eta) / d**2
                    error = abs(repulsion - attraction - Decimal(float(b[row])))
                    allowed = Decimal("1e-12") * eta * abs(slope) + Decimal("1e-15") * (repulsion + attraction)
                    assert error <= allowed, (theta[row], b[row], branch)


@EVERY_FORM
@pytest.mark.parametrize("branch", list(Branch))
def test_the_same_bits_alone_and_in_a_block(name, branch):
    """Rows that finish after different numbers of steps have the bits they have alone, in any block."""
    roots = FORMS[name].roots()
    theta, b = random_states(FORMS[name], 4000, seed=9)
    block = roots.packing_block(theta, b, branch)
    for start, stop in ((0, 1), (17, 1041)):
        part = roots.packing_block(theta[start:stop], b[start:stop], branch)
        assert np.array_equal(part.packing, block.packing[start:stop])
        assert np.array_equal(part.status, block.status[start:stop])
    for row in range(theta.size):
        single = roots.packing(float(theta[row]), float(b[row]), branch)
        assert single.packing == block.packing[row]
        assert single.status == block.status[row]
    assert Status.NOT_CONVERGED not in block.status
    assert set(block.status.tolist()) == {Status.CONVERGED, Status.NO_ROOT}


@EVERY_FORM
def test_both_branches_return_the_one_root_of_a_monotone_isotherm(name):
    """At and above the critical temperature the two branches give the same bits."""
    form = FORMS[name]
    theta_c, b_c = critical(form)
    random = np.random.default_rng(4)
    theta = theta_c * (1.0 - 10.0 ** random.uniform(-15.0, -0.1, 3000))
    theta[0] = theta_c
    b = b_c * 10.0 ** random.uniform(-6.0, 3.0, 3000)
    b[0] = b_c
    gas, liquid = (form.roots().packing_block(theta, b, branch) for branch in Branch)
    assert np.array_equal(gas.packing, liquid.packing)
    assert np.all(gas.status == Status.CONVERGED)
    assert np.all(liquid.status == Status.CONVERGED)
    assert gas.packing[0] == pytest.approx(form.critical_packing, rel=2e-5)


@EVERY_FORM
def test_low_and_high_pressures_are_safe(name):
    """At no pressure the gas is ideal and the liquid has its own density; under any pressure b rho stays below 1."""
    form = FORMS[name]
    roots = form.roots()
    theta = 3.0 * critical(form)[0]
    for b in (0.0, 1e-300, 1e-150, 1e-20):
        gas = roots.packing(theta, b, Branch.GAS)
        liquid = roots.packing(theta, b, Branch.LIQUID)
        assert (gas.status, liquid.status) == (Status.CONVERGED, Status.CONVERGED)
        assert gas.packing == pytest.approx(b, rel=1e-14)
        assert reduced_pressure(form, theta, liquid.packing) == pytest.approx(0.0, abs=1e-14 * theta)
    for b in (1e2, 1e4, 1e8):
        dense = roots.packing(theta, b, Branch.LIQUID)
        assert dense.status == Status.CONVERGED
        assert dense.packing < 1.0
        assert roots.packing(theta, b, Branch.GAS).status == Status.NO_ROOT


def test_what_is_not_a_number_ends_as_not_converged():
    """A NaN cannot loop for ever, and claims nothing."""
    roots = CubicRoots(0.0, 0.0, 1.0 / 3.0, 27.0 / 8.0)
    for theta, b in ((math.nan, 0.1), (3.0, math.nan)):
        for branch in Branch:
            assert roots.packing(theta, b, branch).status == Status.NOT_CONVERGED
            block = roots.packing_block(np.array([theta, 3.0]), np.array([b, 0.1]), branch)
            assert block.status.tolist() == [Status.NOT_CONVERGED, Status.CONVERGED]
