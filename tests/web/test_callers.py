"""Who asks: how often, from which page, by which id."""

from __future__ import annotations

import re

import pytest

from gasapi.app import create_app
from gasapi.settings import Settings
from gasapi.web.problems import Problem
from gasapi.web.rate_limit import RateLimit, caller_address
from gasapi.web.request_id import RequestIds, trace_parent

STATE = "/v1/state?gas=nitrogen&pressure=4e6&temperature=300"


@pytest.fixture(scope="module")
def client():
    return create_app(Settings()).test_client()


class Clock:
    now = 1000.0

    def __call__(self):
        return self.now


def test_a_bucket_empties_at_its_rate(tmp_path):
    """Ten at once and two a second thereafter, for each caller alone; the wait that is told is the wait that is needed."""
    clock = Clock()
    limit = RateLimit(2.0, 10.0, tmp_path / "rates", clock)
    other_worker = RateLimit(2.0, 10.0, tmp_path / "rates", clock)
    for n in range(10):
        (limit, other_worker)[n % 2].take("first")
    with pytest.raises(Problem) as refused:
        limit.take("first")
    assert (429, (("Retry-After", "1"),)) == (refused.value.status, refused.value.headers)
    other_worker.take("second")
    clock.now += 0.49
    with pytest.raises(Problem):
        other_worker.take("first")
    clock.now += 0.02
    other_worker.take("first")
    with pytest.raises(Problem):
        limit.take("first")
    clock.now += 3600.0
    for _ in range(10):
        limit.take("first")
    with pytest.raises(Problem):
        limit.take("first")


def test_the_address_is_that_before_ones_own_proxies():
    """An entry that a caller wrote itself does not count; without proxies the field does not count at all."""
    environ = {"REMOTE_ADDR": "10.0.0.1", "HTTP_X_FORWARDED_FOR": "1.2.3.4, 192.0.2.7, 10.0.0.2"}
    assert "10.0.0.1" == caller_address(environ, 0)
    assert "10.0.0.2" == caller_address(environ, 1)
    assert "192.0.2.7" == caller_address(environ, 2)
    assert "10.0.0.1" == caller_address({"REMOTE_ADDR": "10.0.0.1"}, 1)


def test_pages_of_other_origins_are_let_in_by_name_only():
    """Without named origins no answer speaks of them; with them, the named ones alone are answered, and asked about first."""
    named, other = {"Origin": "https://hmi.example"}, {"Origin": "https://evil.example"}
    inquiry = {"Access-Control-Request-Method": "POST", "Access-Control-Request-Headers": "content-type"}
    closed = create_app(Settings()).test_client()
    answer = closed.get(STATE, headers=named)
    assert not [name for name, _ in answer.headers if name.startswith("Access-Control")]
    client = create_app(Settings(origins=("https://hmi.example",))).test_client()
    answer = client.get(STATE, headers=named)
    assert "https://hmi.example" == answer.headers["Access-Control-Allow-Origin"]
    assert {"Accept", "Origin"} == set(answer.headers.getlist("Vary"))
    assert "Access-Control-Allow-Credentials" not in answer.headers
    assert "Access-Control-Allow-Origin" not in client.get(STATE, headers=other).headers
    first = client.options("/v1/state", headers={**named, **inquiry})
    assert (204, "https://hmi.example") == (first.status_code, first.headers["Access-Control-Allow-Origin"])
    assert "POST" in first.headers["Access-Control-Allow-Methods"]
    assert "Content-Type" in first.headers["Access-Control-Allow-Headers"]
    assert "Access-Control-Allow-Methods" not in client.options("/v1/state", headers={**other, **inquiry}).headers


def test_ids_are_taken_where_they_are_plain_and_made_where_not(client):
    """What a caller sends comes back and is fit for a log line; two made ids differ."""
    assert "line-7/scan.12" == client.get(STATE, headers={"X-Request-ID": "line-7/scan.12"}).headers["X-Request-ID"]
    made = {client.get(STATE).headers["X-Request-ID"] for _ in range(5)}
    for bad in ('a"b', "x" * 200, "a b", ""):
        made.add(client.get(STATE, headers={"X-Request-ID": bad}).headers["X-Request-ID"])
    assert 9 == len(made)
    assert all(re.fullmatch(r"[0-9a-f]{12}-[0-9a-f]+", id) for id in made)
    assert RequestIds().of({}) != RequestIds().of({})


@pytest.mark.parametrize(
    ("field", "valid"),
    [
        ("00-4bf92f3577b34da6a3ce929d0e0e4736-00f067aa0ba902b7-01", True),
        ("00-4BF92F3577B34DA6A3CE929D0E0E4736-00f067aa0ba902b7-01", False),
        ("00-00000000000000000000000000000000-00f067aa0ba902b7-01", False),
        ("00-4bf92f3577b34da6a3ce929d0e0e4736-0000000000000000-01", False),
        ("00-4bf92f3577b34da6a3ce929d0e0e4736-00f067aa0ba902b7", False),
        ("", False),
    ],
)
def test_traces_are_passed_on(client, field, valid):
    """The example of W3C Trace Context, section 3.2.3, and forms that the section calls invalid."""
    assert (field if valid else None) == trace_parent({"HTTP_TRACEPARENT": field})
    assert (field if valid else None) == client.get(STATE, headers={"traceparent": field}).headers.get("traceparent")
