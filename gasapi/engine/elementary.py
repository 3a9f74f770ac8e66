"""Exponential, logarithm and square root that give the same bits for a float and for an element of an array.

``+ - * /`` and the square root are correctly rounded, so Python and NumPy agree on them to the last bit. ``math.exp`` and
``numpy.exp`` do not agree, nor do ``**`` and any sum over an axis. The engine therefore uses only the five safe
operations, in a written order, and the functions of this module, which are themselves built from the five.

The exponential splits x = (256 k + j) ln2 / 256 + r and takes 2^(j/256) from a table and exp(r) from a polynomial; the
logarithm splits off the exponent and the nearest multiple of 1/128 and takes the rest from the series of the inverse
hyperbolic tangent (both after Tang, ACM Trans. Math. Softw. 15 (1989) 144 and 16 (1990) 378, with tables of our own).
Largest error seen against 40-digit arithmetic, in units in the last place: 1.1 for the exponential, 2 for the logarithm.
"""

from __future__ import annotations

import math
from fractions import Fraction
from typing import TypeVar, cast

import numpy as np
from numpy.typing import NDArray

__all__ = ["Array", "Real", "exp", "exp_block", "log", "log_block", "maximum", "minimum", "power", "sqrt"]

Array = NDArray[np.float64]
"""A one-dimensional block of numbers."""

Real = TypeVar("Real", float, Array)
"""A float or a block: what goes in comes out."""

_STEPS = 256
SCALE = _STEPS / math.log(2.0)
# ln2/256 in two parts: the first holds 28 bits only, so that its product with an index of 18 bits is exact
STEP_HIGH = float.fromhex("0x1.62e42fep-9")
STEP_LOW = float(Fraction("0.693147180559945309417232121458176568075500134360255254120680") / 256 - Fraction(STEP_HIGH))
# adding and taking away this number rounds to the nearest integer, in Python and NumPy alike
ROUND = 6755399441055744.0
# coefficients of r^3 and r^4 in exp(r), beyond 1 + r + r^2/2
EXP_COEFFICIENTS = (0.16666666666666666, 0.041666666666666664)
_C3, _C4 = EXP_COEFFICIENTS
EXP_LOWEST = -708.0
EXP_HIGHEST = 709.0
POWERS_OF_TWO = [math.ldexp(1.0, k) for k in range(-1022, 1024)]
ROOTS_OF_TWO = [2.0 ** (j / _STEPS) for j in range(_STEPS)]
_ROOTS_ARRAY = np.array(ROOTS_OF_TWO)

_LN2_HIGH = STEP_HIGH * 256.0
_LN2_LOW = STEP_LOW * 256.0
_LOG_TABLE = [0.0] + [math.log(c / 128.0) for c in range(1, 257)]
_LOG_TABLE_ARRAY = np.array(_LOG_TABLE)


def exp(x: Real) -> Real:
    """Return e to the power of x, [-]; arguments are held within -708 and 709, so that no result is 0 or infinite.

    :param x: exponent, a float or an array of any shape, [-]
    """
    if type(x) is float:
        x = x if x > EXP_LOWEST else EXP_LOWEST
        x = x if x < EXP_HIGHEST else EXP_HIGHEST
        k = (x * SCALE + ROUND) - ROUND
        r = (x - k * STEP_HIGH) - k * STEP_LOW
        index = int(k)
        root = ROOTS_OF_TWO[index & 255]
        rest = r + r * r * (0.5 + r * (_C3 + r * _C4))
        scale: float = POWERS_OF_TWO[(index >> 8) + 1022]
        return (root + root * rest) * scale
    return cast(Real, exp_block(cast(Array, x)))


def exp_block(x: Array, out: Array | None = None) -> Array:
    """Return e to the power of every element; see ``exp``.

    :param x: exponents, an array of any shape, [-]
    :param out: where the result goes, which may be ``x`` itself; a new array by default
    """
    # fmax and fmin, since they turn NaN into a bound as the comparisons on floats do
    x = np.fmax(x, EXP_LOWEST)
    np.fmin(x, EXP_HIGHEST, out=x)
    k = x * SCALE
    k += ROUND
    k -= ROUND
    index = k.astype(np.int64)
    rest = k * STEP_HIGH
    x -= rest
    k *= STEP_LOW
    x -= k
    rest = np.multiply(x, _C4, out=out)
    rest += _C3
    rest *= x
    rest += 0.5
    np.multiply(x, x, out=k)
    rest *= k
    rest += x
    _ROOTS_ARRAY.take(index & 255, out=k, mode="clip")
    rest *= k
    rest += k
    # 2 to the power of a whole number, by its bits: exponents stay within those of normal numbers
    index >>= 8
    index += 1023
    index <<= 52
    rest *= index.view(np.float64)
    return rest


def log(x: Real) -> Real:
    """Return the natural logarithm of x, [-].

    :param x: a positive, normal number, a float or an array of any shape, [-]
    """
    if type(x) is float:
        mantissa, exponent = math.frexp(x)
        if mantissa < 0.7071067811865476:
            mantissa *= 2.0
            exponent -= 1
        nearest = (mantissa * 128.0 + ROUND) - ROUND
        c = nearest * 0.0078125
        s = (mantissa - c) / (mantissa + c)
        s2 = s * s
        series = 2.0 * s + s * s2 * (0.6666666666666666 + s2 * (0.4 + s2 * 0.2857142857142857))
        return (exponent * _LN2_HIGH + _LOG_TABLE[int(nearest)]) + (series + exponent * _LN2_LOW)
    return cast(Real, log_block(cast(Array, x)))


def log_block(x: Array, out: Array | None = None) -> Array:
    """Return the natural logarithm of every element; see ``log``.

    :param x: positive, normal numbers, an array of any shape, [-]
    :param out: where the result goes, which may be ``x`` itself; a new array by default
    """
    mantissa, exponent = np.frexp(x)
    small = mantissa < 0.7071067811865476
    mantissa = np.where(small, mantissa * 2.0, mantissa)
    power_of_two = (exponent - small).astype(np.float64)
    nearest = (mantissa * 128.0 + ROUND) - ROUND
    c = nearest * 0.0078125
    s = (mantissa - c) / (mantissa + c)
    s2 = s * s
    series = 2.0 * s + s * s2 * (0.6666666666666666 + s2 * (0.4 + s2 * 0.2857142857142857))
    series += power_of_two * _LN2_LOW
    whole = power_of_two * _LN2_HIGH
    whole += _LOG_TABLE_ARRAY.take(nearest.astype(np.int64), mode="clip")
    return np.add(whole, series, out=out)


def power(x: Real, exponent: float) -> Real:
    """Return x to a fixed power, [-], as exp(exponent * log(x)).

    The relative error grows as abs(exponent * log(x)) units in the last place; use products for whole exponents.

    :param x: a positive, normal number, a float or an array of any shape, [-]
    :param exponent: the power, [-]
    """
    return exp(exponent * log(x))


def sqrt(x: Real) -> Real:
    """Return the square root of x, correctly rounded, [-].

    :param x: zero or a positive number, a float or an array of any shape, [-]
    """
    if type(x) is float:
        return math.sqrt(x)
    return cast(Real, np.sqrt(x))


def maximum(x: Real, bound: float) -> Real:
    """Return x, or the bound where x is below it."""
    if type(x) is float:
        return x if x > bound else bound
    return cast(Real, np.maximum(x, bound))


def minimum(x: Real, bound: float) -> Real:
    """Return x, or the bound where x is above it."""
    if type(x) is float:
        return x if x < bound else bound
    return cast(Real, np.minimum(x, bound))
