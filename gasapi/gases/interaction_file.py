"""The file of binary interaction parameters, checked and turned into records."""

from __future__ import annotations

from collections.abc import Mapping
from functools import cache
from types import MappingProxyType

from gasapi.gases.data_files import open_data
from gasapi.gases.reading import Table
from gasapi.gases.records import CubicPair

__all__ = ["load_interaction"]

_LARGEST = 2.0
"""A k_ij beyond this would be a slip of the pen: 1 already cancels the attraction between the two."""


@cache
def load_interaction() -> Mapping[tuple[str, str], CubicPair]:
    """Return the published interaction parameters by the two ids in alphabetical order.

    A pair that is absent has no published value: k_ij is 0 there, and the answer should say so.

    :raises DataError: the file does not hold what it must
    """
    return _read_interaction()


def _read_interaction() -> Mapping[tuple[str, str], CubicPair]:
    table = open_data("interaction.json")
    table.text("title")
    table.text("read_from")
    table.texts("notes")
    sources = table.texts_by_key("sources")
    pairs: dict[tuple[str, str], CubicPair] = {}
    for item in table.tables("pairs"):
        key = item.text("first"), item.text("second")
        if key[0] >= key[1]:
            raise item.fault("second", "must come after first in the alphabet")
        if key in pairs:
            raise item.fault("", f"the pair {key[0]} and {key[1]} stands here twice")
        pairs[key] = _pair(item, sources)
    table.close()
    return MappingProxyType(pairs)


def _pair(table: Table, sources: dict[str, str]) -> CubicPair:
    peng_robinson, soave_redlich_kwong, words = _values(table, sources)
    other = table.optional_table("other")
    if other is not None:
        _values(other, sources)
        other.close()
    energy = table.two_numbers("group_energy_Pa") if table.has("group_energy_Pa") else None
    table.close()
    return CubicPair(
        peng_robinson=peng_robinson,
        soave_redlich_kwong=soave_redlich_kwong,
        source=words,
        group_energy=energy,
    )


def _values(table: Table, sources: dict[str, str]) -> tuple[float, float, str]:
    words = sources[table.choice("source", sources)]
    if table.has("page"):
        words += f", p. {table.whole('page')}"
    if table.has("data_temperature_K"):
        low, high = table.two_numbers("data_temperature_K")
        words += f"; data from {low:g} to {high:g} K"
    table.optional_positive("conversion_temperature_K")
    return (
        table.number("peng_robinson", -_LARGEST, _LARGEST),
        table.number("soave_redlich_kwong", -_LARGEST, _LARGEST),
        words,
    )
