"""Structured Text run as a controller runs it: parsed by an independent grammar (blark), computed in 32-bit arithmetic.

Only what plain function blocks need: declarations with initial values, assignments, IF, FOR, and expressions over REAL and INT.
INT is 16 bits wide and an index outside its array is an error, as a controller would have it.
"""

from __future__ import annotations

import operator
from collections.abc import Iterator
from typing import Any

import blark.transform as ast
import numpy as np
from blark.parse import parse_source_code

_ARITHMETIC = {"+": operator.add, "-": operator.sub, "*": operator.mul, "/": operator.truediv}
_COMPARISON = {
    "<": operator.lt,
    ">": operator.gt,
    "<=": operator.le,
    ">=": operator.ge,
    "=": operator.eq,
    "<>": operator.ne,
}


class Array:
    """A one-dimensional array from 0."""

    def __init__(self, values: list[np.float32], last: int) -> None:
        assert last + 1 == len(values)
        self.values = values

    def __getitem__(self, index: int) -> np.float32:
        if not (type(index) is int and 0 <= index < len(self.values)):
            raise IndexError(index)
        return self.values[index]


class FunctionBlock:
    """A function block of a source text.

    :raises Exception: the grammar does not take the text
    """

    def __init__(self, source: str) -> None:
        parsed = parse_source_code(source)
        if parsed.exception is not None:
            raise parsed.exception
        (block,) = parsed.transform().items
        assert isinstance(block, ast.FunctionBlock)
        self.name = str(block.name)
        self.inputs: list[str] = []
        self.outputs: list[str] = []
        self.constants: dict[str, Array] = {}
        self.types: dict[str, str] = {}
        for declarations in block.declarations:
            self._declare(declarations)
        self._statements = block.body.statements

    def __call__(self, pressure: float, temperature: float) -> dict[str, Any]:
        """Return the outputs for inputs, which become 32-bit numbers."""
        self._values: dict[str, Any] = dict(self.constants)
        self._values |= {"pressure": np.float32(pressure), "temperature": np.float32(temperature)}
        for name, type_ in self.types.items():
            self._values.setdefault(name, 0 if type_ == "INT" else np.float32(0.0))
        with np.errstate(all="ignore"):
            self._run(self._statements)
        return {name: self._values[name] for name in self.outputs}

    def _declare(self, declarations: Any) -> None:
        kind = type(declarations).__name__
        for item in declarations.items:
            for variable in item.variables:
                name = str(getattr(variable, "name", variable))
                init = item.init
                if isinstance(init, ast.ArrayTypeInitialization):
                    assert "CONSTANT" in str(declarations.attrs)
                    (span,) = init.spec.subranges
                    assert "0" == str(span.start)
                    assert "REAL" == str(init.spec.type)
                    self.constants[name] = Array(list(_numbers(init.value)), int(str(span.stop)))
                    continue
                self.types[name] = str(init.spec.type)
                if kind == "InputDeclarations":
                    self.inputs.append(name)
                elif kind == "OutputDeclarations":
                    self.outputs.append(name)

    def _run(self, statements: Any) -> None:
        for statement in statements.statements if hasattr(statements, "statements") else statements:
            match statement:
                case ast.AssignmentStatement():
                    (target,) = statement.variables
                    self._assign(str(target), self._value(statement.expression))
                case ast.IfStatement():
                    self._branch(statement)
                case ast.ForStatement():
                    self._loop(statement)
                case _:
                    raise NotImplementedError(type(statement).__name__)

    def _branch(self, statement: Any) -> None:
        if self._truth(statement.if_expression):
            self._run(statement.statements)
            return
        for clause in statement.else_ifs:
            if self._truth(clause.if_expression):
                self._run(clause.statements)
                return
        if statement.else_clause is not None:
            self._run(statement.else_clause.statements)

    def _loop(self, statement: Any) -> None:
        assert statement.step is None
        start, stop = self._value(statement.from_), self._value(statement.to)
        for index in range(start, stop + 1):
            self._assign(str(statement.control), index)
            self._run(statement.statements)

    def _assign(self, name: str, value: Any) -> None:
        assert name in self.types
        assert name not in self.inputs
        if self.types[name] == "INT":
            assert type(value) is int
            assert -32768 <= value <= 32767
        else:
            assert type(value) is np.float32
        self._values[name] = value

    def _truth(self, expression: Any) -> bool:
        value = self._value(expression)
        assert isinstance(value, bool | np.bool_)
        return bool(value)

    def _value(self, expression: Any) -> Any:
        match expression:
            case ast.ParenthesizedExpression():
                return self._value(expression.expr)
            case ast.BinaryOperation():
                left, right = self._value(expression.left), self._value(expression.right)
                assert type(left) is type(right)
                sign = str(expression.op)
                return _COMPARISON[sign](left, right) if sign in _COMPARISON else _ARITHMETIC[sign](left, right)
            case ast.UnaryOperation():
                assert str(expression.op).upper() == "NOT"
                return not self._truth(expression.expr)
            case ast.Integer():
                return int(str(expression))
            case ast.Real():
                return np.float32(str(expression))
            case ast.MultiElementVariable():
                (subscripts,) = expression.elements
                (index,) = subscripts.subscripts
                return self._values[str(expression.name)][self._value(index)]
            case ast.SimpleVariable():
                return self._values[str(expression)]
        raise NotImplementedError(type(expression).__name__)


def _numbers(initial: Any) -> Iterator[np.float32]:
    """Yield the numbers of an array, which the grammar may nest as it likes; a sign may be an operator to it."""
    if isinstance(initial, ast.ArrayInitialization):
        for element in initial.elements:
            assert element.count is None
            yield from _numbers(element.element)
    else:
        yield np.float32(str(initial))
