"""A file is dropped on the page, answered in blocks, drawn and taken away."""

from __future__ import annotations

import csv
import io
import math
import time

import pytest
from playwright.sync_api import expect

DROP = """([name, text]) => {
  const transfer = new DataTransfer();
  transfer.items.add(new File([text], name, { type: "text/csv" }));
  const dropped = new DragEvent("drop", { dataTransfer: transfer, bubbles: true, cancelable: true });
  document.getElementById("drop").dispatchEvent(dropped);
}"""

# invented readings
BROKEN = (
    "time,PT-7 [barg],TT-7 [degC],operator\r\n"
    '2026-03-01T00:00,40,15,"Lee, A."\r\n'
    "2026-03-01T00:01,sensor fault,15,Lee\r\n"
    "\r\n"
    "2026-03-01T00:02,,15,Lee\r\n"
    "2026-03-01T00:03,40,3,Lee\r\n"
)


def finished(here):
    """Answer the file and return its rows as they are taken away."""
    here.page.click("#run")
    expect(here.page.locator("#take")).to_be_visible(timeout=60_000)
    with here.page.expect_download() as download:
        here.page.click("#take")
    with open(download.value.path(), newline="", encoding="utf-8") as file:
        return list(csv.reader(file))


def test_dropped_file_with_broken_rows_is_finished(visit):
    """Broken rows stay in their places without numbers; others have those of the interface; columns are kept."""
    here = visit("#history")
    here.page.evaluate(DROP, ["readings.csv", BROKEN])
    expect(here.page.get_by_label("Column PT-7 is")).to_have_value("pressure")
    expect(here.page.get_by_label("Column TT-7 is")).to_have_value("temperature")
    header, *rows = finished(here)
    assert ["timestamps", "pressure [barg]", "temperature [degC]", "operator"] == header[:4]
    column = {name.split(" ")[0]: n for n, name in enumerate(header)}
    assert ["2026-03-01T00:00", "40", "15", "Lee, A."] == rows[0][:4]
    units = {"pressure": "barg", "temperature": "degC", "density": "kg/m3"}
    for row, temperature in ((rows[0], 15), (rows[3], 3)):
        asked = here.state(gas="carbon dioxide", pressure=40, temperature=temperature, units=units, model="reference")
        assert asked["result"]["density"] == float(row[column["density"]])
        assert asked["quality"]["status_code"] == int(row[column["status_code"]])
    for row in rows[1:3]:
        assert "" == row[column["density"]]
        assert 0x80000000 <= int(row[column["status_code"]])
    # the line of the file, header and empty line counted
    assert "line 3" in rows[1][column["reasons"]]
    expect(here.page.locator("#history-counts")).to_contain_text("Of 4 rows 1 good, 1 uncertain, 2 bad, by reference")
    trend = here.page.locator("#trend")
    trend.focus()
    trend.press("End")
    expect(here.page.locator("#trend-reading")).to_contain_text("Row 4: density")
    trend.press("ArrowLeft")
    expect(here.page.locator("#trend-reading")).to_have_text("Row 3: density no number, Z no number, bad.")
    expect(here.page.locator("#trend path.lane-bad")).to_have_count(1)
    here.keep("history-broken-row")


def test_long_file_leaves_the_page_alive(visit):
    """Forty thousand rows go in blocks: rows are counted meanwhile, and the page goes on drawing frames."""
    here = visit("#history")
    text = io.StringIO()
    text.write("pressure,temperature\n")
    count = 40_000
    for n in range(count):
        text.write(f"{40 + 12 * math.sin(n / 900):.3f},{18 + 6 * math.sin(n / 2000):.2f}\n")
    here.page.evaluate(DROP, ["long.csv", text.getvalue()])
    here.page.evaluate(
        """() => {
          window.longest = 0;
          window.counts = new Set();
          let last = performance.now();
          const frame = (now) => {
            window.longest = Math.max(window.longest, now - last);
            last = now;
            window.counts.add(document.getElementById("counted").textContent);
            requestAnimationFrame(frame);
          };
          requestAnimationFrame(frame);
        }"""
    )
    started = time.monotonic()
    header, *rows = finished(here)
    print(f"{count} rows in {time.monotonic() - started:.2f} s, longest gap {here.page.evaluate('window.longest'):.0f} ms")
    assert count == len(rows)
    assert len(header) == len(rows[-1])
    assert here.page.evaluate("window.counts.size") >= 5
    # far above what it takes (tens of ms), so that a busy machine does not fail it, and far below the time of the whole
    assert here.page.evaluate("window.longest") < 1000
    here.keep("history-long")


def test_semicolons_and_decimal_commas_are_read(visit):
    """A file as spreadsheets of many countries write it is answered as one with points."""
    here = visit("#history")
    here.page.evaluate(DROP, ["komma.csv", "Druck;Temp\n40,5;15,5\n41;16\n"])
    header, *rows = finished(here)
    units = {"pressure": "barg", "temperature": "degC"}
    asked = here.state(gas="carbon dioxide", pressure=40.5, temperature=15.5, units=units, model="reference")
    assert asked["result"]["density"] == float(rows[0][[name.split(" ")[0] for name in header].index("density")])


def test_one_equation_serves_the_whole_file(visit):
    """Rows beyond the range of the best equation, many blocks later, are answered by the equation of all rows."""
    here = visit("?gas=nitrogen&pressure=40&temperature=25&pressure_unit=barg&temperature_unit=degC&model=gerg-2008#history")
    rows = "".join(f"{40 + n % 7},25\n" for n in range(6000)) + "600,25\n"
    here.page.evaluate(DROP, ["two-blocks.csv", "pressure,temperature\n" + rows])
    header, *answered = finished(here)
    density = [name.split(" ")[0] for name in header].index("density")
    units = {"pressure": "barg", "temperature": "degC"}
    for row, pressure in ((answered[0], 40), (answered[-1], 600)):
        asked = here.state(gas="nitrogen", pressure=pressure, temperature=25, units=units, model="gerg-2008")
        assert asked["result"]["density"] == float(row[density])


@pytest.mark.parametrize(
    ("text", "told"),
    [("", "empty"), ("flow,level\n1,2\n", "No column is the pressure"), ("pressure,temperature\n", "no row")],
)
def test_file_that_cannot_be_answered_is_told(visit, text, told):
    """A file without rows, or without the two columns, is refused in words."""
    here = visit("#history")
    here.page.evaluate(DROP, ["odd.csv", text])
    run = here.page.locator("#run")
    fault = here.page.locator("#history-fault")
    here.settled()
    if run.is_visible():
        run.click()
    expect(fault).to_contain_text(told)
