"""The curl session of the README: runs it against a service and compares it with what the README shows.

A command is an indented line that begins with ``$ ``; the indented lines behind it are its answer. As a command,
``python tests/support/readme_session.py --write`` writes the answers of a service of its own into the README.
"""

from __future__ import annotations

import re
import socket
import subprocess
import sys
import time
import urllib.request
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

README = Path(__file__).parents[2] / "README.md"
_ADDRESS = "http://127.0.0.1:8080"
_PROMPT = "    $ "


@contextmanager
def service() -> Iterator[str]:
    """Run the service as the README does, on a free port, and yield its address."""
    with socket.socket() as s:
        s.bind(("127.0.0.1", 0))
        port = s.getsockname()[1]
    process = subprocess.Popen(
        [sys.executable, "-m", "gasapi", "serve", "--port", str(port), "--workers", "1"],
        stdout=subprocess.DEVNULL,
        stderr=subprocess.DEVNULL,
    )
    address = f"http://127.0.0.1:{port}"
    try:
        for _ in range(200):
            try:
                with urllib.request.urlopen(f"{address}/readyz", timeout=1):
                    break
            except OSError:
                time.sleep(0.05)
        yield address
    finally:
        process.terminate()
        process.wait(10)


def shown(text: str) -> list[tuple[str, str]]:
    """Return the commands of a text with the answers that it shows."""
    session: list[tuple[str, str]] = []
    lines = text.splitlines()
    i = 0
    while i < len(lines):
        if lines[i].startswith(_PROMPT):
            command = lines[i][len(_PROMPT) :]
            answer = []
            while i + 1 < len(lines) and lines[i + 1].startswith("    ") and not lines[i + 1].startswith(_PROMPT):
                i += 1
                answer.append(lines[i][4:])
            session.append((command, "\n".join(answer)))
        i += 1
    return session


def run(command: str, address: str) -> str:
    """Return what a command of the session prints."""
    done = subprocess.run(
        ["bash", "-c", command.replace(_ADDRESS, address)], capture_output=True, text=True, timeout=30, check=True
    )
    return done.stdout.replace("\r\n", "\n").rstrip("\n")


def without_hash(answer: str) -> str:
    """Return an answer with the data hash masked: it changes with every line of the engine."""
    return re.sub(r"sha256:[0-9a-f]{64}", "sha256:...", answer)


def write() -> None:
    """Write the answers of a fresh service into the README."""
    lines = README.read_text(encoding="utf-8").splitlines()
    out: list[str] = []
    with service() as address:
        i = 0
        while i < len(lines):
            out.append(lines[i])
            if lines[i].startswith(_PROMPT):
                answer = run(lines[i][len(_PROMPT) :], address)
                out += [f"    {line}".rstrip() for line in answer.splitlines()]
                while i + 1 < len(lines) and lines[i + 1].startswith("    ") and not lines[i + 1].startswith(_PROMPT):
                    i += 1
            i += 1
    README.write_text("\n".join(out) + "\n", encoding="utf-8")


if __name__ == "__main__":
    if sys.argv[1:] != ["--write"]:
        sys.exit("usage: readme_session.py --write")
    write()
