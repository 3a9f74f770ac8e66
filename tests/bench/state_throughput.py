"""Requests per second of ``/v1/state`` against an empty Flask application, both under the same gunicorn settings, in one run.

    python tests/bench/state_throughput.py [--workers 1] [--rounds 5] [--seconds 2] [--connections 4]

Sides: the empty application, fetched (GET, no body) and with the same questions posted to it, which it does not read; states
never asked before, of a pure gas and of a natural gas that are known; one question again and again. Counters and a log line
for each request are on. The sides take turns, and the ratios of each turn are taken to the two floors of the same turn;
medians are printed. The load comes from a process of its own over kept connections.
"""

from __future__ import annotations

import argparse
import os
import selectors
import socket
import statistics
import subprocess
import sys
import time
from collections.abc import Iterator
from itertools import count
from multiprocessing import get_context
from pathlib import Path

HERE = Path(__file__).resolve().parent
ROOT = HERE.parents[1]

# mole fractions of a pipeline gas with eleven components, invented for this measurement
NATURAL_GAS = (
    '{"fractions":{"methane":0.9,"nitrogen":0.02,"carbon-dioxide":0.01,"ethane":0.045,"propane":0.015,"isobutane":0.002,'
    '"butane":0.003,"isopentane":0.001,"pentane":0.001,"hexane":0.0005,"hydrogen":0.0025}}'
)

UNITS = '{"pressure":"barg","temperature":"degC"}'


def head(method: str, path: str, body: bytes = b"") -> bytes:
    length = f"Content-Type: application/json\r\nContent-Length: {len(body)}\r\n" if body else ""
    return f"{method} {path} HTTP/1.1\r\nHost: bench\r\n{length}\r\n".encode() + body


def empty_requests(seed: int) -> Iterator[bytes]:
    request = head("GET", "/")
    while True:
        yield request


def cold_requests(gas: str, seed: int) -> Iterator[bytes]:
    """Yield questions that differ in pressure and temperature, so that none was asked before."""
    for n in count(seed * 1_000_000):
        pressure = 1.0 + (n * 0.6180339887498949) % 60.0
        temperature = 5.0 + (n * 0.7548776662466927) % 60.0
        body = f'{{"gas":{gas},"pressure":{pressure!r},"temperature":{temperature!r},"units":{UNITS}}}'
        yield head("POST", "/v1/state", body.encode())


def pure_requests(seed: int) -> Iterator[bytes]:
    return cold_requests('"nitrogen"', seed)


def mixture_requests(seed: int) -> Iterator[bytes]:
    return cold_requests(NATURAL_GAS, seed)


def cached_requests(seed: int) -> Iterator[bytes]:
    body = b'{"gas":"nitrogen","pressure":40,"temperature":25,"units":{"pressure":"barg","temperature":"degC"}}'
    request = head("POST", "/v1/state", body)
    while True:
        yield request


FLOORS = {"empty GET": empty_requests, "empty POST": pure_requests}
SIDES = {**FLOORS, "cold": pure_requests, "cold mixture": mixture_requests, "cached": cached_requests}


class Connection:
    """A kept connection with one request under way."""

    def __init__(self, port: int) -> None:
        self.socket = socket.create_connection(("127.0.0.1", port))
        self.socket.setsockopt(socket.IPPROTO_TCP, socket.TCP_NODELAY, 1)
        self.buffer = b""
        self.sent_at = 0.0

    def send(self, request: bytes) -> None:
        self.buffer = b""
        self.sent_at = time.perf_counter()
        self.socket.sendall(request)

    def receive(self) -> bool:
        """Return whether the answer is complete; anything but 200 ends the measurement."""
        data = self.socket.recv(65536)
        if not data:
            raise ConnectionError("the server closed a kept connection")
        self.buffer += data
        header, end, body = self.buffer.partition(b"\r\n\r\n")
        if not end:
            return False
        if not header.startswith(b"HTTP/1.1 200"):
            raise ValueError(self.buffer[:600].decode())
        at = header.lower().index(b"content-length:") + 15
        return len(body) >= int(header[at : at + 12].split(b"\r")[0])


def drive(port: int, side: str, seed: int, seconds: float, connections: int) -> tuple[float, float, float]:
    """Return requests per second, and the median and 99th percentile of the time to an answer in microseconds."""
    requests = SIDES[side](seed)
    selector = selectors.DefaultSelector()
    for _ in range(connections):
        connection = Connection(port)
        selector.register(connection.socket, selectors.EVENT_READ, connection)
        connection.send(next(requests))
    times: list[float] = []
    start = now = time.perf_counter()
    while now - start < seconds:
        for key, _ in selector.select():
            connection = key.data
            if connection.receive():
                now = time.perf_counter()
                times.append(now - connection.sent_at)
                connection.send(next(requests))
    times.sort()
    return len(times) / (now - start), times[len(times) // 2] * 1e6, times[len(times) * 99 // 100] * 1e6


def cpu_seconds(master: int) -> float:
    """Return the processor time that the workers of a gunicorn master have used."""
    ticks = 0
    for status in Path("/proc").glob("[0-9]*/stat"):
        try:
            fields = status.read_text().rpartition(")")[2].split()
        except OSError:
            continue  # the process ended meanwhile
        if int(fields[1]) == master:
            ticks += int(fields[11]) + int(fields[12])
    return ticks / os.sysconf("SC_CLK_TCK")


def free_port() -> int:
    with socket.create_server(("127.0.0.1", 0)) as server:
        port: int = server.getsockname()[1]
        return port


def start(command: list[str], port: int, extra: dict[str, str]) -> subprocess.Popen[bytes]:
    environment = {**os.environ, "PYTHONPATH": f"{ROOT}:{HERE}", **extra}
    log = subprocess.DEVNULL
    process = subprocess.Popen([sys.executable, *command], env=environment, stdout=log, stderr=log)
    for _ in range(200):
        try:
            with socket.create_connection(("127.0.0.1", port), timeout=1) as probe:
                probe.sendall(b"GET /livez HTTP/1.1\r\nHost: bench\r\nConnection: close\r\n\r\n")
                if probe.recv(64):
                    return process
        except OSError:
            time.sleep(0.05)
    process.kill()
    raise TimeoutError(f"{command} did not answer")


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--workers", type=int, default=1)
    parser.add_argument("--rounds", type=int, default=5)
    parser.add_argument("--seconds", type=float, default=2.0)
    parser.add_argument("--connections", type=int, default=4)
    options = parser.parse_args()
    empty_port, our_port = free_port(), free_port()
    workers = str(options.workers)
    servers = [
        start(
            f"-m gunicorn --bind 127.0.0.1:{empty_port} --workers {workers} --keep-alive 65 --no-control-socket "
            "--worker-class gasapi.cli.worker.CooperativeWorker empty_app:app".split(),
            empty_port,
            {},
        ),
        start(
            ["-m", "gasapi", "serve", "--port", str(our_port), "--workers", workers],
            our_port,
            {"GASAPI_REQUEST_LOG": "1"},
        ),
    ]
    figures: dict[str, list[tuple[float, ...]]] = {side: [] for side in SIDES}
    try:
        with get_context("spawn").Pool(1) as pool:
            for turn in range(-1, options.rounds):
                for side in SIDES:
                    port, server = (empty_port, servers[0]) if side in FLOORS else (our_port, servers[1])
                    seconds = options.seconds if turn >= 0 else 0.5  # the first turn warms up
                    used = cpu_seconds(server.pid)
                    figure = pool.apply(drive, (port, side, turn + 2, seconds, options.connections))
                    cpu = (cpu_seconds(server.pid) - used) / (figure[0] * seconds)
                    if turn >= 0:
                        figures[side].append((*figure, cpu * 1e6))
    finally:
        for server in servers:
            server.terminate()
        for server in servers:
            server.wait(timeout=40)
    print(f"{workers} worker(s), {options.connections} connections, {options.rounds} rounds of {options.seconds:g} s")
    for side, rows in figures.items():
        rate, median, slow, cpu = (statistics.median(column) for column in zip(*rows, strict=True))
        print(
            f"{side:<13} {rate:5.0f} requests/s, {cpu:3.0f} us of CPU, median {median:.0f} us, 99 % {slow:.0f} us; ratios",
            end="",
        )
        for name in FLOORS:
            by_rate, by_cpu = (
                statistics.median(one(row) / one(floor) for row, floor in zip(rows, figures[name], strict=True))
                for one in (lambda row: row[0], lambda row: 1.0 / row[3])
            )
            print(f"  to {name} {by_rate:.2f} (CPU {by_cpu:.2f})", end="")
        print()


if __name__ == "__main__":
    main()
