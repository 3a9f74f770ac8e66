"""The guide tells the truth: its questions, asked as they stand there, have the answers that it shows."""

from __future__ import annotations

import json
import sys
from html.parser import HTMLParser
from pathlib import Path

import pytest

from gasapi.app import create_app
from gasapi.guide import PAGES, Guide, examples_of
from gasapi.settings import Settings
from gasapi.web.routes.jobs import JOBS

sys.path.insert(0, str(Path(__file__).resolve().parents[1] / "support"))

from guide_examples import rounded, shown

NAMES = [page.name for page in PAGES]


@pytest.fixture(scope="module")
def client():
    return create_app(Settings()).test_client()


def close(expected, found):
    """Return whether two values agree, numbers to the six digits that are shown."""
    if isinstance(expected, dict):
        return (
            isinstance(found, dict) and expected.keys() == found.keys() and all(close(expected[k], found[k]) for k in expected)
        )
    if isinstance(expected, list):
        return isinstance(found, list) and len(expected) == len(found) and all(map(close, expected, found))
    if isinstance(expected, float) and isinstance(found, float):
        return expected == pytest.approx(found, rel=2e-5)
    return expected == found


@pytest.mark.parametrize("name", NAMES)
def test_worked_examples_are_answered_as_they_stand_there(client, name):
    """Run python tests/support/guide_examples.py where this fails, and read the prose again."""
    examples = examples_of(Guide.source(name))
    assert examples
    for example in examples:
        assert example.call == f"v1/{name}"
        response = client.post(f"/{example.call}", json=example.question)
        assert 200 == response.status_code, response.text
        found = rounded(shown(response.get_json()))
        assert close(example.answer, found), json.dumps(found)


def test_every_job_has_a_page():
    """And no page is without a job."""
    assert {*(job.name for job in JOBS), "lookup-table"} <= set(NAMES)


def test_pages_are_served(client):
    """The index links to every page, and every page is HTML with its title."""
    index = client.get("/guide")
    assert (200, "text/html; charset=utf-8") == (index.status_code, index.content_type)
    for page in PAGES:
        assert f'href="guide?page={page.name}"' in index.text
        response = client.get(f"/guide?page={page.name}")
        assert 200 == response.status_code
        assert f"<h1>{page.title}</h1>" in response.text


def test_unknown_pages_are_404_with_the_names_of_those_there_are(client):
    """As everywhere."""
    response = client.get("/guide?page=nonsense")
    assert (404, "application/problem+json") == (response.status_code, response.content_type)
    assert "pressure-decay" in response.get_json()["detail"]


def test_pages_are_read_without_a_token(tmp_path):
    """A closed network reads the guide before anyone has a token."""
    tokens = tmp_path / "tokens"
    tokens.write_text("a-long-enough-token-for-a-test\n")
    client = create_app(Settings(token_file=tokens)).test_client()
    assert 200 == client.get("/guide").status_code
    assert 401 == client.get("/v1/units").status_code


class Balance(HTMLParser):
    """Checks that every element that is opened is closed in order."""

    def __init__(self):
        super().__init__()
        self.open = []

    def handle_starttag(self, tag, attrs):
        if tag not in ("meta", "link", "br"):
            self.open.append(tag)

    def handle_endtag(self, tag):
        assert tag == self.open.pop()


@pytest.mark.parametrize("name", [None, *NAMES])
def test_pages_are_well_formed(client, name):
    """Every element is closed, and nothing is fetched from elsewhere."""
    page = client.get("/guide" if name is None else f"/guide?page={name}").text
    balance = Balance()
    balance.feed(page)
    assert [] == balance.open
    assert "http://" not in page
    assert "https://" not in page
