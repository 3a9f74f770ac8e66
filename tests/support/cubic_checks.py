"""Comparisons of the cubic equations with teqp and CoolProp, constants made equal."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace
from types import ModuleType
from typing import Any

import CoolProp.CoolProp
import numpy as np
from generalised import interaction, substances

from gasapi.engine.models.cubic import CubicMixture
from gasapi.engine.protocol import Branch, Status
from gasapi.gases.records import CubicPair

__all__ = ["coolprop_deviation", "library_states", "teqp_deviation"]

_LIBRARY_NAMES = {
    "methane": "Methane",
    "carbon-dioxide": "CarbonDioxide",
    "propane": "n-Propane",
    "nitrogen": "Nitrogen",
    "ethane": "Ethane",
}


def library_states() -> list[tuple[str, ...]]:
    """Return sets of substances, pure and mixed, with small, large and negative acentric factors."""
    return [
        ("nitrogen",),
        ("water",),
        ("ethanol",),
        ("helium",),
        ("methane", "carbon-dioxide"),
        ("hydrogen", "n-decane", "hydrogen-sulfide"),
        ("methane", "ethane", "propane", "n-butane", "nitrogen", "carbon-dioxide", "water", "methanol"),
    ]


def teqp_deviation(module: ModuleType, model: Callable[..., Any], ids: Sequence[str]) -> float:
    """Return the worst difference of Z and ln(phi) at 60 random temperatures, densities and compositions."""
    random = np.random.default_rng(len(ids))
    parts = substances(*ids)
    mixture = CubicMixture(module.FORM, parts, interaction)
    other = model(
        [s.critical_temperature for s in parts],
        [s.critical_pressure for s in parts],
        [s.acentric_factor for s in parts],
        mixture.interaction_parameters.tolist(),
    )
    worst = 0.0
    for _ in range(60):
        x = random.dirichlet(np.ones(len(ids)))
        x[-1] = 1.0 - x[:-1].sum()
        fluid = mixture.fluid([float(v) for v in x])
        t = float(random.uniform(150.0, 1500.0))
        b = sum(v * module.FORM.component(s).covolume for v, s in zip(x, parts, strict=True))
        rho = float(10.0 ** random.uniform(-4.0, -0.1) / b)
        at = fluid.pressure(t, rho)
        z = at.pressure / (rho * fluid.gas_constant * t)
        worst = max(worst, abs(z - 1.0 - other.get_Ar01(t, rho, x)))
        energy = other.get_Ar00(t, rho, x)
        if z > 0.0:
            worst = max(worst, abs(fluid.residual_gibbs(t, rho) - (energy + z - 1.0 - np.log(z))))
            expected = np.log(other.get_fugacity_coefficients(t, rho * x))
            difference = np.abs(fluid.log_fugacity_coefficients(t, rho) - expected)
            # R differs by 2e-11, which dense states of unlike molecules, with ln(phi) in the hundreds, magnify
            worst = max(worst, float(np.max(difference / np.maximum(1.0, np.abs(expected)))))
    return worst


def coolprop_deviation(module: ModuleType, backend: str, ids: Sequence[str]) -> float:
    """Return the worst relative difference in density from CoolProp's cubic, which knows no k_ij.

    The Peng-Robinson slope of 1976 is the library's; acentric factors here are below 0.491, where 1978 is the same.
    """
    state = CoolProp.CoolProp.AbstractState(backend, "&".join(_LIBRARY_NAMES[id] for id in ids))
    random = np.random.default_rng(7)
    parts = [
        replace(
            s,
            critical_temperature=state.get_fluid_constant(i, CoolProp.iT_critical),
            critical_pressure=state.get_fluid_constant(i, CoolProp.iP_critical),
            acentric_factor=state.get_fluid_constant(i, CoolProp.iacentric_factor),
        )
        for i, s in enumerate(substances(*ids))
    ]
    mixture = CubicMixture(module.FORM, parts, lambda first, second: CubicPair(0.0, 0.0, "none in the library"))
    worst = 0.0
    count = 0
    for _ in range(150):
        x = random.dirichlet(np.ones(len(ids)))
        state.set_mole_fractions(x)
        fluid = mixture.fluid([float(v) for v in x] if len(ids) > 1 else [1.0])
        tc = float(sum(v * s.critical_temperature for v, s in zip(x, parts, strict=True)))
        pc = float(sum(v * s.critical_pressure for v, s in zip(x, parts, strict=True)))
        t = tc * float(random.uniform(0.6, 2.5))
        p = pc * float(10.0 ** random.uniform(-3.0, 1.0))
        for branch, phase in ((Branch.GAS, CoolProp.iphase_gas), (Branch.LIQUID, CoolProp.iphase_liquid)):
            root = fluid.density(t, p, branch)
            # asked for a liquid above the critical temperature, the library may give a root beyond close packing
            single = branch == Branch.LIQUID and root == fluid.density(t, p, Branch.GAS)
            if root.status == Status.CONVERGED and not single:
                state.specify_phase(phase)
                state.update(CoolProp.PT_INPUTS, p, t)
                worst = max(worst, abs(state.rhomolar() / root.density - 1.0))
                count += 1
    assert count > 150
    return worst
