"""A series in a CSV body: the body put aside, its header understood, its rows as columns in SI, block by block.

The body is put aside before the answer begins, since a client that is still sending does not read. Up to
``HELD`` bytes stay in memory, the rest goes to a temporary file; besides that, a request holds a block of rows at a time.
"""

from __future__ import annotations

import tempfile
from collections.abc import Iterator, Mapping, Sequence
from typing import IO, Any, NamedTuple
from urllib.parse import parse_qsl, urlencode

import numpy as np

from gasapi.engine.elementary import Array
from gasapi.service.series import Columns
from gasapi.units import QUANTITIES
from gasapi.web.body import Environ, announced_length
from gasapi.web.columns import is_status
from gasapi.web.csv_table import Block, column_name, numbers, read_blocks, read_header
from gasapi.web.fields import Gas, unknown_member
from gasapi.web.negotiation import content_type
from gasapi.web.problems import Fault, Path, Problem, invalid, pointer, shown
from gasapi.web.query import QueryForm
from gasapi.web.series_questions import SeriesReader, Terms
from gasapi.web.turns import TICKET

__all__ = ["HELD", "CsvRows", "CsvSeries", "CsvSeriesReader", "is_known_column", "put_aside", "require_csv"]

HELD = 16 * 1024 * 1024
"""Bytes of a body that are held in memory; what is beyond stands in a temporary file."""

_PIECE = 256 * 1024
_BROKEN = "the body cannot be read: its chunks are broken, or the connection ended"
_FRACTION = "fraction."
_KNOWN = ("pressure", "temperature", "timestamps", "input_status")
_LONGEST_QUERY = 1 << 16
_GATHERED_ROWS = 200_000


class CsvRows(NamedTuple):
    """A block of rows: the given fields as they came, columns in SI, timestamps as they came, lines that cannot be read."""

    texts: list[bytes]
    columns: Columns
    timestamps: Sequence[bytes] | None
    unreadable: dict[int, int]


class _Plan(NamedTuple):
    """Where the columns stand in a record, None for those that are not there; fractions by name with their scale."""

    fields: int
    pressure: int | None
    temperature: int | None
    timestamps: int | None
    status: int | None
    fractions: tuple[tuple[str, int, float], ...]


class CsvSeries:
    """A series in a body that was put aside; its rows can be read again and again.

    :param body: the body
    :param start: where the records begin
    :param header: the header as it came, without its line end
    :param terms: what holds for all rows
    :param plan: where the columns stand
    :param constants: pressure and temperature for all rows, where no column has them
    """

    def __init__(
        self, body: IO[bytes], start: int, header: bytes, terms: Terms, plan: _Plan, constants: Mapping[str, float]
    ) -> None:
        self._body = body
        self._start = start
        self._plan = plan
        self._constants = constants
        self.header = header
        self.terms = terms

    @property
    def has_timestamps(self) -> bool:
        """Whether there is a column of them."""
        return self._plan.timestamps is not None

    def blocks(self) -> Iterator[CsvRows]:
        """Return the rows in blocks, from the beginning.

        Where the gas changes by the row they are gathered into large ones, so that a composition is met in few of them.
        """
        plan = self._plan
        places = [plan.pressure, plan.temperature, plan.timestamps, plan.status, *(i for _, i, _ in plan.fractions)]
        wanted = sorted({i for i in places if i is not None})
        self._body.seek(self._start)
        rows = (
            self._rows(block, {index: block.columns[at] for at, index in enumerate(wanted)})
            for block in read_blocks(self._body, plan.fields, wanted)
        )
        return _gathered(rows) if plan.fractions else rows

    def close(self) -> None:
        """Let the body go."""
        self._body.close()

    def _rows(self, block: Block, fields: Mapping[int, Sequence[bytes]]) -> CsvRows:
        plan = self._plan
        n = len(block.texts)
        unreadable = dict(block.unreadable)
        wrong: set[int] = set()

        def column(place: int | None, name: str) -> Array:
            if place is None:
                return np.full(n, self._constants[name])
            found, bad = numbers(fields[place])
            wrong.update(bad)
            return found

        pressure = column(plan.pressure, "pressure")
        temperature = column(plan.temperature, "temperature")
        status = None
        if plan.status is not None:
            status = column(plan.status, "input_status")
            outside = ~is_status(status) & ~np.isnan(status)
            if outside.any():
                wrong.update(np.flatnonzero(outside).tolist())
                status[outside] = np.nan
        fractions = None
        if plan.fractions:
            fractions = np.empty((n, len(plan.fractions)))
            for i, (name, place, scale) in enumerate(plan.fractions):
                fractions[:, i] = column(place, name)
                fractions[:, i] /= scale
        if wrong or unreadable:
            for i in wrong:
                unreadable.setdefault(i, block.lines[i])
            at = list(unreadable)
            pressure[at] = np.nan
            unreadable = dict(sorted(unreadable.items()))
        columns = self.terms.columns(pressure, temperature, status, fractions)
        timestamps = None if plan.timestamps is None else fields[plan.timestamps]
        return CsvRows(block.texts, columns, timestamps, unreadable)


def _gathered(blocks: Iterator[CsvRows]) -> Iterator[CsvRows]:
    """Return blocks joined until they have ``_GATHERED_ROWS`` rows."""
    held: list[CsvRows] = []
    count = 0
    for block in blocks:
        held.append(block)
        count += len(block.texts)
        if count >= _GATHERED_ROWS:
            yield _joined(held)
            held, count = [], 0
    if held:
        yield _joined(held)


def _joined(blocks: Sequence[CsvRows]) -> CsvRows:
    texts: list[bytes] = []
    timestamps: list[bytes] = []
    unreadable: dict[int, int] = {}
    for block in blocks:
        unreadable |= {len(texts) + row: line for row, line in block.unreadable.items()}
        texts += block.texts
        timestamps += block.timestamps or ()
    columns = zip(*(block.columns for block in blocks), strict=True)
    joined: list[Any] = [None if column[0] is None else np.concatenate(column) for column in columns]
    return CsvRows(texts, Columns(*joined), timestamps if blocks[0].timestamps is not None else None, unreadable)


class CsvSeriesReader:
    """Reads series from CSV bodies: what holds for all rows from the query, the rest from the header and the rows.

    :param reader: reads what both forms of a series have in common
    """

    def __init__(self, reader: SeriesReader) -> None:
        self._reader = reader
        self._query = QueryForm(reader.schema)

    def of_body(self, body: IO[bytes], query: str) -> CsvSeries:
        """Return the series of a body that was put aside.

        :param body: stands at its beginning
        :param query: the query of the address, percent-encoded
        :raises Problem: 400 or 422, with every fault
        """
        query, keep = _without_keep(query)
        members, known = self._query.read(query)
        header = read_header(body)
        if header is None:
            raise _header_problem(
                "the body has no header; name the columns in its first line, as in pressure [barg],temperature"
            )
        text, names = header
        start = body.tell()
        plan, faults = _plan(names, keep, members)
        loaded, wrong = self._reader.load(members)
        naming = self._parameter
        if faults or wrong or known:
            problem = self._reader.refused(loaded, wrong, naming, known) if wrong or known else None
            raise invalid([*faults, *(problem.faults if problem else ())])
        terms = self._reader.terms(loaded, naming)
        if not any(block.texts for block in read_blocks(body, plan.fields, [])):
            raise _header_problem("there is no row below the header")
        constants = {name: loaded[name] for name in ("pressure", "temperature") if isinstance(loaded[name], float)}
        return CsvSeries(body, start, text, terms, plan, constants)

    def _parameter(self, path: Path) -> str:
        return pointer((self._query.parameter_of(path),))


def is_known_column(text: str) -> bool:
    """Return whether a field of a header names a column that a series has, with or without a unit."""
    folded = column_name(text).name.lower()
    return folded in _KNOWN or (folded.startswith(_FRACTION) and len(folded) > len(_FRACTION))


def require_csv(environ: Environ) -> None:
    """Check that a CSV body is in UTF-8, with a header and as it stands.

    :raises Problem: 415 for another character set or a compressed body; 422 where the header is said to be absent
    """
    kind = content_type(environ.get("CONTENT_TYPE", ""))
    parameters = dict(kind.parameters) if kind is not None else {}
    if parameters.get("charset", "utf-8") not in ("utf-8", "us-ascii"):
        raise Problem(415, "CSV is UTF-8 here; send it so, or leave the charset out")
    encoding = environ.get("HTTP_CONTENT_ENCODING", "identity").strip().lower()
    if encoding not in ("", "identity"):
        raise Problem(415, "the body is compressed; send it as it stands", headers=[("Accept-Encoding", "identity")])
    if parameters.get("header", "present") == "absent":
        raise _header_problem("a series needs a header row that names its columns; leave header=absent out")


def put_aside(environ: Environ, limit: int) -> IO[bytes]:
    """Return the body of a request, read to its end, standing at its beginning.

    :param limit: bytes that it may have
    :raises Problem: 400 where the body breaks off or its chunks are broken; 408 where it does not come; 413 where it is longer
        than the limit; 503 where there is no room for it
    """
    length = announced_length(environ)
    if length is not None and length > limit:
        raise _too_large(limit)
    stream = environ["wsgi.input"]
    # closed by the caller, or with the last reference to it
    body = tempfile.SpooledTemporaryFile(max_size=HELD)  # noqa: SIM115
    held = 0
    most = limit + 1 if length is None else length
    try:
        while held < most and (piece := _read(stream, min(_PIECE, most - held))):
            held += len(piece)
            if held > limit:
                raise _too_large(limit)
            body.write(piece)
    except Problem:
        body.close()
        raise
    except OSError:
        # a disk without room is no fault of the question
        body.close()
        words = "there is no room now to put so large a body aside; ask again, or send it in parts"
        raise Problem(503, words, headers=[("Retry-After", "5")]) from None
    if length is not None and held < length:
        body.close()
        raise Problem(400, f"the body ends after {held} of the {length} bytes that were announced")
    body.seek(0)
    if TICKET in environ:
        try:
            environ[TICKET].enter()
        except Problem:
            body.close()
            raise
    return body


def _read(stream: Any, size: int) -> bytes:
    try:
        piece: bytes = stream.read(size)
    except TimeoutError:
        raise Problem(408, "the body did not arrive in time; send it again") from None
    except Exception:
        # each server has exceptions of its own for broken chunks and connections; none is the service's fault
        raise Problem(400, _BROKEN) from None
    return piece


def _too_large(limit: int) -> Problem:
    return Problem(413, f"the body is larger than the {limit} bytes that are taken here; split the series")


def _header_problem(detail: str) -> Problem:
    return invalid([Fault("", detail)])


def _without_keep(query: str) -> tuple[str, list[str]]:
    """Return a query without its ``keep`` parameters, and what they name."""
    if "keep" not in query or len(query) > _LONGEST_QUERY:
        return query, []
    try:
        pairs = parse_qsl(query, keep_blank_values=True, errors="strict")
    except ValueError:
        # told where the rest of the query is read
        return query, []
    keep = [value for name, value in pairs if name == "keep"]
    return urlencode([(name, value) for name, value in pairs if name != "keep"]), keep


def _plan(names: Sequence[str], keep: Sequence[str], members: dict[str, Any]) -> tuple[_Plan, list[Fault]]:
    """Return where the columns stand; what the header says of units and gas goes to the members of the question."""
    faults: list[Fault] = []
    places: dict[str, int] = {}
    fractions: list[tuple[str, int, str | None]] = []
    kept = set(keep)
    given = {text.strip() for text in names}
    faults += [Fault("/keep", f"there is no column {shown(name)}") for name in keep if name.strip() not in given]
    if len(given) != len(names):
        again = next(text for i, text in enumerate(names) if text.strip() in {n.strip() for n in names[:i]})
        faults.append(Fault("", f"the column {shown(again)} is there twice"))
    for place, text in enumerate(names):
        name, unit = column_name(text)
        folded = name.lower()
        if folded.startswith(_FRACTION) and len(folded) > len(_FRACTION):
            fractions.append((name[len(_FRACTION) :], place, unit))
        elif folded in _KNOWN:
            if folded in places:
                faults.append(Fault("", f"there are two columns of {folded}"))
            places[folded] = place
            if unit is not None:
                faults += _take_unit(folded, unit, members)
        elif text.strip() not in kept and name not in kept:
            known = [*_KNOWN, "fraction.<name>", "keep=<column> for others"]
            faults.append(Fault("", f"column {shown(text)}: {unknown_member(name, known)}"))
    for quantity in ("pressure", "temperature"):
        if quantity in places:
            if quantity in members:
                faults.append(Fault(f"/{quantity}", "this is given by a column and by a parameter; give one of them"))
            members[quantity] = [None]
        elif quantity not in members:
            faults.append(Fault("", f"there is no column {quantity}; name one, or give {quantity} as a parameter for all rows"))
            members[quantity] = [None]
    scales, more = _take_fractions(fractions, members)
    plan = _Plan(
        len(names),
        places.get("pressure"),
        places.get("temperature"),
        places.get("timestamps"),
        places.get("input_status"),
        tuple((name, place, scale) for (name, place, _), scale in zip(fractions, scales, strict=True)),
    )
    return plan, faults + more


def _take_unit(name: str, unit: str, members: dict[str, Any]) -> list[Fault]:
    if name == "input_status":
        return _take(members, "input_status_kind", unit, "/input_status_kind")
    if name == "timestamps":
        # a time zone or the like, which is the caller's own
        return []
    units = members.setdefault("units", {})
    if unit not in QUANTITIES[name]:
        return [Fault("", f"{shown(unit)} is no unit of {name}; known: {', '.join(QUANTITIES[name])}")]
    return _take(units, name, unit, f"/{name}_unit")


def _take(members: dict[str, Any], name: str, value: str, parameter: str) -> list[Fault]:
    """Set a member by the header; a parameter that says otherwise is a fault."""
    if members.setdefault(name, value) != value:
        return [Fault(parameter, f"the header says {shown(value)}")]
    return []


def _take_fractions(
    fractions: Sequence[tuple[str, int, str | None]], members: dict[str, Any]
) -> tuple[list[float], list[Fault]]:
    """Put the columns of fractions into the gas of the question, and return by what each is to be divided."""
    if not fractions:
        return [], []
    gas = members.get("gas", {})
    if not isinstance(gas, dict) or "fractions" in gas:
        return [1.0] * len(fractions), [Fault("/gas", "the gas is given by columns of fractions and by a parameter; give one")]
    default = gas.pop("fraction_unit", "1")
    faults: list[Fault] = []
    scales: list[float] = []
    for name, _, unit in fractions:
        scale = Gas.fraction_units.get(default if unit is None else unit)
        if scale is None:
            where = "/fraction_unit" if unit is None else ""
            words = (
                f"fraction.{name}: {shown(default if unit is None else unit)} is not one of: {', '.join(Gas.fraction_units)}"
            )
            faults.append(Fault(where, words))
        scales.append(scale or 1.0)
    members["gas"] = {**gas, "fractions": {name: [None] for name, _, _ in fractions}}
    return scales, faults
