"""A running service for tests of the page, and the place where pictures of the page are kept."""

from __future__ import annotations

import os
import socket
import subprocess
import sys
import time
import urllib.request
from contextlib import contextmanager
from pathlib import Path

KEPT = Path(__file__).parents[2] / "ci-output" / "page"
NO_FIGURE = "\u2013"
"""What stands where there is no number: a dash."""

MINUS = "\u2212"
START_UP = 30.0  # s


@contextmanager
def served(**environment: str):
    """Run the service and give its address."""
    with socket.create_server(("127.0.0.1", 0)) as probe:
        port = probe.getsockname()[1]
    env = {k: v for k, v in os.environ.items() if not k.startswith(("GASAPI_", "PROMETHEUS_"))}
    process = subprocess.Popen(
        [sys.executable, "-m", "gasapi", "serve", "--port", str(port), "--workers", "2"],
        env={**env, **environment},
        stdout=subprocess.DEVNULL,
        stderr=subprocess.DEVNULL,
    )
    origin = f"http://127.0.0.1:{port}/"
    try:
        deadline = time.monotonic() + START_UP
        while True:
            try:
                urllib.request.urlopen(f"{origin}readyz", timeout=5).close()
                break
            except OSError:
                assert process.poll() is None, "the service ended at its start"
                assert time.monotonic() < deadline, "the service did not become ready"
                time.sleep(0.1)
        yield origin
    finally:
        process.terminate()
        process.wait(timeout=40)
