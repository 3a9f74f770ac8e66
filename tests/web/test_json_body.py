"""Strict JSON: nothing lost, nothing twice, nothing that a double cannot hold."""

from __future__ import annotations

import json
import time

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gasapi.web.json_body import parse_json
from gasapi.web.problems import Problem

VALUES = st.recursive(
    st.none() | st.booleans() | st.integers(-(2**53), 2**53) | st.floats(allow_nan=False, allow_infinity=False) | st.text(),
    lambda inner: st.lists(inner, max_size=4) | st.dictionaries(st.text(), inner, max_size=4),
    max_leaves=20,
)


@given(value=VALUES)
def test_reads_what_the_standard_library_reads(value):
    """A document without a fault has the value that the standard library gives it, colons in strings or not."""
    text = json.dumps(value)
    assert json.loads(text) == parse_json(text.encode())


@given(members=st.dictionaries(st.text(min_size=1), VALUES, min_size=1, max_size=4), data=st.data())
def test_a_member_given_twice_is_found_wherever_it_stands(members, data):
    """Whatever else is in the document, a name that comes twice in one object is refused."""
    name = data.draw(st.sampled_from(sorted(members)))
    pairs = [f"{json.dumps(k)}: {json.dumps(v)}" for k, v in members.items()]
    pairs.insert(data.draw(st.integers(0, len(pairs))), f"{json.dumps(name)}: 1")
    text = '{"outer": [{' + ", ".join(pairs) + "}]}"
    with pytest.raises(Problem) as caught:
        parse_json(text.encode())
    assert caught.value.status == 422
    escaped = name.replace("~", "~0").replace("/", "~1")
    assert f"/outer/0/{escaped}" in [fault.pointer for fault in caught.value.faults]


def test_equal_names_in_different_objects_are_not_twice():
    """A name may come again in another object."""
    assert parse_json(b'{"a": {"b": 1}, "c": {"b": 2, "a": 3}}') == {"a": {"b": 1}, "c": {"b": 2, "a": 3}}


def test_repeated_members_may_be_let_through():
    """Bodies full of time stamps are not read twice for the sake of their colons."""
    assert parse_json(b'{"a": 1, "a": "12:00:00"}', repeated_members=True) == {"a": "12:00:00"}


@pytest.mark.parametrize(
    ("text", "pointers"),
    [
        ('{"a": NaN}', ["/a"]),
        ('{"a": [1, -Infinity, {"b": Infinity}]}', ["/a/1", "/a/2/b"]),
        ('{"a": 1e400, "b": -1e400}', ["/a", "/b"]),
        ('{"a": 1' + "0" * 400 + "}", ["/a"]),
        ('{"a": 1' + "0" * 100_000 + "}", ["/a"]),
        ("NaN", [""]),
    ],
)
def test_numbers_beyond_a_double_are_pointed_at(text, pointers):
    """Every such number is named by its pointer."""
    with pytest.raises(Problem) as caught:
        parse_json(text.encode())
    assert caught.value.status == 422
    assert pointers == [fault.pointer for fault in caught.value.faults]


@pytest.mark.parametrize("text", [b"", b"{", b"[1,]", b'{"a" 1}', b"\xff", b"[" * 10**6, b"tru", b'"\\ud800"', b'{"a": NaN'])
def test_what_is_no_json_is_a_400(text):
    """The words say where the reading stopped."""
    with pytest.raises(Problem) as caught:
        parse_json(text)
    assert caught.value.status == 400
    assert "not JSON" in caught.value.detail


def test_a_hundred_thousand_names_cost_no_quadratic_time():
    """A large object with one name twice is refused in less than a few seconds."""
    pairs = ",".join(f'"m{i}":1' for i in range(100_000))
    start = time.perf_counter()
    with pytest.raises(Problem):
        parse_json(("{" + pairs + ',"m5":2}').encode())
    assert time.perf_counter() - start < 5.0
