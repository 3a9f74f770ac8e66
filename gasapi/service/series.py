"""A series: rows of states of one gas, or of a gas whose composition changes by the row, by one equation for all of them.

There is no second formula here. Rows go through ``evaluate_block``, which does what a single state does, in blocks that stay
in the processor's cache; the conversions that follow are written in the order of ``state``, so that a row has the bits of
the single state with that equation named.

A series is asked in three steps, so that its rows need not be held at once: ``Survey`` looks at the rows, block by block, as
far as the choice of the equation needs; ``Series`` then answers them, block by block; ``Series.summary`` says what holds for
all rows that were answered.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from contextlib import ExitStack
from typing import Any, Final, Literal, NamedTuple, cast

import numpy as np
from numpy.typing import NDArray

from gasapi.engine.certified import CertifiedFluid
from gasapi.engine.elementary import Array
from gasapi.engine.models.helmholtz_fluid import BLOCK_ROWS
from gasapi.engine.phase.region import Region
from gasapi.errors import FractionsInvalid
from gasapi.gases.records import Substance
from gasapi.service.answers import GasAnswer, ModelAnswer
from gasapi.service.context import Context, GasModels
from gasapi.service.evaluation import evaluate_block, is_state
from gasapi.service.models import why_not
from gasapi.service.prepared import PreparedModel
from gasapi.service.quality import BAD, LEVELS, Reason, level_codes
from gasapi.service.questions import GasSpec
from gasapi.service.selection import Choice, choose_for_rows
from gasapi.service.share import Share, cores
from gasapi.service.state import AMBIENT_SHARE, CRITICAL_AMPLIFICATION_MOST
from gasapi.service.two_phase import split

__all__ = [
    "Columns",
    "RowComposition",
    "Series",
    "SeriesQuestion",
    "SeriesRows",
    "SeriesSummary",
    "Survey",
    "TableCertificate",
    "VaryingGasAnswer",
    "answer_share",
    "input_flags",
]

# rows by which a generalised equation is chosen: every so many of a longer series
_SURVEYED_ROWS: Final = 1 << 20
# rows that are answered from a table at a time: they fall into a dozen patches, each of which is a block of its own
_TABLE_ROWS: Final = 10 * BLOCK_ROWS
# compositions in one block of rows from which on a second process pays
_SHARED_FROM: Final = 100

_INPUT_BAD: Final = int(Reason.INPUT_BAD)
_INPUT_UNCERTAIN: Final = int(Reason.INPUT_UNCERTAIN)
_FRACTIONS_BAD: Final = int(Reason.FRACTIONS_BAD)
_NO_MODEL: Final = int(Reason.NO_MODEL)
_TWO_PHASE: Final = int(Reason.TWO_PHASE)
_OUTSIDE: Final = int(Reason.OUTSIDE_VALIDITY | Reason.OUTSIDE_LIMITS)
_UNKNOWN: Final = int(Region.UNKNOWN)
_LIQUID: Final = int(Region.LIQUID)

StatusKind = Literal["opc-ua", "opc-classic"]


class RowComposition(NamedTuple):
    """What the fractions of the rows are of: names in the order of the columns, basis, substances of the question."""

    names: tuple[str, ...]
    basis: Literal["mole", "mass"] = "mole"
    substances: tuple[Substance, ...] = ()


class SeriesQuestion(NamedTuple):
    """What holds for all rows. The members are those of ``StateQuestion``; the gas may change by the row."""

    gas: GasSpec | RowComposition
    model: str = "auto"
    ambient_pressure: float | None = None
    accept_two_phase: bool = False
    dew_point_margin: float | None = None
    accuracy: float | None = None


class Columns(NamedTuple):
    """Rows: temperature (K) and pressure (Pa, NaN where none is known), reasons that came with the rows, fractions.

    All have shape (n,); ``fractions`` is (n, names) and None where the gas does not change.
    """

    temperature: Array
    pressure: Array
    flags: NDArray[np.int64] | None = None
    fractions: Array | None = None

    def rows(self, start: int, stop: int) -> Columns:
        """Return some of the rows."""
        return Columns(
            self.temperature[start:stop],
            self.pressure[start:stop],
            None if self.flags is None else self.flags[start:stop],
            None if self.fractions is None else self.fractions[start:stop],
        )

    def take(self, rows: NDArray[np.intp]) -> Columns:
        """Return the rows of some indices."""
        return Columns(*(None if column is None else column[rows] for column in self))  # type: ignore[arg-type]


class SeriesRows(NamedTuple):
    """Answers, each of shape (n,): density kg/m3, Z and molar volume m3/mol (NaN where bad), reasons, regions.

    Where the gas changes by the row ``molar_mass`` is that of each row, kg/mol, and ``fractions`` (n, components) are mole
    fractions in the order of ``Series.components``; NaN where the composition is bad. Both are None otherwise.
    """

    density: Array
    compressibility_factor: Array
    molar_volume: Array
    flags: NDArray[np.int64]
    region: NDArray[np.int8]
    molar_mass: Array | None = None
    fractions: Array | None = None


class VaryingGasAnswer(NamedTuple):
    """A gas that changes by the row: the ids of all its components."""

    components: tuple[str, ...]


class TableCertificate(NamedTuple):
    """What certified tables did: the error that was allowed, the largest one of the patches used, rows answered by them."""

    accuracy: float
    largest_error: float | None
    rows: int


class SeriesSummary(NamedTuple):
    """What holds for all rows that were answered: rows by level, the equation with the largest uncertainty of any row.

    ``certificate`` is given where the question allows tables.
    """

    gas: GasAnswer | VaryingGasAnswer
    model: ModelAnswer
    phase_model: str | None
    counts: tuple[tuple[str, int], ...]
    cautions: tuple[str, ...]
    data: str
    certificate: TableCertificate | None


def input_flags(status: Array, kind: StatusKind) -> NDArray[np.int64]:
    """Return the reasons that the status codes of the inputs give, shape (n,).

    :param status: OPC UA status codes (IEC 62541-4: the two highest of 32 bits are the severity), or the quality of OPC
        classic (OPC Data Access 3.0, 6.8: bits 6 and 7), shape (n,); NaN counts as bad
    """
    known = np.isfinite(status)
    codes = np.where(known, status, 0.0).astype(np.int64)
    if kind == "opc-ua":
        severity = codes >> 30
        flags = np.where(severity == 0, 0, np.where(severity == 1, _INPUT_UNCERTAIN, _INPUT_BAD))
    else:
        severity = (codes >> 6) & 3
        flags = np.where(severity == 3, 0, np.where(severity == 1, _INPUT_UNCERTAIN, _INPUT_BAD))
    return np.where(known, flags, _INPUT_BAD).astype(np.int64)


class Survey:
    """Looks at the rows of a series, block by block, and chooses the equation. Not shared between threads.

    :param question: what holds for all rows
    """

    def __init__(self, question: SeriesQuestion) -> None:
        self._question = question
        self._temperature: list[Array] = []
        self._pressure: list[Array] = []
        self._held = 0
        self._stride = 1
        self._seen = 0
        names = question.gas.names if isinstance(question.gas, RowComposition) else ()
        self._sums = np.zeros(len(names))

    def add(self, columns: Columns) -> None:
        """Look at the next rows."""
        t, p = columns.temperature, columns.pressure
        first = -self._seen % self._stride
        self._seen += t.size
        t, p = t[first :: self._stride], p[first :: self._stride]
        self._temperature.append(t.copy())
        self._pressure.append(p.copy())
        self._held += t.size
        if columns.fractions is not None:
            x = columns.fractions
            self._sums += x[_good_fractions(x)].sum(axis=0)
        while self._held > _SURVEYED_ROWS:
            self._temperature = [np.concatenate(self._temperature)[::2]]
            self._pressure = [np.concatenate(self._pressure)[::2]]
            self._held = self._temperature[0].size
            self._stride *= 2

    def gas(self) -> GasSpec:
        """Return the gas by which the equation is chosen: that of all rows, or of the mean composition."""
        gas = self._question.gas
        if isinstance(gas, GasSpec):
            return gas
        total = math.fsum(self._sums.tolist())
        count = len(gas.names)
        mean = [s / total for s in self._sums.tolist()] if total > 0.0 else [1.0 / count] * count
        return GasSpec(None, tuple(zip(gas.names, mean, strict=True)), gas.basis, gas.substances)

    def choice(self, models: GasModels) -> Choice:
        """Return the equation for the rows that were looked at; raises as ``choose_for_rows`` does."""
        empty = np.zeros(0)
        t = np.concatenate([empty, *self._temperature])
        p = np.concatenate([empty, *self._pressure])
        usable = is_state(t, p)
        return choose_for_rows(models, self._question.model, t[usable], p[usable])


class Series:
    """Answers the rows of a series. Not shared between threads.

    :param context: the catalogue and the caches
    :param question: what holds for all rows
    :param survey: what was seen of the rows
    :param pause: called between blocks of rows, so that a long series lets others have their turn
    :param shares: whether very many compositions may be shared among processes
    :raises UnknownGas: for a name that nothing has
    :raises FractionsInvalid: for fractions that make no gas
    :raises UnknownModel: for a model id that no equation has
    :raises ModelCannotServe: for a model asked for by name that cannot serve the gas, or all gases of the rows together
    """

    def __init__(
        self,
        context: Context,
        question: SeriesQuestion,
        survey: Survey,
        pause: Callable[[], None] = lambda: None,
        shares: bool = True,
    ) -> None:
        self._context = context
        self._shares = shares
        self._question = question
        self._pause = pause
        self._models = context.models(context.gas(survey.gas()))
        self._choice = survey.choice(self._models)
        margin = question.dew_point_margin
        self._margin = context.dew_point_margin if margin is None else margin
        self._tally = _Tally()
        gas = question.gas
        self.components: tuple[str, ...] = ()
        """Ids of the components of a gas that changes by the row, in the order of ``SeriesRows.fractions``."""
        self._single: PreparedModel | None = None
        if isinstance(gas, RowComposition):
            self.components = self._all_components(gas)
            self._place = {id: i for i, id in enumerate(self.components)}
        elif self._choice.model is not None:
            self._single = self._models.certified(self._choice.model, question.accuracy)

    def _all_components(self, gas: RowComposition) -> tuple[str, ...]:
        """Return the ids of all components that the columns can bring; their names were looked up before."""
        share = 1.0 / len(gas.names)
        spec = GasSpec(None, tuple((name, share) for name in gas.names), gas.basis, gas.substances)
        return self._context.gas(spec).components

    def answer(self, columns: Columns) -> SeriesRows:
        """Return the answers to rows."""
        n = columns.temperature.size
        if self._choice.model is None or columns.fractions is None:
            size = BLOCK_ROWS if self._question.accuracy is None else _TABLE_ROWS
            parts = [self._block(columns.rows(i, i + size)) for i in range(0, n, size)] or [self._block(columns)]
            return parts[0] if len(parts) == 1 else _joined(parts)
        return self._by_composition(columns)

    def _block(self, columns: Columns) -> SeriesRows:
        self._pause()
        if self._single is None:
            return self._without_model(columns)
        rows = self._solve(self._single, self._models.gas.components, columns.temperature, columns.pressure, columns.flags)
        self._tally.levels(rows.flags)
        return rows

    def _without_model(self, columns: Columns) -> SeriesRows:
        n = columns.temperature.size
        flags = np.full(n, _NO_MODEL, dtype=np.int64)
        if columns.flags is not None:
            flags |= columns.flags
        flags |= self._ambient_flags(columns.pressure)
        none = np.full(n, np.nan)
        self._tally.levels(flags)
        x = columns.fractions
        empty = None if x is None else np.full((n, len(self.components)), np.nan)
        return SeriesRows(none, none, none, flags, np.full(n, _UNKNOWN, dtype=np.int8), None if x is None else none, empty)

    def _ambient_flags(self, pressure: Array) -> NDArray[np.int64] | int:
        ambient = self._question.ambient_pressure
        if ambient is None:
            return 0
        matters = int(Reason.AMBIENT_PRESSURE_ASSUMED | Reason.AMBIENT_PRESSURE_MATTERS)
        return np.where(ambient > AMBIENT_SHARE * pressure, matters, int(Reason.AMBIENT_PRESSURE_ASSUMED))

    def _solve(
        self,
        model: PreparedModel,
        components: Sequence[str],
        temperature: Array,
        pressure: Array,
        given: NDArray[np.int64] | None,
    ) -> SeriesRows:
        """Answer rows of one composition, with the operations of ``solve_state`` in their order."""
        t, p = temperature, pressure
        if given is not None:
            unusable = (given & BAD) != 0
            if unusable.any():
                t, p = np.where(unusable, np.nan, t), np.where(unusable, np.nan, p)
        block = evaluate_block(model, t, p, self._margin)
        flags, molar = block.flags, block.density
        if given is not None:
            flags |= given
        flags |= self._ambient_flags(pressure)
        if self._question.accept_two_phase:
            _accept_two_phase(model, components, t, p, molar, flags)
        molar_mass = model.fluid.molar_mass
        # a row that has no density has none of the others either: NaN goes through all three
        with np.errstate(invalid="ignore"):
            density = molar * molar_mass
            volume = 1.0 / molar
            z = p / (molar * model.fluid.gas_constant * t)
        self._tally.uncertainty(model, t, p, molar, flags, block.uncertainty)
        if isinstance(model.fluid, CertifiedFluid):
            self._tally.certificate(model.fluid, t, p, np.isfinite(block.uncertainty) & (block.region != _LIQUID))
        return SeriesRows(density, z, volume, flags, block.region)

    def _by_composition(self, columns: Columns) -> SeriesRows:
        assert columns.fractions is not None
        n = columns.temperature.size
        none = np.full((4, n), np.nan)
        flags = np.zeros(n, dtype=np.int64) if columns.flags is None else columns.flags.copy()
        region = np.full(n, _UNKNOWN, dtype=np.int8)
        rows = SeriesRows(none[0], none[1], none[2], flags, region, none[3], np.full((n, len(self.components)), np.nan))
        groups = _compositions(columns.fractions)
        others = cores() - 1 if self._shares and len(groups) >= _SHARED_FROM else 0
        with ExitStack() as stack:
            shares = [
                (stack.enter_context(self._share(columns, groups[i :: others + 1])), groups[i :: others + 1])
                for i in range(1, others + 1)
            ]
            self._answer_groups(columns, groups[:: others + 1], rows)
            for share, some in shares:
                found = share.result()
                if found is None:
                    self._answer_groups(columns, some, rows)
                    continue
                part, tally = found
                at = np.concatenate([group for group, _ in some])
                whole: Any
                for whole, column in zip(rows, part, strict=True):
                    whole[at] = column
                self._tally.join(tally)
        self._tally.levels(flags)
        return rows

    def _share(self, columns: Columns, groups: Sequence[tuple[NDArray[np.intp], Array]]) -> Share:
        assert self._choice.model is not None
        at = np.concatenate([group for group, _ in groups])
        return Share(self._context.site, self._question._replace(model=self._choice.model), columns.take(at))

    def _answer_groups(self, columns: Columns, groups: Sequence[tuple[NDArray[np.intp], Array]], answers: SeriesRows) -> None:
        """Answer the rows of some compositions, into columns for all rows."""
        density, z, volume, flags, region, molar_mass, fractions = answers
        assert molar_mass is not None
        assert fractions is not None
        for rows, x in groups:
            model, gas = self._of_row(x)
            if model is None:
                t, p = columns.temperature.take(rows), columns.pressure.take(rows)
                flags[rows] |= np.where(is_state(t, p), _FRACTIONS_BAD, _FRACTIONS_BAD | _INPUT_BAD) | self._ambient_flags(p)
                continue
            for start in range(0, rows.size, BLOCK_ROWS):
                self._pause()
                at = rows[start : start + BLOCK_ROWS]
                given = None if columns.flags is None else columns.flags.take(at)
                found = self._solve(model, gas, columns.temperature.take(at), columns.pressure.take(at), given)
                density[at], z[at], volume[at] = found.density, found.compressibility_factor, found.molar_volume
                flags[at], region[at] = found.flags, found.region
                molar_mass[at] = model.fluid.molar_mass
                fractions[at] = 0.0
                for component, share in zip(gas, model.fractions, strict=True):
                    fractions[at, self._place[component]] = share

    def _of_row(self, fractions: Array) -> tuple[PreparedModel | None, tuple[str, ...]]:
        """Return the equation at the composition of a row, None where the composition is bad."""
        gas = self._question.gas
        assert isinstance(gas, RowComposition)
        assert self._choice.model is not None
        values = fractions.tolist()
        if not all(x >= 0.0 for x in values):
            return None, ()
        try:
            resolved = self._context.gas(GasSpec(None, tuple(zip(gas.names, values, strict=True)), gas.basis, gas.substances))
        except FractionsInvalid:
            return None, ()
        if why_not(self._choice.model, resolved) is not None:
            return None, ()
        models = self._context.models(resolved)
        return models.certified(self._choice.model, self._question.accuracy), resolved.components

    def summary(self) -> SeriesSummary:
        """Return what holds for all rows that were answered so far."""
        models, tally, choice = self._models, self._tally, self._choice
        gas: GasAnswer | VaryingGasAnswer
        model = None if choice.model is None else models.prepared(choice.model)
        if isinstance(self._question.gas, RowComposition):
            gas = VaryingGasAnswer(self.components)
        else:
            fractions = models.mole_fractions if model is None else model.fractions
            molar_mass = (
                math.fsum(x * s.molar_mass for x, s in zip(fractions, models.gas.substances, strict=True))
                if model is None
                else model.fluid.molar_mass
            )
            gas = GasAnswer(models.gas.id, tuple(zip(models.gas.components, fractions, strict=True)), molar_mass)
        return SeriesSummary(
            gas,
            _no_model(choice.because) if model is None else tally.model_answer(model, choice.because),
            None if model is None else model.phase.model,
            tuple(zip(LEVELS, tally.counts, strict=True)),
            models.cautions,
            self._context.data,
            None
            if self._question.accuracy is None
            else TableCertificate(self._question.accuracy, tally.largest_error, tally.table_rows),
        )


def answer_share(context: Context, question: SeriesQuestion, columns: Columns) -> tuple[SeriesRows, _Tally]:
    """Return the rows of a share of a series and what was found of uncertainty, for the process that asked for it."""
    survey = Survey(question)
    survey.add(columns)
    series = Series(context, question, survey, shares=False)
    return series.answer(columns), series._tally


def _no_model(because: str) -> ModelAnswer:
    return ModelAnswer("none", "no equation", "", (0.0, 0.0), (0.0, 0.0), False, None, "estimate", because)


class _Tally:
    """Counts rows by level, and keeps the largest uncertainty with the basis of it."""

    def __init__(self) -> None:
        self.counts = [0, 0, 0]
        self._outside = False
        self.largest_error: float | None = None
        self.table_rows = 0
        self._largest: float | None = None
        self._basis: str | None = None

    def levels(self, flags: NDArray[np.int64]) -> None:
        for level, count in enumerate(np.bincount(level_codes(flags), minlength=len(LEVELS)).tolist()):
            self.counts[level] += count
        self._outside |= bool((flags & _OUTSIDE).any())

    def uncertainty(
        self, model: PreparedModel, t: Array, p: Array, molar: Array, flags: NDArray[np.int64], uncertainty: Array
    ) -> None:
        """Take the uncertainties of rows into account, those near the critical point amplified as a single state's is."""
        near = np.flatnonzero(((flags & int(Reason.NEAR_CRITICAL)) != 0) & np.isfinite(uncertainty))
        if near.size:
            derivatives = model.fluid.pressure(t.take(near), molar.take(near))
            stiffness = molar.take(near) * derivatives.density_derivative / p.take(near)
            uncertainty = uncertainty.copy()
            uncertainty[near] /= np.minimum(1.0, np.maximum(1.0 / CRITICAL_AMPLIFICATION_MOST, stiffness))
        known = np.isfinite(uncertainty)
        if not known.any():
            return
        at = int(np.argmax(np.where(known, uncertainty, -1.0)))
        largest = float(uncertainty[at])
        if self._largest is None or largest > self._largest:
            self._largest = largest
            self._basis = model.uncertainty.basis_at(float(t[at]), float(p[at]), float(molar[at]))

    def join(self, other: _Tally) -> None:
        """Take over what another one found of uncertainty and of tables; levels are counted by the flags of all rows."""
        if other._largest is not None and (self._largest is None or other._largest > self._largest):
            self._largest, self._basis = other._largest, other._basis
        self.table_rows += other.table_rows
        if other.largest_error is not None and (self.largest_error is None or other.largest_error > self.largest_error):
            self.largest_error = other.largest_error

    def certificate(self, fluid: CertifiedFluid, t: Array, p: Array, answered: NDArray[np.bool_]) -> None:
        """Count the rows that a table answered, with its largest error."""
        found = fluid.certificate(t[answered], p[answered])
        self.table_rows += found.rows
        if found.largest_error is not None and (self.largest_error is None or found.largest_error > self.largest_error):
            self.largest_error = found.largest_error

    def model_answer(self, model: PreparedModel, because: str) -> ModelAnswer:
        v = model.validity
        return ModelAnswer(
            model.id,
            model.name,
            model.source,
            (v.temperature_min, v.temperature_max),
            (0.0, v.pressure_max),
            not self._outside,
            self._largest,
            self._basis or model.uncertainty.basis,
            because,
        )


def _accept_two_phase(
    model: PreparedModel, components: Sequence[str], t: Array, p: Array, molar: Array, flags: NDArray[np.int64]
) -> None:
    """Put the density of the whole where two phases are the only fault, row by row."""
    for i in np.flatnonzero((flags & BAD) == _TWO_PHASE).tolist():
        found = split(model, components, float(t[i]), float(p[i]))
        if found is not None:
            molar[i] = found.density
            flags[i] = flags[i] & ~_TWO_PHASE | int(Reason.TWO_PHASE_ACCEPTED)


def _good_fractions(fractions: Array) -> NDArray[np.bool_]:
    """Return which rows may be compositions, shape (n,)."""
    with np.errstate(invalid="ignore"):
        return cast("NDArray[np.bool_]", (fractions >= 0.0).all(axis=1) & (np.abs(fractions.sum(axis=1) - 1.0) <= 0.02))


def _compositions(fractions: Array) -> list[tuple[NDArray[np.intp], Array]]:
    """Return the rows of each distinct composition, told apart by the bits of the fractions, in the order of the rows."""
    if not fractions.shape[0]:
        return []
    # -0.0 is 0.0 but for its bits
    table = np.ascontiguousarray(fractions + 0.0)
    keys = table.view(np.dtype((np.void, table.dtype.itemsize * table.shape[1]))).ravel()
    _, first, which = np.unique(keys, return_index=True, return_inverse=True)
    order = np.argsort(which, kind="stable")
    ends = np.cumsum(np.bincount(which))
    starts = np.concatenate([[0], ends[:-1]])
    groups = [(order[a:b], table[f]) for a, b, f in zip(starts, ends, first, strict=True)]
    return [groups[i] for i in np.argsort(first, kind="stable")]


def _joined(parts: Sequence[SeriesRows]) -> SeriesRows:
    """Return the rows of several blocks as one."""
    columns: list[Any] = [None if column[0] is None else np.concatenate(column) for column in zip(*parts, strict=True)]
    return SeriesRows(*columns)
