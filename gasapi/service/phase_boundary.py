"""The phase boundary of a gas: the saturation curve of a pure one, dew and bubble line of a mixture, and named points."""

from __future__ import annotations

import math
from collections.abc import Iterator
from typing import Final, NamedTuple

from gasapi.engine.phase.boundary import NamedPoint
from gasapi.engine.phase.pseudo_pure import PseudoPureVerdict
from gasapi.engine.phase.pure import PureVerdict
from gasapi.service.answers import GasAnswer, ModelAnswer, PhaseAnswer, PhaseWarning, StateAnswer
from gasapi.service.context import Context
from gasapi.service.mixture_phase import MixtureJudge
from gasapi.service.phase import PureJudge
from gasapi.service.prepared import PreparedModel
from gasapi.service.quality import Reason, quality_of
from gasapi.service.questions import StateQuestion
from gasapi.service.selection import choose
from gasapi.service.state import solve_state

__all__ = ["Line", "PhaseBoundary", "PhaseBoundaryAnswer", "answer_phase_boundary"]

_POINTS: Final = 121


class Line(NamedTuple):
    """A line of states, in the order along it: K and Pa."""

    temperature: tuple[float, ...] = ()
    pressure: tuple[float, ...] = ()


class PhaseBoundary(NamedTuple):
    """The dew line from its lowest pressure, and the bubble line back; ``water`` is the line where liquid water forms.

    ``points`` are named: K, Pa and kg/m3 (None where it is not known). ``complete`` says whether the boundary is whole.
    """

    line: Line
    water: Line
    points: tuple[tuple[str, tuple[float, float, float | None]], ...]
    complete: bool


class PhaseBoundaryAnswer(NamedTuple):
    """The boundary, None where no equation tells it, and what stands behind it."""

    state: StateAnswer
    boundary: PhaseBoundary | None


def answer_phase_boundary(context: Context, question: StateQuestion) -> PhaseBoundaryAnswer:
    """Return the phase boundary of a gas.

    :param question: the gas and the model; the state itself only says which equation ``auto`` means
    :raises UnknownGas: for a name that nothing has
    :raises FractionsInvalid: for fractions that make no gas
    :raises UnknownModel: for a model id that no equation has
    :raises ModelCannotServe: for a model asked for by name that cannot serve the gas at all
    """
    models = context.models(context.gas(question.gas))
    choice = choose(models, question.model, question.temperature, question.pressure)
    if choice.model is None:
        return PhaseBoundaryAnswer(solve_state(context, question), None)
    model = models.prepared(choice.model)
    boundary = _boundary(model)
    flags = model.flags
    warnings: tuple[PhaseWarning, ...] = ()
    if boundary is None and isinstance(model.phase, MixtureJudge):
        flags |= int(Reason.OUTSIDE_LIMITS)
        warnings = (PhaseWarning("boundary_not_traced", f"No boundary could be traced: {model.phase.phase.end}."),)
    elif boundary is None:
        flags |= int(Reason.NO_MODEL)
    elif not any(name == "critical" for name, _ in boundary.points):
        # a line that goes on and on, as those of hydrogen and helium do
        flags |= int(Reason.PHASE_UNKNOWN)
    if question.ambient_pressure is not None:
        flags |= int(Reason.AMBIENT_PRESSURE_ASSUMED)
    if model.generalised:
        flags |= int(Reason.UNCERTAINTY_LARGE)
    v = model.validity
    return PhaseBoundaryAnswer(
        StateAnswer(
            gas=GasAnswer(
                models.gas.id, tuple(zip(models.gas.components, model.fractions, strict=True)), model.fluid.molar_mass
            ),
            pressure=question.pressure,
            temperature=question.temperature,
            density=None,
            compressibility_factor=None,
            molar_volume=None,
            density_pressure=None,
            density_temperature=None,
            density_expanded_uncertainty=None,
            phase=PhaseAnswer("unknown" if boundary is None else "two-phase", None, None, None, model.phase.model, warnings),
            model=ModelAnswer(
                model.id,
                model.name,
                model.source,
                (v.temperature_min, v.temperature_max),
                (0.0, v.pressure_max),
                True,
                None,
                model.uncertainty.basis,
                "asked for by name"
                if question.model != "auto"
                else "the equation that answers for this gas at room conditions",
            ),
            quality=quality_of(flags),
            cautions=models.cautions,
            data=context.data,
        ),
        boundary,
    )


def _boundary(model: PreparedModel) -> PhaseBoundary | None:
    judge = model.phase
    if isinstance(judge, MixtureJudge):
        return _of_mixture(judge, model.fluid.molar_mass)
    if isinstance(judge, PureJudge):
        if isinstance(judge.verdict, PureVerdict):
            return _of_pure(judge.verdict, model.fluid.molar_mass)
        if isinstance(judge.verdict, PseudoPureVerdict):
            return _of_pseudo_pure(judge.verdict, model.fluid.molar_mass)
    return None


def _towards(coldest: float, hottest: float) -> Iterator[float]:
    """Yield temperatures from the cold end to the critical point, denser towards it as the square root of the distance is."""
    for i in range(_POINTS):
        rest = 1.0 - i / (_POINTS - 1)
        yield hottest - (hottest - coldest) * rest * rest


def _of_pure(verdict: PureVerdict, molar_mass: float) -> PhaseBoundary:
    curve, critical = verdict.curve, verdict.curve.critical
    triple = verdict.triple_temperature
    coldest = curve.temperature_min
    points: list[tuple[str, tuple[float, float, float | None]]] = [
        ("critical", (critical.temperature, critical.pressure, critical.density * molar_mass))
    ]
    if triple is not None and coldest <= triple < critical.temperature:
        coldest = triple
        # the density of the vapour: three phases meet there, of which this is the gas
        points.append(("triple", (triple, curve.pressure(triple), curve.vapour_density(triple) * molar_mass)))
    temperatures = list(_towards(coldest, critical.temperature))
    # the ends are where they are said to be, to the last bit
    temperatures[0], temperatures[-1] = coldest, critical.temperature
    return PhaseBoundary(Line(tuple(temperatures), tuple(curve.pressure(t) for t in temperatures)), Line(), tuple(points), True)


def _of_pseudo_pure(verdict: PseudoPureVerdict, molar_mass: float) -> PhaseBoundary:
    lines, critical = verdict.lines, verdict.critical
    up = [t for t in _towards(lines.temperature_min, lines.temperature_max) if not math.isnan(lines.dew_pressure(t))]
    down = [t for t in reversed(up[:-1]) if not math.isnan(lines.bubble_pressure(t))]
    pressures = [*(lines.dew_pressure(t) for t in up), *(lines.bubble_pressure(t) for t in down)]
    return PhaseBoundary(
        Line((*up, *down), tuple(pressures)),
        Line(),
        (("critical", (critical.temperature, critical.pressure, critical.density * molar_mass)),),
        True,
    )


def _of_mixture(judge: MixtureJudge, molar_mass: float) -> PhaseBoundary | None:
    outline = judge.phase.outline()
    if outline.temperature.size == 0 and outline.water_temperature.size == 0:
        return None

    def named(name: str, point: NamedPoint | None) -> Iterator[tuple[str, tuple[float, float, float | None]]]:
        if point is not None:
            yield name, (point.temperature, point.pressure, point.density * molar_mass)

    return PhaseBoundary(
        Line(tuple(outline.temperature.tolist()), tuple(outline.pressure.tolist())),
        Line(tuple(outline.water_temperature.tolist()), tuple(outline.water_pressure.tolist())),
        (
            *named("critical", outline.critical),
            *named("cricondentherm", outline.cricondentherm),
            *named("cricondenbar", outline.cricondenbar),
        ),
        outline.complete,
    )
