"""A million rows of CSV through HTTP, one in a hundred broken: time, completeness, and the peak memory of the worker.

    python tests/bench/series_memory.py [--rows 1000000] [--json]

``--json`` asks for the answer in JSON instead of CSV.
"""

from __future__ import annotations

import argparse
import http.client
import random
import re
import time
from collections.abc import Iterator
from pathlib import Path

from series_throughput import Server


def rows(count: int) -> Iterator[bytes]:
    """Yield a history in plant units; every hundredth row cannot be read."""
    rng = random.Random(5)
    yield b"timestamps,pressure [barg],temperature [degC],input_status,tag\r\n"
    for i in range(count):
        pressure = f"{rng.uniform(10.0, 60.0):.4f}" if i % 100 != 37 else "no reading"
        yield (
            f"2026-01-{1 + i // 86400 % 28:02d}T{i // 3600 % 24:02d}:{i // 60 % 60:02d}:{i % 60:02d}Z,{pressure},"
            f"{rng.uniform(5.0, 45.0):.3f},0,PT-{i % 7}\r\n"
        ).encode()


def peaks(master: int) -> list[float]:
    """Return the peak memory of the children of a process, MB."""
    found = []
    for status in Path("/proc").glob("[0-9]*/status"):
        try:
            text = status.read_text()
        except OSError:
            continue
        if re.search(rf"^PPid:\t{master}$", text, re.MULTILINE):
            found.append(int(re.search(r"VmHWM:\s+(\d+)", text)[1]) / 1024.0)
    return found


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--rows", type=int, default=1_000_000)
    parser.add_argument("--json", action="store_true")
    options = parser.parse_args()
    body = b"".join(rows(options.rows))
    server = Server()
    try:
        print(f"body {len(body) / 1e6:.1f} MB; worker at rest {max(peaks(server.process.pid)):.0f} MB")
        connection = http.client.HTTPConnection("127.0.0.1", server.port, timeout=600)
        headers = {"Content-Type": "text/csv", "Accept": "application/json" if options.json else "text/csv"}
        start = time.perf_counter()
        connection.request("POST", "/v1/series?gas=nitrogen&keep=tag", body, headers)
        response = connection.getresponse()
        first = time.perf_counter() - start
        answer = response.read()
        took = time.perf_counter() - start
        print(f"status {response.status}, first byte after {first:.1f} s, all after {took:.1f} s, {len(answer) / 1e6:.1f} MB")
        print(f"{options.rows / took:,.0f} rows/s; peak memory of the worker {max(peaks(server.process.pid)):.0f} MB")
        if not options.json:
            lines = answer.splitlines()
            bad = sum(b"input_bad line" in line for line in lines)
            good = sum(line.endswith(b",gas,ambient_pressure_assumed") for line in lines)
            print(f"{len(lines) - 1} rows back, {bad} marked as unreadable, {good} good")
    finally:
        server.stop()


if __name__ == "__main__":
    main()
