"""Validators of answers, how long they keep, and 304 (RFC 9110, sections 8.8 and 13.1.2; RFC 9111, section 5.2.2)."""

from __future__ import annotations

import pytest

from gasapi.app import create_app
from gasapi.settings import Settings
from gasapi.web.caching import SITE, Freshness, matches

STATE = "/v1/state?gas=nitrogen&pressure=4e6&temperature=300"


@pytest.fixture(scope="module")
def client():
    return create_app(Settings()).test_client()


def freshness(**other):
    return Freshness(**{"version": "1", "data": "sha256:a", "site": None, "private": False, "max_age": 60, **other})


def tag(rules, path="/v1/state", query="gas=nitrogen", accept=""):
    return dict(rules.of(path, query, accept).plain)["ETag"]


def test_validator_is_made_of_question_and_data():
    """It is weak, the same for the same question, and another for any other question, form, data, version or site file."""
    ours = tag(freshness())
    assert ours.startswith('W/"')
    assert ours == tag(freshness())
    others = {
        tag(freshness(), query="gas=argon"),
        tag(freshness(), path="/v1/gases/nitrogen"),
        tag(freshness(), accept="text/csv"),
        tag(freshness(data="sha256:b")),
        tag(freshness(version="2")),
        tag(freshness(site="sha256:c")),
    }
    assert 6 == len(others - {ours})


def test_what_depends_on_the_site_is_to_be_asked_again():
    """A gas of the site may mean another mixture tomorrow; where tokens are on, the answer is for its holder alone."""
    for private, plain, site in ((False, "public, max-age=60", "no-cache"), (True, "private, max-age=60", "private, no-cache")):
        caching = freshness(private=private, site="sha256:c").of("/v1/state", "gas=x", "")
        assert plain == dict(caching.fields({}))["Cache-Control"]
        assert site == dict(caching.fields({SITE: True}))["Cache-Control"]
        assert site == dict(freshness(private=private, site="sha256:c").of("/v1/gases", "", "").plain)["Cache-Control"]


@pytest.mark.parametrize("path", ["/metrics", "/livez", "/readyz", "/", "/assets/1/a.js", "/v2/state"])
def test_health_and_the_page_have_no_validator(path):
    """Counters change by themselves, and the page says itself how long it keeps."""
    assert freshness().of(path, "", "") is None


def test_the_comparison_is_weak_and_takes_lists():
    """RFC 9110, section 8.8.3.2: the mark of weakness does not count; any of a list will do."""
    caching = freshness().of("/v1/state", "gas=nitrogen", "")
    ours = dict(caching.plain)["ETag"]
    for field in (ours, ours.removeprefix("W/"), f'"a", {ours} , "b"'):
        assert caching.plain == matches(field, caching)
    assert caching.site == matches(dict(caching.site)["ETag"], caching)
    for field in ("", '"a"', ours[:-2], "W/"):
        assert matches(field, caching) is None


def test_answers_carry_their_fields(client):
    """GET and HEAD have validator, lifetime and Vary, held by the service or not; a posted answer and a refusal have none."""
    first = client.get(STATE)
    for answer in (first, client.get(STATE), client.head(STATE)):
        assert (200, first.headers["ETag"]) == (answer.status_code, answer.headers["ETag"])
        assert ["public, max-age=60"] == answer.headers.getlist("Cache-Control")
        assert ["Accept"] == answer.headers.getlist("Vary")
        assert ["nosniff"] == answer.headers.getlist("X-Content-Type-Options")
    assert b"" == client.get(STATE, headers={"If-None-Match": first.headers["ETag"]}).data
    body = {"gas": "nitrogen", "pressure": 4e6, "temperature": 300}
    assert "ETag" not in client.post("/v1/state", json=body).headers
    for refused in (client.get(STATE + "&gas=argon"), client.get("/v1/gases/nitrogn"), client.get("/nowhere")):
        assert "no-store" == refused.headers["Cache-Control"]
        assert "ETag" not in refused.headers
    assert "no-store" == client.get("/metrics").headers["Cache-Control"]
    assert ["no-cache"] == client.get("/").headers.getlist("Cache-Control")
    for path in ("/v1/gases", "/v1/gases/argon", "/v1/models", "/v1/units", "/v1/reference-conditions", "/openapi.json"):
        answer = client.get(path)
        again = client.get(path, headers={"If-None-Match": answer.headers["ETag"]})
        assert (304, answer.headers["ETag"], b"") == (again.status_code, again.headers["ETag"], again.data)


def test_the_validator_of_one_form_is_not_that_of_another(client):
    """A cache that holds the JSON is not told to give it to who asked for CSV."""
    json_tag = client.get(STATE).headers["ETag"]
    assert 200 == client.get(STATE, headers={"If-None-Match": json_tag, "Accept": "text/csv"}).status_code


SITE_FILE = """
[site]
ambient_pressure = 98000
[gases.line-gas]
fractions = { methane = 0.9, nitrogen = 0.1 }
[substances.my-solvent]
molar_mass = 86.2
critical_temperature = 507.6
critical_pressure = 3025000
acentric_factor = 0.301
"""


@pytest.fixture
def site_client(tmp_path):
    file = tmp_path / "site.toml"
    file.write_text(SITE_FILE)
    return create_app(Settings(site_file=file)).test_client()


@pytest.mark.parametrize(
    ("query", "control"),
    [
        ("gas=nitrogen&pressure=4e6&temperature=300", "public, max-age=60"),
        ("gas=nitrogen&pressure=4&temperature=300&pressure_unit=bar", "public, max-age=60"),
        ("gas=line-gas&pressure=4e6&temperature=300", "no-cache"),
        ("gas=Line-Gas&pressure=4e6&temperature=300", "no-cache"),
        ("fraction.line-gas=0.5&fraction.argon=0.5&pressure=4e6&temperature=300", "no-cache"),
        ("gas=my-solvent&pressure=1e4&temperature=400", "no-cache"),
        ("gas=nitrogen&pressure=4&temperature=300&pressure_unit=barg", "no-cache"),
    ],
)
def test_what_the_site_file_lays_down_is_found_in_every_form(site_client, query, control):
    """By name, as a part of a mixture, as a substance, or by the ambient pressure of a gauge reading; held or not."""
    for _ in range(2):
        answer = site_client.get(f"/v1/state?{query}")
        assert (200, control) == (answer.status_code, answer.headers["Cache-Control"])
