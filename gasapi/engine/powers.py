"""Powers of one number to a fixed list of exponents, by products and roots wherever the exponents allow it.

A power by ``exp(y log x)`` costs a logarithm and an exponential and loses digits in proportion to ``y log x``. Published
equations use mostly whole, eighth and fortieth exponents, so a whole part is taken by products and a fraction k/40 as a
product of an eighth root and a fifth root; only other fractions fall back on the exponential.
"""

from __future__ import annotations

import math
from collections.abc import Sequence

from gasapi.engine.elementary import Real, exp, log, sqrt

__all__ = ["PowerList"]

_FORTIETH = 1e-12


class PowerList:
    """A plan for x to each of a list of exponents. Immutable.

    :param exponents: the exponents, any real numbers, [-]
    """

    __slots__ = ("_eighths", "_fifths", "_fractions", "_highest", "_lowest", "_steps", "exponents")

    def __init__(self, exponents: Sequence[float]) -> None:
        self.exponents = tuple(float(e) for e in exponents)
        steps: list[tuple[int, int, int, int]] = []
        fractions: list[float] = []
        for exponent in self.exponents:
            whole = math.floor(exponent)
            fraction = exponent - whole
            fortieths = round(fraction * 40.0)
            if abs(fraction * 40.0 - fortieths) < _FORTIETH:
                # fraction = eighth/8 + fifth/5 - carry, since 5 * eighth + 8 * fifth = fortieths (mod 40)
                eighth, fifth = (5 * fortieths) % 8, (2 * fortieths) % 5
                steps.append((whole - (5 * eighth + 8 * fifth - fortieths) // 40, eighth, fifth, -1))
            else:
                if fraction not in fractions:
                    fractions.append(fraction)
                steps.append((whole, 0, 0, fractions.index(fraction)))
        self._steps = tuple(steps)
        self._fractions = tuple(fractions)
        self._highest = max((whole for whole, *_ in steps), default=0)
        self._lowest = min((whole for whole, *_ in steps), default=0)
        self._eighths = any(eighth for _, eighth, _, _ in steps)
        self._fifths = any(fifth for _, _, fifth, _ in steps)

    def of(self, x: Real) -> list[Real]:
        """Return x to each exponent, in the order of the exponents.

        :param x: a positive number, a float or an array of shape (n,), [-]
        """
        one = x / x
        whole: dict[int, Real] = {0: one}
        up = one
        for k in range(1, self._highest + 1):
            up = up * x
            whole[k] = up
        if self._lowest < 0:
            inverse = one / x
            down = one
            for k in range(-1, self._lowest - 1, -1):
                down = down * inverse
                whole[k] = down
        eighth: list[Real] = [one]
        if self._eighths:
            half = sqrt(x)
            quarter = sqrt(half)
            root = sqrt(quarter)
            eighth = [one, root, quarter, quarter * root, half, half * root, half * quarter, half * quarter * root]
        logarithm = log(x) if self._fifths or self._fractions else one
        fifth: list[Real] = [one]
        if self._fifths:
            root = exp(0.2 * logarithm)
            square = root * root
            # one Newton step brings the fifth root to the last digit
            root = root - (root - x / (square * square)) * 0.2
            square = root * root
            fifth = [one, root, square, square * root, square * square]
        fraction = [exp(f * logarithm) for f in self._fractions]
        result: list[Real] = []
        for n, a, b, other in self._steps:
            value = whole[n]
            if a:
                value = value * eighth[a]
            if b:
                value = value * fifth[b]
            if other >= 0:
                value = value * fraction[other]
            result.append(value)
        return result
