"""Dew points and critical points against publications."""

import math

import pytest
from CoolProp.CoolProp import PropsSI
from gerg_mixtures import DRY_AIR, gerg_phase, with_water

from gasapi.engine.phase.bubble_dew import BubbleDewLines
from gasapi.engine.phase.mixture import DewKind
from gasapi.gases.equation_files import load_reference

# Enhancement factor of moist air, f = exp(alpha (1 - e/p) + beta (p/e - 1)), alpha = sum A t^i, ln beta = sum B t^i, 273 to
# 373 K and up to 2 MPa: L. Greenspan, J. Res. Natl. Bur. Stand. 80A (1976) 41, after R. W. Hyland, ibid. 79A (1975) 551; the
# ITS-90 coefficients of B. Hardy, Third Int. Symp. on Humidity and Moisture (1998), from memory; they give 1.0040 at 293.15 K
# and 101325 Pa.
_ALPHA = (-1.6302041e-1, 1.8071570e-3, -6.7703064e-6, 8.5813609e-9)
_BETA = (-5.9890467e1, 3.4378043e-1, -7.7326396e-4, 6.3405286e-7)


def _saturated(temperature: float, pressure: float) -> float:
    """Return the mole fraction of water in saturated air, by enhancement factor and IAPWS-95 vapour pressure (CoolProp)."""
    e = PropsSI("P", "T", temperature, "Q", 0, "Water")
    alpha = sum(c * temperature**i for i, c in enumerate(_ALPHA))
    beta = math.exp(sum(c * temperature**i for i, c in enumerate(_BETA)))
    return math.exp(alpha * (1.0 - e / pressure) + beta * (pressure / e - 1.0)) * e / pressure


@pytest.mark.parametrize(("pressure", "tolerance"), [(101325.0, 0.15), (7e5, 0.5), (1e6, 0.7), (2e6, 1.3)])
@pytest.mark.parametrize("temperature", [278.15, 293.15, 313.15])
def test_moist_and_compressed_air(temperature, pressure, tolerance):
    """The pressure dew point of air from its water fraction is the published one within the uncertainty that is stated."""
    verdict = gerg_phase(with_water(DRY_AIR, _saturated(temperature, pressure))).at(400.0, pressure)
    assert verdict.dew_kind == DewKind.WATER
    assert verdict.dew_point_temperature == pytest.approx(temperature, abs=tolerance)
    assert abs(verdict.dew_point_temperature - temperature) < verdict.dew_point_uncertainty


def test_dew_line_of_air():
    """Dew temperatures of dry air follow the published dew line, and its extremes the published ones.

    Lemmon, Jacobsen, Penoncello and Friend, J. Phys. Chem. Ref. Data 29 (2000) 331: maxcondentherm 132.6312 K, maxcondenbar
    3.78502 MPa. GERG-2008 has its own pairs: 0.1 K on the line, 0.3 K and 2 % at the top.
    """
    curve = load_reference("air").bubble_dew
    assert curve is not None
    lines = BubbleDewLines(curve)
    phase = gerg_phase(DRY_AIR)
    for temperature in (80.0, 95.0, 110.0, 120.0):
        dew = phase.at(300.0, float(lines.dew_pressure(temperature))).dew_point_temperature
        assert dew == pytest.approx(temperature, abs=0.15)
    outline = phase.outline()
    assert outline.cricondentherm.temperature == pytest.approx(132.6312, abs=0.3)
    assert outline.cricondenbar.pressure == pytest.approx(3.78502e6, rel=0.02)


def test_critical_line_of_ethane_and_carbon_dioxide():
    """The critical temperature passes a minimum of about 291 K near 0.7 carbon dioxide, below that of either gas.

    Kuenen, Phil. Mag. 44 (1897) 174, and later measurements; value from memory.
    """
    point = gerg_phase({"carbon-dioxide": 0.7, "ethane": 0.3}).critical
    assert point is not None
    assert point.temperature == pytest.approx(291.0, abs=0.7)


def test_water_in_methane():
    """Methane at 310.93 K and 6.895 MPa holds 0.00126 water (60 lb in a million standard cubic feet).

    Olds, Sage and Lacey, Ind. Eng. Chem. 34 (1942) 1223, as in the chart of McKetta and Wehe (1958); value from memory, 5 %.
    """
    verdict = gerg_phase({"methane": 1.0 - 0.00126, "water": 0.00126}).at(400.0, 6.895e6)
    assert verdict.dew_kind == DewKind.WATER
    assert verdict.dew_point_temperature == pytest.approx(310.93, abs=2.5)
    assert abs(verdict.dew_point_temperature - 310.93) < verdict.dew_point_uncertainty
