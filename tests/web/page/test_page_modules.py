"""Modules of the page by themselves, in the browser that runs them."""

from __future__ import annotations

import csv
import io
import random

import pytest

from gasapi.web.page.assets import Assets

RECORDS = """async ([module, text]) => {
  const { fieldsOf, recordsOf, recordOf, separatorOf } = await import(module);
  const records = [];
  const lines = [];
  for await (const block of recordsOf(new File([text], "a.csv"), 700)) {
    records.push(...block.records.map((record) => fieldsOf(record, ",")));
    lines.push(...block.lines);
  }
  return { records, lines, again: records.map(recordOf), separator: separatorOf(text.split("\\n")[0]) };
}"""


def address(visit, name):
    return f"{visit.origin}assets/{Assets().digest}/{name}"


def test_records_are_those_of_another_reader(visit):
    """Quotes, line breaks within them, a byte-order mark and both line ends: the fields are those of Python's reader."""
    here = visit()
    chance = random.Random(20260301)
    words = ["", "40.5", "a, b", 'the "old" line', "two\nlines", "ünïcode", "x" * 200]
    rows = [[chance.choice(words) for _ in range(4)] + ["end"] for _ in range(3000)]
    for line_end in ("\n", "\r\n"):
        text = io.StringIO()
        csv.writer(text, lineterminator=line_end).writerows(rows)
        read = here.page.evaluate(RECORDS, [address(here, "csv.js"), "\ufeff" + text.getvalue()])
        assert rows == read["records"]
        assert rows == list(csv.reader(io.StringIO("\n".join(read["again"]), newline="")))
        begun, number = [], 1
        for row in rows:
            begun.append(number)
            number += 1 + sum(field.count("\n") for field in row)
        assert begun == read["lines"]


@pytest.mark.parametrize(("line", "separator"), [("a,b", ","), ("a;b,c;d", ";"), ("a\tb", "\t"), ('"a;b;c",d', ",")])
def test_separator_is_told_from_the_header(visit, line, separator):
    """The sign that parts a header into most fields is its separator."""
    here = visit()
    assert separator == here.page.evaluate(RECORDS, [address(here, "csv.js"), line])["separator"]


def test_numbers_are_read_and_written_as_people_do(visit):
    """Decimal commas are read, words are not; digits are kept as asked, and large and small numbers get a power of ten."""
    here = visit()
    tried = """async (module) => {
      const { parsed, shown, brief, digitsFor, percent } = await import(module);
      return [
        ["40", "6,5", " -1.5e3 ", "+2", "1 000", ".5", "", "4.0.0", "1e", "NaN", "0x10"].map((text) => String(parsed(text))),
        [shown(106.49434, 6), shown(0.000412345, 4), shown(1.5e8, 3), shown(2.5e-7, 3), shown(null), shown(-0.5, 2), shown(0)],
        [brief(40, 4), brief(0.05, 3), brief(1200, 3), brief(8.7183, 3)],
        [digitsFor(5e-4), digitsFor(0.01), digitsFor(null), digitsFor(1e-9)],
        percent(0.0005),
      ];
    }"""
    nan = "NaN"
    assert [
        ["40", "6.5", "-1500", "2", "1000", "0.5", nan, nan, nan, nan, nan],
        ["106.494", "0.0004123", "1.5 \u00d7 10\u2078", "2.5 \u00d7 10\u207b\u2077", "\u2013", "\u22120.50", "0"],
        ["40", "0.05", "1200", "8.72"],
        [6, 4, 6, 8],
        "0.05 %",
    ] == here.page.evaluate(tried, address(here, "numbers.js"))


def test_ticks_are_round_and_inside(visit):
    """Ticks are multiples of 1, 2 or 5 times a power of ten within the range; labels are moved apart."""
    here = visit()
    found = here.page.evaluate(
        "async (module) => { const { ticks, roundStep, spread } = await import(module);"
        " return [ticks(-1.01, 79.2, 8), ticks(0.9993, 1.0011, 4), [0.3, 2, 7, 11].map(roundStep),"
        " spread([{ at: 10 }, { at: 12 }, { at: 99 }, { at: 100 }], 15, 0, 100).map((label) => label.at)]; }",
        address(here, "axes.js"),
    )
    assert [0, 20, 40, 60] == found[0]
    assert [0.9995, 1, 1.0005, 1.001] == found[1]
    assert [0.5, 2, 10, 20] == found[2]
    assert [10, 25, 85, 100] == found[3]
