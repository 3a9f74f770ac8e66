"""The papers beside the page, and the files of the page, as the application answers them."""

from __future__ import annotations

import re

import pytest

from gasapi.app import create_app
from gasapi.settings import Settings
from gasapi.web.page.assets import Assets
from gasapi.web.page.interface import calls_of, schemas_of

SITE = """
[gases.fuel-gas]
name = "Fuel gas of boiler house 2"
fractions = { methane = 0.9, ethane = 0.06, nitrogen = 0.04 }
"""


@pytest.fixture(scope="module")
def client():
    return create_app(Settings()).test_client()


def text(client, path):
    answer = client.get(path)
    assert 200 == answer.status_code
    assert "text/html; charset=utf-8" == answer.content_type
    return answer.get_data(as_text=True)


def test_nothing_is_inline_and_nothing_comes_from_elsewhere(client):
    """No script, style or handler stands in the HTML, and no file names another address to fetch from."""
    for path in ("/", "/catalogue", "/catalogue?gas=water", "/interface"):
        page = text(client, path)
        assert not re.search(r"<script(?![^>]*\bsrc=)|<style|\sstyle=|\son[a-z]+=", page)
        assert not re.search(r'(?:src|href)="(?:https?:)?//', page)
    for name in Assets()._files:
        content = Assets().find(Assets().digest, name).content.decode()
        assert [] == re.findall(r"""(?:url\(|import |from |fetch\()\s*["']?(?:https?:)?//""", content)


def test_files_are_kept_under_the_address_of_their_content(client):
    """A file may be kept for ever under its address; under the address of another version there is none."""
    page = text(client, "/")
    address = re.search(r'src="(assets/([0-9a-f]{16})/main\.js)"', page)
    answer = client.get(address[1])
    assert 200 == answer.status_code
    assert "text/javascript; charset=utf-8" == answer.content_type
    assert "immutable" in answer.headers["Cache-Control"]
    assert "no-cache" == client.get("/").headers["Cache-Control"]
    assert 404 == client.get(address[1].replace(address[2], "0" * 16)).status_code
    assert 404 == client.get(f"assets/{address[2]}/..%2Fpapers.py").status_code


def test_every_module_is_fetched_at_once(client):
    """Each script is named in the page, so that none waits for another."""
    page = text(client, "/")
    assert set(Assets().modules) == set(re.findall(r'modulepreload" href="assets/[0-9a-f]+/([a-z-]+\.js)"', page))


def test_catalogue_finds_by_any_name(client):
    """A CAS number, a synonym and a nearly right name find their gas; all gases are listed without a search."""
    everything = text(client, "/catalogue")
    assert len(client.get("/v1/gases").json["gases"]) == everything.count('aria-label="Put ')
    for search in ("7664-41-7", "R-717", "ammonja"):
        assert 'href="catalogue?gas=ammonia"' in text(client, f"/catalogue?search={search}")


def test_gas_has_its_constants_with_sources_and_cautions(client):
    """What the interface says of a gas stands on its paper."""
    paper = text(client, "/catalogue?gas=chlorine")
    entry = client.get("/v1/gases/chlorine").json
    assert entry["critical_temperature"]["source"][:40] in paper
    assert f"{entry['critical_temperature']['value']:.6g}" in paper
    for caution in entry["cautions"]:
        assert caution[:40] in paper
    for model in entry["models"]:
        assert f"<code>{model['id']}</code>" in paper
    assert 404 == client.get("/catalogue?gas=unobtainium").status_code


def test_what_was_typed_is_never_markup(client):
    """A search is written as text."""
    assert "<b>" not in text(client, "/catalogue?search=%3Cb%3Ebold")


def test_interface_tells_every_call_of_the_document(client):
    """Each path and method, member and named part of the OpenAPI document stands on the paper."""
    document = client.get("/openapi.json").json
    paper = text(client, "/interface")
    for path, item in document["paths"].items():
        for method in item:
            assert f"<code>{method.upper()} {path}</code>" in paper
    for name in document["components"]["schemas"]:
        assert f'id="schema-{name}"' in paper
    anchors = set(re.findall(r' id="([^"]+)"', paper))
    assert set() == set(re.findall(r'href="#([^"]+)"', paper)) - anchors


def test_site_gases_stay_within_a_closed_site(tmp_path):
    """Where tokens are asked for, the open papers do not tell what the site calls its own; elsewhere they do."""
    site, tokens = tmp_path / "site.toml", tmp_path / "tokens"
    site.write_text(SITE, encoding="utf-8")
    tokens.write_text("a-long-token-of-this-test-only-0123456789\n", encoding="utf-8")
    opened = create_app(Settings(site_file=site)).test_client()
    assert "boiler house" in text(opened, "/catalogue")
    closed = create_app(Settings(site_file=site, token_file=tokens)).test_client()
    assert "boiler house" not in text(closed, "/catalogue")
    assert 404 == closed.get("/catalogue?gas=fuel-gas").status_code
    assert 401 == closed.get("/v1/gases").status_code
    for path in ("/", "/interface", f"/assets/{Assets().digest}/sheet.css"):
        assert 200 == closed.get(path).status_code


def test_document_is_told_in_words():
    """Parameters, members at their depths, references and refusals of a small document."""
    document = {
        "paths": {
            "/v1/thing": {
                "post": {
                    "summary": "A thing",
                    "description": "One.\n\nTwo\nlines.",
                    "parameters": [{"name": "n", "in": "query", "required": True, "schema": {"type": "integer", "default": 3}}],
                    "requestBody": {"content": {"application/json": {"schema": {"$ref": "#/components/schemas/Thing"}}}},
                    "responses": {"200": {"description": "Done"}, "422": {"$ref": "#/components/responses/No"}},
                }
            }
        },
        "components": {
            "schemas": {
                "Thing": {
                    "type": "object",
                    "required": ["a"],
                    "properties": {
                        "a": {"type": ["number", "null"], "description": "First."},
                        "b": {"type": "object", "properties": {"c": {"enum": ["x", "y"], "type": "string"}}},
                        "d": {"type": "array", "items": {"$ref": "#/components/schemas/Thing"}},
                    },
                }
            },
            "responses": {"No": {"description": "Refused"}},
        },
    }
    (call,) = calls_of(document)
    assert ("POST", "/v1/thing", "post-v1-thing") == (call.method, call.path, call.anchor)
    assert ["One.", "Two lines."] == call.paragraphs
    assert [("n", "integer, in the query", True, "Left out: 3.")] == [
        (line.name, line.kind, line.required, line.description) for line in call.parameters
    ]
    lines = [(line.depth, line.name, line.kind, line.required, line.description) for line in call.bodies[0].lines]
    assert [
        (0, "a", "number or null", True, "First."),
        (0, "b", "object", False, ""),
        (1, "c", "string", False, "One of: x, y."),
        (0, "d", "array of Thing", False, ""),
    ] == lines
    assert (["Done"], ["Refused"]) == ([a.description for a in call.answers], [r.description for r in call.refusals])
    assert ["Thing"] == [schema.name for schema in schemas_of(document)]
    assert ([], []) == (calls_of({}), schemas_of({}))
