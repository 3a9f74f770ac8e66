"""The fraction of one gas in a blend of two, from a densitometer: which mixture of the two real gases has this density."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from typing import Final, NamedTuple

from scipy.optimize import brentq, minimize_scalar

from gasapi.engine.protocol import Branch, Status
from gasapi.errors import GasapiError
from gasapi.service.answers import PhaseWarning, StateAnswer
from gasapi.service.context import Context, GasModels
from gasapi.service.gas import resolve_gas
from gasapi.service.joined import joined
from gasapi.service.questions import GasSpec, InputUncertainty, StateQuestion
from gasapi.service.selection import choose
from gasapi.service.state import solve_state
from gasapi.service.uncertainty import expanded_density_uncertainty

__all__ = [
    "DensityUncertainties",
    "FractionFromDensityAnswer",
    "FractionFromDensityQuestion",
    "FractionFromDensityResult",
    "SameGas",
    "answer_fraction_from_density",
]

_INTERVALS: Final = 16
_X_TOLERANCE: Final = 1e-14
# a mixture is found where its state has the reading again to this, relative; else the root lay on a branch without a claim
_AGREEMENT: Final = 1e-8
_STEP: Final = 1e-4
_LEAST_PRESSURE: Final = 1e-9


class SameGas(GasapiError):
    """The two gases of a blend are one and the same."""

    def __init__(self, name: str) -> None:
        self.name = name
        super().__init__(f"both gases are {name}; a blend takes two different gases")


class DensityUncertainties(NamedTuple):
    """Standard uncertainties of a density reading and of its state: kg/m3, Pa, K."""

    density: float = 0.0
    pressure: float = 0.0
    temperature: float = 0.0


class FractionFromDensityQuestion(NamedTuple):
    """A density (kg/m3) of a blend of two gases; of ``state`` the gas itself is not looked at, but its substances are."""

    state: StateQuestion
    first: GasSpec
    second: GasSpec
    density: float
    uncertainty: DensityUncertainties | None = None


class FractionFromDensityResult(NamedTuple):
    """Mole fraction of the first gas and kg/mol; None where nothing is known, or where no mixture explains the reading."""

    mole_fraction: float | None = None
    molar_mass: float | None = None
    explained: bool | None = None
    mole_fraction_expanded_uncertainty: float | None = None


class FractionFromDensityAnswer(NamedTuple):
    """The result, and the state of the mixture that explains the reading, or of the pure gas that comes nearest to it."""

    state: StateAnswer
    result: FractionFromDensityResult


class _Blend:
    """The blends of two gases by one equation.

    :raises SameGas: there is one gas only
    """

    def __init__(self, context: Context, question: FractionFromDensityQuestion) -> None:
        self._context = context
        self._question = question
        first, second = (context.gas(spec) for spec in (question.first, question.second))
        if (first.components, first.shares) == (second.components, second.shares):
            raise SameGas(first.id or "the same mixture")
        state = question.state
        half = context.models(resolve_gas(self.spec(0.5), context.catalogue))
        choice = choose(half, state.model, state.temperature, state.pressure)
        self.model = choice.model

    def spec(self, x: float) -> GasSpec:
        """Return the gas with a mole fraction of the first."""
        parts: list[tuple[str, float]] = []
        for spec, share in ((self._question.first, x), (self._question.second, 1.0 - x)):
            assert spec.name is not None
            parts.append((spec.name, share))
        return GasSpec(None, tuple(parts), "mole", self._question.state.gas.substances)

    def density(self, x: float, branch: Branch) -> float | None:
        """Return the density on a branch, kg/m3, None where it does not reach the state; the phase is not looked at."""
        assert self.model is not None
        # many compositions that nobody asks for again are not to fill the cache of the context
        prepared = GasModels(resolve_gas(self.spec(x), self._context.catalogue), self._context).prepared(self.model)
        temperature, pressure, limits = self._question.state.temperature, self._question.state.pressure, prepared.extended
        if not (
            limits.temperature_min <= temperature <= limits.temperature_max
            and _LEAST_PRESSURE <= pressure <= limits.pressure_max
        ):
            return None
        root = prepared.fluid.density(temperature, pressure, branch)
        return root.density * prepared.fluid.molar_mass if root.status == Status.CONVERGED else None

    def state(self, x: float) -> StateAnswer:
        """Return the state at a fraction, phase and quality included."""
        uncertainty = self._question.uncertainty
        return solve_state(
            self._context,
            self._question.state._replace(
                gas=self.spec(x),
                accept_two_phase=False,
                model=self.model or self._question.state.model,
                input_uncertainty=None
                if uncertainty is None
                else InputUncertainty(uncertainty.pressure, uncertainty.temperature),
            ),
        )


def answer_fraction_from_density(context: Context, question: FractionFromDensityQuestion) -> FractionFromDensityAnswer:
    """Return the mixture of two gases that has a density.

    :raises SameGas: the two gases are one
    :raises UnknownGas: for a name that nothing has
    :raises UnknownModel: for a model id that no equation has
    :raises ModelCannotServe: for a model asked for by name that cannot serve the blend
    """
    blend = _Blend(context, question)
    if blend.model is None:
        return FractionFromDensityAnswer(blend.state(0.5), FractionFromDensityResult())
    found: list[tuple[float, StateAnswer]] = []
    refused: list[StateAnswer] = []
    for branch in (Branch.GAS, Branch.LIQUID):
        for x in _roots(blend, question.density, branch):
            state = blend.state(x)
            if state.density is None:
                refused.append(state)
                continue
            agrees = abs(state.density - question.density) <= _AGREEMENT * question.density
            if agrees and all(abs(x - other) > _AGREEMENT for other, _ in found):
                found.append((x, state))
    if len(found) == 1:
        return _answer(blend, question, *found[0])
    if found:
        return _ambiguous(found)
    if refused:
        return FractionFromDensityAnswer(refused[0], FractionFromDensityResult())
    return _beyond(blend, question)


def _roots(blend: _Blend, density: float, branch: Branch) -> Iterator[float]:
    """Yield every fraction at which the density on a branch is the one that was read."""

    def gap(x: float) -> float:
        rho = blend.density(x, branch)
        return math.nan if rho is None else rho - density

    points = [(x, gap(x)) for x in (i / _INTERVALS for i in range(_INTERVALS + 1))]
    points = _with_turning_points(points, gap)
    for i, (x, here) in enumerate(points):
        if here == 0.0:
            yield x
        if i + 1 < len(points) and here * points[i + 1][1] < 0.0:
            root = brentq(gap, x, points[i + 1][0], xtol=_X_TOLERANCE, rtol=1e-15, disp=False)
            if root == root:
                yield float(root)


def _with_turning_points(points: list[tuple[float, float]], gap: Callable[[float], float]) -> list[tuple[float, float]]:
    """Return points with those added where the density turns round, beyond the reading: two fractions may lie beside it."""
    found = list(points)
    for before, here, after in zip(points, points[1:], points[2:], strict=False):
        nearest = abs(here[1]) < abs(before[1]) and abs(here[1]) < abs(after[1])
        if nearest and before[1] * here[1] > 0.0 and here[1] * after[1] > 0.0:
            sign = math.copysign(1.0, here[1])
            turn = minimize_scalar(
                lambda x, sign=sign: sign * gap(x), bounds=(before[0], after[0]), method="bounded", options={"xatol": 1e-9}
            )
            found.append((float(turn.x), gap(float(turn.x))))
    return sorted(found)


def _reading_uncertainty(question: FractionFromDensityQuestion, state: StateAnswer) -> float:
    """Return the expanded uncertainty (k = 2) of the reading against a state, kg/m3: both sensors' and the equation's part."""
    assert state.density is not None
    assert state.density_pressure is not None
    assert state.density_temperature is not None
    u = question.uncertainty or DensityUncertainties()
    model = state.model.relative_uncertainty or 0.0
    of_state = expanded_density_uncertainty(
        state.density, state.density_pressure, state.density_temperature, u.pressure, u.temperature, model
    )
    return math.hypot(2.0 * u.density, of_state)


def _answer(
    blend: _Blend, question: FractionFromDensityQuestion, x: float, state: StateAnswer, *warnings: PhaseWarning
) -> FractionFromDensityAnswer:
    expanded = None
    if question.uncertainty is not None:
        slope = _slope(blend, x)
        if slope is not None and slope != 0.0:
            expanded = _reading_uncertainty(question, state) / abs(slope)
    result = FractionFromDensityResult(x, state.gas.molar_mass, True, expanded)
    return FractionFromDensityAnswer(joined([state], warnings), result)


def _slope(blend: _Blend, x: float) -> float | None:
    """Return d density / d fraction, kg/m3, by a difference inside 0 to 1."""
    low, high = max(0.0, x - _STEP), min(1.0, x + _STEP)
    for branch in (Branch.GAS, Branch.LIQUID):
        first, second = blend.density(low, branch), blend.density(high, branch)
        if first is not None and second is not None:
            return (second - first) / (high - low)
    return None


def _ambiguous(found: list[tuple[float, StateAnswer]]) -> FractionFromDensityAnswer:
    fractions = ", ".join(f"{x:.6g}" for x, _ in found)
    message = (
        f"More than one mixture of the two gases has this density here (mole fractions of the first: {fractions}); "
        "read the density at another pressure or temperature."
    )
    state = joined([found[0][1]], (PhaseWarning("ambiguous_fraction", message),))
    return FractionFromDensityAnswer(state, FractionFromDensityResult(None, None, True))


def _beyond(blend: _Blend, question: FractionFromDensityQuestion) -> FractionFromDensityAnswer:
    """Return the answer to a reading beyond both pure gases: at the end of the scale within the uncertainty, or none."""
    ends = [(x, state) for x, state in ((x, blend.state(x)) for x in (0.0, 1.0)) if state.density is not None]
    if not ends:
        return FractionFromDensityAnswer(blend.state(0.0), FractionFromDensityResult())

    def gap(end: tuple[float, StateAnswer]) -> float:
        assert end[1].density is not None
        return abs(end[1].density - question.density)

    x, state = min(ends, key=gap)
    if gap((x, state)) <= _reading_uncertainty(question, state):
        message = (
            "The reading lies beyond the pure gas, but within the uncertainty; the fraction is held at the end of its scale."
        )
        return _answer(blend, question, x, state, PhaseWarning("at_pure_gas", message))
    message = (
        f"No mixture of the two gases has this density here: the nearest is the pure gas at {state.density:.6g} kg/m3, "
        f"the reading is {question.density:.6g} kg/m3. Check the readings; another gas, air or a liquid may be present."
    )
    state = joined([state], (PhaseWarning("reading_not_explained", message),))
    return FractionFromDensityAnswer(state, FractionFromDensityResult(None, None, False))
