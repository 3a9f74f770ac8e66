"""Straight-line routines rewritten for blocks: the bits of the plain expressions, in buffers that are used again."""

from __future__ import annotations

from concurrent.futures import ThreadPoolExecutor

import numpy as np
import pytest

from gasapi.engine import elementary
from gasapi.engine.block_code import compile_block

SOURCE = """def routine(x, numbers):
    a, b, c = numbers
    v1 = a * x
    v2 = v1 + b
    v2 += -2.5 * (x - 0.5)
    v2 += v1
    v3 = exp(-0.25 * v2 - 1.0 * v1)
    v4 = log(v3) / (2.0 * 3.0 * x)
    v5 = sqrt(x) * v4 + (0.0 + c * v3)
    v6 = x / x
    return (v5, v2, v6,), (v1, v5,)
"""


def plainly(source, x, numbers):
    """The same lines as Python runs them."""
    space = {"exp": elementary.exp, "log": elementary.log, "sqrt": elementary.sqrt}
    exec(source, space)
    return space["routine"](x, numbers)


@pytest.fixture(scope="module")
def x():
    return np.random.default_rng(4).uniform(0.1, 3.0, 3001)


def test_bits_are_those_of_the_expressions(x):
    """Every result, whatever order the buffers are used in."""
    numbers = (x * 0.3, 1.7, np.sqrt(x))
    expected, found = plainly(SOURCE, x, numbers), compile_block(SOURCE)(x, numbers)
    for group, other in zip(expected, found, strict=True):
        for array, again in zip(group, other, strict=True):
            assert np.array_equal(array, again)


def test_inputs_stay_as_they_were(x):
    """Nothing that came in is written into."""
    numbers = (x * 0.3, x + 1.0, np.sqrt(x))
    copies = [n.copy() for n in (x, *numbers)]
    compile_block(SOURCE)(x, numbers)
    for before, after in zip(copies, (x, *numbers), strict=True):
        assert np.array_equal(before, after)


def test_results_outlive_the_next_call(x):
    """What is handed out lies in no buffer."""
    routine = compile_block(SOURCE)
    (first, *_), _ = routine(x, (x, 1.0, x))
    copy = first.copy()
    routine(x * 2.0, (x, 5.0, x))
    assert np.array_equal(copy, first)


def test_threads_have_buffers_of_their_own(x):
    """Four threads at once, each with its own numbers."""
    routine = compile_block(SOURCE)

    def ask(factor):
        return [routine(x * factor, (x, 1.0, x))[0][0] for _ in range(50)]

    with ThreadPoolExecutor(4) as pool:
        answers = list(pool.map(ask, (1.0, 1.5, 2.0, 2.5)))
    for factor, found in zip((1.0, 1.5, 2.0, 2.5), answers, strict=True):
        expected = plainly(SOURCE, x * factor, (x, 1.0, x))[0][0]
        for array in found:
            assert np.array_equal(expected, array)


@pytest.mark.parametrize("shape", [(0,), (1,), (9000,), (3, 4)])
def test_any_shape(shape):
    """An empty block, one row, more rows than buffers are kept for, and a table."""
    values = np.random.default_rng(1).uniform(0.1, 2.0, shape)
    expected = plainly(SOURCE, values, (values, 1.0, values))[0][0]
    assert np.array_equal(expected, compile_block(SOURCE)(values, (values, 1.0, values))[0][0])


def test_other_lines_are_refused():
    """A line that is no plain assignment."""
    with pytest.raises(ValueError, match="no straight line"):
        compile_block("def routine(x, numbers):\n    a, b = numbers\n    if a: b = x\n    return (b,)\n")
