"""The jobs on the page: each shows what the interface answers."""

from __future__ import annotations

import pytest
from page_service import MINUS
from playwright.sync_api import expect

LINE = "?gas=methane&pressure=30&temperature=20&pressure_unit=barg&temperature_unit=degC"
UNITS = {"pressure": "barg", "temperature": "degC"}


def figures(page, leaf):
    """Return the results of a leaf: the first number of each."""
    texts = page.locator(f"#{leaf} dl dt").all_inner_texts()
    values = page.locator(f"#{leaf} dl dd:not(.band)").all_inner_texts()
    return dict(zip(texts, values, strict=True))


def number(text):
    return float(text.split(" ")[0].replace(MINUS, "-"))


def asked(here, call, **question):
    answer = here.context.request.post(f"{here.origin}v1/{call}", data={**question})
    assert answer.ok, answer.text()
    return answer.json()["result"]


def test_meter(visit):
    """A flow is told in all measures, and a meter's factor with its picture; the fields stand in the address."""
    here = visit(f"{LINE}#meter")
    here.page.get_by_label("Reference condition").select_option("din-1343")
    here.page.locator("#meter [name=principle]").select_option("differential_pressure")
    here.page.locator("#meter [name=design_density]").fill("25")
    here.settled()
    told = figures(here.page, "meter")
    result = asked(
        here,
        "flow",
        gas="methane",
        pressure=30,
        temperature=20,
        units={**UNITS, "volume_flow": "m3/h", "mass_flow": "kg/h", "amount_flow": "kmol/h"},
        flow={"kind": "actual_volume", "value": 120, "unit": "m3/h"},
        reference="din-1343",
        meter={"principle": "differential_pressure", "design_density": 25},
    )
    assert pytest.approx(result["reference_volume"], rel=1e-4) == number(told["Volume at the reference condition"])
    assert pytest.approx(result["mass"], rel=1e-4) == number(told["Mass"])
    assert pytest.approx(result["correction_factor"], rel=1e-5) == number(told["Multiply the reading by"])
    expect(here.page.locator("#meter svg[role=img]")).to_be_visible()
    assert "#meter?" in here.page.url
    there = visit(None)
    there.page.goto(here.page.url)
    there.settled()
    assert told == figures(there.page, "meter")


def test_vessel(visit):
    """What a vessel holds, and what is used when it falls."""
    here = visit(f"{LINE}#vessel")
    here.page.locator("#vessel [name=later_pressure]").fill("10")
    here.settled()
    told = figures(here.page, "vessel")
    result = asked(
        here,
        "vessel",
        gas="methane",
        pressure=30,
        temperature=20,
        volume=50,
        units={**UNITS, "volume": "L"},
        later={"pressure": 10, "temperature": 20},
    )
    assert pytest.approx(result["mass"], rel=1e-4) == number(told["Mass held"])
    assert pytest.approx(result["used_mass"], rel=1e-4) == number(told["Mass used"])


def test_leak_test(visit):
    """A leak is told with its uncertainty, and whether it can be told from none."""
    here = visit(f"{LINE}#leak")
    here.page.locator("#leak [name=end_pressure]").fill("29")
    here.settled()
    told = figures(here.page, "leak")
    result = asked(
        here,
        "pressure-decay",
        gas="methane",
        volume=2,
        duration=24,
        units={**UNITS, "duration": "h", "mass_flow": "g/h"},
        start={"pressure": 30, "temperature": 20},
        end={"pressure": 29, "temperature": 20},
        input_uncertainty={"pressure": 0.02, "temperature": 0.1},
    )
    assert pytest.approx(result["lost_mass"], rel=1e-3) == number(told["Lost mass"])
    assert pytest.approx(result["leak_rate"], rel=1e-3) == number(told["Leak rate"])
    assert result["resolved"] is told["Is the loss resolved?"].startswith("Yes")
    here.page.locator("#leak [name=end_pressure]").fill("30")
    here.settled()
    expect(here.page.locator("#leak")).to_contain_text("cannot be told from none")


def test_share_of_two_gases(visit):
    """A density between those of the two gases gives the share; one beyond both is not explained."""
    here = visit("?gas=nitrogen&pressure=3&temperature=20&pressure_unit=barg&temperature_unit=degC#share")
    expect(here.page.locator("#share")).to_contain_text("Give the density")
    density = here.page.locator("#share [name=density]")
    density.fill("2")
    here.settled()
    result = asked(
        here, "fraction-from-density", gases=["hydrogen", "nitrogen"], density=2, pressure=3, temperature=20, units=UNITS
    )
    assert pytest.approx(100 * result["mole_fraction"], rel=1e-4) == number(figures(here.page, "share")["Share of hydrogen"])
    expect(here.page.locator("#share svg[role=img]")).to_be_visible()
    density.fill("50")
    here.settled()
    expect(here.page.locator("#share")).to_contain_text("no mixture of the two explains")


def test_table_is_drawn_and_taken_away(visit):
    """The table keeps its tolerance, its errors are drawn, and it is saved as CSV and as Structured Text."""
    here = visit(f"{LINE}#table")
    expect(here.page.locator("#table rect.cell").first).to_be_attached()
    told = figures(here.page, "table")
    assert number(told["Largest error found"]) <= 0.1
    for words, first in (("CSV", ","), ("Structured Text", "FUNCTION_BLOCK")):
        with here.page.expect_download() as download:
            here.page.get_by_role("button", name=words).click()
        with open(download.value.path(), encoding="ascii") as file:
            assert first in file.read()


def test_refusal_of_a_job_is_told(visit):
    """A vessel of no volume is refused with the service's own sentence."""
    here = visit(f"{LINE}#vessel")
    here.page.locator("#vessel [name=volume]").fill("0")
    here.settled()
    expect(here.page.locator("#vessel .fault")).to_contain_text("volume")
    expect(here.page.locator("#vessel dl")).to_have_count(0)
    assert all("422" in words for words in here.errors)
    here.errors.clear()
