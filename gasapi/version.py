"""What was at work: the version of the package, and one hash over all coefficients and the code of the engine."""

from __future__ import annotations

import hashlib
from functools import cache
from pathlib import Path

from gasapi import __version__
from gasapi.gases.data_files import data_hash

__all__ = ["__version__", "data_and_code_hash"]

_ENGINE = Path(__file__).resolve().parent / "engine"


@cache
def data_and_code_hash() -> str:
    """Return ``sha256:`` and the digest of the data files' hash followed by the engine's source files, in a fixed order."""
    digest = hashlib.sha256(data_hash().encode())
    for path in sorted(_ENGINE.rglob("*.py")):
        digest.update(path.relative_to(_ENGINE).as_posix().encode())
        digest.update(b"\0")
        digest.update(path.read_bytes().replace(b"\r\n", b"\n"))
        digest.update(b"\0")
    return f"sha256:{digest.hexdigest()}"
