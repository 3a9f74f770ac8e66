"""CSV bodies (RFC 4180), read in blocks: records, the columns that a header names, and numbers.

A record is a line; where quotes are open it goes on to the next lines, but not further than a field can sensibly be, so that
a stray quote spoils its own line and not the rest of the file. Fields are kept as the bytes that came.
"""

from __future__ import annotations

import csv
import math
import re
from collections.abc import Iterator, Sequence
from operator import methodcaller
from typing import IO, NamedTuple

import numpy as np

from gasapi.engine.elementary import Array

__all__ = ["Block", "ColumnName", "column_name", "numbers", "read_blocks", "read_header"]

_PIECE = 1 << 20
_MOST_LINES_OF_A_RECORD = 100
_MOST_BYTES_OF_A_RECORD = 1 << 16
_LONGEST_HEADER = 1 << 17
_LONGEST_LINE = 1 << 24
_BYTE_ORDER_MARK = b"\xef\xbb\xbf"

_NUMBER = re.compile(rb"[ \t]*[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?[ \t]*")
_NAME = re.compile(r"\s*(.*?)\s*(?:\[\s*([^\[\]]*?)\s*\]\s*)?", re.DOTALL)


_COMMAS = methodcaller("count", b",")


class ColumnName(NamedTuple):
    """What stands above a column: its name, and the unit in brackets, None where there is none."""

    name: str
    unit: str | None


class Block(NamedTuple):
    """Records in the order of the body: their text as it came, their fields by column, lines of those that cannot be read.

    ``columns`` holds, for the columns that were asked for, a field of each record; ``lines`` are the numbers of the lines
    (from 1) at which the records begin, and ``unreadable`` are those of unreadable records by their index in the block.
    """

    texts: list[bytes]
    columns: list[Sequence[bytes]]
    lines: Sequence[int]
    unreadable: dict[int, int]


def column_name(text: str) -> ColumnName:
    """Return the name and the unit of a header field such as ``pressure [barg]``."""
    found = _NAME.fullmatch(text)
    assert found is not None
    return ColumnName(found[1], found[2])


def read_header(body: IO[bytes]) -> tuple[bytes, list[str]] | None:
    """Return the header as it came, without its line end, and its fields; the body stands at the first record then.

    None where the body is empty or its first line is no header: broken, or longer than a header can be.
    """
    line = body.readline(_LONGEST_HEADER)
    text = line.removeprefix(_BYTE_ORDER_MARK).rstrip(b"\r\n")
    if not text.strip() or (len(line) == _LONGEST_HEADER and not line.endswith(b"\n")):
        return None
    try:
        fields = next(csv.reader([text.decode("utf-8")], strict=True))
    except (UnicodeDecodeError, csv.Error):
        return None
    return text, fields


def read_blocks(body: IO[bytes], fields: int, wanted: Sequence[int]) -> Iterator[Block]:
    """Return the records of a body in blocks of about a megabyte.

    :param body: stands after the header
    :param fields: how many fields a record has
    :param wanted: indices of the columns that are needed
    """
    records = _Records(fields, wanted)
    rest = b""
    while piece := body.read(_PIECE):
        data = rest + piece
        end = data.rfind(b"\n") + 1
        if not end and len(data) > _LONGEST_LINE:
            # a line without an end: it is cut, and cannot be read
            data += b"\n"
            end = len(data)
        rest = data[end:]
        if end:
            block = records.simple_block(data[:end]) or records.block(data[: end - 1].split(b"\n"))
            if block is not None:
                yield block
    block = records.block([rest] if rest else [], last=True)
    if block is not None:
        yield block


class _Records:
    """Puts lines together to records."""

    def __init__(self, fields: int, wanted: Sequence[int]) -> None:
        self._fields = fields
        self._wanted = list(wanted)
        self._line = 2
        # empty lines count only if something follows them; an open record waits for its end
        self._empty = 0
        self._open: list[bytes] = []

    def simple_block(self, data: bytes) -> Block | None:
        """Return the records of whole lines in which there is neither a quote nor an empty line, and every field is there.

        None where anything is otherwise; nothing was taken then. This is the common case, split at once.
        """
        if self._open or self._empty or b'"' in data:
            return None
        data = data.replace(b"\r\n", b"\n")
        if b"\n\n" in data or data.startswith(b"\n"):
            return None
        data = data[:-1]
        texts = data.split(b"\n")
        count = self._fields
        if set(map(_COMMAS, texts)) != {count - 1}:
            return None
        fields = data.replace(b"\n", b",").split(b",")
        first = self._line
        self._line += len(texts)
        return Block(texts, [fields[i::count] for i in self._wanted], range(first, self._line), {})

    def block(self, lines: list[bytes], last: bool = False) -> Block | None:
        """Return the records of the next lines, those before them included that were not complete."""
        texts, starts, broken = self._gather(lines, last)
        if not texts:
            return None
        fields = [[] if i in broken else _split(text) for i, text in enumerate(texts)]
        count = self._fields
        unreadable: dict[int, int] = {}
        nothing = [b""] * count
        for i, found in enumerate(fields):
            if len(found) != count:
                unreadable[i] = starts[i]
                kept = [_plain(field) for field in (found or texts[i].split(b","))[:count]]
                texts[i] = b",".join([*kept, *nothing[len(kept) :]])
                fields[i] = nothing
        columns = list(zip(*fields, strict=True))
        return Block(texts, [columns[i] for i in self._wanted], starts, unreadable)

    def _gather(self, lines: list[bytes], last: bool) -> tuple[list[bytes], Sequence[int], set[int]]:
        """Return the texts of records, the lines at which they begin, and the indices of those whose quotes do not end."""
        texts: list[bytes] = []
        starts: list[int] = []
        broken: set[int] = set()
        queue = [*self._open, *lines]
        number = self._line
        self._open = []
        at = 0
        while at < len(queue):
            line = queue[at]
            if not line or line == b"\r":
                self._empty += 1
                at += 1
                number += 1
                continue
            for back in range(self._empty, 0, -1):
                texts.append(b"")
                starts.append(number - back)
            self._empty = 0
            end = _end_of_record(queue, at)
            if end is None and not last and not _too_long(queue, at):
                self._open = queue[at:]
                break
            if end is None:
                broken.add(len(texts))
                end = at + 1
            texts.append(b"\n".join(queue[at:end]).removesuffix(b"\r"))
            starts.append(number)
            number += end - at
            at = end
        self._line = number
        return texts, starts, broken


def _end_of_record(queue: list[bytes], at: int) -> int | None:
    """Return the index after the last line of a record, None where its quotes are still open."""
    marks = 0
    size = 0
    for end in range(at, min(len(queue), at + _MOST_LINES_OF_A_RECORD)):
        marks += queue[end].count(b'"')
        size += len(queue[end])
        if marks % 2 == 0:
            return end + 1
        if size > _MOST_BYTES_OF_A_RECORD:
            return None
    return None


def _too_long(queue: list[bytes], at: int) -> bool:
    """Return whether enough lines have come to tell that quotes do not end."""
    rest = queue[at : at + _MOST_LINES_OF_A_RECORD]
    return len(rest) == _MOST_LINES_OF_A_RECORD or sum(map(len, rest)) > _MOST_BYTES_OF_A_RECORD


def _split(text: bytes) -> list[bytes]:
    """Return the fields of a record, nothing where it breaks the grammar."""
    if b'"' not in text:
        return text.split(b",")
    try:
        rows = list(csv.reader([text.decode("utf-8", "surrogateescape")], strict=True))
    except csv.Error:
        return []
    if len(rows) != 1:
        return []
    return [field.encode("utf-8", "surrogateescape") for field in rows[0]]


def _plain(field: bytes) -> bytes:
    """Return a field of a broken record in a form that breaks nothing else."""
    if any(mark in field for mark in (b'"', b",", b"\n", b"\r")):
        return b'"' + field.replace(b'"', b'""') + b'"'
    return field


def numbers(fields: Sequence[bytes]) -> tuple[Array, list[int]]:
    """Return fields as numbers, NaN where there is none, and the indices of those that are neither empty nor a number."""
    if b"_" in b"".join(fields):
        # float() takes digits that underscores group, a number of CSV has none
        fields = [b"?" if b"_" in field else field for field in fields]
    wrong: list[int] = []
    try:
        found = np.array(list(map(float, fields)))
    except ValueError:
        found = np.array([_number(field) for field in fields])
    for i in np.flatnonzero(~np.isfinite(found)).tolist():
        # float() takes some words, too
        if not _NUMBER.fullmatch(fields[i]):
            found[i] = math.nan
            if fields[i].strip():
                wrong.append(i)
    return found, wrong


def _number(field: bytes) -> float:
    try:
        return float(field)
    except ValueError:
        return math.nan
