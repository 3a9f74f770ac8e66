"""What the service holds while it runs: the catalogue, the data of the equations, and bounded caches of what was built.

A context is made once, from explicit parts, and shared by all threads of a worker. Work that depends on the composition
alone (mixture parameters, saturation functions) is cached apart from work that depends on the state.
"""

from __future__ import annotations

from collections.abc import Hashable
from dataclasses import replace
from functools import cached_property
from typing import Final, NamedTuple

from gasapi.engine.certified import CertifiedFluid
from gasapi.engine.models import gerg_2008, reference
from gasapi.engine.models.gerg_2008 import GergFluid, GergSystem
from gasapi.engine.models.helmholtz_fluid import HelmholtzFluid
from gasapi.engine.models.reference import ReferenceFluid
from gasapi.engine.phase.saturation import SaturationCurve
from gasapi.engine.protocol import Fluid
from gasapi.gases.catalogue import Catalogue
from gasapi.gases.hazards import GENERAL_CAUTION
from gasapi.gases.loader import load_gerg, load_interaction, load_reference
from gasapi.gases.records import CubicPair, Limits, ReferenceEquation
from gasapi.gases.site import Site
from gasapi.service.answers import StateAnswer
from gasapi.service.cache import BoundedCache, CacheCounts
from gasapi.service.gas import ResolvedGas, resolve_gas
from gasapi.service.generalised_uncertainty import GeneralisedUncertainty
from gasapi.service.models import GENERALISED, generalised_limits
from gasapi.service.phase import PhaseLibrary
from gasapi.service.prepared import PhaseJudge, PreparedModel
from gasapi.service.quality import Reason
from gasapi.service.questions import GasSpec, StateQuestion
from gasapi.service.uncertainty import PublishedUncertainty
from gasapi.version import data_and_code_hash

__all__ = ["CacheSizes", "Context", "GasModels"]

DEFAULT_DEW_POINT_MARGIN: Final = 5.0
DEFAULT_AMBIENT_PRESSURE: Final = 101325.0

# a binary share above which a plain combining rule of GERG-2008 counts in the uncertainty
_PAIR_SHARE: Final = 1e-3
_COMBINING_RULE_UNCERTAINTY: Final = 0.005

# errors for which certified tables are kept
_ACCURACIES: Final = (1e-1, 1e-2, 1e-3, 1e-4, 1e-5, 1e-6, 1e-7, 1e-8, 1e-9, 1e-10, 1e-11, 1e-12)


class CacheSizes(NamedTuple):
    """How many entries each cache may hold."""

    gases: int = 4096
    compositions: int = 512
    systems: int = 256
    states: int = 16384


class GasModels:
    """The models of one gas, each made ready when it is first asked for. Safe to share between threads.

    :param gas: the gas
    :param context: where data and shared parts come from
    """

    def __init__(self, gas: ResolvedGas, context: Context) -> None:
        self.gas = gas
        self._context = context
        self._prepared: dict[str, PreparedModel] = {}
        self._certified: dict[tuple[str, float], PreparedModel] = {}
        self._limits: dict[str, tuple[Limits, Limits]] = {}
        self._uncertainty: dict[str, GeneralisedUncertainty] = {}

    @cached_property
    def mole_fractions(self) -> tuple[float, ...]:
        """Mole fractions by the molar masses of the catalogue."""
        return self.gas.mole_fractions([s.molar_mass for s in self.gas.substances])

    @cached_property
    def cautions(self) -> tuple[str, ...]:
        """What a person must know of this gas, and the general caution."""
        components = zip(self.gas.components, self.mole_fractions, strict=True)
        return (*self._context.catalogue.cautions(components, self.gas.own), GENERAL_CAUTION)

    @cached_property
    def reference_equation(self) -> ReferenceEquation | None:
        """The reference equation that covers the gas, if there is one."""
        return None if self.gas.reference_id is None else load_reference(self.gas.reference_id)

    def limits(self, model: str) -> tuple[Limits, Limits]:
        """Return validity and extended limits of a model that can serve the gas."""
        held = self._limits.get(model)
        if held is None:
            held = self._limits[model] = self._find_limits(model)
        return held

    def _find_limits(self, model: str) -> tuple[Limits, Limits]:
        if model == reference.ID:
            equation = self.reference_equation
            assert equation is not None
            return equation.validity, equation.extended
        if model == gerg_2008.ID:
            data = load_gerg()
            return data.validity, data.extended
        return generalised_limits(model, self.gas.substances, self.mole_fractions)

    def _generalised_uncertainty(self, model: str) -> GeneralisedUncertainty:
        held = self._uncertainty.get(model)
        if held is None:
            held = self._uncertainty[model] = GeneralisedUncertainty(model, self.gas.substances, self.mole_fractions)
        return held

    def expected_uncertainty(self, model: str, temperature: float, pressure: float) -> float:
        """Return the stated uncertainty of a generalised model at a state."""
        return self._generalised_uncertainty(model).at(temperature, pressure, 0.0)

    def vapour_below_triple(self, temperature: float, pressure: float) -> bool:
        """Return whether the state is known to be vapour below the triple point, from a published sublimation line."""
        equation = self.reference_equation
        return equation is not None and self._context.phases.vapour_below_triple(equation, temperature, pressure)

    def prepared(self, model: str) -> PreparedModel:
        """Return a model made ready for the gas; it must be able to serve it (see ``models.why_not``)."""
        held = self._prepared.get(model)
        if held is None:
            held = self._prepared[model] = self._prepare(model)
        return held

    def certified(self, model: str, accuracy: float | None) -> PreparedModel:
        """Return a model made ready for the gas, with certified tables where an error of density is allowed, [-].

        The error that is kept to is the next power of ten below, so that few tables serve all.
        """
        prepared = self.prepared(model)
        if accuracy is None or not isinstance(prepared.fluid, HelmholtzFluid):
            return prepared
        kept = next((power for power in _ACCURACIES if power <= accuracy), _ACCURACIES[-1])
        held = self._certified.get((model, kept))
        if held is None:
            held = self._certified[model, kept] = replace(prepared, fluid=CertifiedFluid(prepared.fluid, kept))
        return held

    def _prepare(self, model: str) -> PreparedModel:
        if model == reference.ID:
            return self._prepare_reference()
        if model == gerg_2008.ID:
            return self._prepare_gerg()
        return self._prepare_generalised(model)

    def _prepare_reference(self) -> PreparedModel:
        equation = self.reference_equation
        assert equation is not None
        fluid = self._context.reference_fluid(equation.id)
        assert fluid.critical is not None
        return PreparedModel(
            id=reference.ID,
            name=f"Reference equation for {equation.name}",
            source=equation.citation,
            fluid=fluid,
            fractions=self.mole_fractions,
            molar_masses=tuple(s.molar_mass for s in self.gas.substances),
            validity=equation.validity,
            extended=equation.extended,
            uncertainty=PublishedUncertainty(equation.uncertainties, equation.validity, fluid.critical.density),
            phase=self._context.phases.of_reference(fluid),
            flags=int(Reason.FRACTIONS_SCALED) if self.gas.scaled else 0,
            generalised=False,
            gas_only=False,
            notes=equation.notes,
        )

    def _prepare_gerg(self) -> PreparedModel:
        data = load_gerg()
        system = self._context.gerg_system(self.gas.components)
        fractions = self.gas.mole_fractions(system.molar_masses)
        fluid = system.fluid(fractions)
        least = _combining_rule_part(system, fractions)
        return PreparedModel(
            id=gerg_2008.ID,
            name=gerg_2008.NAME,
            source=data.citation,
            fluid=fluid,
            fractions=fractions,
            molar_masses=system.molar_masses,
            validity=data.validity,
            extended=data.extended,
            uncertainty=PublishedUncertainty(data.uncertainties, data.validity, fluid.reducing_density, least),
            phase=self._context.phases.of_gerg(fluid, self.gas, self.reference_equation),
            flags=int(Reason.FRACTIONS_SCALED) if self.gas.scaled else 0,
            generalised=False,
            gas_only=False,
        )

    def _prepare_generalised(self, model: str) -> PreparedModel:
        line = GENERALISED[model]
        fluid: Fluid = line.module.build(self.gas.substances, self.mole_fractions, self._context.interaction)
        flags = int(Reason.FRACTIONS_SCALED) if self.gas.scaled else 0
        if any("associating" in s.flags for s in self.gas.substances):
            flags |= int(Reason.ASSOCIATING)
        if line.uses_interaction and getattr(fluid, "missing_pairs", None):
            flags |= int(Reason.INTERACTION_MISSING)
        validity, extended = self.limits(model)
        return PreparedModel(
            id=model,
            name=line.module.NAME,
            source=line.module.SOURCE,
            fluid=fluid,
            fractions=self.mole_fractions,
            molar_masses=tuple(s.molar_mass for s in self.gas.substances),
            validity=validity,
            extended=extended,
            uncertainty=self._generalised_uncertainty(model),
            phase=self._phase_of_generalised(model, fluid),
            flags=flags,
            generalised=True,
            gas_only=line.gas_only,
        )

    def _phase_of_generalised(self, model: str, fluid: Fluid) -> PhaseJudge:
        """Return the verdict of the model itself where it has one, else of the best equation that has."""
        line = GENERALISED[model]
        # without interaction parameters the dew line of a mixture is not worth its name, for water by hundreds of kelvin
        if line.has_saturation and (self.gas.is_pure or line.uses_interaction):
            module = GENERALISED[model].module
            mixture = None
            if not self.gas.is_pure and hasattr(module, "mixture"):
                mixture = module.mixture(self.gas.substances, self._context.interaction)
            return self._context.phases.of_generalised(fluid, self.gas, self.reference_equation, self.mole_fractions, mixture)
        if self.gas.reference_id is not None:
            return self.prepared(reference.ID).phase
        if self.gas.gerg:
            return self.prepared(gerg_2008.ID).phase
        return self.prepared("peng-robinson").phase


def _combining_rule_part(system: GergSystem, fractions: tuple[float, ...]) -> float:
    """Return the least uncertainty of a composition that leans on pairs which were never fitted to data, [-]."""
    leaning = max(
        (
            fractions[i] * fractions[j]
            for i, j, basis in zip(system.first.tolist(), system.second.tolist(), system.pair_bases, strict=True)
            if basis != "fitted"
        ),
        default=0.0,
    )
    return _COMBINING_RULE_UNCERTAINTY if leaning > _PAIR_SHARE else 0.0


class Context:
    """The catalogue, the site and the caches of one worker.

    :param catalogue: the gases by name, those of the site included
    :param site: the site's own settings, None where there is no site file
    :param sizes: bounds of the caches
    """

    def __init__(self, catalogue: Catalogue, site: Site | None = None, sizes: CacheSizes | None = None) -> None:
        sizes = sizes or CacheSizes()
        self.catalogue = catalogue
        self.site = site
        self.phases = PhaseLibrary()
        self.data = data_and_code_hash()
        self._interaction = load_interaction()
        self._gases: BoundedCache[Hashable, ResolvedGas] = BoundedCache(sizes.gases)
        self._compositions: BoundedCache[ResolvedGas, GasModels] = BoundedCache(sizes.compositions)
        self._systems: BoundedCache[tuple[str, ...], GergSystem] = BoundedCache(sizes.systems)
        self._references: BoundedCache[str, ReferenceFluid] = BoundedCache(sizes.systems)
        self._pure_gerg: BoundedCache[str, GergFluid] = BoundedCache(64)
        self.states: BoundedCache[StateQuestion, StateAnswer] = BoundedCache(sizes.states)

    @property
    def ambient_pressure(self) -> float | None:
        """The ambient pressure of the site, Pa, None where none was stated."""
        return None if self.site is None else self.site.ambient_pressure

    @property
    def dew_point_margin(self) -> float:
        """Where nearness to the dew point begins unless a question says otherwise, K."""
        margin = None if self.site is None else self.site.dew_point_margin
        return DEFAULT_DEW_POINT_MARGIN if margin is None else margin

    def gas(self, spec: GasSpec) -> ResolvedGas:
        """Return the gas that is named.

        :raises UnknownGas: for a name that nothing has
        :raises FractionsInvalid: for fractions that make no gas
        """
        return self._gases.get_or_make(spec, lambda: resolve_gas(spec, self.catalogue))

    def models(self, gas: ResolvedGas) -> GasModels:
        """Return the models of a gas."""
        return self._compositions.get_or_make(gas, lambda: GasModels(gas, self))

    def gerg_system(self, components: tuple[str, ...]) -> GergSystem:
        """Return GERG-2008 for a set of components."""
        return self._systems.get_or_make(components, lambda: GergSystem(load_gerg(), components))

    def reference_fluid(self, id: str) -> ReferenceFluid:
        """Return a gas by its reference equation."""
        return self._references.get_or_make(id, lambda: _reference_fluid(load_reference(id)))

    def interaction(self, first: str, second: str) -> CubicPair | None:
        """Return the interaction parameters of two gases, None where none were published."""
        return self._interaction.get((first, second) if first < second else (second, first))

    def cache_counts(self) -> dict[str, CacheCounts]:
        """Return the counters of every cache by name."""
        return {
            "gases": self._gases.counts(),
            "compositions": self._compositions.counts(),
            "component_sets": self._systems.counts(),
            "states": self.states.counts(),
        }


def _reference_fluid(equation: ReferenceEquation) -> ReferenceFluid:
    curve = None if equation.saturation is None else SaturationCurve(equation.saturation)
    return ReferenceFluid(equation, curve)
