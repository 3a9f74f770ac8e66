"""Steady load with malformed and giant requests while workers are killed: what was answered, how fast, and in how much memory.

    python tests/bench/soak.py [--seconds 60] [--requests 0] [--workers 2] [--connections 8] [--kill-every 5] [--floor]

Every answer is compared with the one that the program gives without a server: the numbers bit for bit. A question whose
connection ended with its worker, before a byte of the answer came, is asked again. With ``--kill-every 0`` memory is looked at
instead: what the workers hold at the end beside what they held once the caches were full. ``--floor`` also measures an empty
application under the same server settings, and the ratio to it.
"""

from __future__ import annotations

import argparse
import json
import os
import random
import selectors
import signal
import socket
import subprocess
import sys
import time
from collections import Counter
from collections.abc import Iterator
from dataclasses import dataclass, field
from pathlib import Path

HERE = Path(__file__).resolve().parent
ROOT = HERE.parents[1]
sys.path[:0] = [str(ROOT), str(ROOT / "tests" / "support")]

from running import Running, free_port, resident_bytes, running  # noqa: E402

from gasapi.app import create_app  # noqa: E402
from gasapi.settings import Settings  # noqa: E402

MALFORMED_SHARE = 0.01
GIANT_SHARE = 0.001
GIANT_ROWS = 20_000
PATIENCE = 30.0  # s for one answer

# mole fractions invented for this measurement
GASES = (
    '"nitrogen"',
    '"carbon dioxide"',
    '"propane"',
    '"1-butanol"',
    '{"fractions":{"methane":0.9,"nitrogen":0.02,"carbon-dioxide":0.01,"ethane":0.045,"propane":0.02,"hydrogen":0.005}}',
    '{"fractions":{"hydrogen":30,"methane":70},"fraction_unit":"%"}',
)
UNITS = '{"pressure":"barg","temperature":"degC"}'

MALFORMED = (
    b"{",
    b"",
    b"[1, 2, 3]",
    b'{"gas":"nitrogn","pressure":1e5,"temperature":300}',
    b'{"gas":"nitrogen","pressure":-1,"temperature":300}',
    b'{"gas":"nitrogen","pressure":NaN,"temperature":300}',
    b'{"gas":"nitrogen","pressure":"1e5","temperature":300}',
    b'{"gas":"nitrogen","gas":"argon","pressure":1e5,"temperature":300}',
    b'{"gas":{"fractions":{"methane":0.5}},"pressure":1e5,"temperature":300}',
    b'{"gas":"nitrogen","pressure":1e5,"temperature":300,"units":{"pressure":"furlong"}}',
    b"\xff\xfe\x00" * 50,
    b"[" * 3000,
)


@dataclass(frozen=True)
class Request:
    """The bytes to send, and the answer that is right: status, and for a good question the body up to its trace.

    ``breaks_off`` is said of a request whose body never comes, after which its connection is of no use.
    """

    kind: str
    data: bytes
    status: tuple[int, ...]
    body: bytes | None = None
    breaks_off: bool = False


def post(path: str, body: bytes) -> bytes:
    head = f"POST {path} HTTP/1.1\r\nHost: soak\r\nContent-Type: application/json\r\nContent-Length: {len(body)}\r\n\r\n"
    return head.encode() + body


def without_trace(body: bytes) -> bytes:
    """Return an answer without its last member, which says whether it was held."""
    return body.partition(b'"trace":')[0]


def good_requests(count: int) -> list[Request]:
    """Return questions with the answers that the program gives without a server."""
    client = create_app(Settings()).test_client()
    requests = []
    for n in range(count):
        pressure = 1.0 + (n * 0.6180339887498949) % 60.0
        temperature = 5.0 + (n * 0.7548776662466927) % 60.0
        gas = GASES[n % len(GASES)]
        body = f'{{"gas":{gas},"pressure":{pressure!r},"temperature":{temperature!r},"units":{UNITS}}}'.encode()
        answer = client.post("/v1/state", data=body, content_type="application/json")
        assert answer.status_code == 200, answer.data
        requests.append(Request("good", post("/v1/state", body), (200,), without_trace(answer.data)))
    return requests


def giant_requests() -> list[Request]:
    """Return a long series with its answer, and bodies beyond the limit, announced and real."""
    client = create_app(Settings()).test_client()
    rows = {
        "gas": "nitrogen",
        "pressure": [1e5 + 317.0 * n for n in range(GIANT_ROWS)],
        "temperature": [280.0 + 40.0 * (n % 997) / 997.0 for n in range(GIANT_ROWS)],
    }
    body = json.dumps(rows).encode()
    answer = client.post("/v1/series", data=body, content_type="application/json")
    assert answer.status_code == 200, answer.data[:500]
    series = Request("giant", post("/v1/series", body), (200,), without_trace(answer.data))
    beyond = Request(
        "giant", post("/v1/state", b" " * 100)[:-100].replace(b": 100\r", b": 99999999999\r"), (413,), breaks_off=True
    )
    return [series, series, beyond]


def malformed_requests() -> list[Request]:
    return [Request("malformed", post("/v1/state", body), (400, 422)) for body in MALFORMED]


def stream(seed: int, count: int) -> Iterator[Request]:
    """Return requests without end, the same for the same seed; all answers are known before the first one is taken."""
    chance = random.Random(seed)
    good, giant, malformed = good_requests(count), giant_requests(), malformed_requests()

    def draw() -> Request:
        share = chance.random()
        if share < GIANT_SHARE:
            return chance.choice(giant)
        return chance.choice(malformed if share < GIANT_SHARE + MALFORMED_SHARE else good)

    return iter(draw, None)


@dataclass
class Tally:
    """What came of the requests; ``wrong`` holds the first few answers that are not right."""

    asked: Counter[str] = field(default_factory=Counter)
    answered: Counter[str] = field(default_factory=Counter)
    refused: int = 0
    asked_again: int = 0
    cut_short: int = 0
    unanswered: int = 0
    wrong: list[str] = field(default_factory=list)
    times: list[float] = field(default_factory=list)

    def percentile(self, share: float) -> float:
        """Return the time within which this share of the small questions was answered, s."""
        times = sorted(self.times)
        return times[min(len(times) - 1, int(share * len(times)))] if times else float("nan")


class Connection:
    """A kept connection with one request under way."""

    def __init__(self, port: int) -> None:
        self.port = port
        self.request: Request | None = None
        self.open()

    def open(self) -> None:
        self.socket = socket.create_connection(("127.0.0.1", self.port), timeout=PATIENCE)
        self.socket.setsockopt(socket.IPPROTO_TCP, socket.TCP_NODELAY, 1)
        self.buffer = bytearray()
        self.length = -1

    def send(self, request: Request) -> None:
        self.request = request
        self.buffer.clear()
        self.length = -1
        self.sent_at = time.perf_counter()
        self.socket.sendall(request.data)

    def receive(self) -> bool | None:
        """Return whether the answer is complete, None where the connection has ended."""
        try:
            data = self.socket.recv(1 << 18)
        except ConnectionResetError:
            return None
        if not data:
            return None
        self.buffer += data
        if self.length < 0:
            end = self.buffer.find(b"\r\n\r\n")
            if end < 0:
                return False
            head = bytes(self.buffer[:end]).lower()
            at = head.index(b"content-length:") + 15
            self.body_at = end + 4
            self.length = int(head[at:].split(b"\r", 1)[0])
            self.closes = b"connection: close" in head
        return len(self.buffer) >= self.body_at + self.length


class Soak:
    """One run of load against a running service."""

    def __init__(self, server: Running, connections: int, kill_every: float, seed: int, questions: int) -> None:
        self.server = server
        self.tally = Tally()
        self.kills = 0
        self.replaced: list[float] = []
        self._kill_every = kill_every
        self._requests = stream(seed, questions)
        self._chance = random.Random(seed + 1)
        self._count = connections
        self._killed: tuple[float, set[int]] | None = None

    def run(self, seconds: float, requests: int = 0) -> Tally:
        """Send requests for some time, or so many of them; every one that was sent is followed to its end."""
        self._selector = selectors.DefaultSelector()
        self._connections = [Connection(self.server.port) for _ in range(self._count)]
        for connection in self._connections:
            self._register(connection)
            self._next(connection)
        start = time.monotonic()
        next_kill = start + self._kill_every if self._kill_every else float("inf")
        open_ended = True
        under_way = len(self._connections)
        while under_way:
            now = time.monotonic()
            if open_ended and (now - start > seconds or (requests and sum(self.tally.asked.values()) >= requests)):
                open_ended = False
            if now > next_kill and open_ended:
                self._kill()
                next_kill = now + self._kill_every
            self._look_for_successor()
            for key, _ in self._selector.select(timeout=0.02):
                under_way -= self._serve(key.data, open_ended)
            late = time.perf_counter() - PATIENCE
            for connection in self._connections:
                if connection.request is not None and connection.sent_at < late:
                    self.tally.unanswered += 1
                    self._selector.unregister(connection.socket)
                    connection.request = None
                    under_way -= 1
        for connection in self._connections:
            connection.socket.close()
        self._selector.close()
        return self.tally

    def _register(self, connection: Connection) -> None:
        self._selector.register(connection.socket, selectors.EVENT_READ, connection)

    def _next(self, connection: Connection) -> None:
        request = next(self._requests)
        self.tally.asked[request.kind] += 1
        self._send(connection, request)

    def _send(self, connection: Connection, request: Request) -> None:
        try:
            connection.send(request)
        except OSError:
            connection.request = request
            self._again(connection)

    def _again(self, connection: Connection) -> None:
        """Ask the same on a new connection."""
        request = connection.request
        assert request is not None
        self.tally.asked_again += 1
        self._selector.unregister(connection.socket)
        connection.socket.close()
        connection.open()
        self._register(connection)
        self._send(connection, request)

    def _serve(self, connection: Connection, open_ended: bool) -> int:
        """Take what has come; return 1 where the connection is done."""
        request = connection.request
        if request is None:
            return 0
        complete = connection.receive()
        if complete is False:
            return 0
        if complete is None:
            if connection.buffer:
                self.tally.cut_short += 1
            self._again(connection)
            return 0
        self._judge(connection, request)
        if connection.closes or request.breaks_off:
            self._selector.unregister(connection.socket)
            connection.socket.close()
            connection.open()
            self._register(connection)
        if open_ended:
            self._next(connection)
            return 0
        connection.request = None
        return 1

    def _judge(self, connection: Connection, request: Request) -> None:
        if request.kind != "giant":
            self.tally.times.append(time.perf_counter() - connection.sent_at)
        status = int(connection.buffer[9:12])
        body = bytes(connection.buffer[connection.body_at :])
        self.tally.answered[request.kind] += 1
        if status == 503 and b"retry-after:" in bytes(connection.buffer[: connection.body_at]).lower():
            self.tally.refused += 1
            return
        right = status in request.status and (request.body is None or without_trace(body) == request.body)
        if not right and len(self.tally.wrong) < 10:
            self.tally.wrong.append(f"{request.kind} {request.data[:200]!r}: {status} {body[:300]!r}")

    def _kill(self) -> None:
        workers = self.server.workers()
        if self._killed is None and workers:
            os.kill(self._chance.choice(workers), signal.SIGKILL)
            self.kills += 1
            self._killed = time.monotonic(), set(workers)

    def _look_for_successor(self) -> None:
        if self._killed is not None and set(self.server.workers()) - self._killed[1]:
            self.replaced.append(time.monotonic() - self._killed[0])
            self._killed = None


def floor(workers: int, seconds: float, connections: int) -> float:
    """Return requests per second of an empty application under the same kind of server."""
    port = free_port()
    command = f"-m gunicorn --bind 127.0.0.1:{port} --workers {workers} --keep-alive 65 --no-control-socket "
    command += "--worker-class gasapi.cli.worker.CooperativeWorker empty_app:app"
    environment = {**os.environ, "PYTHONPATH": f"{ROOT}:{HERE}"}
    null = subprocess.DEVNULL
    process = subprocess.Popen([sys.executable, *command.split()], env=environment, stdout=null, stderr=null)
    try:
        server = Running(process, port, None)
        for _ in range(400):
            try:
                server.ask()
                break
            except OSError:
                time.sleep(0.05)
        request = Request("good", b"GET / HTTP/1.1\r\nHost: soak\r\n\r\n", (200,))
        soak = Soak(server, connections, 0.0, 0, 1)
        soak._requests = iter(lambda: request, None)
        started = time.monotonic()
        tally = soak.run(seconds)
        return sum(tally.answered.values()) / (time.monotonic() - started)
    finally:
        process.terminate()
        process.wait(timeout=40)


def main() -> int:
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--seconds", type=float, default=60.0)
    parser.add_argument("--requests", type=int, default=0, help="stop after so many (0: by time alone)")
    parser.add_argument("--workers", type=int, default=2)
    parser.add_argument("--connections", type=int, default=8)
    parser.add_argument("--kill-every", type=float, default=5.0, help="s between two kills of a worker (0: none)")
    parser.add_argument("--questions", type=int, default=3000, help="different questions")
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--floor", action="store_true", help="measure an empty application as well")
    options = parser.parse_args()
    with running("--workers", str(options.workers)) as server:
        soak = Soak(server, options.connections, options.kill_every, options.seed, options.questions)
        seconds = options.seconds if not options.requests else float("inf")
        before: dict[int, int] = {}
        if not options.kill_every:
            # the caches fill first
            soak.run(seconds, options.requests // 5 or 20_000)
            before = {pid: resident_bytes(pid) for pid in server.workers()}
            soak.tally = Tally()
        started = time.monotonic()
        tally = soak.run(seconds, options.requests)
        elapsed = time.monotonic() - started
        after = {pid: resident_bytes(pid) for pid in server.workers()}
    rate = sum(tally.answered.values()) / elapsed
    print(f"{sum(tally.answered.values())} answers in {elapsed:.0f} s, {rate:.0f} a second, {soak.kills} workers killed")
    print(f"asked {dict(tally.asked)}, asked again {tally.asked_again}, refused with 503 {tally.refused}")
    print(f"wrong {len(tally.wrong)}, cut short {tally.cut_short}, unanswered {tally.unanswered}")
    print(
        "small questions: " + ", ".join(f"{100 * p:g} % within {1e3 * tally.percentile(p):.2f} ms" for p in (0.5, 0.99, 0.999))
    )
    if soak.replaced:
        print(f"a killed worker was replaced within {max(soak.replaced):.2f} s")
    for pid, held in before.items():
        now = after.get(pid, 0)
        growth = f"{now / 2**20:.1f} at the end ({now / held - 1:+.1%})"
        print(f"worker {pid}: {held / 2**20:.1f} MiB with full caches, {growth}")
    if options.floor:
        empty = floor(options.workers, min(options.seconds, 10.0), options.connections)
        print(f"empty application {empty:.0f} a second, ratio {rate / empty:.2f}")
    for line in tally.wrong:
        print("WRONG", line)
    return int(bool(tally.wrong or tally.cut_short or tally.unanswered))


if __name__ == "__main__":
    sys.exit(main())
