"""The page in a real browser: one Chromium and one running service for all tests, a fresh profile for each."""

from __future__ import annotations

import os
import shutil

import pytest
from page_service import KEPT, served
from playwright.sync_api import sync_playwright

SETTLED = """async () => {
  const frame = () => new Promise((done) => requestAnimationFrame(done));
  do {
    while (document.querySelector("main[aria-busy]")) await frame();
    await frame();
    await frame();
  } while (document.querySelector("main[aria-busy]"));
}"""
FLAGS = (
    "--no-sandbox",
    "--disable-gpu",
    "--disable-quic",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
)


def _chromium() -> str:
    found = shutil.which("chromium") or shutil.which("chromium-browser") or shutil.which("google-chrome")
    if found is None:
        words = "NO CHROMIUM HERE, SO THE PAGE WAS NOT TESTED IN A BROWSER: apt-get install chromium"
        if os.environ.get("CI"):
            pytest.fail(words)
        pytest.skip(words)
    return found


@pytest.fixture(scope="session")
def origin():
    with served() as address:
        yield address


@pytest.fixture(scope="module")
def browser():
    # not for the session: its event loop would still run while other tests want one of their own
    path = _chromium()
    with sync_playwright() as playwright:
        browser = playwright.chromium.launch(executable_path=path, args=list(FLAGS))
        yield browser
        browser.close()


class Visit:
    """A browser with a fresh profile at one service; what the console says and what leaves the service is kept."""

    def __init__(self, browser, origin, **options):
        self.origin = origin
        self.context = browser.new_context(**{"viewport": {"width": 1440, "height": 900}, **options})
        self.context.set_default_timeout(15_000)
        self.errors: list[str] = []
        self.elsewhere: list[str] = []
        self.page = self.context.new_page()
        self.watch(self.page)

    def watch(self, page):
        page.on("console", self._note)
        page.on("pageerror", lambda error: self.errors.append(str(error)))
        page.on("request", lambda request: self._is_here(request.url) or self.elsewhere.append(request.url))

    def _note(self, message):
        address = message.location.get("url", "")
        # beside a bare JSON answer a browser looks for an icon by itself
        if message.type in ("error", "warning") and not address.endswith("/favicon.ico"):
            self.errors.append(f"{message.text} {address}")

    def _is_here(self, address: str) -> bool:
        return address.startswith((self.origin, "blob:" + self.origin, "data:"))

    def open(self, address: str = ""):
        self.page.goto(self.origin + address)
        self.page.evaluate(SETTLED)
        if any("ERR_NETWORK_CHANGED" in words for words in self.errors):
            # an interface of this machine came or went, as when a container starts: Chromium drops what it was fetching
            self.errors.clear()
            self.page.reload()
        return self.page

    def settled(self):
        """Wait until nothing is being asked and the page has drawn."""
        self.page.evaluate(SETTLED)
        return self.page

    def state(self, **question):
        """Ask the service itself."""
        answer = self.context.request.post(f"{self.origin}v1/state", data=question)
        assert answer.ok, answer.text()
        return answer.json()

    def keep(self, name: str, **options):
        """Keep a picture of the page among the outputs of the test run."""
        KEPT.mkdir(parents=True, exist_ok=True)
        self.page.screenshot(path=KEPT / f"{name}.png", full_page=True, **options)


@pytest.fixture
def visit(browser, origin):
    """A visit to the service that must end with nothing in the console and nothing fetched from elsewhere."""
    visits = []

    def start(address: str | None = "", at: str = origin, **options):
        made = Visit(browser, at, **options)
        visits.append(made)
        if address is not None:
            made.open(address)
            made.settled()
        return made

    yield start
    for made in visits:
        made.context.close()
        assert [] == made.errors
        assert [] == made.elsewhere
