"""``POST /v1/states``: independent states in one call; one bad question never sinks the others."""

from __future__ import annotations

import json

import pytest

GOOD = {"gas": "nitrogen", "pressure": 40, "temperature": 25, "units": {"pressure": "barg", "temperature": "degC"}}


@pytest.fixture
def ask(client):
    def asked(body):
        data = body if isinstance(body, (str, bytes)) else json.dumps(body)
        answer = client.post("/v1/states", data=data, content_type="application/json")
        return answer.status_code, answer.get_json()

    return asked


def test_answers_are_those_of_single_states(ask, client):
    """In their order, each whole."""
    questions = [
        {**GOOD, "pressure": 41},
        {"gas": {"fractions": {"methane": 0.9, "ethane": 0.1}}, "pressure": 5e6, "temperature": 300},
        {"gas": "propane", "pressure": 9e5, "temperature": 250},
    ]
    status, found = ask({"questions": questions})
    assert status == 200
    assert list(found) == ["answers"]
    for question, answer in zip(questions, found["answers"], strict=True):
        single = client.post("/v1/state", json=question).get_json()
        for member in single.keys() - {"trace"}:
            assert single[member] == answer[member]
        assert list(single) == list(answer)


@pytest.mark.parametrize(
    ("question", "pointer"),
    [
        ({**GOOD, "gas": "nitrogem"}, "/gas"),
        ({**GOOD, "pressure": "40"}, "/pressure"),
        ({**GOOD, "colour": 1}, "/colour"),
        ({**GOOD, "temperature": -300}, "/temperature"),
        ({**GOOD, "model": "gerg"}, "/model"),
        ({"gas": "nitrogen"}, "/pressure"),
        (None, ""),
        ("nitrogen", ""),
        ([GOOD], ""),
    ],
    ids=str,
)
def test_a_bad_question_gets_its_problem(ask, question, pointer):
    """As RFC 9457 has it, pointers within the question; its neighbours are answered."""
    status, found = ask({"questions": [GOOD, question, GOOD]})
    assert status == 200
    first, problem, last = found["answers"]
    assert first["result"] == last["result"]
    assert first["quality"]["level"] == "good"
    assert list(problem) == ["problem"]
    assert problem["problem"]["status"] == 422
    assert pointer in {fault["pointer"] for fault in problem["problem"]["errors"]}


@pytest.mark.parametrize(
    ("text", "pointer"),
    [
        ('{"gas": "nitrogen", "gas": "argon", "pressure": 1e5, "temperature": 300}', "/gas"),
        ('{"gas": "nitrogen", "pressure": NaN, "temperature": 300}', "/pressure"),
        ('{"gas": "nitrogen", "pressure": 1e999, "temperature": 300}', "/pressure"),
        ("Infinity", ""),
    ],
)
def test_faults_of_form_stay_in_their_question(ask, text, pointer):
    """A member given twice, and numbers that are none."""
    good = json.dumps(GOOD)
    status, found = ask(f'{{"questions": [{good}, {text}, {good}]}}')
    assert status == 200
    assert found["answers"][0]["result"] == found["answers"][2]["result"]
    assert pointer == found["answers"][1]["problem"]["errors"][0]["pointer"]


@pytest.mark.parametrize(
    ("body", "status"),
    [
        ({"questions": []}, 422),
        ({"questions": [GOOD] * 1001}, 422),
        ({"questions": GOOD}, 422),
        ({}, 422),
        ([GOOD], 422),
        ({"questions": [GOOD], "more": 1}, 422),
        ('{"questions": [', 400),
        ('{"questions": [1], "questions": [2]}', 422),
    ],
    ids=lambda body: str(body)[:40],
)
def test_what_is_no_list_of_questions_is_refused(ask, body, status):
    """As a whole."""
    assert status == ask(body)[0]


def test_a_thousand_questions(ask):
    """The most that one call takes."""
    questions = [{**GOOD, "pressure": 1 + i * 0.01} for i in range(1000)]
    status, found = ask({"questions": questions})
    assert status == 200
    densities = [answer["result"]["density"] for answer in found["answers"]]
    assert densities == sorted(densities)
    assert len(set(densities)) == 1000
