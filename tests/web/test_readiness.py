"""What ``/readyz`` tells."""

from __future__ import annotations

import time
from datetime import UTC, datetime, timedelta

from gasapi.app import create_app
from gasapi.settings import Settings
from gasapi.web.tokens import TokenList, new_token
from gasapi.web.turns import Gate


def test_a_ready_service_says_so():
    """Version, data, and each thing that was looked at."""
    answer = create_app(Settings()).test_client().get("/readyz").json
    assert {"status", "version", "data", "checks"} == answer.keys()
    assert {"ready"} == {answer["status"], *answer["checks"].values()}


def test_expired_tokens_are_told(tmp_path):
    """Where no token is good any longer nobody can ask: 503, in words; one that is good is enough."""
    today = datetime.now(UTC).date()
    old, good = (new_token("someone", today + timedelta(days=days))[1] for days in (-1, 0))
    file = tmp_path / "tokens"
    for lines, status in ((old, 503), (f"{old}\n{good}", 200)):
        file.write_text(lines)
        answer = create_app(Settings(token_file=file)).test_client().get("/readyz")
        assert status == answer.status_code
        assert ("expired" in answer.text) == (status == 503)
    assert not TokenList.from_file(file).any_good(today + timedelta(days=1))


def test_a_full_line_is_told_but_does_not_take_the_service_out(monkeypatch):
    """Small questions are answered beside a full line."""
    gates = []
    make = Gate.__init__

    def noted(self, share):
        make(self, share)
        gates.append(self)

    monkeypatch.setattr(Gate, "__init__", noted)
    client = create_app(Settings(large_active=1, large_waiting=0)).test_client()
    gates[0].enter(time.monotonic())
    answer = client.get("/readyz")
    assert 200 == answer.status_code
    assert "full" in answer.json["checks"]["large_questions"]
    series = {"gas": "argon", "pressure": [1e5, 2e5], "temperature": 300}
    refused = client.post("/v1/series", json=series)
    assert (503, "1") == (refused.status_code, refused.headers["Retry-After"])
    gates[0].leave()
    assert 200 == client.post("/v1/series", json=series).status_code
