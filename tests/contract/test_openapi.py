"""The OpenAPI document against the routes, the schemas, and the answers of the service."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import jsonschema
import pytest
import referencing
import referencing.jsonschema

from gasapi.web.openapi import OPERATIONS, make_document

EXPORTED = Path(__file__).resolve().parents[2] / "openapi" / "openapi.json"
PAPERS = {"/assets/{digest}/{name}", "/catalogue", "/guide", "/interface"}
"""What belongs to the page for people and is no part of the interface for programs."""


@pytest.fixture(scope="module")
def document():
    return json.loads(EXPORTED.read_text(encoding="utf-8"))


def close_to(made: Any, exported: Any) -> bool:
    """Return whether two documents are equal, numbers of worked examples to 1 part in a million."""
    if isinstance(made, dict) and isinstance(exported, dict):
        return made.keys() == exported.keys() and all(close_to(made[k], exported[k]) for k in made)
    if isinstance(made, list) and isinstance(exported, list):
        return len(made) == len(exported) and all(map(close_to, made, exported))
    if isinstance(made, float) and isinstance(exported, float):
        return made == pytest.approx(exported, rel=1e-6, abs=1e-12)
    return made == exported


def parts(document):
    """Return the schemas of components and parameters."""
    operations = [operation for item in document["paths"].values() for operation in item.values()]
    parameters = [parameter["schema"] for operation in operations for parameter in operation.get("parameters", ())]
    return [*document["components"]["schemas"].values(), *parameters]


def validator(document, schema):
    resource = referencing.Resource(document, referencing.jsonschema.DRAFT202012)
    registry = referencing.Registry().with_resource("urn:document", resource)
    return jsonschema.Draft202012Validator(absolute(schema), registry=registry)


def absolute(schema):
    """Return a schema whose references lead into the document."""
    if isinstance(schema, dict):
        return {k: "urn:document" + v if k == "$ref" else absolute(v) for k, v in schema.items()}
    return [absolute(item) for item in schema] if isinstance(schema, list) else schema


def contents(document):
    """Yield (where, content) of every body that the document describes."""
    for address, item in document["paths"].items():
        for method, operation in item.items():
            for media, content in operation.get("requestBody", {}).get("content", {}).items():
                yield f"{method} {address} question {media}", content
            for media, content in operation["responses"]["200"]["content"].items():
                yield f"{method} {address} answer {media}", content


def test_exported_document_is_what_the_schemas_make(app, document):
    """Run python -m gasapi.web.openapi where this fails."""
    made = make_document(app.test_client())
    differing = [key for key in made if not close_to(made[key], document.get(key))]
    assert [] == differing
    assert made.keys() == document.keys()


def test_service_serves_the_exported_document(client, document):
    """The bytes of the file are the bytes of the answer."""
    assert EXPORTED.read_bytes() == client.get("/openapi.json").data
    assert document["openapi"].startswith("3.1")


def test_every_route_is_described_and_every_description_has_a_route(app, document):
    """Routes and document name the same addresses and methods."""
    routes = {
        (rule.rule.replace("<", "{").replace(">", "}"), method.lower())
        for rule in app.url_map.iter_rules()
        for method in (rule.methods or set()) - {"HEAD", "OPTIONS"}
    }
    described = {(path, method) for path, item in document["paths"].items() for method in item}
    assert described == {route for route in routes if route[0] not in PAPERS}
    assert len(OPERATIONS) == len(described)


def test_every_schema_is_valid(document):
    """Components and parameters are JSON Schema 2020-12, as OpenAPI 3.1 asks."""
    for schema in parts(document):
        jsonschema.Draft202012Validator.check_schema(schema)


def test_every_reference_leads_somewhere(document):
    """No reference is broken."""
    text = json.dumps(document)
    for pointer in set(text.split('"$ref": "#/')[1:]):
        node = document
        for step in pointer.split('"')[0].split("/"):
            node = node[step]
        assert node


def test_every_operation_has_an_id_and_refusals_of_its_own(document):
    """Ids are unique; each operation says how it may fail."""
    operations = [operation for item in document["paths"].values() for operation in item.values()]
    assert len({operation["operationId"] for operation in operations}) == len(operations)
    assert all("500" in operation["responses"] for operation in operations)


def test_worked_examples_conform(document):
    """Every example, of a question or of an answer, is valid by the schema beside it."""
    checked = 0
    for where, content in contents(document):
        for name, example in content.get("examples", {}).items():
            faults = [error.message for error in validator(document, content["schema"]).iter_errors(example["value"])]
            assert [] == faults, f"{where} {name}"
            checked += 1
    assert checked >= 12


@pytest.mark.parametrize(
    "question",
    [
        {"gas": "nitrogen", "pressure": 1e5, "temperature": 300},
        {"gas": {"fractions": {"methane": 92, "nitrogen": 8}, "fraction_unit": "%"}, "pressure": 1, "temperature": 300},
        {"gas": "nitrogen", "pressure": "1e5", "temperature": 300},
        {"gas": "nitrogen", "pressure": True, "temperature": 300},
        {"gas": "nitrogen", "pressure": 1e5},
        {"gas": "nitrogen", "pressure": 1e5, "temperature": 300, "units": {"pressure": "Bar"}},
        {"gas": "nitrogen", "pressure": 1e5, "temperature": 300, "units": {"force": "N"}},
        {"gas": {"fractions": {}}, "pressure": 1e5, "temperature": 300},
        {"gas": "nitrogen", "pressure": 1e5, "temperature": 300, "accuracy": 0},
        {"gas": "nitrogen", "pressure": 1e5, "temperature": 300, "dew_point_margin": -1},
        {"gas": "nitrogen", "pressure": 1e5, "temperature": 300, "substances": {"x": {"molar_mass": 10}}},
        {"gas": "nitrogen", "pressure": 1e5, "temperature": 300, "model": None},
        {"gas": "nitrogen", "pressure": 1e5, "temperature": 300, "flow": 1},
    ],
)
def test_document_and_service_judge_a_question_alike(client, document, question):
    """What the document's schema refuses the service refuses, and the other way round."""
    schema = document["paths"]["/v1/state"]["post"]["requestBody"]["content"]["application/json"]["schema"]
    allowed = validator(document, schema).is_valid(question)
    assert (200 if allowed else 422) == client.post("/v1/state", json=question).status_code


@pytest.mark.parametrize(
    "question",
    [
        {"gas": "nitrogen", "pressure": 1e5, "temperature": 300},
        {"gas": "water", "pressure": 1e5, "temperature": 280},
        {"gas": "carbon dioxide", "pressure": 8e6, "temperature": 305, "input_uncertainty": {"pressure": 100}},
        {"gas": "helium", "pressure": 1e15, "temperature": 300},
    ],
)
def test_answers_conform_to_the_document(client, document, question):
    """Answers of several kinds are valid by the document."""
    schema = document["paths"]["/v1/state"]["post"]["responses"]["200"]["content"]["application/json"]["schema"]
    answer = client.post("/v1/state", json=question).get_json()
    assert [] == [error.message for error in validator(document, schema).iter_errors(answer)]
