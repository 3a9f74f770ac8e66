"""The cubic equations in component densities, against teqp and against the cubic's own fugacities."""

import numpy as np
import pytest
import teqp

from gasapi.engine.models import peng_robinson, soave_redlich_kwong
from gasapi.engine.phase.cubic_energy import CubicEnergy
from gasapi.engine.protocol import Branch, Status
from gasapi.gases.records import CubicPair, Substance

_IDS = ("methane", "propane", "n-hexane", "carbon-dioxide")
_T = (190.56, 369.83, 507.6, 304.13)
_P = (4.599e6, 4.248e6, 3.025e6, 7.377e6)
_W = (0.011, 0.152, 0.301, 0.224)
_K = 0.03
"""Rounded constants, and one k_ij for all pairs: invented, both sides get the same."""


def _mixture(model):
    substances = [
        Substance(id=i, molar_mass=0.03, critical_temperature=t, critical_pressure=p, acentric_factor=w)
        for i, t, p, w in zip(_IDS, _T, _P, _W, strict=True)
    ]
    return model.mixture(substances, lambda a, b: CubicPair(_K, _K, "invented"))


@pytest.mark.parametrize(("model", "kind"), [(peng_robinson, "PR"), (soave_redlich_kwong, "SRK")])
def test_against_teqp(model, kind):
    """Z and the potentials agree with teqp; its constants are rounded, so to eight digits only."""
    kmat = (_K * (1.0 - np.eye(4))).tolist()
    other = teqp.make_model(
        {"kind": kind, "model": {"Tcrit / K": list(_T), "pcrit / Pa": list(_P), "acentric": list(_W), "kmat": kmat}}
    )
    energy = CubicEnergy(_mixture(model))
    rng = np.random.default_rng(2)
    temperature = rng.uniform(220.0, 450.0, 8)
    densities = rng.uniform(50.0, 8000.0, 8)[:, None] * rng.dirichlet(np.ones(4), 8)
    d = energy.derivatives(temperature, densities)
    for i in range(8):
        expected = other.build_Psir_gradient_autodiff(temperature[i], densities[i]) / (8.314462618 * temperature[i])
        assert d.potential[i] == pytest.approx(expected, rel=1e-6, abs=1e-7)
        expected = other.build_Psir_Hessian_autodiff(temperature[i], densities[i]) * densities[i].sum()
        expected /= 8.314462618 * temperature[i]
        assert np.abs(d.hessian[i] - expected).max() < 1e-6 * np.abs(expected).max()


@pytest.mark.parametrize("model", [peng_robinson, soave_redlich_kwong])
@pytest.mark.parametrize("branch", [Branch.GAS, Branch.LIQUID])
def test_fugacities_of_the_mixture(model, branch):
    """Roots and fugacities are those that the cubic's own formulas give."""
    mixture = _mixture(model)
    energy = CubicEnergy(mixture)
    rng = np.random.default_rng(3)
    fractions = rng.dirichlet(np.ones(4), 20)
    found, _, status = energy.log_fugacity(np.full(20, 280.0), np.full(20, 2e6), fractions, branch)
    expected = mixture.log_fugacity(280.0, 2e6, fractions, branch)
    good = (status == Status.CONVERGED) & np.isfinite(expected[:, 0])
    assert good.sum() >= 5
    assert found[good] == pytest.approx(expected[good], rel=1e-9, abs=1e-9)


def test_subset():
    """Some of the components by themselves are those components with the rest absent."""
    energy = CubicEnergy(_mixture(peng_robinson))
    some = energy.subset([0, 2])
    assert some.components == ("methane", "n-hexane")
    t = np.array([300.0])
    whole = energy.derivatives(t, np.array([[500.0, 0.0, 80.0, 0.0]]))
    part = some.derivatives(t, np.array([[500.0, 80.0]]))
    assert part.potential[0] == pytest.approx(whole.potential[0, [0, 2]], rel=1e-13)
