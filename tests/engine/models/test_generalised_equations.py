"""One body of tests for every generalised equation: what physics and the engine's contract ask of all of them."""

from __future__ import annotations

import math

import numpy as np
import pytest
from generalised import COMPOSITIONS, MODELS, fluid, scale, states, substances

from gasapi.engine.protocol import Branch, Status

EVERY = [(model, composition) for model in MODELS for composition in COMPOSITIONS]
SOLVED = pytest.mark.parametrize(("model", "composition"), EVERY)


@SOLVED
@pytest.mark.parametrize("branch", list(Branch))
def test_the_same_bits_alone_and_in_a_block(model, composition, branch):
    """A state has the same density, status, pressure and Gibbs energy alone, in a block and in a shuffled one."""
    equation = fluid(model, composition)
    t, p = states(composition, 350, seed=11)
    block = equation.density(t, p, branch)
    order = np.random.default_rng(3).permutation(t.size)
    shuffled = equation.density(t[order], p[order], branch)
    solved = block.status == Status.CONVERGED
    derivatives = equation.pressure(t[solved], block.density[solved])
    gibbs = equation.residual_gibbs(t[solved], block.density[solved])
    for row, place in enumerate(order):
        assert shuffled.status[row] == block.status[place]
        assert np.array_equal(shuffled.density[row], block.density[place], equal_nan=True)
    number = 0
    for row in range(t.size):
        single = equation.density(float(t[row]), float(p[row]), branch)
        assert single.status == block.status[row]
        if solved[row]:
            assert type(single.density) is float
            assert single.density == block.density[row]
            alone = equation.pressure(float(t[row]), single.density)
            assert np.array_equal(alone, [value[number] for value in derivatives], equal_nan=True)
            assert np.array_equal(equation.residual_gibbs(float(t[row]), single.density), gibbs[number], equal_nan=True)
            number += 1


@SOLVED
def test_every_row_ends_with_a_verdict_and_converges(model, composition):
    """Nothing between 1e-8 and 1000 critical pressures stays unconverged, near-critical states included."""
    t, p = states(composition, 3000, seed=5)
    for branch in Branch:
        root = fluid(model, composition).density(t, p, branch)
        assert Status.NOT_CONVERGED not in root.status
        assert root.status.dtype == np.int8


@SOLVED
def test_a_returned_density_has_the_pressure_asked_for_and_a_positive_slope(model, composition):
    """p(T, rho(T, p)) = p to 1e-12 of rho dp/drho or to the rounding of the pressure, and dp/drho > 0."""
    equation = fluid(model, composition)
    t, p = states(composition, 3000, seed=6)
    for branch in Branch:
        root = equation.density(t, p, branch)
        solved = root.status == Status.CONVERGED
        if model == "lee-kesler":
            # between the critical points of its two fluids, and with a negative acentric factor around them, a blend
            # can meet one density at two pressures
            margin = 0.01 if equation.constants.acentric_factor < 0.0 else 1e-6
            solved &= np.abs(t / equation.constants.temperature - 1.0) > margin
        rho = root.density[solved]
        back = equation.pressure(t[solved], rho)
        # the repulsive and attractive parts of the pressure cancel in a liquid: their size is that of rho R T/(1 - b rho)
        rounding = 1e-14 * (p[solved] + equation.gas_constant * t[solved] * rho * 100.0)
        assert np.all(back.density_derivative > 0.0)
        assert np.all(np.abs(back.pressure - p[solved]) <= 1e-12 * rho * back.density_derivative + rounding)


@SOLVED
def test_the_ideal_gas_is_the_limit_of_zero_pressure(model, composition):
    """Z - 1 falls in proportion to the pressure, and a pressure of 1e-200 Pa is no trouble."""
    equation = fluid(model, composition)
    tc, pc = scale(composition)
    t = 1.1 * tc
    departures = []
    for p in (1e-3 * pc, 1e-5 * pc):
        rho = equation.density(t, p, Branch.GAS).density
        departures.append(p / (rho * equation.gas_constant * t) - 1.0)
    assert abs(departures[0]) < 2e-3
    assert departures[0] == pytest.approx(100.0 * departures[1], rel=2e-3, abs=1e-12)
    vanishing = equation.density(t, 1e-200, Branch.GAS)
    assert vanishing.status == Status.CONVERGED
    assert vanishing.density == pytest.approx(1e-200 / (equation.gas_constant * t), rel=1e-14)


@SOLVED
def test_derivatives_of_the_pressure_agree_with_differences(model, composition):
    """Central differences extrapolated to fourth order give both derivatives to 1e-7."""
    equation = fluid(model, composition)
    tc, pc = scale(composition)
    for t_ratio, p_ratio in ((0.9, 1e-3), (1.1, 0.1), (1.5, 2.0), (3.0, 0.5)):
        root = equation.density(t_ratio * tc, p_ratio * pc, Branch.GAS)
        if root.status != Status.CONVERGED:
            continue
        t, rho = t_ratio * tc, root.density
        at = equation.pressure(t, rho)

        def difference(function, x):
            h = 2e-4 * x
            near = (function(x + h) - function(x - h)) / (2.0 * h)
            far = (function(x + 2.0 * h) - function(x - 2.0 * h)) / (4.0 * h)
            return (4.0 * near - far) / 3.0

        by_density = difference(lambda r, t=t: equation.pressure(t, r).pressure, rho)
        by_temperature = difference(lambda u, rho=rho: equation.pressure(u, rho).pressure, t)
        assert at.density_derivative == pytest.approx(by_density, rel=1e-7)
        assert at.temperature_derivative == pytest.approx(by_temperature, rel=1e-7)


@SOLVED
def test_the_residual_gibbs_energy_fits_the_density(model, composition):
    """d(g_res/RT)/dp at fixed temperature is (Z - 1)/p, and g_res vanishes with the pressure."""
    equation = fluid(model, composition)
    tc, pc = scale(composition)

    def gibbs(t, p):
        return equation.residual_gibbs(t, equation.density(t, p, Branch.GAS).density)

    for t_ratio, p_ratio in ((0.9, 1e-2), (1.2, 0.2), (1.6, 3.0), (4.0, 1.0)):
        t, p = t_ratio * tc, p_ratio * pc
        root = equation.density(t, p, Branch.GAS)
        if root.status != Status.CONVERGED:
            continue
        h = 1e-3 * p
        near = (gibbs(t, p + h) - gibbs(t, p - h)) / (2.0 * h)
        far = (gibbs(t, p + 2.0 * h) - gibbs(t, p - 2.0 * h)) / (4.0 * h)
        z = p / (root.density * equation.gas_constant * t)
        assert (4.0 * near - far) / 3.0 * p == pytest.approx(z - 1.0, rel=1e-7, abs=1e-11)
        assert gibbs(t, 1e-6 * pc) == pytest.approx(0.0, abs=1e-5)


@SOLVED
def test_the_molar_mass_is_the_mole_average(model, composition):
    """M = sum x_i M_i, and R is that of CODATA 2018."""
    expected = sum(x * substances(id)[0].molar_mass for id, x in COMPOSITIONS[composition].items())
    equation = fluid(model, composition)
    assert expected == equation.molar_mass
    assert equation.gas_constant == 8.314462618
    assert equation.model == model


@pytest.mark.parametrize("model", MODELS)
def test_every_equation_says_where_it_comes_from(model):
    """ID, NAME and SOURCE are there, and a common gas can be served."""
    module = MODELS[model]
    assert model == module.ID
    assert module.NAME
    assert any(character.isdigit() for character in module.SOURCE)
    assert module.serves(substances("nitrogen", "methane")) is None


@SOLVED
@pytest.mark.parametrize("branch", list(Branch))
def test_absurd_states_get_a_verdict_and_no_exception(model, composition, branch):
    """From 1e-6 K and 0 Pa to 1e12 K and 1e300 Pa, and for NaN, the same verdict alone and in a block; NaN is never solved."""
    equation = fluid(model, composition)
    temperatures = (1e-6, 1e-3, 1.0, 10.0, 300.0, 3000.0, 1e6, 1e12, math.nan)
    pressures = (0.0, 5e-324, 1e-200, 1e-30, 1.0, 1e5, 1e10, 1e15, 1e300, math.nan)
    t, p = (np.array(values) for values in zip(*[(t, p) for t in temperatures for p in pressures], strict=True))
    block = equation.density(t, p, branch)
    for row in range(t.size):
        single = equation.density(float(t[row]), float(p[row]), branch)
        assert single.status == block.status[row]
        if single.status == Status.CONVERGED:
            assert single.density == block.density[row]
            assert 0.0 <= single.density < math.inf
            assert not math.isnan(t[row] + p[row])
        if p[row] <= 1e15:
            assert single.status != Status.NOT_CONVERGED or math.isnan(t[row])
