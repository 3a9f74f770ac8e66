"""The critical point that an equation itself has: where slope and curvature of the isotherm vanish."""

from __future__ import annotations

from typing import Final

from gasapi.engine.helmholtz import TermSum

__all__ = ["find_critical_point"]

_MOST_STEPS: Final = 40
_ENOUGH: Final = 1e-12
_NUDGE: Final = 1e-6


def find_critical_point(energy: TermSum, tau: float, delta: float) -> tuple[float, float]:
    """Return tau and delta at which 1 + D a + D^2 a and D^2 a + D^3 a are zero (D the Euler derivative of alpha_r).

    Newton's method in two variables, the Jacobian by central differences; steps are held to 2 %.

    :param energy: residual energy without non-analytic terms
    :param tau: first guess of the inverse reduced temperature, [-]
    :param delta: first guess of the reduced density, [-]
    :raises ArithmeticError: where no critical point is found near the guess
    """

    def faults(t: float, d: float) -> tuple[float, float]:
        first, second, third = energy.isotherm(t).euler(d)
        return 1.0 + first + second, second + third

    for _ in range(_MOST_STEPS):
        f, g = faults(tau, delta)
        f_up, g_up = faults(tau * (1.0 + _NUDGE), delta)
        f_down, g_down = faults(tau * (1.0 - _NUDGE), delta)
        f_dense, g_dense = faults(tau, delta * (1.0 + _NUDGE))
        f_thin, g_thin = faults(tau, delta * (1.0 - _NUDGE))
        a, b = (f_up - f_down) / (2.0 * _NUDGE), (f_dense - f_thin) / (2.0 * _NUDGE)
        c, d = (g_up - g_down) / (2.0 * _NUDGE), (g_dense - g_thin) / (2.0 * _NUDGE)
        determinant = a * d - b * c
        if determinant == 0.0:
            break
        warm, dense = (f * d - g * b) / determinant, (g * a - f * c) / determinant
        scale = max(abs(warm), abs(dense)) / 0.02
        if scale > 1.0:
            warm, dense = warm / scale, dense / scale
        tau *= 1.0 - warm
        delta *= 1.0 - dense
        if max(abs(warm), abs(dense)) < _ENOUGH or (f == 0.0 and g == 0.0):
            return tau, delta
        if scale < 1e-8 and max(abs(warm), abs(dense)) < 1e-9:
            return tau, delta
    raise ArithmeticError("no critical point near the first guess")
