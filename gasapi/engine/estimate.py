"""A first guess of the density: the Peng-Robinson equation, solved by a fixed number of steps.

A guess only has to be near; the same steps on floats and blocks keep the bits of what follows equal. Peng and Robinson,
Ind. Eng. Chem. Fundam. 15 (1976) 59, eqs. 4 to 18.
"""

from __future__ import annotations

from gasapi.engine.elementary import Real, maximum, minimum, sqrt

__all__ = ["DensityEstimate"]

_OMEGA_A = 0.45723553
_OMEGA_B = 0.07779607
# a fourth step brings the cubic's own root no nearer to the equation that is solved
_STEPS = 3


class DensityEstimate:
    """A Peng-Robinson density for one (pseudo-)critical point. Immutable.

    :param gas_constant: J/mol/K
    :param critical_temperature: K
    :param critical_pressure: Pa
    :param acentric_factor: [-]
    """

    __slots__ = ("_a", "_b", "_m", "_r", "_tc")

    def __init__(
        self, gas_constant: float, critical_temperature: float, critical_pressure: float, acentric_factor: float
    ) -> None:
        rt = gas_constant * critical_temperature
        self._r = gas_constant
        self._tc = critical_temperature
        self._a = _OMEGA_A * rt * rt / critical_pressure
        self._b = _OMEGA_B * rt / critical_pressure
        self._m = 0.37464 + acentric_factor * (1.54226 - 0.26992 * acentric_factor)

    def _reduced(self, temperature: Real, pressure: Real) -> tuple[Real, Real, Real]:
        rt = self._r * temperature
        alpha = maximum(1.0 + self._m * (1.0 - sqrt(temperature / self._tc)), 0.0)
        scale = pressure / rt
        return self._a * (alpha * alpha) * scale / rt, self._b * scale, scale

    def gas(self, temperature: Real, pressure: Real) -> Real:
        """Return an estimate from the largest root, mol/m3.

        :param temperature: K, a float or an array of shape (n,)
        :param pressure: Pa, of the same kind and shape
        """
        a, b, scale = self._reduced(temperature, pressure)
        # p < R T / (v - b) bounds the root from above; the cubic bends upward there
        z = 1.0 + b
        return scale / _fall(a, b, z)

    def liquid(self, temperature: Real, pressure: Real) -> Real:
        """Return an estimate from the smallest root, mol/m3.

        :param temperature: K, a float or an array of shape (n,)
        :param pressure: Pa, of the same kind and shape
        """
        a, b, scale = self._reduced(temperature, pressure)
        return scale / _fall(a, b, 1.0001 * b)


def _fall(a: Real, b: Real, z: Real) -> Real:
    """Take Newton steps on the cubic in Z from an end of the isotherm, whence they cannot pass the first root."""
    c2 = b - 1.0
    c1 = a - b * (2.0 + 3.0 * b)
    c0 = b * (b + b * b - a)
    for _ in range(_STEPS):
        f = ((z + c2) * z + c1) * z + c0
        slope = (3.0 * z + 2.0 * c2) * z + c1
        half = 3.0 * z + c2
        # Halley's step, held between close packing and the bound from above where the start was on the wrong side
        z = z - f * slope / maximum(slope * slope - f * half, 1e-300)
        z = b + maximum(minimum(z - b, 1.0), 0.0)
    return b + b * maximum(z / b - 1.0, 0.01)
