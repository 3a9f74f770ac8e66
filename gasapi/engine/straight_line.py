"""Writes the evaluation of a term layout as straight-line Python and compiles it: once for floats, once for blocks.

A loop over terms costs a float more in interpretation than in arithmetic: 63 microseconds against 30 for a density of an
eleven-component natural gas. Written out, the same sequence of operations serves floats and blocks alike; the two forms
differ in the exponential only, which is written in line for floats and called for blocks, and in that a block's operations
write into buffers (see ``block_code``). So both give the same bits, and no form is maintained by hand. Sources hold no data
but exponents and shapes; coefficients come as arguments.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from functools import cached_property
from typing import Any, Final, NamedTuple

from gasapi.engine import elementary
from gasapi.engine.block_code import compile_block

__all__ = ["Group", "Routine", "Routines", "TauFactor", "Writer", "compile_float"]

Routine = Callable[[Any, Any], Any]

_EPSILON: Final = 1e-12
# GERG-2008's departure functions have nine bells about delta = 0.5; 7 exponentials fewer are an eighth of the time
_PRODUCTS_FROM: Final = 3


class TauFactor(NamedTuple):
    """B(tau) = tau^exponent exp(E): E is 0, -g tau^l (damped: g, l), -beta (tau - gamma)^2 (gaussian: beta, gamma)
    or 1/(beta (tau - gamma)^2 + b) (reciprocal: beta, gamma, b)."""

    exponent: float
    kind: str
    parameters: tuple[float, ...]


class Group(NamedTuple):
    """The slots that share F(delta): 1, exp(-g delta^l) (damped: g, l) or
    exp(-eta (delta - epsilon)^2 - beta (delta - gamma)) (gaussian: eta, epsilon, beta, gamma); members are (slot, d)."""

    kind: str
    parameters: tuple[float, ...]
    members: tuple[tuple[int, float], ...]


class Routines:
    """The routines of a layout, each written and compiled (1 to 5 ms) when it is first used.

    ``temper`` and ``temper_slopes`` take (tau, amplitudes), the others (delta, coefficients of the slots); each exists for
    floats and for blocks. Two threads may both compile a routine; they get the same one in all but identity.

    :param taus: the distinct factors of tau
    :param groups: the slots by factor of delta
    :param cells: (slot, factor of tau) of each merged term, in the order of the amplitudes
    """

    def __init__(self, taus: Sequence[TauFactor], groups: Sequence[Group], cells: Sequence[tuple[int, int]]) -> None:
        self._taus = tuple(taus)
        self._groups = tuple(groups)
        self._cells = tuple(cells)
        self._slots = 1 + max(slot for slot, _ in cells)

    def _temper(self, inline: bool, slopes: bool) -> Routine:
        source = _write_temper(inline, self._taus, self._cells, slopes)
        return compile_float(source) if inline else compile_block(source)

    @cached_property
    def temper_float(self) -> Routine:
        """Coefficients of the slots at a temperature."""
        return self._temper(inline=True, slopes=False)

    @cached_property
    def temper_block(self) -> Routine:
        """Coefficients of the slots at temperatures."""
        return self._temper(inline=False, slopes=False)

    @cached_property
    def temper_slopes_float(self) -> Routine:
        """Coefficients of the slots, and tau times their slopes in tau."""
        return self._temper(inline=True, slopes=True)

    @cached_property
    def temper_slopes_block(self) -> Routine:
        """Coefficients of the slots at temperatures, and tau times their slopes in tau."""
        return self._temper(inline=False, slopes=True)

    @cached_property
    def euler_float(self) -> Routine:
        """First to third Euler derivative at a density."""
        return compile_float(_write_euler(True, self._groups, self._slots))

    @cached_property
    def euler_block(self) -> Routine:
        """First to third Euler derivative at densities."""
        return compile_block(_write_euler(False, self._groups, self._slots))

    @cached_property
    def first_float(self) -> Routine:
        """First Euler derivative at a density."""
        return compile_float(_write_first(True, self._groups, self._slots))

    @cached_property
    def first_block(self) -> Routine:
        """First Euler derivative at densities."""
        return compile_block(_write_first(False, self._groups, self._slots))

    @cached_property
    def value_float(self) -> Routine:
        """The energy at a density."""
        return compile_float(_write_value(True, self._groups, self._slots))

    @cached_property
    def value_block(self) -> Routine:
        """The energy at densities."""
        return compile_block(_write_value(False, self._groups, self._slots))


class Writer:
    """Lines of one function, with powers and exponentials written once each."""

    def __init__(self, inline: bool, centres: frozenset[float] = frozenset()) -> None:
        self.lines: list[str] = []
        self.centres = centres
        self._inline = inline
        self._names: dict[tuple[str, object], str] = {}
        self._count = 0

    def name(self) -> str:
        """Return a name that is not in use."""
        self._count += 1
        return f"v{self._count}"

    def put(self, expression: str) -> str:
        """Write an expression, and return the name of its value."""
        name = self.name()
        self.lines.append(f"{name} = {expression}")
        return name

    def once(self, key: tuple[str, object], write: Callable[[], str]) -> str:
        """Return the name of what a key stands for, written when it is first asked for."""
        if key not in self._names:
            self._names[key] = write()
        return self._names[key]

    def unpack(self, prefix: str, count: int, source: str) -> None:
        """Write the unpacking of a tuple into numbered names."""
        names = ", ".join(f"{prefix}{i}" for i in range(count))
        self.lines.append(f"{names}, = {source}" if count == 1 else f"{names} = {source}")

    def exponential(self, argument: str) -> str:
        """Write e to the power of an expression; the float form repeats ``elementary.exp`` line by line."""
        if not self._inline:
            return self.put(f"exp({argument})")
        x = self.put(argument)
        self.lines.append(f"if not LOWEST < {x} < HIGHEST: {x} = HIGHEST if {x} >= HIGHEST else LOWEST")
        k = self.put(f"({x} * {elementary.SCALE!r} + {elementary.ROUND!r}) - {elementary.ROUND!r}")
        r = self.put(f"({x} - {k} * {elementary.STEP_HIGH!r}) - {k} * {elementary.STEP_LOW!r}")
        index = self.put(f"int({k})")
        root = self.put(f"ROOTS[{index} & 255]")
        c3, c4 = elementary.EXP_COEFFICIENTS
        rest = self.put(f"{r} + {r} * {r} * (0.5 + {r} * ({c3!r} + {r} * {c4!r}))")
        return self.put(f"({root} + {root} * {rest}) * POWERS_OF_TWO[({index} >> 8) + 1022]")

    def logarithm(self, x: str) -> str:
        """Write the natural logarithm of a name."""
        return self.once(("log", x), lambda: self.put(f"log({x})"))

    def whole_power(self, x: str, n: int) -> str:
        """Write x to a whole power by halving the exponent."""
        if n == 1:
            return x
        if n == 0:
            return self.once((x, 0), lambda: self.put(f"{x} / {x}"))
        if n < 0:
            inverse = self.once((x, -1), lambda: self.put(f"1.0 / {x}"))
            if n == -1:
                return inverse
            half = -n // 2
            return self.once((x, n), lambda: self.put(f"{self.whole_power(x, -half)} * {self.whole_power(x, n + half)}"))
        half = n // 2
        return self.once((x, n), lambda: self.put(f"{self.whole_power(x, half)} * {self.whole_power(x, n - half)}"))

    def power(self, x: str, exponent: float) -> str:
        """Write x to any power: whole part by products, k/40 by eighth and fifth roots, other fractions by exp and log."""
        whole = math.floor(exponent)
        fraction = exponent - whole
        fortieths = round(fraction * 40.0)
        factors: list[str] = []
        if abs(fraction * 40.0 - fortieths) < _EPSILON:
            # fraction = eighths/8 + fifths/5 - carry, since 5 * eighths + 8 * fifths = fortieths (mod 40)
            eighths, fifths = (5 * fortieths) % 8, (2 * fortieths) % 5
            whole -= (5 * eighths + 8 * fifths - fortieths) // 40
            for part in (4, 2, 1):
                if eighths & part:
                    factors.append(self._root_of_two(x, part))
            if fifths:
                factors.append(self.whole_power(self._fifth_root(x), fifths))
        else:
            factors.append(self.once((x, fraction), lambda: self.exponential(f"{fraction!r} * {self.logarithm(x)}")))
        if whole or not factors:
            factors.insert(0, self.whole_power(x, whole))
        if len(factors) == 1:
            return factors[0]
        return self.once((x, exponent), lambda: self.put(" * ".join(factors)))

    def _root_of_two(self, x: str, part: int) -> str:
        """Write the square root (4), the fourth root (2) or the eighth root (1)."""
        of = x if part == 4 else self._root_of_two(x, part * 2)
        return self.once((x, f"root {part}"), lambda: self.put(f"sqrt({of})"))

    def _fifth_root(self, x: str) -> str:
        def write() -> str:
            guess = self.exponential(f"0.2 * {self.logarithm(x)}")
            square = self.put(f"{guess} * {guess}")
            # one Newton step brings the fifth root to the last digit
            return self.put(f"{guess} - ({guess} - {x} / ({square} * {square})) * 0.2")

        return self.once((x, "fifth root"), write)

    def total(self, parts: Sequence[str]) -> str:
        """Write a sum, added from the left."""
        if len(parts) == 1:
            return parts[0]
        name = self.put(f"{parts[0]} + {parts[1]}")
        # the name is this sum's own from here on, so that a block may be added to in place
        self.lines.extend(f"{name} += {part}" for part in parts[2:])
        return name

    def source(self, arguments: str, result: str) -> str:
        """Return the source of the function."""
        body = "\n    ".join([*self.lines, f"return {result}"])
        return f"def routine({arguments}):\n    {body}\n"


def _tuple(names: Sequence[str]) -> str:
    return f"({', '.join(names)},)"


def _write_basis(w: Writer, taus: Sequence[TauFactor]) -> list[str]:
    basis = []
    for exponent, kind, p in taus:
        power = w.power("tau", exponent)
        if kind:
            factor = w.once((kind, p), lambda kind=kind, p=p: w.exponential(_tau_exponent(w, kind, p)))  # type: ignore[misc]
            power = w.put(f"{power} * {factor}")
        basis.append(power)
    return basis


def _tau_exponent(w: Writer, kind: str, p: tuple[float, ...]) -> str:
    if kind == "damped":
        return f"{-p[0]!r} * {w.power('tau', p[1])}"
    offset = w.once(("tau offset", p[1]), lambda: w.put(f"tau - {p[1]!r}"))
    if kind == "gaussian":
        return f"{-p[0]!r} * ({offset} * {offset})"
    return f"1.0 / ({p[0]!r} * ({offset} * {offset}) + {p[2]!r})"


def _tau_growth(w: Writer, factor: TauFactor) -> str:
    """Write tau dB/dtau over B: the exponent plus tau times the slope of E."""
    exponent, kind, p = factor
    if not kind:
        return repr(exponent)
    if kind == "damped":
        return f"({exponent!r} - {p[0] * p[1]!r} * {w.power('tau', p[1])})"
    offset = w.once(("tau offset", p[1]), lambda: w.put(f"tau - {p[1]!r}"))
    if kind == "gaussian":
        return f"({exponent!r} - {2.0 * p[0]!r} * {offset} * tau)"
    width = w.once(("width", p), lambda: w.put(f"{p[0]!r} * ({offset} * {offset}) + {p[2]!r}"))
    return f"({exponent!r} - {2.0 * p[0]!r} * {offset} * tau / ({width} * {width}))"


def _write_slots(w: Writer, cells: Sequence[tuple[int, int]], basis: Sequence[str]) -> list[str]:
    slots: dict[int, list[str]] = {}
    for entry, (slot, b) in enumerate(cells):
        slots.setdefault(slot, []).append(f"a{entry} * {basis[b]}")
    result = []
    for slot in sorted(slots):
        parts = slots[slot]
        first = w.put(parts[0] if len(parts) == 1 else f"{parts[0]} + {parts[1]}")
        w.lines.extend(f"{first} += {part}" for part in parts[2:])
        result.append(first)
    return result


def _write_temper(inline: bool, taus: Sequence[TauFactor], cells: Sequence[tuple[int, int]], slopes: bool) -> str:
    w = Writer(inline)
    w.unpack("a", len(cells), "amplitudes")
    basis = _write_basis(w, taus)
    values = _tuple(_write_slots(w, cells, basis))
    if not slopes:
        return w.source("tau, amplitudes", values)
    growth = [w.put(f"{_tau_growth(w, tau)} * {b}") for tau, b in zip(taus, basis, strict=True)]
    return w.source("tau, amplitudes", f"{values}, {_tuple(_write_slots(w, cells, growth))}")


class _Sums(NamedTuple):
    """Names of the sums of c d^j delta^d over a group, j = 0, 1, ..., and of its factor and the derivatives of ln F."""

    sums: list[str]
    factor: str
    u: str
    v: str
    w: str


def _write_group(w: Writer, group: Group, orders: Sequence[int], derivatives: int) -> _Sums:
    """Write a group's sums of the given orders, its factor F, u = D ln F, v = D u and w = D v (as many as asked)."""
    parts: dict[int, list[str]] = {order: [] for order in orders}
    highest = max(orders)
    for slot, d in group.members:
        term = w.put(f"c{slot} * {w.power('delta', d)}") if d else f"c{slot}"
        for order in range(highest + 1):
            if order and d != 1.0:
                term = w.put(f"{term} * {d!r}") if d else "0.0"
            if order in parts and term != "0.0":
                parts[order].append(term)
    sums = [w.total(parts[order]) if parts[order] else "0.0" for order in orders]
    if not group.kind:
        return _Sums(sums, "", "", "", "")
    if group.kind == "damped":
        g, power = group.parameters
        exponent = w.put(f"{-g!r} * {w.power('delta', power)}")
        factor = w.exponential(exponent)
        names = [""] * 3
        last = exponent
        for i in range(derivatives):
            last = w.put(f"{power!r} * {last}") if power != 1.0 else last
            names[i] = last
        return _Sums(sums, factor, *names)
    eta, epsilon, beta, gamma = group.parameters
    offset = w.once(("offset", epsilon), lambda: w.put(f"delta - {epsilon!r}"))
    square = w.once(("offset square", epsilon), lambda: w.put(f"{offset} * {offset}"))
    if epsilon in w.centres and _is_product(group):
        factor = _bell_product(w, eta, beta, offset, square, epsilon)
    else:
        text = f"{-eta!r} * {square}" if eta else ""
        if beta:
            slant = w.once(("offset", gamma), lambda: w.put(f"delta - {gamma!r}"))
            text += f" - {beta!r} * {slant}" if text else f"{-beta!r} * {slant}"
        factor = w.exponential(text)
    a, b = -2.0 * eta, 2.0 * eta * epsilon - beta
    delta_square = w.power("delta", 2.0)
    quadratic = w.put(f"{a!r} * {delta_square}") if a else "0.0"
    linear = w.put(f"{b!r} * delta") if b else "0.0"
    names = [f"({quadratic} + {linear})", f"(2.0 * {quadratic} + {linear})", f"(4.0 * {quadratic} + {linear})"]
    return _Sums(sums, factor, *(w.put(n) if i < derivatives else "" for i, n in enumerate(names)))


def _is_product(group: Group) -> bool:
    """Return whether a bell is a product of low powers of exp(-(delta - epsilon)^2/8) and exp(-(delta - epsilon)/4)."""
    if group.kind != "gaussian":
        return False
    eta, epsilon, beta, gamma = group.parameters
    return epsilon == gamma and 0.0 <= eta <= 1.0 and 0.0 <= beta <= 4.0 and 8.0 * eta % 1.0 == 4.0 * beta % 1.0 == 0.0


def _centres(groups: Sequence[Group]) -> frozenset[float]:
    """Return the centres that so many bells share that products cost less than an exponential each."""
    found = [g.parameters[1] for g in groups if _is_product(g)]
    return frozenset(centre for centre in found if found.count(centre) >= _PRODUCTS_FROM)


def _bell_product(w: Writer, eta: float, beta: float, offset: str, square: str, centre: float) -> str:
    factors = []
    if eta:
        bell = w.once(("bell", centre), lambda: w.exponential(f"-0.125 * {square}"))
        factors.append(w.whole_power(bell, round(8.0 * eta)))
    if beta:
        slant = w.once(("slant", centre), lambda: w.exponential(f"-0.25 * {offset}"))
        factors.append(w.whole_power(slant, round(4.0 * beta)))
    return factors[0] if len(factors) == 1 else w.put(f"{factors[0]} * {factors[1]}")


def _write_euler(inline: bool, groups: Sequence[Group], slots: int) -> str:
    w = Writer(inline, _centres(groups))
    w.unpack("c", slots, "coefficients")
    first, second, third = [], [], []
    for group in groups:
        if not group.kind:
            (s1, s2, s3), *_ = _write_group(w, group, (1, 2, 3), 0)
            first.append(s1)
            second.append(s2)
            third.append(s3)
            continue
        (s0, s1, s2, s3), factor, u, v, last = _write_group(w, group, (0, 1, 2, 3), 3)
        q = w.put(f"{u} * {u} + {v}")
        first.append(w.put(f"{factor} * ({s1} + {u} * {s0})"))
        second.append(w.put(f"{factor} * ({s2} + 2.0 * {u} * {s1} + {q} * {s0})"))
        third.append(
            w.put(f"{factor} * ({s3} + 3.0 * {u} * {s2} + 3.0 * {q} * {s1} + ({u} * ({q} + 2.0 * {v}) + {last}) * {s0})")
        )
    return w.source("delta, coefficients", _tuple([w.total(first), w.total(second), w.total(third)]))


def _write_first(inline: bool, groups: Sequence[Group], slots: int) -> str:
    w = Writer(inline, _centres(groups))
    w.unpack("c", slots, "coefficients")
    parts = []
    for group in groups:
        if not group.kind:
            (s1,), *_ = _write_group(w, group, (1,), 0)
            parts.append(s1)
            continue
        (s0, s1), factor, u, *_ = _write_group(w, group, (0, 1), 1)
        parts.append(w.put(f"{factor} * ({s1} + {u} * {s0})"))
    return w.source("delta, coefficients", w.total(parts))


def _write_value(inline: bool, groups: Sequence[Group], slots: int) -> str:
    w = Writer(inline, _centres(groups))
    w.unpack("c", slots, "coefficients")
    parts = []
    for group in groups:
        (s0,), factor, *_ = _write_group(w, group, (0,), 0)
        parts.append(w.put(f"{factor} * {s0}") if factor else s0)
    return w.source("delta, coefficients", w.total(parts))


_NAMES: Final = {
    "log": elementary.log,
    "sqrt": elementary.sqrt,
    "LOWEST": elementary.EXP_LOWEST,
    "HIGHEST": elementary.EXP_HIGHEST,
    "ROOTS": elementary.ROOTS_OF_TWO,
    "POWERS_OF_TWO": elementary.POWERS_OF_TWO,
}


def compile_float(source: str) -> Routine:
    """Return a routine over floats from its source."""
    space: dict[str, Any] = dict(_NAMES)
    exec(compile(source, "<isotherm routine>", "exec"), space)
    routine: Routine = space["routine"]
    return routine
