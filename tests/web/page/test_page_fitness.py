"""Fit for people and places: access, size, speed, narrow and wide, light and dark, without scripts, with tokens."""

from __future__ import annotations

from importlib.resources import files

import axe_playwright_python
import pytest
from page_service import KEPT, NO_FIGURE, served
from playwright.sync_api import expect

AXE = files(axe_playwright_python).joinpath("axe.min.js").read_text(encoding="utf-8")
LINE = "?gas=carbon+dioxide&pressure=40&temperature=8&pressure_unit=barg&temperature_unit=degC"
FOCUSED = "document.activeElement.id || document.activeElement.name || document.activeElement.textContent"
METER = "#meter?reference=din-1343&principle=volumetric&design_density=80"
LEAVES = (
    "",
    LINE,
    "#history",
    METER,
    "#vessel",
    "#leak",
    "#share?density=20",
    "#table",
)
LOOK = (
    """async (parts) => (await axe.run({ include: parts.map((part) => [part]) }, { resultTypes: ["violations"] })).violations"""
)
PAPERS = ("catalogue", "catalogue?search=R-134a", "catalogue?gas=ammonia", "interface")


# of the long papers a part is looked at, which holds every kind of thing that is on them
LOOKED_AT = {"interface": ["header", "nav", "#post-v1-state", "#get-v1-gases"], "catalogue?search=chlor": ["html"]}
IN_DARK = (LINE, "#history", "#leak", "catalogue?gas=ammonia")


@pytest.mark.parametrize(
    ("scheme", "addresses"), [("light", (*LEAVES, *LOOKED_AT, "catalogue?gas=ammonia")), ("dark", IN_DARK)]
)
def test_no_serious_fault_of_access(visit, scheme, addresses):
    """axe-core finds nothing serious on any leaf or paper, in light and in dark."""
    here = visit(None, color_scheme=scheme)
    for address in addresses:
        here.page.goto("about:blank")
        here.open(address)
        here.settled()
        here.page.evaluate(AXE)
        found = here.page.evaluate(LOOK, LOOKED_AT.get(address, ["html"]))
        serious = [
            (address, fault["id"], node["target"], node["failureSummary"][:300])
            for fault in found
            if fault["impact"] in ("serious", "critical")
            for node in fault["nodes"]
        ]
        assert [] == serious


KEPT_OF_EACH_WIDTH = {LINE: "state", METER: "meter", "#table": "table"}


@pytest.mark.parametrize(
    ("width", "height", "scheme", "addresses"),
    [
        (360, 740, "light", (*LEAVES, *PAPERS)),
        (1440, 900, "dark", KEPT_OF_EACH_WIDTH),
        (2560, 1440, "light", KEPT_OF_EACH_WIDTH),
    ],
)
def test_nothing_overflows(visit, width, height, scheme, addresses):
    """No leaf or paper is wider than the window, from a phone to a wall; pictures are kept."""
    here = visit(None, color_scheme=scheme, viewport={"width": width, "height": height})
    for address in addresses:
        here.page.goto("about:blank")
        here.open(address)
        here.settled()
        assert here.page.evaluate("document.documentElement.scrollWidth") <= width, address
        if address in KEPT_OF_EACH_WIDTH:
            here.keep(f"{KEPT_OF_EACH_WIDTH[address]}-{width}-{scheme}")


def test_everything_is_reached_by_keyboard_in_order(visit):
    """Tab goes through the sentence from left to right, then to what stands below; the focus is always visible."""
    here = visit()
    here.page.focus(".wordmark")
    seen = []
    for _ in range(28):
        here.page.keyboard.press("Tab")
        seen.append(
            here.page.evaluate("document.activeElement.id || document.activeElement.name || document.activeElement.textContent")
        )
        assert "none" != here.page.evaluate("getComputedStyle(document.activeElement).outlineStyle")
    wanted = [
        "gas",
        "pressure",
        "pressure_unit",
        "temperature",
        "temperature_unit",
        "to-blend",
        "density_unit",
        "overlay",
        "map",
        "curves",
    ]
    assert wanted == [name for name in seen if name in wanted]


def test_page_and_assets_are_small(visit):
    """The page with all that it needs is below 300 kB, uncompressed."""
    here = visit(None)
    sizes = []
    here.page.on("response", lambda answer: "/v1/" not in answer.url and sizes.append(len(answer.body())))
    here.open()
    here.settled()
    print(f"{len(sizes)} files, {sum(sizes)} bytes")
    assert 20 < len(sizes)
    assert sum(sizes) < 300_000


def test_paint_and_answers_are_measured(visit):
    """Every visit marks its first paint and every change its answer; the figures are printed, a clock proves nothing."""
    here = visit(None)
    paints = []
    for _ in range(4):
        here.open(LINE)
        here.settled()
        here.page.wait_for_function("performance.getEntriesByName('first-contentful-paint').length")
        paints.append(here.page.evaluate("performance.getEntriesByName('first-contentful-paint')[0].startTime"))
    for n in range(8):
        here.page.fill("#pressure", str(30 + n))
        here.settled()
    answers = here.page.evaluate("performance.getEntriesByName('answer drawn').map((entry) => entry.duration)")[1:]
    print(f"first paint {sorted(paints)} ms, answers {sorted(answers)} ms")
    assert len(paints) == 4
    assert len(answers) >= 7


def test_policy_forbids_what_is_not_of_the_service(visit):
    """The policy takes scripts and styles from the service alone, and the browser enforces it."""
    here = visit()
    answer = here.context.request.get(here.origin)
    policy = answer.headers["content-security-policy"]
    assert "unsafe" not in policy
    assert "default-src 'none'" in policy
    ran = here.page.evaluate(
        """() => {
          const script = document.createElement("script");
          script.textContent = "window.inline = true";
          document.body.append(script);
          return window.inline === true;
        }"""
    )
    assert ran is False
    assert all("Content Security Policy" in words for words in here.errors)
    assert here.errors != []
    here.errors.clear()


def test_without_scripts_the_question_is_still_asked(visit):
    """Without scripts the sentence is a plain form of the interface, and the papers read as they are."""
    here = visit(None, java_script_enabled=False)
    here.page.goto(here.origin)
    here.page.fill("#gas", "nitrogen")
    here.page.click("#ask")
    here.page.wait_for_load_state()
    assert "/v1/state?" in here.page.url
    assert '"density"' in here.page.content()
    here.page.goto(here.origin + "catalogue?search=laughing")
    here.page.goto(here.origin + "interface")
    expect(here.page.locator("#post-v1-state")).to_contain_text("POST /v1/state")


def test_token_is_asked_for_once_and_kept_for_the_visit(visit, tmp_path):
    """Where tokens are on, page and assets open, a wrong token is asked for again, a good one is kept for the visit."""
    tokens = tmp_path / "tokens"
    tokens.write_text("a-long-token-of-this-test-only-0123456789\n", encoding="utf-8")
    with served(GASAPI_TOKEN_FILE=str(tokens)) as closed:
        here = visit(None, at=closed)
        here.page.goto(closed)
        dialog = here.page.locator("#token-dialog")
        expect(dialog).to_be_visible()
        here.page.fill("#token", "wrong")
        here.page.click("#token-form button[value=use]")
        expect(dialog).to_contain_text("not good here")
        here.page.fill("#token", "a-long-token-of-this-test-only-0123456789")
        here.page.click("#token-form button[value=use]")
        expect(here.page.locator("#density")).not_to_have_text(NO_FIGURE)
        here.settled()
        here.page.reload()
        here.settled()
        expect(here.page.locator("#density")).not_to_have_text(NO_FIGURE)
        expect(dialog).not_to_be_visible()
        assert all("401" in words for words in here.errors)
        here.errors.clear()
        here.context.close()


def test_sheet_is_printed_whole(visit):
    """The printed sheet is a document of a few pages without controls."""
    here = visit(LINE)
    KEPT.mkdir(parents=True, exist_ok=True)
    printed = here.page.pdf(path=KEPT / "sheet.pdf", format="A4")
    assert printed.startswith(b"%PDF")
    here.page.emulate_media(media="print")
    expect(here.page.locator(".leaves")).not_to_be_visible()
    expect(here.page.locator("#density")).to_be_visible()
    expect(here.page.locator("#cautions")).to_be_visible()
