"""Where the data files of the package lie, how one is opened, and the hash that names their whole content."""

from __future__ import annotations

import hashlib
from collections.abc import Iterable
from functools import cache
from pathlib import Path

import orjson

from gasapi.gases.reading import DataError, Table

__all__ = ["data_files", "data_hash", "hash_of_files", "names_of_files", "open_data"]

_DATA = Path(__file__).resolve().parent / "data"


def open_data(name: str) -> Table:
    """Return the outermost table of a data file.

    :param name: its name below ``data/``, with forward slashes; never a text that a caller of the service sent
    :raises DataError: it is missing or is no JSON table
    """
    try:
        return Table(orjson.loads((_DATA / name).read_bytes()), name)
    except FileNotFoundError:
        raise DataError(name, "", "the file is missing from the package") from None
    except orjson.JSONDecodeError as error:
        raise DataError(name, "", f"is not JSON: {error}") from None


def names_of_files(folder: str) -> tuple[str, ...]:
    """Return the names, without ending, of the JSON files in a folder below ``data/``, in alphabetical order."""
    return tuple(sorted(path.stem for path in (_DATA / folder).glob("*.json")))


def data_files() -> tuple[tuple[str, Path], ...]:
    """Return (name, path) of every data file of the package, sorted by name, for ``hash_of_files``."""
    return tuple(sorted((f"data/{path.relative_to(_DATA).as_posix()}", path) for path in _DATA.rglob("*.json")))


def hash_of_files(files: Iterable[tuple[str, Path]]) -> str:
    """Return ``sha256:...`` over names and bytes of files, in the order of their names.

    :param files: (name, path) pairs, for instance those of ``data_files`` and the source files of the engine; the names,
        not the paths, enter the hash, so that it is the same on every machine
    """
    digest = hashlib.sha256()
    for name, path in sorted(files):
        content = path.read_bytes()
        digest.update(f"{name}\0{len(content)}\0".encode())
        digest.update(content)
    return f"sha256:{digest.hexdigest()}"


@cache
def data_hash() -> str:
    """Return ``sha256:...`` over all data files of the package."""
    return hash_of_files(data_files())
