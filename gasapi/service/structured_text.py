"""A lookup table as a function block in IEC 61131-3 Structured Text, for controllers that cannot call a service.

Plain syntax of the standard alone: REAL and INT, one-dimensional constant arrays, IF and FOR. Every index comes out of a loop
with fixed bounds, so that none can leave its array whatever comes in. A NaN fails every comparison, and is told by that.
Only ASCII, since compilers differ beyond it.
"""

from __future__ import annotations

import re
import textwrap
import unicodedata
from collections.abc import Iterable
from typing import Final, NamedTuple

import numpy as np

from gasapi.service.bilinear import Float32
from gasapi.service.lookup_table import LookupTable

__all__ = ["BAD_INPUT", "CLAMPED", "IN_RANGE", "RESERVED", "BlockText", "block_name", "function_block", "real"]

_RESERVED = """
    array at begin bool by byte case constant date dint do dword else elsif end exit false fb finally for from function
    function_block if int lint lreal lword mod not of on or output pressure pressures program real repeat resource
    retain return sint status string struct table_values temperature temperatures then time to tod true type udint uint
    ulint until usint var var_input var_output while with word wstring xor and density compressibility_factor
    molar_volume i j k p t u v low high abs add cal div eq exp ge gt le ld ln log lt max min mul ne r s sel sin cos tan
    sqrt st sub
"""
RESERVED: Final = frozenset(_RESERVED.split())
"""Words that may not name a function block, in lower case: keywords of the standard, and the names inside the block."""

IN_RANGE: Final = 0
CLAMPED: Final = 1
BAD_INPUT: Final = 2

_WIDTH: Final = 100
_LONGEST_NAME: Final = 32


class BlockText(NamedTuple):
    """What the header of a function block says; ``units`` are those of pressure, temperature and the property."""

    name: str
    property: str
    gas: str
    units: tuple[str, str, str]
    date: str
    model: str
    source: str
    quality: str
    version: str
    data: str
    uncertainty: float | None
    cautions: tuple[str, ...]
    ambient_pressure: float | None = None


def block_name(property: str, gas: str) -> str:
    """Return an identifier of IEC 61131-3 made of a property and a gas, at most 32 characters long."""
    words = re.sub(r"[^A-Za-z0-9]+", "_", _ascii(f"{property} {gas}")).strip("_")
    return words[:_LONGEST_NAME].rstrip("_")


def real(value: np.float32) -> str:
    """Return a number as a REAL literal: the fewest digits that give the same 32 bits, always with a decimal point."""
    text = np.format_float_scientific(value, unique=True, trim="0", exp_digits=1)
    mantissa, exponent = text.split("e")
    if -4 <= int(exponent) < 7:
        return np.format_float_positional(value, unique=True, trim="0")
    return f"{mantissa}E{int(exponent)}"


def function_block(table: LookupTable, text: BlockText) -> str:
    """Return the source of a function block.

    Inputs ``pressure`` and ``temperature``; outputs a value named after the property, and ``status``: 0 in range, 1 an input
    was outside and held at the end of the range, 2 an input was no number and the value is 0.0.

    :param table: axes, values and error
    :param text: what the header says
    """
    grid = table.grid
    m, n = grid.pressure.size, grid.temperature.size
    lines = [
        f"FUNCTION_BLOCK {text.name}",
        *_comment(_header(table, text)),
        "VAR_INPUT",
        f"    pressure : REAL; (* {text.units[0]} *)",
        f"    temperature : REAL; (* {text.units[1]} *)",
        "END_VAR",
        "VAR_OUTPUT",
        f"    {text.property} : REAL; (* {text.units[2]} *)",
        f"    status : INT; (* {IN_RANGE} in range, {CLAMPED} input outside and clamped, {BAD_INPUT} input bad, value 0.0 *)",
        "END_VAR",
        "VAR CONSTANT",
        *_array("PRESSURES", grid.pressure),
        *_array("TEMPERATURES", grid.temperature),
        *_array("TABLE_VALUES", grid.values.ravel()),
        "END_VAR",
        "VAR",
        "    p, t, u, v, low, high : REAL;",
        "    i, j, k : INT;",
        "END_VAR",
        "",
        f"status := {IN_RANGE};",
        "p := pressure;",
        "t := temperature;",
        *_clamped("p", "pressure", "PRESSURES", m - 1),
        *_clamped("t", "temperature", "TEMPERATURES", n - 1),
        "",
        f"IF status = {BAD_INPUT} THEN",
        f"    {text.property} := 0.0;",
        "ELSE",
        *_search("i", "p", "PRESSURES", m),
        *_search("j", "t", "TEMPERATURES", n),
        "    u := (p - PRESSURES[i]) / (PRESSURES[i + 1] - PRESSURES[i]);",
        "    v := (t - TEMPERATURES[j]) / (TEMPERATURES[j + 1] - TEMPERATURES[j]);",
        f"    k := i * {n} + j;",
        "    low := TABLE_VALUES[k] + v * (TABLE_VALUES[k + 1] - TABLE_VALUES[k]);",
        f"    k := k + {n};",
        "    high := TABLE_VALUES[k] + v * (TABLE_VALUES[k + 1] - TABLE_VALUES[k]);",
        f"    {text.property} := low + u * (high - low);",
        "END_IF;",
        "",
        "END_FUNCTION_BLOCK",
        "",
    ]
    return "\n".join(lines)


def _header(table: LookupTable, text: BlockText) -> list[str]:
    grid, own = table.grid, text.uncertainty
    property, (p_unit, t_unit, unit) = text.property.replace("_", " "), text.units
    lines = [
        f"{text.name}: {property} of {text.gas}" + (f" in {unit}" if unit != "1" else ""),
        f"Made {text.date} by gasapi {text.version}, data {text.data}",
        f"Equation: {text.model}",
        f"Source: {text.source}",
        f"Quality over the range: {text.quality}",
        f"Pressure {real(grid.pressure[0])} to {real(grid.pressure[-1])} {p_unit}"
        + (f" at an ambient pressure of {text.ambient_pressure:.9g} Pa" if text.ambient_pressure is not None else "")
        + f", temperature {real(grid.temperature[0])} to {real(grid.temperature[-1])} {t_unit}",
        f"Grid {grid.pressure.size} x {grid.temperature.size}, {table.bytes} bytes of REAL. Bilinear interpolation differs "
        f"from the equation by at most {100.0 * table.max_relative_error:.4g} % in 32-bit arithmetic; the equation's own "
        + ("uncertainty is not known." if own is None else f"uncertainty is {100.0 * own:.3g} % (k = 2) and comes on top."),
        "Outside the range the inputs are held at its ends, and status says so: the value is then not that of the gas.",
        "The gas and its composition are taken as they were asked; the block cannot know when they change.",
    ]
    return [*lines, *(f"Caution: {caution}" for caution in text.cautions)]


def _clamped(local: str, input: str, axis: str, last: int) -> list[str]:
    """Return what holds an input inside its axis; neither below nor above nor inside is a NaN."""
    return [
        f"IF {input} < {axis}[0] THEN",
        f"    {local} := {axis}[0];",
        f"    IF status < {CLAMPED} THEN status := {CLAMPED}; END_IF;",
        f"ELSIF {input} > {axis}[{last}] THEN",
        f"    {local} := {axis}[{last}];",
        f"    IF status < {CLAMPED} THEN status := {CLAMPED}; END_IF;",
        f"ELSIF NOT ({input} >= {axis}[0]) THEN",
        f"    {local} := {axis}[0];",
        f"    status := {BAD_INPUT};",
        "END_IF;",
    ]


def _search(index: str, local: str, axis: str, size: int) -> list[str]:
    """Return what finds the last node that is not above a value, the one before the last node at most."""
    if size == 2:
        return [f"    {index} := 0;"]
    return [
        f"    {index} := 0;",
        f"    FOR k := 1 TO {size - 2} DO",
        f"        IF {local} >= {axis}[k] THEN {index} := k; END_IF;",
        "    END_FOR;",
    ]


def _array(name: str, values: Float32) -> list[str]:
    numbers = ", ".join(real(value) for value in values)
    wrapped = textwrap.wrap(numbers, _WIDTH - 8, break_long_words=False, break_on_hyphens=False)
    return [
        f"    {name} : ARRAY[0..{values.size - 1}] OF REAL := [",
        *(f"        {line}" for line in wrapped),
        "    ];",
    ]


def _comment(paragraphs: Iterable[str]) -> list[str]:
    lines: list[str] = []
    for paragraph in paragraphs:
        # neither end nor start of a comment may stand inside one
        plain = _ascii(paragraph).replace("(*", "( *").replace("*)", "* )")
        lines += textwrap.wrap(plain, _WIDTH - 4, subsequent_indent="    ", break_on_hyphens=False)
    return ["(*", *(f"  {line}" for line in lines), "*)"]


def _ascii(text: str) -> str:
    """Return a text in printable ASCII: letters without their accents, what has no such form as a question mark."""
    plain = unicodedata.normalize("NFKD", text).translate(_PLAIN).encode("ascii", "replace").decode("ascii")
    return re.sub(r"[^ -~]", " ", plain)


_PLAIN: Final = {
    **dict.fromkeys(range(0x0300, 0x0370), None),
    0x2010: "-",
    0x2011: "-",
    0x2012: "-",
    0x2013: "-",
    0x2014: "-",
    0x2018: "'",
    0x2019: "'",
    0x201C: '"',
    0x201D: '"',
    0x00B0: "deg",
    0x00B7: ".",
    0x00D8: "O",
    0x00F8: "o",
    0x0141: "L",
    0x0142: "l",
    0x00DF: "ss",
    0x00B5: "u",
    0x03BC: "u",
}
