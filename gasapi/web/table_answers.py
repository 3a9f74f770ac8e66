"""A lookup table written down: as JSON, as CSV whose first row and column are the axes, or as Structured Text."""

from __future__ import annotations

from typing import Any

from gasapi import __version__
from gasapi.service.bilinear import Float32
from gasapi.service.lookup_table import LookupTable, LookupTableAnswer, LookupTableQuestion
from gasapi.service.structured_text import BlockText, block_name, function_block, real
from gasapi.units import UnitMap
from gasapi.web.job_answers import job_members
from gasapi.web.job_questions import LookupTableAsked
from gasapi.web.negotiation import MediaType

__all__ = ["TABLE_CSV", "TABLE_TEXT", "table_csv", "table_members", "table_text"]

TABLE_CSV = MediaType("text", "csv", (("header", "present"),))
"""RFC 4180 with the axes as header."""

TABLE_TEXT = MediaType("text", "plain", (("charset", "us-ascii"),))
"""Structured Text is ASCII."""


def table_members(asked: LookupTableAsked, units: UnitMap, answer: LookupTableAnswer) -> dict[str, Any]:
    """Return the answer to a table as JSON has it; every number has the fewest digits that give the same 32 bits."""
    table, question = answer.table, asked.question
    result: dict[str, Any] = {
        "property": question.property,
        "pressure": None if table is None else _axis(table.grid.pressure, question.pressure),
        "temperature": None if table is None else _axis(table.grid.temperature, question.temperature),
        "values": None if table is None else [[float(real(value)) for value in row] for row in table.grid.values],
        "max_relative_error": None if table is None else table.max_relative_error,
        "tolerance": question.tolerance,
        "bytes": None if table is None else table.bytes,
    }
    return job_members(answer.state, units, result)


def table_csv(asked: LookupTableAsked, units: UnitMap, answer: LookupTableAnswer, table: LookupTable) -> str:
    """Return a table as CSV (RFC 4180): temperatures in the first row, a pressure before each other row."""
    question = asked.question
    corner = (
        f"{question.property} [{_property_unit(question, units)}] by pressure [{units.pressure.name}] down "
        f"and temperature [{units.temperature.name}] across"
    )
    rows = [[corner, *map(repr, _axis(table.grid.temperature, question.temperature))]]
    for pressure, values in zip(_axis(table.grid.pressure, question.pressure), table.grid.values, strict=True):
        rows.append([repr(pressure), *(repr(float(real(value))) for value in values)])
    return "".join(",".join(row) + "\r\n" for row in rows)


def table_text(asked: LookupTableAsked, units: UnitMap, answer: LookupTableAnswer, table: LookupTable, date: str) -> str:
    """Return a table as a function block.

    :param date: of today, as it is to stand in the header
    """
    question, state = asked.question, answer.state
    gas = state.gas.id or "mixture"
    shown = state.gas.id or ", ".join(f"{id} {x:.6g}" for id, x in state.gas.fractions)
    quality = state.quality.level + (f" ({', '.join(state.quality.reasons)})" if state.quality.reasons else "")
    return function_block(
        table,
        BlockText(
            name=asked.name or block_name(question.property, gas),
            property=question.property,
            gas=shown if state.gas.id else f"a mixture ({shown}, mole fractions)",
            units=(units.pressure.name, units.temperature.name, _property_unit(question, units)),
            date=date,
            model=f"{state.model.name} ({state.model.id})",
            source=state.model.source,
            quality=quality,
            version=__version__,
            data=state.data,
            uncertainty=state.model.relative_uncertainty,
            cautions=state.cautions,
            ambient_pressure=question.ambient if units.pressure.gauge else None,
        ),
    )


def _property_unit(question: LookupTableQuestion, units: UnitMap) -> str:
    return "1" if question.property_unit is None else question.property_unit.name


def _axis(axis: Float32, ends: tuple[float, float]) -> list[float]:
    """Return the nodes of an axis; the ends as they were asked, which are the same numbers in 32 bits."""
    return [ends[0], *(float(real(node)) for node in axis[1:-1]), ends[1]]
