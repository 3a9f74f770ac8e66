"""Rewrites a straight-line routine over blocks as calls of NumPy's functions on buffers that are used again.

Written as expressions, a routine of 400 operations makes 400 arrays, which leave the processor's cache and make the system
map and unmap memory: 1.8 ms for 2048 rows where the arithmetic takes 0.3. Here every operation writes into one of a dozen
or two buffers, and a buffer is free again after its number's last use. Operations, operands and their order are those of
the source, so the bits are those of the form for floats.
"""

from __future__ import annotations

import ast
from collections.abc import Callable
from threading import local
from typing import Any, Final, NamedTuple

import numpy as np

from gasapi.engine import elementary

__all__ = ["compile_block"]

# buffers of blocks up to this many rows are kept for the next call: 25 of them, 1.5 MB a thread
_KEPT_ROWS: Final = 8192

_OPERATIONS: Final[dict[type[ast.operator], str]] = {
    ast.Add: "add",
    ast.Sub: "subtract",
    ast.Mult: "multiply",
    ast.Div: "divide",
}
_FOLD: Final[dict[str, Callable[[float, float], float]]] = {
    "add": lambda a, b: a + b,
    "subtract": lambda a, b: a - b,
    "multiply": lambda a, b: a * b,
    "divide": lambda a, b: a / b,
}


class _Step(NamedTuple):
    """One operation on operands: numbers as they are, inputs by name, results of earlier steps by index."""

    function: str
    operands: tuple[float | str | int, ...]


class _Scratch(local):
    """The buffers of one thread, by count, for the last number of rows."""

    def __init__(self) -> None:
        self.rows = -1
        self.buffers: list[Any] = []

    def take(self, count: int, like: Any) -> list[Any]:
        """Return buffers of the shape of an array; what they hold means nothing."""
        if like.ndim != 1 or like.size > _KEPT_ROWS:
            return [np.empty(like.shape) for _ in range(count)]
        if like.size != self.rows:
            self.rows, self.buffers = like.size, []
        held = self.buffers
        while len(held) < count:
            held.append(np.empty(like.size))
        return held if len(held) == count else held[:count]


_SCRATCH: Final = _Scratch()


class _Program:
    """The steps of a routine, in order."""

    def __init__(self, routine: ast.FunctionDef) -> None:
        self.steps: list[_Step] = []
        self.arguments = [a.arg for a in routine.args.args]
        self._names: dict[str, float | str | int] = {name: name for name in self.arguments}
        self.unpack = ""
        self.result: ast.expr | None = None
        for line in routine.body:
            self._read(line)

    def _read(self, line: ast.stmt) -> None:
        match line:
            case ast.Assign([ast.Tuple(names)], ast.Name()):
                self.unpack = ast.unparse(line)
                self._names |= {n.id: n.id for n in names if isinstance(n, ast.Name)}
            case ast.Assign([ast.Name(name)], value):
                self._names[name] = self.value(value)
            case ast.AugAssign(ast.Name(name), operator, value):
                self._names[name] = self._step(_OPERATIONS[type(operator)], self._names[name], self.value(value))
            case ast.Return(value):
                self.result = value
            case _:
                raise ValueError(f"no straight line: {ast.unparse(line)}")

    def value(self, node: ast.expr) -> float | str | int:
        """Return where the value of an expression is found, its steps added."""
        match node:
            case ast.Constant(float() | int() as number):
                return float(number)
            case ast.UnaryOp(ast.USub(), operand):
                constant = self.value(operand)
                assert isinstance(constant, float)
                return -constant
            case ast.Name(name):
                return self._names[name]
            case ast.BinOp(left, operator, right):
                return self._step(_OPERATIONS[type(operator)], self.value(left), self.value(right))
            case ast.Call(ast.Name(function), [argument]):
                return self._step(function, self.value(argument))
        raise ValueError(f"no straight line: {ast.unparse(node)}")

    def _step(self, function: str, *operands: float | str | int) -> float | str | int:
        numbers = [o for o in operands if isinstance(o, float)]
        if len(numbers) == len(operands):
            return _FOLD[function](*numbers)
        self.steps.append(_Step(function, operands))
        return len(self.steps) - 1


def _last_uses(steps: list[_Step]) -> dict[int, int]:
    last: dict[int, int] = {}
    for number, step in enumerate(steps):
        for operand in step.operands:
            if isinstance(operand, int):
                last[operand] = number
    return last


def _results(program: _Program, node: ast.expr) -> set[int]:
    """Return the steps whose values are handed out, and so must not lie in a buffer."""
    found: set[int] = set()
    for part in ast.walk(node):
        if isinstance(part, ast.Name):
            at = program.value(part)
            if isinstance(at, int):
                found.add(at)
    return found


def compile_block(source: str) -> Callable[[Any, Any], Any]:
    """Return a routine over blocks, with the operations of the source in the order of the source.

    :param source: a function of two arguments, the first an array of shape (n,); its lines unpack the second, assign
        expressions of ``+ - * /``, ``exp``, ``log`` and ``sqrt``, add in place, and return names in tuples
    :raises ValueError: a line is none of these
    """
    (routine,) = ast.parse(source).body
    assert isinstance(routine, ast.FunctionDef)
    program = _Program(routine)
    assert program.result is not None
    kept, last = _results(program, program.result), _last_uses(program.steps)
    places: dict[int, str] = {}
    free: list[str] = []
    buffers = 0
    lines = [program.unpack] if program.unpack else []
    body: list[str] = []

    def text(operand: float | str | int) -> str:
        return repr(operand) if isinstance(operand, float) else operand if isinstance(operand, str) else places[operand]

    for number, (function, operands) in enumerate(program.steps):
        written = [text(o) for o in operands]
        # a buffer whose number is used here for the last time may take the result at once
        for operand in {o for o in operands if isinstance(o, int)}:
            if last[operand] == number and operand not in kept:
                free.append(places[operand])
        if number in kept:
            place = f"k{number}"
            body.append(f"{place} = {function}({', '.join(written)})")
        else:
            if free:
                place = free.pop()
            else:
                place = f"b{buffers}"
                buffers += 1
            body.append(f"{function}({', '.join(written)}, {place})")
        places[number] = place
    if buffers:
        names = ", ".join(f"b{i}" for i in range(buffers))
        lines.append(f"{names}, = scratch({buffers}, {program.arguments[0]})")
    returned = _written(program, program.result, places)
    text_of_body = "\n    ".join([*lines, *body, f"return {returned}"])
    space: dict[str, Any] = {
        **{name: getattr(np, name) for name in _FOLD},
        "sqrt": np.sqrt,
        "exp": elementary.exp_block,
        "log": elementary.log_block,
        "scratch": _SCRATCH.take,
    }
    exec(compile(f"def routine({', '.join(program.arguments)}):\n    {text_of_body}\n", "<block routine>", "exec"), space)
    compiled: Callable[[Any, Any], Any] = space["routine"]
    return compiled


def _written(program: _Program, node: ast.expr, places: dict[int, str]) -> str:
    if isinstance(node, ast.Tuple):
        return f"({', '.join(_written(program, part, places) for part in node.elts)},)"
    at = program.value(node)
    return places[at] if isinstance(at, int) else at if isinstance(at, str) else repr(at)
