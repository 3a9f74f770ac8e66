"""Sums of Helmholtz terms against a plain evaluation of each term in high precision."""

from __future__ import annotations

import numpy as np
import pytest
from mpmath import diff, exp, mp, mpf

from gasapi.engine.helmholtz import TermLayout, TermSum
from gasapi.gases.loader import load_reference
from gasapi.gases.records import ResidualTerm

TERMS = {
    "monomial": ResidualTerm("monomial", 0.7, 2.0, 0.875),
    "monomial of no density": ResidualTerm("monomial", -1.3, 0.0, 3.0),
    "negative exponent": ResidualTerm("monomial", 0.4, 1.0, -2.35),
    "odd exponent": ResidualTerm("monomial", 0.4, 3.0, 1.3437),
    "fractional density": ResidualTerm("monomial", 0.3, 1.5, 0.2),
    "damped": ResidualTerm("damped", 0.9, 4.0, 7.85, (1.0, 2.0)),
    "damped with a factor": ResidualTerm("damped", -0.6, 2.0, 3.0, (0.565, 3.0)),
    "damped both": ResidualTerm("damped_both", 0.8, 2.0, 1.5, (1.0, 2.0, 0.9, 3.0)),
    "gaussian": ResidualTerm("gaussian", 1.4, 1.0, 0.4, (1.2, 0.9, 1.7, 1.1)),
    "gaussian reciprocal": ResidualTerm("gaussian_reciprocal", 0.2, 1.0, 4.3, (0.6, 0.8, 0.4, 1.05, 1.3)),
    "density gaussian": ResidualTerm("density_gaussian", -0.3, 3.0, 5.4, (1.0, 0.5, 0.9, 0.5)),
    "nonanalytic": ResidualTerm("nonanalytic", -0.7, 1.0, 0.0, (3.5, 0.875, 0.3, 0.7, 0.3, 10.0, 275.0)),
}


def plain(term, delta, tau):
    """One term as the record's description writes it."""
    p = [mpf(v) for v in term.parameters]
    n, d, t = mpf(term.n), mpf(term.d), mpf(term.t)
    if term.kind == "nonanalytic":
        a, b, beta, big_a, big_b, big_c, big_d = p
        y = (delta - 1) ** 2
        distance = ((1 - tau) + big_a * y ** (1 / (2 * beta))) ** 2 + big_b * y**a
        return n * distance**b * delta * exp(-big_c * y - big_d * (tau - 1) ** 2)
    value = n * delta**d * tau**t
    match term.kind:
        case "damped":
            return value * exp(-p[0] * delta ** p[1])
        case "damped_both":
            return value * exp(-p[0] * delta ** p[1] - p[2] * tau ** p[3])
        case "gaussian":
            return value * exp(-p[0] * (delta - p[1]) ** 2 - p[2] * (tau - p[3]) ** 2)
        case "gaussian_reciprocal":
            return value * exp(-p[0] * (delta - p[1]) ** 2 + 1 / (p[2] * (tau - p[3]) ** 2 + p[4]))
        case "density_gaussian":
            return value * exp(-p[0] * (delta - p[1]) ** 2 - p[2] * (delta - p[3]))
    return value


@pytest.mark.parametrize(
    "terms", [[TERMS["monomial"], t] for t in TERMS.values()] + [list(TERMS.values())], ids=[*TERMS, "all"]
)
@pytest.mark.parametrize(("delta", "tau"), [(0.3, 1.07), (1.21, 0.93), (0.02, 1.6)])
def test_value_and_derivatives(terms, delta, tau):
    """Every kind of term, alone and together, with three Euler derivatives in density and the one in temperature."""
    mp.dps = 40
    energy = TermSum.of(terms)
    d, t = mpf(delta), mpf(tau)

    def total(x, y):
        return sum(plain(term, x, y) for term in terms)

    def euler(x, y, order):
        return total(x, y) if order == 0 else x * diff(lambda s: euler(s, y, order - 1), x)

    isotherm, slope = energy.with_slopes(tau)
    scale = max(1e-6, float(abs(total(d, t))))
    assert isotherm.value(delta) == pytest.approx(float(total(d, t)), abs=3e-14 * scale)
    found = isotherm.euler(delta)
    orders = 3 if isotherm.exact_third else 2
    for order in range(orders):
        exact = float(euler(d, t, order + 1))
        assert found[order] == pytest.approx(exact, rel=1e-12, abs=3e-13 * scale)
    mixed = float(t * diff(lambda y: euler(d, y, 1), t))
    assert slope.first_of_slope(delta) == pytest.approx(mixed, rel=1e-12, abs=3e-12 * scale)


def test_a_float_and_an_element_have_the_same_bits():
    """Every routine of a layout that holds every kind of term."""
    energy = TermSum.of(list(TERMS.values()))
    rng = np.random.default_rng(1)
    tau, delta = rng.uniform(0.4, 2.5, 2000), rng.uniform(1e-6, 3.0, 2000)
    isotherm, slope = energy.with_slopes(tau)
    first, second, third = isotherm.euler(delta)
    value, mixed = isotherm.value(delta), slope.first_of_slope(delta)
    for i, (t, d) in enumerate(zip(tau.tolist(), delta.tolist(), strict=True)):
        alone, alone_slope = energy.with_slopes(t)
        assert alone.euler(d) == (first[i], second[i], third[i])
        assert alone.value(d) == value[i]
        assert alone_slope.first_of_slope(d) == mixed[i]
        assert energy.isotherm(t).euler(d) == (first[i], second[i], third[i])


def test_rows_can_be_taken():
    """The isotherms of some rows are those rows' isotherms."""
    energy = TermSum.of(load_reference("nitrogen").terms)
    tau, delta = np.linspace(0.3, 1.5, 40), np.linspace(0.01, 2.0, 40)
    rows = np.array([3, 17, 38])
    whole = energy.isotherm(tau).euler(delta)
    part = energy.isotherm(tau).take(rows).euler(delta[rows])
    for all_rows, some in zip(whole, part, strict=True):
        assert np.array_equal(all_rows[rows], some)


def test_terms_with_equal_exponents_are_merged():
    """Two terms that differ in n only cost one."""
    layout = TermLayout([TERMS["damped"], TERMS["damped"], TERMS["monomial"]])
    assert layout.n_entries == 2
    assert layout.amplitudes(np.array([1.0, 2.0, 4.0])) in ([3.0, 4.0], [4.0, 3.0])


def test_an_unknown_kind_is_refused():
    """A term that no formula is held for is a fault of the data, not zero."""
    with pytest.raises(ValueError, match="spline"):
        TermLayout([ResidualTerm("spline", 1.0, 1.0, 1.0)])
