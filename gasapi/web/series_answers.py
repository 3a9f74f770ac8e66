"""Series written down: JSON in pieces and CSV lines, in the caller's units. Nothing is computed here but conversions.

Arrays go to orjson as they are: every number in the shortest form that reads back to the same bits, and null for NaN.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Sequence
from functools import lru_cache
from typing import Any

import numpy as np
import orjson
from numpy.typing import NDArray

from gasapi import __version__
from gasapi.engine.elementary import Array
from gasapi.engine.phase.region import REGION_NAMES
from gasapi.service.quality import quality_of
from gasapi.service.series import SeriesRows, SeriesSummary, VaryingGasAnswer
from gasapi.units import UnitMap

__all__ = ["array_bytes", "csv_header", "csv_lines", "given_lines", "joined_rows", "json_pieces"]

_ROWS_OF_A_PIECE = 32768
_NUMPY = orjson.OPT_SERIALIZE_NUMPY
_REGIONS = np.array(REGION_NAMES, dtype=object)


@lru_cache(maxsize=4096)
def _written(flags: int) -> tuple[int, bool, orjson.Fragment, bytes]:
    """Return what reasons are in an answer: status code, whether that is good, words as JSON and as a CSV field."""
    quality = quality_of(flags)
    words = orjson.Fragment(orjson.dumps(quality.reasons))
    return quality.status_code, quality.level == "good", words, " ".join(quality.reasons).encode("ascii")


def _kinds(flags: NDArray[np.int64]) -> list[int]:
    """Return the distinct numbers of an array in which there are few."""
    found: list[int] = []
    while flags.size:
        first = int(flags[0])
        found.append(first)
        flags = flags[flags != first]
    return found


def _status_codes(flags: NDArray[np.int64]) -> NDArray[np.int64]:
    kinds = _kinds(flags)
    if len(kinds) == 1:
        return np.full(flags.size, _written(kinds[0])[0], dtype=np.int64)
    codes = np.empty(flags.size, dtype=np.int64)
    for kind in kinds:
        codes[flags == kind] = _written(kind)[0]
    return codes


def array_bytes(values: Any) -> bytes:
    """Return the elements of an array or list as JSON, without the brackets."""
    return orjson.dumps(values, option=_NUMPY)[1:-1]


def json_pieces(
    rows: SeriesRows,
    summary: SeriesSummary,
    units: UnitMap,
    timestamps: Iterable[bytes] | None,
    unreadable: dict[int, int] | None = None,
) -> Iterator[bytes]:
    """Return a series answer as pieces of one JSON text.

    :param timestamps: elements of the timestamps as JSON, in pieces that commas join; None where none were given
    :param unreadable: line number by row, of the rows of a CSV body that could not be read; None for a JSON body
    """
    n = rows.flags.size
    cuts = range(0, n, _ROWS_OF_A_PIECE)

    def column(values: Any, convert: Callable[[Any], Any] | None = None) -> Iterator[bytes]:
        yield b"["
        for i in cuts:
            part = values[i : i + _ROWS_OF_A_PIECE]
            yield (b"," if i else b"") + array_bytes(np.ascontiguousarray(part if convert is None else convert(part)))
        yield b"]"

    yield b'{"gas":'
    yield from _gas(rows, summary, units, column)
    if timestamps is not None:
        yield b',"timestamps":['
        for i, piece in enumerate(timestamps):
            yield b"," + piece if i else piece
        yield b"]"
    yield b',"result":{"density":'
    yield from column(rows.density, units.density.from_si)
    yield b',"compressibility_factor":'
    yield from column(rows.compressibility_factor)
    yield b',"molar_volume":'
    yield from column(rows.molar_volume, units.molar_volume.from_si)
    yield b'},"status_code":'
    yield from column(rows.flags, _status_codes)
    yield b',"phase":{"region":['
    for i in cuts:
        yield (b"," if i else b"") + array_bytes(_REGIONS[rows.region[i : i + _ROWS_OF_A_PIECE]].tolist())
    yield b'],"model":' + orjson.dumps(summary.phase_model) + b'},"counts":' + orjson.dumps(dict(summary.counts))
    yield b',"reasons":{'
    yield from _reasons(rows.flags)
    yield b"}"
    if unreadable is not None:
        yield b',"unreadable":' + orjson.dumps(unreadable, option=orjson.OPT_NON_STR_KEYS)
    rest = {
        "units": dict(units.names),
        "model": _model(summary),
        "cautions": summary.cautions,
        **_certificate(summary),
        "trace": {"cached": False, "version": __version__, "data": summary.data},
    }
    yield b"," + orjson.dumps(rest)[1:]


def _certificate(summary: SeriesSummary) -> dict[str, Any]:
    found = summary.certificate
    if found is None:
        return {}
    members = {"accuracy": found.accuracy, "largest_error": found.largest_error, "table_rows": found.rows}
    return {"certificate": members}


def _reasons(flags: NDArray[np.int64]) -> Iterator[bytes]:
    """Return the words of the rows that are not good, by row number."""
    comma = b""
    for i in range(0, flags.size, _ROWS_OF_A_PIECE):
        part = flags[i : i + _ROWS_OF_A_PIECE]
        kinds = _kinds(part)
        told = {kind: _written(kind)[2] for kind in kinds if not _written(kind)[1]}
        if not told:
            continue
        at = list(range(part.size))
        if len(told) < len(kinds):
            good = np.array([kind for kind in kinds if kind not in told], dtype=np.int64)
            at = np.flatnonzero(~np.isin(part, good)).tolist()
            part = part.take(at)
        words = dict(zip(map(str, [i + row for row in at]), map(told.__getitem__, part.tolist()), strict=True))
        yield comma + orjson.dumps(words)[1:-1]
        comma = b","


def _gas(rows: SeriesRows, summary: SeriesSummary, units: UnitMap, column: Callable[..., Iterator[bytes]]) -> Iterator[bytes]:
    gas = summary.gas
    if not isinstance(gas, VaryingGasAnswer):
        members = {"id": gas.id, "fractions": dict(gas.fractions), "molar_mass": units.molar_mass.from_si(gas.molar_mass)}
        yield orjson.dumps(members)
        return
    assert rows.fractions is not None
    yield b'{"id":null,"fractions":{'
    for i, component in enumerate(gas.components):
        yield (b"," if i else b"") + orjson.dumps(component) + b":"
        yield from column(rows.fractions[:, i])
    yield b'},"molar_mass":'
    yield from column(rows.molar_mass, units.molar_mass.from_si)
    yield b"}"


def _model(summary: SeriesSummary) -> dict[str, Any]:
    model = summary.model
    return {
        "id": model.id,
        "name": model.name,
        "source": model.source,
        "validity": {"temperature": model.validity_temperature, "pressure": model.validity_pressure},
        "inside_validity": model.inside_validity,
        "relative_uncertainty": model.relative_uncertainty,
        "uncertainty_basis": model.uncertainty_basis,
        "selected_because": model.selected_because,
    }


def csv_header(given: bytes, units: UnitMap) -> bytes:
    """Return the header of a CSV answer: the given columns, then those of the answer with their units.

    :param given: the given header, without its line end; empty where there is none
    """
    answer = (
        f"status_code,density [{units.density.name}],compressibility_factor,"
        f"molar_volume [{units.molar_volume.name}],region,reasons\r\n"
    ).encode()
    return given + b"," + answer if given else answer


def csv_lines(given: Sequence[bytes], rows: SeriesRows, units: UnitMap, lines: dict[int, int]) -> bytes:
    """Return rows as CSV, each after what was given for it.

    :param given: the given fields of each row as they came, without the line end
    :param lines: line numbers of the rows that could not be read, by index
    """
    numbers = (units.density.from_si(rows.density), rows.compressibility_factor, units.molar_volume.from_si(rows.molar_volume))
    texts = [array_bytes(np.ascontiguousarray(column)).replace(b"null", b"").split(b",") for column in numbers]
    kinds = _kinds(rows.flags)
    status = {kind: b"%d" % _written(kind)[0] for kind in kinds}
    words = {kind: _written(kind)[3] for kind in kinds}
    flags = rows.flags.tolist()
    ends = [words[flag] for flag in flags]
    for row, line in lines.items():
        ends[row] += b" line %d" % line
    regions = [name.encode("ascii") for name in REGION_NAMES]
    parts = zip(
        given, map(status.__getitem__, flags), *texts, map(regions.__getitem__, rows.region.tolist()), ends, strict=True
    )
    return b"\r\n".join(map(b",".join, parts)) + b"\r\n"


def joined_rows(parts: Sequence[SeriesRows]) -> SeriesRows:
    """Return the rows of several blocks as one."""
    columns: list[Any] = [None if c[0] is None else np.concatenate(c) for c in zip(*parts, strict=True)]
    return SeriesRows(*columns)


def given_lines(columns: Sequence[Array | list[Any]]) -> list[bytes]:
    """Return columns of a JSON body as the fields of CSV rows."""
    written = [_fields(column) for column in columns]
    return list(map(b",".join, zip(*written, strict=True)))


def _fields(column: Array | list[Any]) -> list[bytes]:
    if isinstance(column, list):
        return [_field(value) for value in column]
    return array_bytes(column).replace(b"null", b"").split(b",")


def _field(value: Any) -> bytes:
    """Return a value as a field of RFC 4180."""
    if value is None:
        return b""
    text = value if type(value) is str else orjson.dumps(value).decode()
    if any(mark in text for mark in ',"\r\n'):
        text = '"' + text.replace('"', '""') + '"'
    return text.encode("utf-8")
