"""CSV records in blocks: what RFC 4180 says, and what files in the field do."""

from __future__ import annotations

import csv
import io
import math
import random

import numpy as np
import pytest

from gasapi.web import csv_table
from gasapi.web.csv_table import column_name, numbers, read_blocks, read_header


def read(text, fields, wanted=None):
    """All fields of all records, the lines of unreadable ones, and the texts."""
    wanted = list(range(fields)) if wanted is None else wanted
    rows, lines, texts, starts = [], [], [], []
    for block in read_blocks(io.BytesIO(text), fields, wanted):
        lines += [block.lines[i] for i in block.unreadable]
        starts += list(block.lines)
        rows += [list(row) for row in zip(*block.columns, strict=True)]
        texts += block.texts
    return rows, lines, texts, starts


@pytest.mark.parametrize("piece", [1, 2, 3, 7, 64, 1 << 20])
def test_records_do_not_depend_on_the_size_of_pieces(monkeypatch, piece):
    """Quotes, line ends within fields, empty lines and broken rows on every border."""
    monkeypatch.setattr(csv_table, "_PIECE", piece)
    text = b'1,2\r\n"a\r\nb","c"",d"\r\n\r\n3\r\n4,5,6\n"x" y,7\n8,9'
    rows, lines, texts, starts = read(text, 2)
    nothing = [b"", b""]
    assert rows == [[b"1", b"2"], [b"a\r\nb", b'c",d'], nothing, nothing, nothing, nothing, [b"8", b"9"]]
    assert lines == [5, 6, 7, 8]
    assert starts == [2, 3, 5, 6, 7, 8, 9]
    assert texts[1] == b'"a\r\nb","c"",d"'


@pytest.mark.parametrize("seed", range(20))
def test_records_are_those_of_the_standard_library(monkeypatch, seed):
    """Random tables, written by the csv module with both line ends and read in small pieces."""
    monkeypatch.setattr(csv_table, "_PIECE", 50)
    rng = random.Random(seed)
    fields = rng.randint(2, 5)
    parts = ["", "1", "a,b", 'q"q', "x\ny", "x\r\ny", "\u00e4", " ", "40.5"]
    table = [[rng.choice(parts) for _ in range(fields)] for _ in range(60)]
    out = io.StringIO(newline="")
    csv.writer(out, lineterminator=rng.choice(["\n", "\r\n"])).writerows(table)
    rows, lines, *_ = read(out.getvalue().encode(), fields)
    assert lines == []
    assert [[f.decode() for f in row] for row in rows] == table


def test_only_the_columns_that_are_wanted():
    """In their order."""
    assert read(b"1,2,3\n4,5,6\n", 3, [0, 2])[0] == [[b"1", b"3"], [b"4", b"6"]]


def test_quotes_that_do_not_end():
    """Spoil their line and no more, at the end of a body as well."""
    text = b'1,"2\n' + b"3,4\n" * 300 + b'5,"6'
    rows, lines, *_ = read(text, 2)
    assert len(rows) == 302
    assert lines == [2, 303]


def test_a_line_that_does_not_end(monkeypatch):
    """Is cut, so that memory is bounded."""
    monkeypatch.setattr(csv_table, "_LONGEST_LINE", 1000)
    monkeypatch.setattr(csv_table, "_PIECE", 100)
    rows, lines, *_ = read(b"1,2\n" + b"x" * 5000 + b"\n3,4\n", 2)
    assert rows[0] == [b"1", b"2"]
    assert rows[-1] == [b"3", b"4"]
    assert len(lines) == len(rows) - 2


def test_one_column():
    """An empty line between rows is an empty field, at the end it is nothing."""
    rows, lines, *_ = read(b"1\n\n2\n\n\n", 1)
    assert rows == [[b"1"], [b""], [b"2"]]
    assert lines == []


@pytest.mark.parametrize(
    ("text", "name", "unit"),
    [
        ("pressure", "pressure", None),
        ("pressure [barg]", "pressure", "barg"),
        ("pressure[ kg/m3 ]", "pressure", "kg/m3"),
        (" fraction.n-butane [%] ", "fraction.n-butane", "%"),
        ("odd [x] name", "odd [x] name", None),
        ("[x]", "", "x"),
        ("", "", None),
    ],
)
def test_column_names(text, name, unit):
    """A name, and a unit in brackets at its end."""
    assert (name, unit) == column_name(text)


@pytest.mark.parametrize(
    ("body", "expected"),
    [
        (b"a,b\n1,2\n", (b"a,b", ["a", "b"])),
        (b"\xef\xbb\xbfa,b\r\n", (b"a,b", ["a", "b"])),
        (b'"a, b",c', (b'"a, b",c', ["a, b", "c"])),
        (b"", None),
        (b"\n", None),
        (b"a\xff\n", None),
        (b'a,"b\n', None),
        (b"x" * 200_000, None),
    ],
)
def test_headers(body, expected):
    """The first line, or nothing."""
    assert expected == read_header(io.BytesIO(body))


def test_numbers():
    """Plain ones, with spaces and signs; empty fields are missing, anything else is wrong."""
    fields = [b"1", b" 2.5 ", b"+3e2", b"-.5", b"4.", b"", b"  ", b"1e999"]
    found, wrong = numbers(fields)
    assert np.array_equal(found, [1.0, 2.5, 300.0, -0.5, 4.0, math.nan, math.nan, math.inf], equal_nan=True)
    assert wrong == []
    odd = [b"nan", b"inf", b"-Infinity", b"1_0", b"0x1", b"1,5", b"\xd9\xa4", b"e5", b"1 2", b"1.2.3", b"a", b"7"]
    found, wrong = numbers(odd)
    assert wrong == list(range(len(odd) - 1))
    assert found[-1] == 7.0
    assert np.isnan(found[:-1]).all()
