"""Cubics through points against a general numerical library."""

import numpy as np
import pytest
from scipy.interpolate import CubicSpline, PchipInterpolator

from gasapi.engine.phase.spline import hermite, hermite_slope, monotone_slopes, spline_slopes

_X = np.array([0.0, 0.3, 0.35, 1.1, 2.0, 2.2, 3.7])
_FINE = np.linspace(0.0, 3.7, 200)


@pytest.mark.parametrize(("slopes", "library"), [(spline_slopes, CubicSpline), (monotone_slopes, PchipInterpolator)])
@pytest.mark.parametrize("y", [np.exp(_X), np.sin(2.0 * _X), np.array([1.0, 2.0, 2.0, 5.0, 4.0, 9.0, 9.5])])
def test_curves_are_those_of_a_library(slopes, library, y):
    """Values and derivatives between uneven knots are the library's, to rounding."""
    expected = library(_X, y)
    own = slopes(_X, y)
    assert hermite(_FINE, _X, y[:, None], own[:, None])[:, 0] == pytest.approx(expected(_FINE), abs=1e-12)
    assert hermite_slope(_FINE, _X, y[:, None], own[:, None])[:, 0] == pytest.approx(expected(_FINE, 1), abs=1e-11)


@pytest.mark.parametrize("slopes", [spline_slopes, monotone_slopes])
def test_points_have_to_follow_each_other(slopes):
    """Abscissas that do not rise are refused."""
    with pytest.raises(ValueError, match="rise"):
        slopes(np.array([0.0, 1.0, 1.0, 2.0]), np.zeros(4))
