"""Requests of the jobs into questions: checked members in the caller's units become a question in SI."""

from __future__ import annotations

from abc import ABC, abstractmethod
from collections.abc import Callable, Mapping
from typing import Any, Final, Generic, NamedTuple, TypeVar

from marshmallow import Schema, ValidationError

from gasapi.errors import GasapiError
from gasapi.service.flow import FlowQuestion
from gasapi.service.flow import Meter as FlowMeter
from gasapi.service.fraction_from_density import DensityUncertainties, FractionFromDensityQuestion, SameGas
from gasapi.service.lookup_table import (
    LookupTableQuestion,
    RangeNotOnePhase,
    RangeTooNarrow,
    ToleranceTooSmall,
)
from gasapi.service.molar_mass import MolarMassQuestion
from gasapi.service.pressure_decay import Correlation, LeakLimit, PressureDecayQuestion
from gasapi.service.questions import GasSpec, InputUncertainty, StateQuestion
from gasapi.service.vessel import DrawOff, VesselQuestion
from gasapi.units import SI_UNITS, UnitMap, unit, unit_map
from gasapi.web import job_schemas
from gasapi.web.job_fields import Measured
from gasapi.web.json_body import parse_json
from gasapi.web.problems import Fault, Path, Problem, invalid, located, path_of, pointer, shown
from gasapi.web.questions import STANDARD_ATMOSPHERE

__all__ = [
    "AskedJob",
    "ComparisonReader",
    "FlowReader",
    "FractionFromDensityReader",
    "JobReader",
    "LookupTableAsked",
    "LookupTableReader",
    "MolarMassReader",
    "PhaseBoundaryAsked",
    "PhaseBoundaryReader",
    "PressureDecayReader",
    "Readings",
    "VesselReader",
]

Question = TypeVar("Question")
"""The question of one job."""


# in SI: wider than anything that is measured, narrow enough that every result is a double
_BOUNDS: Final = {
    "volume": (1e-15, 1e15),
    "mass": (1e-20, 1e20),
    "density": (1e-15, 1e6),
    "duration": (1e-9, 1e12),
    "volume_flow": (1e-30, 1e15),
    "mass_flow": (1e-30, 1e15),
    "amount_flow": (1e-30, 1e15),
    "throughput": (1e-30, 1e15),
    "pressure": (0.0, 1e13),
    "temperature": (0.0, 1e6),
}


# where auto chooses the equation of a gas as a whole
_ROOM_PRESSURE: Final = 101325.0
_ROOM_TEMPERATURE: Final = 293.15


class AskedJob(NamedTuple, Generic[Question]):
    """The question of a job, the units of its answer, and where a fault that the service finds stands in the request."""

    question: Question
    units: UnitMap
    path_of: Callable[[GasapiError], Path]

    def problem(self, error: GasapiError) -> Problem:
        """Return the problem of a question that the service refused."""
        return invalid([Fault(pointer(self.path_of(error)), str(error))])


class Readings:
    """The members of a request on their way to SI; faults gather in ``wrong``.

    :param loaded: what could be loaded
    :param wrong: what is wrong already
    :param site_ambient: Pa, the ambient pressure of the site where it is known
    """

    def __init__(self, loaded: Mapping[str, Any], wrong: list[tuple[Path, str]], site_ambient: float | None) -> None:
        self.loaded = loaded
        self.wrong = wrong
        self.units: UnitMap = loaded.get("units", unit_map(()))
        self._site_ambient = site_ambient

    def get(self, *path: str) -> Any:
        """Return the member at a path, None where there is none."""
        node: Any = self.loaded
        for step in path:
            node = node.get(step) if node is not None else None
        return node

    def ambient(self, own: float | None = None) -> tuple[float, float | None]:
        """Return an ambient pressure, Pa, and the same again where it was assumed for a gauge reading."""
        for given in (own, self.loaded.get("ambient_pressure"), self._site_ambient):
            if given is not None:
                return given, None
        return STANDARD_ATMOSPHERE, STANDARD_ATMOSPHERE if self.units.pressure.gauge else None

    def pressure(self, *path: str, own_ambient: float | None = None) -> tuple[float, float | None]:
        """Return an absolute pressure, Pa, and the ambient that was assumed for it; 0 where it is missing."""
        ambient, assumed = self.ambient(own_ambient)
        return self._absolute(path, "pressure", ambient), assumed

    def temperature(self, *path: str) -> float:
        """Return an absolute temperature, K; 0 where it is missing."""
        return self._absolute(path, "temperature", 0.0)

    def pair(self, *path: str) -> tuple[float, float, float | None]:
        """Return pressure (Pa), temperature (K) and the assumed ambient (Pa) of an object of readings."""
        own = self.get(*path, "ambient_pressure") if path else None
        pressure, assumed = self.pressure(*path, "pressure", own_ambient=own)
        return pressure, self.temperature(*path, "temperature"), assumed

    def in_si(self, quantity: str, *path: str) -> Any:
        """Return a quantity without an offset in SI, None where it is missing."""
        value = self.get(*path)
        return None if value is None else self.bounded(self.units[quantity].to_si(value), quantity, path)

    def bounded(self, value: float, quantity: str, path: tuple[str, ...]) -> float:
        """Return a value in SI that must be one of this world, so that no result leaves the range of a double."""
        least, most = _BOUNDS[quantity]
        if not least <= value <= most:
            si = "Pa m3/s" if quantity == "throughput" else SI_UNITS[quantity].name
            words = f"this is {value:.6g} {si}; give a {quantity.replace('_', ' ')} from {least:g} to {most:g} {si}"
            self.wrong.append((path, words))
        return value

    def end(self, quantity: str, place: int) -> float:
        """Return an end of a range of pressures or temperatures in SI, 0 where it is missing."""
        ends = self.get(quantity)
        if ends is None:
            return 0.0
        ambient = self.ambient()[0] if quantity == "pressure" else 0.0
        return self._above_zero((quantity, place), quantity, ends[place], ambient)

    def measured(self, measured: Measured, path: tuple[str, ...]) -> float:
        """Return a value with its own unit in SI."""
        own = unit(measured.quantity, measured.unit) if measured.unit is not None else self.units[measured.quantity]
        value: float = own.to_si(measured.value)
        most = _BOUNDS[measured.quantity][1]
        if not abs(value) <= most:
            si = SI_UNITS[measured.quantity].name
            words = f"this is {value:.6g} {si}; give a flow of at most {most:g} {si} either way"
            self.wrong.append(((*path, "value"), words))
        return value

    def uncertainty(self, quantity: str, *path: str) -> float:
        """Return a standard uncertainty in SI, 0 where it is missing."""
        value = self.get(*path)
        if value is None:
            return 0.0
        found: float = self.units[quantity].difference_to_si(value)
        most = _BOUNDS[quantity][1]
        if not found <= most:
            si = SI_UNITS[quantity].name
            self.wrong.append((path, f"this is {found:.6g} {si}; a standard uncertainty is at most {most:g} {si}"))
            return 0.0
        return found

    def input_uncertainty(self) -> InputUncertainty | None:
        """Return the standard uncertainties of pressure (Pa) and temperature (K), None where none was given."""
        if self.get("input_uncertainty") is None:
            return None
        return InputUncertainty(
            self.uncertainty("pressure", "input_uncertainty", "pressure"),
            self.uncertainty("temperature", "input_uncertainty", "temperature"),
        )

    def state(self, *path: str, gas: GasSpec | None = None) -> StateQuestion:
        """Return the question about one state of the job."""
        return self.state_at(*self.pair(*path), gas=gas)

    def state_at(self, pressure: float, temperature: float, assumed: float | None, gas: GasSpec | None = None) -> StateQuestion:
        """Return the question about a state: Pa, K, and the ambient that was assumed for a gauge reading, Pa."""
        spec = gas if gas is not None else self.loaded.get("gas")
        substances = self.loaded.get("substances")
        if spec is None:
            spec = GasSpec("")
        return StateQuestion(
            spec._replace(substances=substances) if substances else spec,
            pressure,
            temperature,
            self.loaded.get("model", "auto"),
            assumed,
            self.loaded.get("accept_two_phase", False),
            self.loaded.get("dew_point_margin"),
            None,
            self.loaded.get("accuracy"),
        )

    def _absolute(self, path: tuple[str, ...], quantity: str, ambient: float) -> float:
        value = self.get(*path)
        return 0.0 if value is None else self._above_zero(path, quantity, value, ambient)

    def _above_zero(self, path: Path, quantity: str, value: float, ambient: float) -> float:
        own, si = self.units[quantity], SI_UNITS[quantity].name
        absolute: float = own.to_si(value, ambient)
        if not 0.0 < absolute < float("inf"):
            at_ambient = f" at an ambient of {ambient:g} Pa" if own.gauge else ""
            self.wrong.append(
                (
                    path,
                    f"{shown(value)} {own.name} is {absolute:.7g} {si}{at_ambient}; "
                    f"an absolute {quantity} lies above 0 {si} and within the range of a double",
                )
            )
        return absolute


class JobReader(ABC, Generic[Question]):
    """Reads the questions of one job.

    :param site_ambient: Pa, the ambient pressure of the site where it is known
    """

    schema: Schema

    def __init__(self, site_ambient: float | None = None) -> None:
        self._site_ambient = site_ambient

    def of_body(self, body: bytes) -> AskedJob[Question]:
        """Return the question of a JSON body.

        :raises Problem: 400 or 422, with every fault
        """
        return self.of_members(parse_json(body))

    def of_members(self, members: Any) -> AskedJob[Question]:
        """Return the question of a JSON value.

        :raises Problem: 422, with every fault
        """
        try:
            loaded = self.schema.load(members)
            wrong: list[tuple[Path, str]] = []
        except ValidationError as error:
            loaded = error.valid_data if isinstance(error.valid_data, dict) else {}
            wrong = located(error.messages)
        readings = Readings(loaded, wrong, self._site_ambient)
        self.check(readings)
        if readings.wrong:
            raise invalid([Fault(pointer(path), detail) for path, detail in readings.wrong])
        question = self.question(readings)
        if readings.wrong:
            raise invalid([Fault(pointer(path), detail) for path, detail in readings.wrong])
        return AskedJob(question, readings.units, self.locator(readings))

    def check(self, readings: Readings) -> None:
        """Convert the readings, some of which may be missing, so that what is wrong with them is told with all other faults."""
        readings.pair()

    @abstractmethod
    def question(self, readings: Readings) -> Question:
        """Return the question of readings without a fault so far."""

    def locator(self, readings: Readings) -> Callable[[GasapiError], Path]:
        """Return where in the request an exception of the service is at home."""
        gas: GasSpec | None = readings.get("gas")
        mixture = gas is not None and gas.name is None
        return lambda error: path_of(error, mixture=mixture)


class ComparisonReader(JobReader[StateQuestion]):
    """Reads comparisons, which are asked as a state is."""

    schema = job_schemas.ComparisonSchema()

    def question(self, readings: Readings) -> StateQuestion:
        """Return the state."""
        return readings.state()


class FlowReader(JobReader[FlowQuestion]):
    """Reads flows."""

    schema = job_schemas.FlowSchema()

    def check(self, readings: Readings) -> None:
        """Convert line and design state."""
        readings.pair()
        readings.pair("meter", "design")

    def question(self, readings: Readings) -> FlowQuestion:
        """Return the flow."""
        flow: Measured = readings.get("flow")
        if flow.kind == "reference_volume" and readings.get("reference") is None:
            readings.wrong.append(
                (("reference",), "a flow in reference volume needs the reference condition that it is stated at")
            )
        meter = None
        if readings.get("meter") is not None:
            design = None
            if readings.get("meter", "design") is not None:
                pressure, temperature, _ = readings.pair("meter", "design")
                design = (pressure, temperature)
            meter = FlowMeter(readings.get("meter", "principle"), readings.in_si("density", "meter", "design_density"), design)
        return FlowQuestion(
            readings.state()._replace(input_uncertainty=readings.input_uncertainty()),
            flow.kind,  # type: ignore[arg-type]
            readings.measured(flow, ("flow",)),
            readings.get("reference"),
            meter,
        )


class VesselReader(JobReader[VesselQuestion]):
    """Reads vessels."""

    schema = job_schemas.VesselSchema()

    def check(self, readings: Readings) -> None:
        """Convert both states, the volume and the minimum pressure."""
        readings.pair()
        readings.pair("later")
        readings.in_si("volume", "volume")

    def question(self, readings: Readings) -> VesselQuestion:
        """Return the vessel."""
        state = readings.state()._replace(input_uncertainty=readings.input_uncertainty())
        draw_off = None
        rate: Measured | None = readings.get("draw_off")
        if rate is not None:
            if rate.kind == "reference_volume" and readings.get("reference") is None:
                readings.wrong.append(
                    (("reference",), "a draw-off in reference volume needs the reference condition that it is stated at")
                )
            ambient, assumed = readings.ambient()
            value = rate.rest["minimum_pressure"]
            minimum = readings.units.pressure.to_si(value, ambient)
            if not 0.0 < minimum < state.pressure:
                readings.wrong.append(
                    (
                        ("draw_off", "minimum_pressure"),
                        f"{shown(value)} {readings.units.pressure.name} is {minimum:.7g} Pa; the minimum pressure lies "
                        f"above 0 Pa absolute and below the {state.pressure:.7g} Pa of the vessel",
                    )
                )
            taken = readings.bounded(readings.measured(rate, ("draw_off",)), rate.quantity, ("draw_off", "value"))
            draw_off = DrawOff(rate.kind, taken, minimum, assumed)  # type: ignore[arg-type]
        return VesselQuestion(
            state,
            readings.in_si("volume", "volume"),
            readings.get("reference"),
            None if readings.get("later") is None else readings.state("later"),
            draw_off,
        )


class PressureDecayReader(JobReader[PressureDecayQuestion]):
    """Reads leak tests."""

    schema = job_schemas.PressureDecaySchema()

    def check(self, readings: Readings) -> None:
        """Convert both states, the volume and the duration."""
        readings.pair("start")
        readings.pair("end")
        readings.in_si("volume", "volume")
        readings.in_si("duration", "duration")

    def question(self, readings: Readings) -> PressureDecayQuestion:
        """Return the leak test."""
        correlation = readings.get("correlation")
        limit = readings.get("leak_limit")
        if limit is not None:
            readings.bounded(limit[0], "throughput" if limit[1] else "mass_flow", ("leak_limit", "value"))
        return PressureDecayQuestion(
            readings.state("start"),
            readings.state("end"),
            readings.in_si("volume", "volume"),
            readings.in_si("duration", "duration"),
            readings.input_uncertainty(),
            Correlation() if correlation is None else Correlation(**correlation),
            readings.get("reference"),
            None if limit is None else LeakLimit(*limit),
        )


class FractionFromDensityReader(JobReader[FractionFromDensityQuestion]):
    """Reads densities of blends."""

    schema = job_schemas.FractionFromDensitySchema()

    def check(self, readings: Readings) -> None:
        """Convert the state and the density."""
        readings.pair()
        readings.in_si("density", "density")

    def question(self, readings: Readings) -> FractionFromDensityQuestion:
        """Return the blend."""
        uncertainty = None
        if readings.get("input_uncertainty") is not None:
            uncertainty = DensityUncertainties(
                *(readings.uncertainty(q, "input_uncertainty", q) for q in ("density", "pressure", "temperature"))
            )
        first, second = readings.get("gases")
        substances = readings.get("substances") or ()
        state = readings.state(gas=GasSpec(first))
        return FractionFromDensityQuestion(
            state,
            GasSpec(first, substances=substances),
            GasSpec(second, substances=substances),
            readings.in_si("density", "density"),
            uncertainty,
        )

    def locator(self, readings: Readings) -> Callable[[GasapiError], Path]:
        """Return which of the two gases an exception speaks of."""
        names: tuple[str, str] = readings.get("gases")

        def find(error: GasapiError) -> Path:
            if isinstance(error, SameGas):
                return ("gases",)
            path = path_of(error, mixture=False)
            if path != ("gas",):
                return path if path[:1] != ("gas",) else ("gases",)
            name = getattr(error, "name", None)
            return ("gases", names.index(name)) if name in names else ("gases",)

        return find


class MolarMassReader(JobReader[MolarMassQuestion]):
    """Reads densities of gases that are not known."""

    schema = job_schemas.MolarMassSchema()

    def check(self, readings: Readings) -> None:
        """Convert the state and the density, or the mass and the volume; one of the two is given."""
        readings.pair()
        given = {name for name in ("density", "mass", "volume") if readings.get(name) is not None}
        at_fault = {path[0] for path, _ in readings.wrong if path}
        if not at_fault & {"density", "mass", "volume"} and given not in ({"density"}, {"mass", "volume"}):
            readings.wrong.append((("density",), "give either density, or mass and volume"))
        for name in given:
            readings.in_si(name, name)

    def question(self, readings: Readings) -> MolarMassQuestion:
        """Return the reading."""
        density = readings.in_si("density", "density")
        weighed = density is None
        if weighed:
            density = readings.in_si("mass", "mass") / readings.in_si("volume", "volume")
            readings.bounded(density, "density", ("mass",))
        relative = None
        stated = readings.get("input_uncertainty")
        if stated is not None:
            relative = self._relative(readings, ("mass", "volume") if weighed else ("density",))
        like: GasSpec | None = readings.get("like")
        return MolarMassQuestion(
            readings.state(gas=like),
            density,
            like is not None,
            relative,
            readings.uncertainty("pressure", "input_uncertainty", "pressure"),
            readings.uncertainty("temperature", "input_uncertainty", "temperature"),
        )

    def _relative(self, readings: Readings, measured: tuple[str, ...]) -> float:
        """Return the relative standard uncertainty of a density, of its mass and volume where it was weighed."""
        for name in ("density", "mass", "volume"):
            if name not in measured and readings.get("input_uncertainty", name) is not None:
                readings.wrong.append((("input_uncertainty", name), f"this goes with a reading of {name}, which is not given"))
        squares = [
            (readings.uncertainty(name, "input_uncertainty", name) / readings.in_si(name, name)) ** 2 for name in measured
        ]
        return float(sum(squares) ** 0.5)

    def locator(self, readings: Readings) -> Callable[[GasapiError], Path]:
        """Return where an exception about the gas that it resembles is at home."""
        like: GasSpec | None = readings.get("like")
        mixture = like is not None and like.name is None

        def find(error: GasapiError) -> Path:
            path = path_of(error, mixture=mixture)
            return ("like", *path[1:]) if path[:1] == ("gas",) else path

        return find


class LookupTableAsked(NamedTuple):
    """The question of a table, the form that it is wanted in, and the name that its function block is to have, if any."""

    question: LookupTableQuestion
    form: str
    name: str | None


class LookupTableReader(JobReader[LookupTableAsked]):
    """Reads questions for tables."""

    schema = job_schemas.LookupTableSchema()

    def check(self, readings: Readings) -> None:
        """Convert the ends of both ranges."""
        for place in (0, 1):
            readings.end("pressure", place)
            readings.end("temperature", place)

    def question(self, readings: Readings) -> LookupTableAsked:
        """Return the table."""
        ambient, assumed = readings.ambient()
        units = readings.units
        of_property = readings.get("property")
        low, high = (readings.end("pressure", place) for place in (0, 1))
        cold, warm = (readings.end("temperature", place) for place in (0, 1))
        state = readings.state_at(0.5 * (low + high), 0.5 * (cold + warm), assumed)
        question = LookupTableQuestion(
            state,
            readings.get("pressure"),
            readings.get("temperature"),
            units.pressure,
            units.temperature,
            None if of_property == "compressibility_factor" else units[of_property],
            ambient,
            of_property,
            readings.get("tolerance"),
        )
        return LookupTableAsked(question, readings.get("format"), readings.get("name"))

    def locator(self, readings: Readings) -> Callable[[GasapiError], Path]:
        """Return where in the request an exception of the service is at home."""
        find_other = super().locator(readings)

        def find(error: GasapiError) -> Path:
            if isinstance(error, RangeTooNarrow):
                return (error.quantity,)
            if isinstance(error, ToleranceTooSmall):
                return ("tolerance",)
            return ("pressure",) if isinstance(error, RangeNotOnePhase) else find_other(error)

        return find


class PhaseBoundaryAsked(NamedTuple):
    """The gas at room conditions, and the ambient pressure under gauge pressures of the answer, Pa."""

    state: StateQuestion
    ambient: float


class PhaseBoundaryReader(JobReader[PhaseBoundaryAsked]):
    """Reads questions for phase boundaries."""

    schema = job_schemas.PhaseBoundarySchema()

    def check(self, readings: Readings) -> None:
        """There are no readings."""

    def question(self, readings: Readings) -> PhaseBoundaryAsked:
        """Return the gas."""
        ambient, assumed = readings.ambient()
        return PhaseBoundaryAsked(readings.state_at(_ROOM_PRESSURE, _ROOM_TEMPERATURE, assumed), ambient)
