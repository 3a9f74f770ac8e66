"""GERG-2008 against published check values and an independent library."""

from __future__ import annotations

import json
import warnings
from pathlib import Path

import numpy as np
import pytest
from deviations import LIMIT, gerg_deviation, gerg_pairs

from gasapi.engine.models.gerg_2008 import GergSystem
from gasapi.engine.protocol import Branch
from gasapi.gases.loader import load_gerg

PUBLISHED = json.loads((Path(__file__).parents[1] / "published" / "gerg_2008_check_points.json").read_bytes())
DATA = load_gerg()

# An illustrative natural gas; invented
NATURAL_GAS = {
    "methane": 0.85,
    "nitrogen": 0.02,
    "carbon-dioxide": 0.015,
    "ethane": 0.06,
    "propane": 0.03,
    "n-butane": 0.006,
    "isobutane": 0.006,
    "n-pentane": 0.003,
    "isopentane": 0.004,
    "n-hexane": 0.002,
    "helium": 0.004,
}


def fluid_of(composition):
    return GergSystem(DATA, list(composition)).fluid(list(composition.values()))


@pytest.mark.parametrize("component", DATA.components, ids=lambda c: c.id)
def test_every_component_agrees_with_an_independent_library(component):
    """Pure components, over the extended range."""
    assert gerg_deviation((component.id,), np.array([1.0]), 40).worst < LIMIT


def test_every_pair_agrees_with_an_independent_library():
    """All 210 pairs, over the extended range."""
    rng = np.random.default_rng(4)
    worst = {}
    for pair in gerg_pairs():
        x = rng.uniform(0.05, 0.95)
        worst[pair] = gerg_deviation(pair, np.array([x, 1.0 - x]), 12).worst
    assert len(worst) == 210
    assert {pair: d for pair, d in worst.items() if d >= LIMIT} == {}


def test_all_components_at_once_agree_with_an_independent_library():
    """Random mixtures of all 21 components."""
    rng = np.random.default_rng(9)
    for seed in range(4):
        x = rng.dirichlet(np.ones(len(DATA.components)))
        assert gerg_deviation(tuple(c.id for c in DATA.components), x, 30, seed).worst < LIMIT


@pytest.mark.parametrize("point", PUBLISHED["points"], ids=lambda p: f"{len(p['fractions'])} at {p['temperature_K']} K")
def test_check_points(point):
    """Densities confirmed by two outside implementations."""
    composition = {k: v for k, v in point["fractions"].items() if v > 0.0}
    fluid = fluid_of(composition)
    root = fluid.density(float(point["temperature_K"]), float(point["pressure_Pa"]), Branch.GAS)
    assert root.status == 0
    assert root.density == pytest.approx(point["density_mol_per_m3"], rel=2e-11)


def test_alone_and_in_a_block_give_the_same_bits():
    """A natural gas from deep inside its loops to dense gas, both branches."""
    fluid = fluid_of(NATURAL_GAS)
    rng = np.random.default_rng(2)
    t = rng.uniform(80.0, 450.0, 2400)
    p = np.exp(rng.uniform(np.log(1e3), np.log(7e7), t.size))
    for branch in Branch:
        block = fluid.density(t, p, branch)
        alone = [fluid.density(a, b, branch) for a, b in zip(t.tolist(), p.tolist(), strict=True)]
        assert [r.density for r in alone] == block.density.tolist()
        assert [int(r.status) for r in alone] == block.status.tolist()


def test_the_branches_are_never_confused():
    """Along each found branch dp/drho is positive from the outside to the root, at states full of false roots."""
    fluid = fluid_of({"methane": 0.6, "propane": 0.3, "n-hexane": 0.1})
    rng = np.random.default_rng(6)
    t = fluid.reducing_temperature / rng.uniform(1.05, 2.2, 400)
    p = np.exp(rng.uniform(np.log(1e3), np.log(2e7), t.size))
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        for branch, outside in ((Branch.GAS, 0.0), (Branch.LIQUID, 3.2 * fluid.reducing_density)):
            root = fluid.density(t, p, branch)
            found = root.status == 0
            assert found.sum() > 50
            for part in np.linspace(0.02, 1.0, 25):
                rho = root.density[found] + (outside - root.density[found]) * (1.0 - part)
                assert np.all(fluid.pressure(t[found], np.maximum(rho, 1e-6)).density_derivative > 0.0)


def test_the_critical_point_of_a_pure_component_is_its_own():
    """Slope and curvature vanish there; n-heptane's lies 1.1 K above its reducing temperature."""
    heptane = fluid_of({"n-heptane": 1.0})
    assert heptane.critical.temperature == pytest.approx(541.23, abs=0.01)
    at = heptane.pressure(heptane.critical.temperature, heptane.critical.density)
    assert abs(at.density_derivative) < 1e-9 * heptane.gas_constant * heptane.critical.temperature


def test_the_order_of_components_only_changes_the_last_digit():
    """Binary parameters are turned round where a pair is asked for the other way."""
    forward = fluid_of(NATURAL_GAS).density(290.0, 6e6, Branch.GAS).density
    backward = fluid_of(dict(reversed(NATURAL_GAS.items()))).density(290.0, 6e6, Branch.GAS).density
    assert backward == pytest.approx(forward, rel=1e-14)
