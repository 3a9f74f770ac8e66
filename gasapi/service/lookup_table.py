"""A small table of a property for a controller: bilinear interpolation in 32-bit arithmetic within a stated error.

The range is surveyed first, inside and along its edges: a table across two phases would be off by the jump between them. The
grid comes from ``interpolation_grid``; its error is then looked for on a dense grid and at the extrema of every cell, with
the equation itself and in the arithmetic of the controller (see ``bilinear``).
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import replace
from typing import Final, Literal, NamedTuple

import numpy as np
from numpy.typing import NDArray

from gasapi.engine.elementary import Array
from gasapi.engine.phase.region import Region
from gasapi.errors import GasapiError
from gasapi.service.answers import ModelAnswer, StateAnswer
from gasapi.service.bilinear import Float32, Grid, interpolate
from gasapi.service.context import Context
from gasapi.service.evaluation import Block, evaluate_block, evaluate_float
from gasapi.service.interpolation_grid import MOST_VALUES, Axes, GridTooLarge, Surface, grids, no_pause, within
from gasapi.service.mixture_phase import MixtureJudge
from gasapi.service.phase import NoVerdict
from gasapi.service.prepared import PhaseJudge, PreparedModel
from gasapi.service.quality import BAD, Reason, quality_of
from gasapi.service.questions import StateQuestion
from gasapi.service.selection import AUTO, choose_for_rows
from gasapi.service.state import ambient_flags, solve_state
from gasapi.units import Unit

__all__ = [
    "LookupTable",
    "LookupTableAnswer",
    "LookupTableQuestion",
    "Property",
    "RangeNotOnePhase",
    "RangeTooNarrow",
    "ToleranceTooSmall",
    "answer_lookup_table",
]

Property = Literal["density", "compressibility_factor", "molar_volume"]

_SURVEY: Final = 65
_EDGE: Final = 513
_SURVEY_SINGLY: Final = 9
_EDGE_SINGLY: Final = 17
_HALVINGS: Final = 60
_JUMP: Final = 1e-3
_NARROWEST: Final = 1e-4
_LARGEST: Final = 3e38
_PIECE: Final = 8192
_POINTS: Final = 110_000
_LEAST_INSIDE: Final = 5
_MOST_INSIDE: Final = 33
_ROUNDING: Final = 6e-7
"""What roundings of the inputs and of another order of operations can add to a relative error in 32-bit arithmetic."""

_TWO_PHASE: Final = int(Region.TWO_PHASE)
_LIQUID: Final = int(Region.LIQUID)
_SOLID: Final = int(Region.SOLID_POSSIBLE)
_UNKNOWN: Final = int(Region.UNKNOWN)


class RangeNotOnePhase(GasapiError):
    """The range holds a state for which no table can be made: ``pressure`` Pa, ``temperature`` K, and the same as asked."""

    def __init__(self, why: str, pressure: float, temperature: float, shown: str) -> None:
        self.why = why
        self.pressure = pressure
        self.temperature = temperature
        super().__init__(f"{why} at {shown}; narrow the range so that it stays in one phase and inside the equation's limits")


class RangeTooNarrow(GasapiError):
    """The ends of a range are one number, or nearly, in 32-bit arithmetic."""

    def __init__(self, quantity: str, low: float, high: float) -> None:
        self.quantity = quantity
        super().__init__(f"32-bit arithmetic cannot divide the range from {low:.9g} to {high:.9g}; widen it")


class ToleranceTooSmall(GasapiError):
    """No table of a size that a controller could hold keeps the tolerance."""

    def __init__(self, tolerance: float) -> None:
        self.tolerance = tolerance
        super().__init__(
            f"a relative error of {tolerance:g} takes more than {MOST_VALUES} values over this range; "
            "give a larger tolerance or a smaller range"
        )


class LookupTableQuestion(NamedTuple):
    """A table over ranges in the caller's units, ``state`` being its middle; ``ambient`` (Pa) is under gauge pressures."""

    state: StateQuestion
    pressure: tuple[float, float]
    temperature: tuple[float, float]
    pressure_unit: Unit
    temperature_unit: Unit
    property_unit: Unit | None
    ambient: float
    property: Property
    tolerance: float


class LookupTable(NamedTuple):
    """A table in the caller's units, and the largest relative error that was found, rounding included."""

    grid: Grid
    max_relative_error: float

    @property
    def bytes(self) -> int:
        """What axes and values take in a controller, 4 bytes a number."""
        return 4 * (self.grid.pressure.size + self.grid.temperature.size + self.grid.values.size)


class LookupTableAnswer(NamedTuple):
    """The table, None where no equation serves the gas, and the state in the middle with the verdict over the whole range."""

    state: StateAnswer
    table: LookupTable | None


class _KnownPhase(NoVerdict):
    """The phase of a range that was surveyed already, and is one that is no liquid: it is not looked for again.

    A phase may cost a hundred times what a density does, for a mixture whose boundary is not known.
    """

    def __init__(self, judge: PhaseJudge) -> None:
        self.compares_roots = judge.compares_roots
        self.near_critical_block = judge.near_critical_block  # type: ignore[method-assign]

    def survey_block(self, temperature: Array, pressure: Array, margin: float) -> tuple[NDArray[np.int8], NDArray[np.bool_]]:
        """Return gas for each row; nearness to the dew point was seen by the survey."""
        return np.zeros(temperature.size, dtype=np.int8), np.zeros(temperature.size, dtype=bool)


class _Sampler:
    """A property of one gas by one equation, in the caller's units."""

    def __init__(
        self, model: PreparedModel, question: LookupTableQuestion, margin: float, pause: Callable[[], None] = no_pause
    ) -> None:
        self.model = self.solved = model
        self.pause = pause
        self.question = question
        self.margin = margin
        self.flags = 0
        self.uncertainty = 0.0

    def trust(self) -> None:
        """Take it from here on that the whole range is one phase, and no liquid."""
        self.solved = replace(self.model, phase=_KnownPhase(self.model.phase))

    def si(self, pressure: Array, temperature: Array) -> tuple[Array, Array]:
        """Return points in Pa and K."""
        q = self.question
        return q.pressure_unit.to_si(pressure, q.ambient), q.temperature_unit.to_si(temperature)

    def states(self, pressure: Array, temperature: Array) -> Block:
        """Return the states of points in the caller's units, shape (k,).

        :raises RangeNotOnePhase: one of them gives no number
        """
        p, t = self.si(pressure, temperature)
        block = self._evaluate(t, p)
        bad = np.flatnonzero(block.flags & BAD)
        if bad.size:
            # of several reasons two phases are the one that says most
            worst = bad[np.argmax(block.region[bad] == _TWO_PHASE)]
            raise self.refusal(
                int(block.flags[worst]), int(block.region[worst]), float(pressure[worst]), float(temperature[worst])
            )
        self.flags |= int(np.bitwise_or.reduce(block.flags, initial=0))
        self.uncertainty = max(self.uncertainty, float(np.nanmax(block.uncertainty, initial=0.0)))
        return block

    def _evaluate(self, temperature: Array, pressure: Array) -> Block:
        """Return the states of rows, a piece at a time, others having their turn between two pieces."""
        pieces = []
        for start in range(0, pressure.size, _PIECE):
            self.pause()
            rows = slice(start, start + _PIECE)
            pieces.append(evaluate_block(self.solved, temperature[rows], pressure[rows], self.margin))
        return pieces[0] if len(pieces) == 1 else Block(*(np.concatenate(columns) for columns in zip(*pieces, strict=True)))

    def refusal(self, flags: int, region: int, pressure: float, temperature: float) -> RangeNotOnePhase:
        """Return the error that names a state, given in the caller's units."""
        q = self.question
        p, t = self.si(np.array([pressure]), np.array([temperature]))
        if region == _TWO_PHASE:
            why = "the range touches two phases"
        elif region == _SOLID:
            why = "the range touches states where the gas may freeze"
        else:
            why = f"the range touches states without a number ({', '.join(quality_of(flags & BAD).reasons)})"
        shown = (
            f"{pressure:.7g} {q.pressure_unit.name} and {temperature:.7g} {q.temperature_unit.name} "
            f"({float(p[0]):.8g} Pa absolute, {float(t[0]):.8g} K)"
        )
        return RangeNotOnePhase(why, float(p[0]), float(t[0]), shown)

    def property_of(self, pressure: Array, temperature: Array, density: Array) -> Array:
        """Return the property at points in the caller's units.

        :param density: mol/m3, shape (k,)
        """
        q, fluid = self.question, self.model.fluid
        if q.property == "density":
            value = density * fluid.molar_mass
        elif q.property == "molar_volume":
            value = 1.0 / density
        else:
            p, t = self.si(pressure, temperature)
            value = p / (density * fluid.gas_constant * t)
        return value if q.property_unit is None else q.property_unit.from_si(value)

    def at(self, pressure: Array, temperature: Array) -> Array:
        """Return the property at points; raises as ``states`` does."""
        return self.property_of(pressure, temperature, self.states(pressure, temperature).density)

    def scale(self, pressure: NDArray[np.float64], temperature: NDArray[np.float64]) -> NDArray[np.float64]:
        """Return the scale by which the property is as smooth as Z: T/p for a density, p/T for a volume."""
        p, t = self.si(pressure, temperature)
        middle = self.question.state.pressure / self.question.state.temperature
        if self.question.property == "density":
            return t / p * middle
        if self.question.property == "molar_volume":
            return p / t / middle
        return np.ones(np.broadcast_shapes(p.shape, t.shape))


def answer_lookup_table(
    context: Context, question: LookupTableQuestion, pause: Callable[[], None] = no_pause
) -> LookupTableAnswer:
    """Return a small table of a property.

    :param pause: called now and then, to let other work have its turn
    :raises RangeNotOnePhase: the range touches two phases, or states without a number
    :raises RangeTooNarrow: the range is no range in 32-bit arithmetic
    :raises ToleranceTooSmall: it would take too large a table
    :raises UnknownGas: for a name that nothing has
    :raises FractionsInvalid: for fractions that make no gas
    :raises UnknownModel: for a model id that no equation has
    :raises ModelCannotServe: for a model asked for by name that cannot serve the gas at all
    """
    for quantity, ends in (("pressure", question.pressure), ("temperature", question.temperature)):
        _check_width(quantity, ends)
    models = context.models(context.gas(question.state.gas))
    p, t = _mesh(np.linspace(*question.pressure, 9), np.linspace(*question.temperature, 9))
    p, t = question.pressure_unit.to_si(p, question.ambient), question.temperature_unit.to_si(t)
    choice = choose_for_rows(models, question.state.model, t, p)
    if choice.model is None:
        return LookupTableAnswer(solve_state(context, question.state), None)
    margin = context.dew_point_margin if question.state.dew_point_margin is None else question.state.dew_point_margin
    sampler = _Sampler(models.prepared(choice.model), question, margin, pause)
    _check_limits(sampler)
    surface = _survey(sampler)
    table = _table(sampler, surface)
    because = (
        choice.because if question.state.model != AUTO else "of the equations for this gas its range holds most of the table"
    )
    return LookupTableAnswer(_verdict(context, sampler, because), table)


def _check_width(quantity: str, ends: tuple[float, float]) -> None:
    low, high = ends
    size = max(abs(low), abs(high))
    if not (high - low >= _NARROWEST * size and size <= _LARGEST):
        raise RangeTooNarrow(quantity, low, high)


def _check_limits(sampler: _Sampler) -> None:
    """Refuse a range with a corner beyond the limits of the equation, before any phase is looked for out there."""
    q, limits = sampler.question, sampler.model.extended
    for pressure in q.pressure:
        for temperature in q.temperature:
            p, t = sampler.si(np.array([pressure]), np.array([temperature]))
            if not (limits.temperature_min <= t[0] <= limits.temperature_max and p[0] <= limits.pressure_max):
                raise sampler.refusal(int(Reason.OUTSIDE_LIMITS), _UNKNOWN, pressure, temperature)


def _mesh(x: Array, y: Array) -> tuple[Array, Array]:
    """Return the points of a grid as two columns, x the slower."""
    return np.repeat(x, y.size), np.tile(y, x.size)


def _survey(sampler: _Sampler) -> Surface:
    """Return a smooth stand-in of the property; refuse a range with more than one phase."""
    q = sampler.question
    tested_singly = _tested_singly(sampler.model.phase)
    x, y = _samples(q, _SURVEY_SINGLY if tested_singly else _SURVEY)
    p, t = _mesh(x, y)
    region = sampler.states(p, t).region.reshape(x.size, y.size)
    _check_boundary(sampler, x, y, region)
    for edge_p, edge_t in _edges(q, _EDGE_SINGLY if tested_singly else _EDGE):
        sampler.states(edge_p, edge_t)
    if not tested_singly:
        _check_cold_edge(sampler)
    if not (region == _LIQUID).any():
        sampler.trust()
    x, y = _samples(q, _SURVEY)
    p, t = _mesh(x, y)
    smooth = sampler.property_of(p, t, sampler.states(p, t).density).reshape(x.size, y.size) * sampler.scale(
        x[:, None], y[None, :]
    )
    return Surface(x, y, smooth, sampler.scale)


def _tested_singly(judge: PhaseJudge) -> bool:
    """Return whether every state of a mixture takes a stability test of its own, since no boundary could be traced.

    Then a sparser survey has to do: the phase does not hang on a line that a dense one could miss.
    """
    return isinstance(judge, MixtureJudge) and judge.phase.boundary is None


def _samples(q: LookupTableQuestion, count: int) -> tuple[Array, Array]:
    """Return pressures, denser at the low end, and temperatures of a survey."""
    x = q.pressure[0] + (q.pressure[1] - q.pressure[0]) * np.linspace(0.0, 1.0, count) ** 2
    x[-1] = q.pressure[1]
    return x, np.linspace(*q.temperature, count)


def _edges(q: LookupTableQuestion, count: int) -> tuple[tuple[Array, Array], ...]:
    """Return the four edges of the range, densely: a dome may cut one between its corners."""
    p, t = np.linspace(*q.pressure, count), np.linspace(*q.temperature, count)
    return tuple(
        [(p, np.full(count, end)) for end in q.temperature] + [(np.full(count, end), t) for end in q.pressure],
    )


def _check_boundary(sampler: _Sampler, x: Array, y: Array, region: NDArray[np.int8]) -> None:
    """Refuse a range that holds liquid and gas with a saturation line between them."""
    liquid = region == _LIQUID
    if liquid.all() or not liquid.any():
        return
    for i, j in np.argwhere(liquid[:, :-1] & ~liquid[:, 1:]):
        _check_between(sampler, (x[i], y[j]), (x[i], y[j + 1]))
    for i, j in np.argwhere(liquid[:-1] ^ liquid[1:]):
        cold, warm = ((x[i + 1], y[j]), (x[i], y[j])) if liquid[i + 1, j] else ((x[i], y[j]), (x[i + 1], y[j]))
        _check_between(sampler, cold, warm)


def _check_between(sampler: _Sampler, cold: tuple[float, float], warm: tuple[float, float]) -> None:
    """Refuse where the density jumps between a liquid state and one that is none: halve the way until they meet."""
    model, margin = sampler.model, sampler.margin

    def state(at: tuple[float, float]) -> tuple[int, int, float]:
        p, t = sampler.si(np.array([at[0]]), np.array([at[1]]))
        point = evaluate_float(model, float(t[0]), float(p[0]), margin)
        return point.region, point.flags, point.density

    for _ in range(_HALVINGS):
        middle = (0.5 * (cold[0] + warm[0]), 0.5 * (cold[1] + warm[1]))
        if middle in (cold, warm):
            break
        region, flags, _ = state(middle)
        if flags & BAD:
            raise sampler.refusal(flags, region, *middle)
        if region == _LIQUID:
            cold = middle
        else:
            warm = middle
    dense, thin = state(cold)[2], state(warm)[2]
    if dense > thin * (1.0 + _JUMP):
        raise sampler.refusal(int(Reason.TWO_PHASE), _TWO_PHASE, *warm)


def _check_cold_edge(sampler: _Sampler) -> None:
    """Refuse where the dew point comes up into the range between two points of its cold edge, as a retrograde dome can."""
    q, judge = sampler.question, sampler.model.phase
    cold = min(q.temperature)

    def margin_at(pressure: float) -> float:
        p, t = sampler.si(np.array([pressure]), np.array([cold]))
        point = evaluate_float(sampler.model, float(t[0]), float(p[0]), sampler.margin)
        if point.flags & BAD:
            raise sampler.refusal(point.flags, point.region, pressure, cold)
        region, _, surveyed = judge.survey_float(float(t[0]), float(p[0]), sampler.margin)
        if region in (_LIQUID, _UNKNOWN):
            return math.inf
        found = judge.margins(float(t[0]), float(p[0]), point.density, region, sampler.margin, surveyed).margin_temperature
        return math.inf if found is None else found

    points = np.linspace(*q.pressure, _SURVEY).tolist()
    margins = [margin_at(pressure) for pressure in points]
    least = min(range(len(points)), key=margins.__getitem__)
    if not math.isfinite(margins[least]):
        return
    low, high = points[max(0, least - 1)], points[min(len(points) - 1, least + 1)]
    golden = (math.sqrt(5.0) - 1.0) / 2.0
    for _ in range(30):
        a, b = high - golden * (high - low), low + golden * (high - low)
        if margin_at(a) < margin_at(b):
            high = b
        else:
            low = a


def _table(sampler: _Sampler, surface: Surface) -> LookupTable:
    """Return the smallest grid whose error, looked for with the equation itself, is within the tolerance."""
    tolerance = sampler.question.tolerance
    try:
        for axes in grids(surface, tolerance - _ROUNDING, sampler.pause):
            grid = _grid(sampler, _rounded(axes))
            error = _largest_error(sampler, grid) + _ROUNDING
            if error <= tolerance:
                return LookupTable(grid, error)
            # the error falls as the number of values rises: where that leads too far, no more is tried
            if axes.values * error > MOST_VALUES * tolerance:
                break
    except GridTooLarge:
        pass
    raise ToleranceTooSmall(tolerance)


def _rounded(axes: Axes) -> tuple[Float32, Float32]:
    """Return the axes as a controller holds them, inner nodes with no more digits than they need."""
    return _short(axes.x), _short(axes.y)


def _short(axis: Array) -> Float32:
    place = -math.floor(math.log10(0.02 * float(np.diff(axis).min())))
    nodes = np.array([axis[0], *(round(float(node), place) for node in axis[1:-1]), axis[-1]])
    short: Float32 = (nodes if (np.diff(nodes) > 0.0).all() else axis).astype(np.float32)
    return short


def _grid(sampler: _Sampler, axes: tuple[Float32, Float32]) -> Grid:
    x, y = axes
    p, t = _mesh(_inside(x, sampler.question.pressure), _inside(y, sampler.question.temperature))
    return Grid(x, y, sampler.at(p, t).reshape(x.size, y.size).astype(np.float32))


def _inside(axis: Float32, ends: tuple[float, float]) -> Array:
    """Return 32-bit numbers as doubles, those beside the range brought back to its ends: 0.1 is not a 32-bit number."""
    return np.clip(axis.astype(np.float64), *ends)


def _largest_error(sampler: _Sampler, grid: Grid) -> float:
    """Return the largest relative error of a grid, on a dense grid and around the worst point of every cell."""
    cells = (grid.pressure.size - 1) * (grid.temperature.size - 1)
    inside = int(np.clip(math.sqrt(_POINTS / cells), _LEAST_INSIDE, _MOST_INSIDE))
    inner = np.linspace(0.0, 1.0, inside)
    x = within(grid.pressure.astype(np.float64), inner)
    y = within(grid.temperature.astype(np.float64), inner)
    p, t = _mesh(x, y)
    found = _errors(sampler, grid, p, t).reshape(x.size, y.size)
    largest = float(found.max())
    step = 1.0 / (inside - 1)
    u, v = _worst(found, inside)
    # two rounds of nine points around the worst one of each cell, each round a third of the last
    for _ in range(2):
        step /= 3.0
        u, v, error = _closer(sampler, grid, u, v, step)
        largest = max(largest, error)
    return largest


def _worst(found: NDArray[np.float64], inside: int) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return the place of the largest error in every cell, as fractions of its sides, shape (m - 1, n - 1)."""
    step = inside - 1
    m, n = (found.shape[0] - 1) // step, (found.shape[1] - 1) // step
    at = np.add.outer(step * np.arange(m), np.arange(inside))[:, None, :, None]
    by = np.add.outer(step * np.arange(n), np.arange(inside))[None, :, None, :]
    flat = found[at, by].reshape(m, n, inside * inside).argmax(axis=2)
    return (flat // inside) / step, (flat % inside) / step


def _closer(
    sampler: _Sampler, grid: Grid, u: NDArray[np.float64], v: NDArray[np.float64], step: float
) -> tuple[NDArray[np.float64], NDArray[np.float64], float]:
    """Return the worst of nine points around a point of every cell, and the largest error of all."""
    around = np.array([(a, b) for a in (-step, 0.0, step) for b in (-step, 0.0, step)])
    us = np.clip(u[:, :, None] + around[:, 0], 0.0, 1.0)
    vs = np.clip(v[:, :, None] + around[:, 1], 0.0, 1.0)
    x, y = grid.pressure.astype(np.float64), grid.temperature.astype(np.float64)
    p = x[:-1, None, None] + us * np.diff(x)[:, None, None]
    t = y[None, :-1, None] + vs * np.diff(y)[None, :, None]
    errors = _errors(sampler, grid, p.ravel(), t.ravel()).reshape(us.shape)
    worst = errors.argmax(axis=2)[:, :, None]
    return (
        np.take_along_axis(us, worst, 2)[:, :, 0],
        np.take_along_axis(vs, worst, 2)[:, :, 0],
        float(errors.max()),
    )


def _errors(sampler: _Sampler, grid: Grid, pressure: Array, temperature: Array) -> Array:
    """Return relative errors at points, which are 32-bit numbers as a controller has them, against the equation at those."""
    p, t = pressure.astype(np.float32), temperature.astype(np.float32)
    q = sampler.question
    true = sampler.at(_inside(p, q.pressure), _inside(t, q.temperature))
    return np.abs(interpolate(grid, p, t).astype(np.float64) / true - 1.0)


def _verdict(context: Context, sampler: _Sampler, because: str) -> StateAnswer:
    """Return the state in the middle of the range, with the quality, uncertainty and range of validity of all of it."""
    q, model = sampler.question, sampler.model
    middle = solve_state(context, q.state._replace(model=model.id))
    p, t = sampler.si(np.array(q.pressure), np.array(q.temperature))
    v = model.validity
    assumed = ambient_flags(q.state.ambient_pressure, float(p[0]))
    return middle._replace(
        quality=quality_of(sampler.flags | assumed),
        model=ModelAnswer(
            model.id,
            model.name,
            model.source,
            (v.temperature_min, v.temperature_max),
            (0.0, v.pressure_max),
            bool(t.min() >= v.temperature_min and t.max() <= v.temperature_max and p[1] <= v.pressure_max),
            sampler.uncertainty,
            middle.model.uncertainty_basis,
            because,
        ),
    )
