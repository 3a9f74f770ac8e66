"""Problem documents: pointers, bounds, and nothing that UTF-8 cannot carry."""

from __future__ import annotations

import json

import jsonschema
import pytest
from hypothesis import given
from hypothesis import strategies as st

from gasapi.errors import FractionsInvalid, GasapiError, ModelCannotServe, UnknownGas, UnknownModel
from gasapi.web.problems import KINDS, LARGEST_BODY, Fault, Problem, body, document, invalid, located, path_of, pointer, shown


@pytest.mark.parametrize(
    ("path", "expected"),
    [
        ((), ""),
        (("foo",), "/foo"),
        (("foo", 0), "/foo/0"),
        (("",), "/"),
        (("a/b",), "/a~1b"),
        (("c%d",), "/c%d"),
        (("m~n",), "/m~0n"),
    ],
)
def test_pointers_of_the_standard(path, expected):
    """The worked pointers of RFC 6901, section 5."""
    assert expected == pointer(path)


def test_messages_are_located_in_their_order():
    """A tree of messages becomes a list of paths; _schema stands for the member itself."""
    tree = {"gas": {"fractions": {"x": ["a", "b"]}}, "units": {"_schema": ["c"]}, "pressure": "d", "rows": {3: ["e"]}}
    assert [
        (("gas", "fractions", "x"), "a"),
        (("gas", "fractions", "x"), "b"),
        (("units",), "c"),
        (("pressure",), "d"),
        (("rows", 3), "e"),
    ] == located(tree)


@given(
    details=st.lists(st.text(st.characters(codec=None), max_size=3000), max_size=60),
    name=st.text(st.characters(codec=None), max_size=2000),
)
def test_any_body_is_bounded_and_json(details, name):
    """Whatever stands in a request, the body is JSON in UTF-8 of at most 16 KiB."""
    problem = Problem(422, name, [Fault(pointer((name, i)), detail) for i, detail in enumerate(details)])
    written = body(problem, name)
    assert len(written) <= LARGEST_BODY
    assert json.loads(written)["status"] == 422


@pytest.mark.parametrize("status", KINDS)
def test_members_are_those_of_the_standard(status):
    """Type, title, status, detail and instance (RFC 9457, section 3.1), the type and instance being URI references."""
    members = document(Problem(status, "words"), "/v1/state \xe9?")
    assert ["type", "title", "status", "detail", "instance"] == list(members)
    schema = {"format": "uri-reference"}
    for name in ("type", "instance"):
        jsonschema.validate(members[name], schema, format_checker=jsonschema.FormatChecker())
        assert members[name].isascii()
        assert " " not in members[name]


def test_one_fault_is_told_in_the_detail():
    """With a single fault the detail says all."""
    assert invalid([Fault("/gas", "no such gas")]).detail == "/gas: no such gas"


@pytest.mark.parametrize(
    ("error", "mixture", "path"),
    [
        (UnknownGas("x"), False, ("gas",)),
        (UnknownGas("x"), True, ("gas", "fractions", "x")),
        (FractionsInvalid("sum", None), True, ("gas", "fractions")),
        (FractionsInvalid("negative", "x"), True, ("gas", "fractions", "x")),
        (UnknownModel("x", ()), False, ("model",)),
        (ModelCannotServe("x", "y", "z"), False, ("model",)),
        (GasapiError("?"), False, ()),
    ],
)
def test_exceptions_point_at_their_member(error, mixture, path):
    """What the service refuses is pointed at where it stands in the question."""
    assert path == path_of(error, mixture=mixture)


@pytest.mark.parametrize(
    ("value", "expected"),
    [
        ("x", '"x"'),
        (True, "true"),
        (None, "null"),
        ({}, "an object"),
        ([], "an array"),
        (1.5, "1.5"),
        pytest.param(10**5000, "a number of thousands of digits", id="digits"),
    ],
)
def test_values_are_shown_in_short(value, expected):
    """An error shows a value as JSON has it, and never at length."""
    assert expected == shown(value)


def test_long_values_are_cut():
    """A value of a million letters is shown by its beginning."""
    assert len(shown("x" * 10**6)) < 100
