"""Phase verdicts made ready for the service: which equation judges a gas, and its warnings in words.

The physics stays in ``gasapi.engine.phase``; here are only the choice, the shared curves and the sentences.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Final

import numpy as np
from numpy.typing import NDArray

from gasapi.engine.elementary import Array
from gasapi.engine.models.cubic import CubicMixture
from gasapi.engine.models.gerg_2008 import GergFluid
from gasapi.engine.models.reference import ReferenceFluid
from gasapi.engine.phase.bubble_dew import BubbleDewLines
from gasapi.engine.phase.mixture import mixture_phase
from gasapi.engine.phase.pseudo_pure import PseudoPureVerdict
from gasapi.engine.phase.pure import PureVerdict, reference_verdict
from gasapi.engine.phase.region import Region
from gasapi.engine.phase.saturation import SaturationCurve
from gasapi.engine.phase.saturation_fit import fit_saturation
from gasapi.engine.phase.sublimation import SublimationLine
from gasapi.engine.phase.verdict import PhaseVerdict, Sign
from gasapi.engine.protocol import Fluid
from gasapi.gases.records import ReferenceEquation
from gasapi.service.answers import PhaseWarning
from gasapi.service.cache import BoundedCache
from gasapi.service.gas import ResolvedGas
from gasapi.service.mixture_phase import MixtureJudge
from gasapi.service.prepared import Margins, PhaseJudge

__all__ = ["NoVerdict", "PhaseLibrary", "PureJudge", "words_of"]


def _number(value: float) -> str:
    return f"{value:.5g}"


def _near_dew(n: Mapping[str, float]) -> str:
    where = f"; it lies at {_number(n['dew_point_temperature'])} K" if "dew_point_temperature" in n else ""
    return f"The gas is less than {_number(n['margin'])} K above its dew point at this pressure{where}."


def _near_saturation(n: Mapping[str, float]) -> str:
    return (
        f"The liquid is less than {_number(n['margin'])} K below its boiling temperature at this pressure"
        f" ({_number(n['dew_point_temperature'])} K)."
    )


def _near_critical(n: Mapping[str, float]) -> str:
    text = "The state is near the critical point"
    if "critical_temperature" in n:
        text += f" ({_number(n['critical_temperature'])} K, {_number(n['critical_pressure'])} Pa)"
    if "density_sensitivity" in n:
        return f"{text}: 1 % in pressure is {_number(n['density_sensitivity'])} % in density."
    return f"{text}: small errors of pressure or temperature are large ones of density."


def _below_triple(n: Mapping[str, float]) -> str:
    return f"The temperature is below the triple point ({_number(n['triple_temperature'])} K): solid forms instead of liquid."


def _freezing(n: Mapping[str, float]) -> str:
    return (
        f"The fluid is dense and near the triple-point temperature ({_number(n['triple_temperature'])} K);"
        " no melting line is held, and it may freeze."
    )


def _shifted(n: Mapping[str, float]) -> str:
    return (
        f"The critical point of this equation ({_number(n['critical_temperature'])} K) is off the accepted one"
        f" ({_number(n['accepted_critical_temperature'])} K): the phase near it is uncertain."
    )


_SENTENCES: Final[Mapping[str, Callable[[Mapping[str, float]], str]]] = {
    "near_dew_point": _near_dew,
    "near_saturation": _near_saturation,
    "near_critical": _near_critical,
    "below_triple_point": _below_triple,
    "freezing_possible": _freezing,
    "critical_point_shifted": _shifted,
}


def words_of(sign: Sign) -> PhaseWarning:
    """Return a sign of the engine as a warning in words."""
    return PhaseWarning(sign.code, _SENTENCES[sign.code](dict(sign.numbers)))


class PureJudge:
    """The phase of a pure gas or of air, with its warnings in words. Immutable.

    :param verdict: the engine's verdict
    """

    compares_roots = False

    def __init__(self, verdict: PhaseVerdict) -> None:
        self.model = verdict.model
        self.verdict = verdict
        self.covers = verdict.covers
        self.region_float = verdict.region_float
        self.survey_block = verdict.survey_block
        self.refine_float = verdict.refine_float
        self.refine_block = verdict.refine_block
        self.near_critical_float = verdict.near_critical_float
        self.near_critical_block = verdict.near_critical_block

    def survey_float(self, temperature: float, pressure: float, margin: float) -> tuple[int, bool, object]:
        """Return region and nearness of one state."""
        return (*self.verdict.survey_float(temperature, pressure, margin), None)

    def margins(
        self, temperature: float, pressure: float, density: float | None, region: int, margin: float, surveyed: object
    ) -> Margins:
        """Return the margins and warnings of one state."""
        margins = self.verdict.margins(temperature, pressure)
        signs = self.verdict.signs(temperature, pressure, density, region, margin, margins)
        return Margins(*margins, tuple(words_of(s) for s in signs))


class NoVerdict:
    """The phase of a gas for which no equation can tell it: unknown everywhere."""

    model: str | None = None
    compares_roots = True

    def covers(self, temperature: float, pressure: float) -> bool:
        """Return that no region can be told."""
        return False

    def region_float(self, temperature: float, pressure: float) -> int:
        """Return unknown."""
        return int(Region.UNKNOWN)

    def survey_float(self, temperature: float, pressure: float, margin: float) -> tuple[int, bool, object]:
        """Return unknown."""
        return int(Region.UNKNOWN), False, None

    def survey_block(self, temperature: Array, pressure: Array, margin: float) -> tuple[NDArray[np.int8], NDArray[np.bool_]]:
        """Return unknown for each row."""
        return np.full(temperature.size, int(Region.UNKNOWN), dtype=np.int8), np.zeros(temperature.size, dtype=bool)

    def refine_float(self, temperature: float, pressure: float, density: float, region: int) -> int:
        """Return the region as it is."""
        return region

    def refine_block(self, temperature: Array, pressure: Array, density: Array, region: NDArray[np.int8]) -> NDArray[np.int8]:
        """Return the regions as they are."""
        return region

    def near_critical_float(self, temperature: float, density: float) -> bool:
        """Return that nothing is known of it."""
        return False

    def near_critical_block(self, temperature: Array, density: Array) -> NDArray[np.bool_]:
        """Return that nothing is known of it."""
        return np.zeros(temperature.size, dtype=bool)

    def margins(
        self, temperature: float, pressure: float, density: float | None, region: int, margin: float, surveyed: object
    ) -> Margins:
        """Return no margins."""
        return Margins(None, None, None)


class PhaseLibrary:
    """Makes judges, and keeps the saturation curves that had to be solved for. Safe to share between threads."""

    def __init__(self) -> None:
        self._curves: BoundedCache[tuple[str, object], SaturationCurve] = BoundedCache(1024)
        self._sublimation: BoundedCache[str, SublimationLine] = BoundedCache(16)

    def of_reference(self, fluid: ReferenceFluid) -> PhaseJudge:
        """Return the judge of a gas by its reference equation."""
        equation = fluid.equation
        if isinstance(fluid.saturation, SaturationCurve):
            return PureJudge(reference_verdict(equation, fluid, fluid.saturation))
        assert equation.bubble_dew is not None
        freezing = None if equation.triple is None else equation.triple.temperature
        return PureJudge(PseudoPureVerdict(fluid, BubbleDewLines(equation.bubble_dew), freezing))

    def of_gerg(self, fluid: GergFluid, gas: ResolvedGas, equation: ReferenceEquation | None) -> PhaseJudge:
        """Return the judge of a composition by GERG-2008; a pure gas freezes as its reference equation says."""
        if fluid.critical is not None:
            return self._pure(fluid, gas, equation, published=True)
        return MixtureJudge(fluid.model, lambda: mixture_phase(fluid.system, fluid.fractions))

    def of_generalised(
        self,
        fluid: Fluid,
        gas: ResolvedGas,
        equation: ReferenceEquation | None,
        fractions: tuple[float, ...],
        mixture: CubicMixture | None,
    ) -> PhaseJudge:
        """Return the judge of a gas by a generalised equation that has a saturation line of its own."""
        if gas.is_pure:
            return self._pure(fluid, gas, equation)
        if mixture is None:
            return NoVerdict()
        return MixtureJudge(fluid.model, lambda: mixture_phase(mixture, fractions))

    def _pure(self, fluid: Fluid, gas: ResolvedGas, equation: ReferenceEquation | None, published: bool = False) -> PhaseJudge:
        substance = gas.substances[0]
        curve = self._curves.get_or_make((fluid.model, substance), lambda: SaturationCurve(fit_saturation(fluid)))
        triple = substance.triple_temperature
        if triple is None:
            triple = substance.melting_temperature
        line = None
        if equation is not None:
            triple = equation.triple.temperature if equation.triple is not None else None
            line = self._line(equation)
        accepted = None
        if published:
            # a generalised equation has the accepted critical point by construction
            accepted = (substance.critical_temperature, substance.critical_pressure)
        return PureJudge(PureVerdict(fluid, curve, triple, line, accepted))

    def _line(self, equation: ReferenceEquation) -> SublimationLine | None:
        curve = equation.sublimation
        if curve is None:
            return None
        return self._sublimation.get_or_make(equation.id, lambda: SublimationLine(curve))

    def vapour_below_triple(self, equation: ReferenceEquation, temperature: float, pressure: float) -> bool:
        """Return whether a state is known to be vapour below the triple point, by the published sublimation line."""
        curve = equation.sublimation
        if curve is None or not curve.temperature_min <= temperature < curve.triple.temperature:
            return False
        line = self._line(equation)
        return line is not None and pressure < line.pressure(temperature)
