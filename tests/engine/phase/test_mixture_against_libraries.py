"""Dew points of invented mixtures against teqp (GERG-2008) and CoolProp (cubic equations): 60 and 2 x 30 compositions."""

import CoolProp
import numpy as np
import pytest
import teqp

from gasapi.engine.models import peng_robinson, soave_redlich_kwong
from gasapi.engine.models.gerg_2008 import GergSystem
from gasapi.engine.phase.mixture import mixture_phase
from gasapi.gases.loader import load_gerg
from gasapi.gases.records import CubicPair, Substance

_TEQP = {"carbon-dioxide": "carbondioxide", "carbon-monoxide": "carbonmonoxide", "hydrogen-sulfide": "hydrogensulfide"}
_COOLPROP = {
    "methane": "Methane",
    "ethane": "Ethane",
    "propane": "Propane",
    "n-butane": "n-Butane",
    "isobutane": "IsoButane",
    "n-pentane": "n-Pentane",
    "n-hexane": "n-Hexane",
    "n-heptane": "n-Heptane",
    "nitrogen": "Nitrogen",
    "carbon-dioxide": "CarbonDioxide",
    "hydrogen-sulfide": "HydrogenSulfide",
    "oxygen": "Oxygen",
    "argon": "Argon",
}


def _composition(rng, names, most):
    chosen = [str(c) for c in rng.choice(names, rng.integers(2, most), replace=False)]
    fractions = np.maximum(rng.dirichlet(np.full(len(chosen), 0.7)), 1e-4)
    return chosen, fractions / fractions.sum()


def test_gerg_2008():
    """The median difference to teqp's own solution at given pressure and composition is far below 0.5 K, and none is above."""
    data = load_gerg()
    names = [c.id for c in data.components if c.id != "water"]
    rng = np.random.default_rng(11)
    differences = []
    for _ in range(60):
        chosen, fractions = _composition(rng, names, 9)
        phase = mixture_phase(GergSystem(data, chosen), fractions.tolist())
        boundary = phase.boundary
        if boundary is None:
            continue
        model = teqp.make_model({"kind": "GERG2008resid", "model": {"names": [_TEQP.get(c, c) for c in chosen]}})
        dew_side = np.arange(boundary.position.size) <= int(boundary.log_temperature.argmax())
        for pressure in (5e5, 3e6):
            dew = phase.at(900.0, pressure).dew_point_temperature
            if dew is None:
                continue
            # teqp starts from a node of the trace beside the point, not from the point
            distance = np.where(dew_side, np.abs(boundary.log_pressure - np.log(pressure)), np.inf)
            node = int(distance.argmin())
            unknown = boundary.unknown[node]
            liquid = boundary.system.incipient_densities(unknown[None])[0]
            vapour = float(np.exp(unknown[-2])) * fractions
            _, found, _, _ = model.mixture_VLE_px(pressure, fractions, float(np.exp(unknown[-1])), vapour, liquid)
            differences.append(abs(dew - found))
    assert len(differences) > 100
    assert np.median(differences) < 1e-3
    assert max(differences) < 0.01


@pytest.mark.parametrize(("model", "backend"), [(peng_robinson, "PR"), (soave_redlich_kwong, "SRK")])
def test_cubic_equations(model, backend):
    """The median difference to CoolProp's own search, with its constants and the same k_ij, is far below 0.1 K."""
    substances = {}
    for name, other in _COOLPROP.items():
        state = CoolProp.AbstractState(backend, other)
        substances[name] = Substance(
            id=name,
            molar_mass=state.molar_mass(),
            critical_temperature=state.T_critical(),
            critical_pressure=state.p_critical(),
            acentric_factor=state.acentric_factor(),
        )
    rng = np.random.default_rng(4)
    differences = []
    for _ in range(30):
        chosen, fractions = _composition(rng, list(_COOLPROP), 8)
        k = float(rng.uniform(-0.02, 0.1))
        mixture = model.mixture([substances[c] for c in chosen], lambda a, b, k=k: CubicPair(k, k, "invented"))
        phase = mixture_phase(mixture, fractions.tolist())
        state = CoolProp.AbstractState(backend, "&".join(_COOLPROP[c] for c in chosen))
        state.set_mole_fractions(fractions.tolist())
        for i in range(len(chosen)):
            for j in range(len(chosen)):
                if i != j:
                    state.set_binary_interaction_double(i, j, "kij", k)
        for pressure in (3e5, 1.5e6):
            try:
                state.update(CoolProp.PQ_INPUTS, pressure, 1.0)
            except ValueError:
                # the library has no answer for some of them
                continue
            dew = phase.at(900.0, pressure).dew_point_temperature
            assert dew is not None
            differences.append(abs(dew - state.T()))
    assert len(differences) > 45
    assert np.median(differences) < 1e-3
    assert np.quantile(differences, 0.95) < 0.1
