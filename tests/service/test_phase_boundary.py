"""Phase boundaries: against CoolProp, published named points, and the service's own verdict beside the line."""

from __future__ import annotations

import pytest
from CoolProp.CoolProp import PropsSI

from gasapi.errors import ModelCannotServe
from gasapi.service.phase_boundary import answer_phase_boundary
from gasapi.service.questions import GasSpec, StateQuestion

# invented
RICH = {"methane": 0.85, "ethane": 0.08, "n-butane": 0.07}


def boundary_of(context, gas, model="auto"):
    spec = GasSpec(gas) if isinstance(gas, str) else GasSpec(None, tuple(gas.items()))
    return answer_phase_boundary(context, StateQuestion(spec, 101325.0, 293.15, model))


@pytest.mark.parametrize(
    ("gas", "other"), [("nitrogen", "Nitrogen"), ("carbon-dioxide", "CarbonDioxide"), ("propane", "Propane")]
)
def test_saturation_curves_are_those_of_an_independent_library(context, gas, other):
    """The vapour pressure at every point of the curve but the last, where libraries differ in how they end it."""
    line = boundary_of(context, gas).boundary.line
    assert len(line.temperature) > 100
    for t, p in list(zip(line.temperature, line.pressure, strict=True))[:-1:10]:
        # below 1 Pa the other library's own equilibrium is off by more
        if p > 1.0:
            assert PropsSI("P", "T", t, "Q", 1, other) == pytest.approx(p, rel=2e-6)


def test_named_points_of_nitrogen(context):
    """Span et al. (2000): critical point 126.192 K, 3.3958 MPa, 313.3 kg/m3; triple point 63.151 K, 12.52 kPa."""
    points = dict(boundary_of(context, "nitrogen").boundary.points)
    assert (126.192, 3.3958e6, 313.3) == pytest.approx(points["critical"], rel=1e-4)
    assert (63.151, 12520.0) == pytest.approx(points["triple"][:2], rel=1e-3)


def test_the_curve_runs_from_the_triple_to_the_critical_point(context):
    """Its ends are the named points."""
    boundary = boundary_of(context, "carbon-dioxide").boundary
    points = dict(boundary.points)
    line = boundary.line
    assert points["triple"][:2] == (line.temperature[0], line.pressure[0])
    assert points["critical"][:2] == pytest.approx((line.temperature[-1], line.pressure[-1]), rel=1e-9)
    assert sorted(line.temperature) == list(line.temperature)
    assert sorted(line.pressure) == list(line.pressure)


def test_air_has_a_dew_and_a_bubble_line(context):
    """Up along the dew line, back along the bubble line, which lies at the higher pressure."""
    line = boundary_of(context, "air").boundary.line
    top = line.temperature.index(max(line.temperature))
    assert 132.63 == pytest.approx(line.temperature[top], abs=0.1)
    dew = dict(zip(line.temperature[: top + 1], line.pressure[: top + 1], strict=True))
    bubble = dict(zip(line.temperature[top + 1 :], line.pressure[top + 1 :], strict=True))
    for t in list(bubble)[5::10]:
        assert dew[t] < bubble[t]


def test_the_service_sees_two_phases_inside_the_line_of_a_mixture(context, ask):
    """Half a kelvin beside every dew point between the cricondentherm and 5 bar: gas on one side, two phases on the other."""
    answer = boundary_of(context, RICH)
    assert ("gerg-2008", "good", True) == (answer.state.model.id, answer.state.quality.level, answer.boundary.complete)
    line, points = answer.boundary.line, dict(answer.boundary.points)
    checked = 0
    for t, p in zip(line.temperature, line.pressure, strict=True):
        if 5e5 < p < points["cricondentherm"][1] and t > 250.0:
            assert "gas" == ask(RICH, t + 0.5, p).phase.region
            assert "two-phase" == ask(RICH, t - 0.5, p).phase.region
            checked += 1
    assert checked >= 5


def test_named_points_of_a_mixture_are_extremes_of_its_line(context):
    """No point of the line is warmer than the cricondentherm or at a higher pressure than the cricondenbar."""
    boundary = boundary_of(context, RICH).boundary
    points = dict(boundary.points)
    assert max(boundary.line.temperature) == pytest.approx(points["cricondentherm"][0], abs=0.5)
    assert max(boundary.line.temperature) <= points["cricondentherm"][0] + 1e-6
    assert max(boundary.line.pressure) <= points["cricondenbar"][1] * (1.0 + 1e-9)
    assert points["critical"][1] <= points["cricondenbar"][1]


def test_a_wet_gas_has_a_water_line_of_its_own(context):
    """0.1 % of water at 50 bar has 5 kPa, the vapour pressure at 33 degC; the gas holds more, so that it condenses below."""
    water = boundary_of(context, {"methane": 0.949, "ethane": 0.05, "water": 0.001}).boundary.water
    assert len(water.temperature) > 10
    near = min(zip(water.pressure, water.temperature, strict=True), key=lambda point: abs(point[0] - 50e5))
    assert 278.0 < near[1] < 307.0


def test_an_open_boundary_is_uncertain(context):
    """Hydrogen with nitrogen: the line goes on to pressures that nobody has."""
    answer = boundary_of(context, {"hydrogen": 0.5, "nitrogen": 0.5})
    assert "critical" not in dict(answer.boundary.points)
    assert ("uncertain", False) == (answer.state.quality.level, answer.boundary.complete)


def test_a_boundary_below_the_range_of_the_equation_is_told_and_not_drawn(context):
    """Hydrogen with helium: null, bad, and why."""
    answer = boundary_of(context, {"hydrogen": 0.5, "helium": 0.5})
    assert None is answer.boundary
    assert ("bad", ("outside_limits",)) == (answer.state.quality.level, answer.state.quality.reasons)
    assert ["boundary_not_traced"] == [warning.code for warning in answer.state.phase.warnings]


def test_no_line_without_an_equation_that_has_one(context):
    """An equation that cannot serve the gas is refused by name."""
    with pytest.raises(ModelCannotServe):
        boundary_of(context, "silane", "gerg-2008")
