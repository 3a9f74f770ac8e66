"""The files that the browser fetches: read once, under an address that changes with their content."""

from __future__ import annotations

import hashlib
from importlib.resources import files
from typing import NamedTuple

__all__ = ["Assets"]

_TYPES = {
    "css": "text/css; charset=utf-8",
    "js": "text/javascript; charset=utf-8",
    "svg": "image/svg+xml",
}


class Asset(NamedTuple):
    """One file with its media type."""

    content: bytes
    content_type: str


class Assets:
    """All files of the folder ``assets``. Immutable.

    ``digest`` is a part of their addresses, so that a browser may keep them for as long as it likes and still never mixes
    the files of two versions.
    """

    def __init__(self) -> None:
        self._files: dict[str, Asset] = {}
        digest = hashlib.sha256()
        for entry in sorted(files(__package__).joinpath("assets").iterdir(), key=lambda entry: entry.name):
            content_type = _TYPES.get(entry.name.rpartition(".")[2])
            if content_type is None:
                continue
            content = entry.read_bytes()
            digest.update(f"{entry.name}\n{len(content)}\n".encode())
            digest.update(content)
            self._files[entry.name] = Asset(content, content_type)
        self.digest = digest.hexdigest()[:16]

    @property
    def modules(self) -> tuple[str, ...]:
        """The names of the scripts, so that the browser can fetch them at once and not one after another."""
        return tuple(name for name in self._files if name.endswith(".js"))

    @property
    def size(self) -> int:
        """The bytes of all files together."""
        return sum(len(asset.content) for asset in self._files.values())

    def find(self, digest: str, name: str) -> Asset | None:
        """Return a file, None where there is none of this name or the address is that of another version."""
        return self._files.get(name) if digest == self.digest else None
