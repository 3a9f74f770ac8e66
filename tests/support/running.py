"""A running service for the tests of faults: started as a person starts it, looked at as the machine sees it."""

from __future__ import annotations

import http.client
import os
import signal
import socket
import subprocess
import sys
import time
from collections.abc import Iterator
from contextlib import closing, contextmanager
from pathlib import Path

START_UP = 40.0  # s; a test machine is rarely idle


def free_port() -> int:
    with socket.create_server(("127.0.0.1", 0)) as server:
        port: int = server.getsockname()[1]
        return port


class Running:
    """A running service."""

    def __init__(self, process: subprocess.Popen[bytes], port: int, log: Path | None) -> None:
        self.process = process
        self.port = port
        self.log = log

    def connect(self, timeout: float = 20.0) -> socket.socket:
        return socket.create_connection(("127.0.0.1", self.port), timeout=timeout)

    def ask(self, method="GET", path="/livez", body=None, headers=None, timeout=60.0):
        """Return status, header fields and body of one answer over a connection of its own."""
        with closing(http.client.HTTPConnection("127.0.0.1", self.port, timeout=timeout)) as connection:
            connection.request(method, path, body, headers or {})
            answer = connection.getresponse()
            return answer.status, answer.headers, answer.read()

    def workers(self) -> list[int]:
        """Return the process ids of the workers."""
        found = []
        for status in Path("/proc").glob("[0-9]*/stat"):
            try:
                fields = status.read_text().rpartition(")")[2].split()
            except OSError:
                continue  # the process ended meanwhile
            if int(fields[1]) == self.process.pid and fields[0] != "Z":
                found.append(int(status.parent.name))
        return sorted(found)

    def hang_up(self) -> None:
        self.process.send_signal(signal.SIGHUP)


def resident_bytes(pid: int) -> int:
    """Return the resident memory of a process."""
    (line,) = [line for line in Path(f"/proc/{pid}/status").read_text().splitlines() if line.startswith("VmRSS:")]
    return 1024 * int(line.split()[1])


@contextmanager
def running(*options: str, log: Path | None = None, **environment: str) -> Iterator[Running]:
    """Run ``gasapi serve`` until the block ends."""
    port = free_port()
    env = {k: v for k, v in os.environ.items() if not k.startswith(("GASAPI_", "PROMETHEUS_"))}
    with (log or Path(os.devnull)).open("wb") as output:
        process = subprocess.Popen(
            [sys.executable, "-m", "gasapi", "serve", "--port", str(port), *options],
            env={**env, **environment},
            stdout=output,
            stderr=subprocess.STDOUT,
        )
    server = Running(process, port, log)
    try:
        until = time.monotonic() + START_UP
        while True:
            try:
                if server.ask(path="/readyz")[0] == 200:
                    break
            except (OSError, http.client.HTTPException):
                assert process.poll() is None, log.read_text() if log else "the service ended at once"
                assert time.monotonic() < until, "the service did not start"
                time.sleep(0.02)
        yield server
    finally:
        if process.poll() is None:
            process.terminate()
        process.wait(timeout=45)
