"""A person picks a gas, sets the state, reads the answer and hands it over."""

from __future__ import annotations

import contextlib
import io
import re

import pytest
from page_service import MINUS, NO_FIGURE
from playwright.sync_api import expect

PLANT = {"pressure": "barg", "temperature": "degC", "density": "kg/m3"}
CARBON_DIOXIDE = "?gas=carbon+dioxide&pressure={p}&temperature={t}&pressure_unit=barg&temperature_unit=degC"


def read(page, id="density"):
    """Return the number that a figure shows."""
    return float(page.inner_text(f"#{id}").replace(MINUS, "-"))


def close_to(value):
    """The page shows as many digits as the uncertainty of the equation deserves."""
    return pytest.approx(value, rel=1e-4)


def test_gas_is_found_by_any_name_and_answered(visit):
    """A gas is picked from the list by keyboard, and the figures are those of the interface."""
    here = visit()
    gas = here.page.locator("#gas")
    gas.click()
    gas.press_sequentially("ammon")
    expect(here.page.locator(".found [role=option]").first).to_have_text(re.compile("Ammonia"))
    gas.press("ArrowDown")
    gas.press("Enter")
    here.page.fill("#pressure", "5")
    here.page.fill("#temperature", "60")
    here.settled()
    asked = here.state(gas="ammonia", pressure=5, temperature=60, units=PLANT)
    assert close_to(asked["result"]["density"]) == read(here.page)
    assert close_to(asked["result"]["compressibility_factor"]) == read(here.page, "factor")
    expect(here.page.locator("#equation")).to_contain_text(asked["model"]["name"])
    expect(here.page.locator("#cautions")).to_contain_text(asked["cautions"][0])
    here.keep("ammonia")


def test_cas_number_and_formula_find_a_gas(visit):
    """A CAS number in the list leads to the gas."""
    here = visit()
    here.page.click("#gas")
    here.page.locator("#gas").press_sequentially("7664-41-7")
    options = here.page.locator(".found [role=option]")
    expect(options).to_have_count(1)
    options.click()
    expect(here.page.locator("#gas")).to_have_value("ammonia")


def test_change_of_unit_keeps_the_state(visit):
    """Another unit writes the same state anew: 40 barg are 580.151 psig (1 psi = 6894.757 Pa, NIST SP 811)."""
    here = visit()
    before = read(here.page)
    here.page.select_option("select[name=pressure_unit]", "psig")
    here.settled()
    expect(here.page.locator("#pressure")).to_have_value("580.151")
    assert close_to(before) == read(here.page)
    here.page.select_option("select[name=temperature_unit]", "degF")
    here.settled()
    expect(here.page.locator("#temperature")).to_have_value("59")
    assert close_to(before) == read(here.page)
    here.page.select_option("select[name=density_unit]", "lb/ft3")
    here.settled()
    # 1 lb/ft3 = 16.01846 kg/m3, NIST SP 811
    assert close_to(before / 16.018463) == read(here.page)


def test_crossing_the_dew_line_is_seen(visit):
    """Colder and colder: good, then warned near the dew line, then liquid; mark and words change, not colour alone."""
    here = visit(CARBON_DIOXIDE.format(p=40, t=15))
    verdict, reasons = here.page.locator("#verdict"), here.page.locator("#reasons")
    expect(verdict).to_contain_text("Good")
    here.page.fill("#temperature", "8")
    here.settled()
    expect(verdict).to_contain_text("Uncertain")
    expect(reasons).to_contain_text("close to its dew line")
    expect(here.page.locator("[data-code=near_dew_point]")).to_be_visible()
    here.keep("near-the-dew-line")
    here.page.fill("#temperature", "2")
    here.settled()
    expect(reasons).to_contain_text("liquid")
    expect(verdict).to_contain_text("Uncertain")


def test_arrow_keys_move_the_state_over_the_dew_line(visit):
    """The map is worked by keyboard: downwards is colder, and the address follows."""
    here = visit(CARBON_DIOXIDE.format(p=40, t=8))
    here.page.focus("#map")
    for _ in range(6):
        here.page.keyboard.press("ArrowDown")
    here.settled()
    assert float(here.page.input_value("#temperature")) < 6.2
    expect(here.page.locator("#reasons")).to_contain_text("liquid")
    assert f"temperature={here.page.input_value('#temperature')}" in here.page.url


def test_pointer_drags_the_state(visit):
    """Dragging the mark to the left lowers the pressure."""
    here = visit(CARBON_DIOXIDE.format(p=40, t=15))
    box = here.page.locator("#handle").bounding_box()
    x, y = box["x"] + box["width"] / 2, box["y"] + box["height"] / 2
    here.page.mouse.move(x, y)
    here.page.mouse.down()
    here.page.mouse.move(x - 60, y, steps=5)
    here.page.mouse.move(x - 120, y, steps=5)
    here.page.mouse.up()
    here.settled()
    assert 20 < float(here.page.input_value("#pressure")) < 36
    asked = here.state(
        gas="carbon dioxide",
        pressure=float(here.page.input_value("#pressure")),
        temperature=float(here.page.input_value("#temperature")),
        units=PLANT,
    )
    assert close_to(asked["result"]["density"]) == read(here.page)


def test_curves_are_read_by_keyboard(visit):
    """The reading says the Z that the service gives for that pressure."""
    here = visit(CARBON_DIOXIDE.format(p=40, t=25))
    curves = here.page.locator("#curves")
    curves.focus()
    curves.press("Home")
    for _ in range(20):
        curves.press("ArrowRight")
    said = curves.get_attribute("aria-valuetext")
    pressure = float(curves.get_attribute("aria-valuenow"))
    z = float(re.search(r"25 °C: Z ([0-9.]+)", said)[1])
    asked = here.state(gas="carbon dioxide", pressure=pressure, temperature=25, units=PLANT)
    assert pytest.approx(asked["result"]["compressibility_factor"], abs=2e-5) == z
    expect(here.page.locator("#reading")).to_have_text(said)


def test_picture_has_five_isotherms_and_other_equations(visit):
    """Five temperatures are drawn; other equations are laid over them on request, and listed with their differences."""
    here = visit("?gas=nitrogen&pressure=40&temperature=25&pressure_unit=barg&temperature_unit=degC")
    expect(here.page.locator("#curves path.curve:not(.liquid):not(.other)")).to_have_count(5)
    here.page.check("#overlay")
    here.settled()
    rows = here.page.locator("#agreement tbody tr")
    assert 5 <= here.page.locator("#curves path.curve.other").count() == rows.count() - 1
    expect(here.page.locator("#agreement tr.chosen")).to_contain_text("reference")
    here.keep("other-equations")
    here.page.check("input[name=quantity][value=density]")
    here.settled()
    expect(here.page.locator("#curves-caption")).to_contain_text("Density")


def test_dew_line_and_margin_are_drawn(visit):
    """The whole boundary is drawn where it is asked for, with its critical point, and the height above it."""
    here = visit(CARBON_DIOXIDE.format(p=40, t=15))
    expect(here.page.locator("#map .plumb-text")).to_have_text("8.72 K")
    here.page.check("input[name=view][value=whole]")
    here.settled()
    expect(here.page.locator("#map path.dew")).to_have_count(1)
    expect(here.page.locator("#map")).to_contain_text("critical")
    here.keep("whole-dew-line")


def test_design_window_is_drawn_and_linked(visit):
    """The window of the design stands in the picture and in the address, but not in the question to the service."""
    here = visit()
    here.page.click("#more > summary")
    for name, value in (("pressure_low", 20), ("pressure_high", 50), ("temperature_low", 5), ("temperature_high", 30)):
        here.page.fill(f"[name='window.{name}']", str(value))
    here.settled()
    expect(here.page.locator("#map rect.design")).to_have_count(1)
    assert "window.pressure_low=20" in here.page.url
    expect(here.page.locator("#call-get code")).not_to_contain_text("window")


def test_link_opens_the_same_answer(visit):
    """The copied link, opened anew elsewhere, asks and shows the same; so does the address that answers by itself."""
    here = visit(permissions=["clipboard-read", "clipboard-write"])
    here.page.fill("#gas", "sulfur hexafluoride")
    here.page.fill("#pressure", "6,5")
    here.page.fill("#temperature", "-5")
    here.page.select_option("select[name=density_unit]", "g/L")
    here.settled()
    here.page.click("#call-link button")
    link = here.page.evaluate("navigator.clipboard.readText()")
    there = visit(None)
    there.page.goto(link)
    there.settled()
    assert here.page.inner_text("#density") == there.page.inner_text("#density")
    assert "sulfur hexafluoride" == there.page.input_value("#gas")
    assert "6.5" == there.page.input_value("#pressure")
    answer = there.context.request.get(there.page.inner_text("#call-get code")).json()
    assert close_to(answer["result"]["density"]) == read(there.page)


def test_numbers_without_units_mean_what_they_mean_to_the_interface(visit):
    """The query of a GET works behind the page's own address, its defaults (Pa and K) included."""
    here = visit("?gas=nitrogen&pressure=4101325&temperature=298.15")
    asked = here.context.request.get(f"{here.origin}v1/state?gas=nitrogen&pressure=4101325&temperature=298.15").json()
    assert close_to(asked["result"]["density"]) == read(here.page)
    assert "nitrogen, 4101325 Pa, 298.15 K: gasapi" == here.page.title()


def test_curl_and_python_hold_the_question(visit):
    """What is handed over as curl and as Python holds the very body that the page asked with."""
    here = visit(
        "?fraction.methane=0.9&fraction.nitrogen=0.1&pressure=70&temperature=15&pressure_unit=barg&temperature_unit=degC"
    )
    curl = here.page.inner_text("#call-curl code")
    body = re.search(r"-d '(.*?)' 'http", curl)[1]
    answer = here.context.request.post(f"{here.origin}v1/state", data=body, headers={"Content-Type": "application/json"})
    assert close_to(answer.json()["result"]["density"]) == read(here.page)
    python = here.page.inner_text("#call-python code")
    printed = io.StringIO()
    with contextlib.redirect_stdout(printed):
        exec(compile(python, "handed over", "exec"), {})
    assert close_to(float(printed.getvalue().split()[0])) == read(here.page)
    assert 'gas={"fractions": {"methane": 0.9, "nitrogen": 0.1}}' in python
    line = here.page.inner_text("#call-line code")
    address = re.search(r"'(http[^']*)'$", line)[1]
    fields = here.context.request.get(address, headers={"Accept": "text/csv; header=absent"}).text().strip().split(",")
    assert close_to(float(fields[1])) == read(here.page)
    assert 5 == len(fields)


def test_mixture_is_typed_and_its_sum_is_told(visit):
    """A mixture is made of components; what is missing is said, and the answer is that of the mixture."""
    here = visit("?gas=methane&pressure=70&temperature=15&pressure_unit=barg&temperature_unit=degC")
    here.page.click("#to-blend")
    here.settled()
    expect(here.page.locator("#whole")).to_contain_text("make the whole")
    fractions = here.page.get_by_label("Fraction", exact=True)
    fractions.nth(1).fill("0.05")
    expect(here.page.locator("#whole")).to_contain_text("0.05 are missing")
    expect(here.page.locator("#fault")).to_be_visible()
    expect(here.page.locator("#density")).to_have_text(NO_FIGURE)
    fractions.nth(0).fill("0.95")
    here.settled()
    asked = here.state(gas={"fractions": {"methane": 0.95, "nitrogen": 0.05}}, pressure=70, temperature=15, units=PLANT)
    assert close_to(asked["result"]["density"]) == read(here.page)
    here.keep("mixture")
    assert all("422" in words for words in here.errors)
    here.errors = []  # the sum was not whole for a moment


@pytest.mark.parametrize(
    ("field", "value", "told"),
    [
        ("#gas", "nitrogne", "nitrogen"),
        ("#pressure", "-5", "absolute pressure"),
        ("#pressure", "abc", "is not a number"),
        ("#temperature", "-300", "above 0 K"),
    ],
)
def test_what_cannot_be_answered_is_told(visit, field, value, told):
    """A fault is told in words at its field, and no earlier figure is left standing."""
    here = visit()
    here.errors = []  # the browser itself reports an answer with status 422
    here.page.fill(field, value)
    here.page.press(field, "Tab")
    here.settled()
    expect(here.page.locator("#fault")).to_contain_text(told)
    expect(here.page.locator(field)).to_have_attribute("aria-invalid", "true")
    expect(here.page.locator("#density")).to_have_text(NO_FIGURE)
    assert all("422" in words for words in here.errors)
    here.errors = []


def test_two_phases_give_no_number_and_say_why(visit):
    """A mixture inside its two-phase range has no figure, a crossed ring and the reason."""
    here = visit(
        "?fraction.propane=0.5&fraction.n-butane=0.5&pressure=4&temperature=20&pressure_unit=bar&temperature_unit=degC"
    )
    expect(here.page.locator("#verdict")).to_contain_text("Bad")
    expect(here.page.locator("#reasons")).to_contain_text("side by side")
    expect(here.page.locator("#density")).to_have_text(NO_FIGURE)


def test_service_that_is_gone_is_told(visit):
    """Without the service the page says so and leaves no figure standing; with it back the next change is answered."""
    here = visit()
    here.context.set_offline(True)
    here.page.fill("#pressure", "30")
    here.settled()
    expect(here.page.locator("#fault")).to_contain_text("cannot be reached")
    expect(here.page.locator("#verdict")).to_contain_text("No answer")
    expect(here.page.locator("#cautions li")).to_have_count(0)
    expect(here.page.locator("#density")).to_have_text(NO_FIGURE)
    here.context.set_offline(False)
    here.page.fill("#pressure", "31")
    here.settled()
    expect(here.page.locator("#fault")).not_to_be_visible()
    expect(here.page.locator("#verdict")).to_contain_text("Good")
    expect(here.page.locator("#cautions li")).not_to_have_count(0)
    asked = here.state(gas="carbon dioxide", pressure=31, temperature=15, units=PLANT)
    assert close_to(asked["result"]["density"]) == read(here.page)
    assert all("ERR_INTERNET_DISCONNECTED" in words for words in here.errors)
    here.errors = []
