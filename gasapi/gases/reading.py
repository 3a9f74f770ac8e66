"""Strict reading of nested tables (JSON or TOML): every member is asked for by name and kind, and none is left over.

A fault names the file, the key and what would be right, because the person who reads it is the one who typed the file.
"""

from __future__ import annotations

import math
from collections.abc import Collection, Iterator, Mapping
from typing import Any

from gasapi.errors import GasapiError

__all__ = ["DataError", "Table"]


class DataError(GasapiError):
    """A data or site file says something that cannot be right: ``file``, ``key`` (dotted) and ``detail``."""

    def __init__(self, file: str, key: str, detail: str) -> None:
        self.file = file
        self.key = key
        self.detail = detail
        place = f"{file}: {key}" if key else file
        super().__init__(f"{place}: {detail}")


def _kind(value: object) -> str:
    names = {bool: "a truth value", int: "a number", float: "a number", str: "a text", list: "a list", dict: "a table"}
    return "nothing" if value is None else names.get(type(value), type(value).__name__)


class Table:
    """One table of a file. Asking for a member marks it as known; ``close`` refuses members that nobody asked for."""

    __slots__ = ("_asked", "file", "key", "members")

    def __init__(self, members: object, file: str, key: str = "") -> None:
        """Wrap the members of a table; raises DataError where they are no table."""
        if not isinstance(members, dict):
            raise DataError(file, key, f"must be a table of named members, not {_kind(members)}")
        self.members: Mapping[str, Any] = members
        self.file = file
        self.key = key
        self._asked: set[str] = set()

    def fault(self, key: str, detail: str) -> DataError:
        """Return the exception for a member of this table, or for the table itself where ``key`` is empty."""
        dotted = ".".join(part for part in (self.key, key) if part)
        return DataError(self.file, dotted, detail)

    def close(self) -> None:
        """Raise DataError where the table holds a member that was never asked for."""
        left = [key for key in self.members if key not in self._asked]
        if left:
            known = ", ".join(sorted(self._asked)) or "none"
            raise self.fault(left[0], f"is not a member that belongs here; known members: {known}")

    def _take(self, key: str) -> Any:
        self._asked.add(key)
        if key not in self.members:
            raise self.fault(key, "is missing")
        return self.members[key]

    def has(self, key: str) -> bool:
        """Return whether a member is there and not null, and mark it as known."""
        self._asked.add(key)
        return self.members.get(key) is not None

    def text(self, key: str) -> str:
        """Return a text that is not empty."""
        value = self._take(key)
        if not isinstance(value, str) or not value.strip():
            raise self.fault(key, f"must be a text that is not empty, not {_kind(value)}")
        return value

    def optional_text(self, key: str) -> str | None:
        """Return a text, or None where the member is absent or null."""
        return self.text(key) if self.has(key) else None

    def choice(self, key: str, allowed: Collection[str]) -> str:
        """Return a text that is one of ``allowed``."""
        value = self.text(key)
        if value not in allowed:
            raise self.fault(key, f"is {value!r}, must be one of {', '.join(sorted(allowed))}")
        return value

    def texts(self, key: str) -> tuple[str, ...]:
        """Return a list of texts."""
        value = self._take(key)
        if not isinstance(value, list) or not all(isinstance(item, str) and item.strip() for item in value):
            raise self.fault(key, "must be a list of texts that are not empty")
        return tuple(value)

    def texts_by_key(self, key: str) -> dict[str, str]:
        """Return a table of texts, whatever its members are called."""
        table = self.table(key)
        texts = {name: table.text(name) for name in table.members}
        table.close()
        return texts

    def number(self, key: str, low: float = -math.inf, high: float = math.inf) -> float:
        """Return a finite number within ``low`` and ``high``, both included."""
        return self._number(key, self._take(key), low, high)

    def positive(self, key: str) -> float:
        """Return a finite number above zero."""
        value = self.number(key)
        if value <= 0.0:
            raise self.fault(key, f"is {value!r}, must be above zero")
        return value

    def optional_number(self, key: str, low: float = -math.inf, high: float = math.inf) -> float | None:
        """Return a finite number, or None where the member is absent or null."""
        return self.number(key, low, high) if self.has(key) else None

    def optional_positive(self, key: str) -> float | None:
        """Return a finite number above zero, or None where the member is absent or null."""
        return self.positive(key) if self.has(key) else None

    def sourced_number(
        self, key: str, sources: Mapping[str, str], low: float = -math.inf, high: float = math.inf
    ) -> tuple[float, str]:
        """Return a number and the words of its source, from a list ``[number, source]`` or ``[number, source, [more]]``.

        :param sources: words by key; ``more`` names further ones that the first one speaks of
        """
        value = self._take(key)
        if not isinstance(value, list) or len(value) not in (2, 3):
            raise self.fault(key, "must be a list of a number and the key of its source")
        keys = [value[1], *(value[2] if len(value) == 3 and isinstance(value[2], list) else value[2:])]
        for name in keys:
            if not isinstance(name, str) or name not in sources:
                raise self.fault(key, f"names the source {name!r}; sources: {', '.join(sources)}")
        words = sources[keys[0]]
        if len(keys) > 1:
            words += f": {'; '.join(sources[name] for name in keys[1:])}"
        return self._number(key, value[0], low, high), words

    def whole(self, key: str) -> int:
        """Return an integer."""
        value = self._take(key)
        if type(value) is not int:
            raise self.fault(key, f"must be a whole number, not {_kind(value)}")
        return value

    def flag(self, key: str) -> bool:
        """Return a truth value."""
        value = self._take(key)
        if type(value) is not bool:
            raise self.fault(key, f"must be true or false, not {_kind(value)}")
        return value

    def numbers(self, key: str) -> tuple[float, ...]:
        """Return a list of finite numbers that is not empty."""
        return self._numbers(key, self._take(key))

    def two_numbers(self, key: str) -> tuple[float, float]:
        """Return a list of exactly two finite numbers."""
        value = self.numbers(key)
        if len(value) != 2:
            raise self.fault(key, f"has {len(value)} numbers, must have 2")
        return value[0], value[1]

    def rows(self, key: str, width: int) -> tuple[tuple[float, ...], ...]:
        """Return a list, not empty, of rows of ``width`` finite numbers."""
        value = self._take(key)
        if not isinstance(value, list) or not value:
            raise self.fault(key, "must be a list of rows that is not empty")
        rows = []
        for index, item in enumerate(value):
            row = self._numbers(f"{key}[{index}]", item)
            if len(row) != width:
                raise self.fault(f"{key}[{index}]", f"has {len(row)} numbers, must have {width}")
            rows.append(row)
        return tuple(rows)

    def table(self, key: str) -> Table:
        """Return a table within this one."""
        return Table(self._take(key), self.file, self._dotted(key))

    def optional_table(self, key: str) -> Table | None:
        """Return a table within this one, or None where the member is absent or null."""
        return self.table(key) if self.has(key) else None

    def tables(self, key: str) -> Iterator[Table]:
        """Yield the tables of a list that is not empty."""
        value = self._take(key)
        if not isinstance(value, list) or not value:
            raise self.fault(key, "must be a list of tables that is not empty")
        for index, item in enumerate(value):
            yield Table(item, self.file, self._dotted(f"{key}[{index}]"))

    def _dotted(self, key: str) -> str:
        return f"{self.key}.{key}" if self.key else key

    def _number(self, key: str, value: object, low: float = -math.inf, high: float = math.inf) -> float:
        if type(value) is not float and type(value) is not int:
            raise self.fault(key, f"must be a number, not {_kind(value)}")
        number = float(value)
        if not math.isfinite(number):
            raise self.fault(key, f"must be a finite number, not {value!r}")
        if not low <= number <= high:
            raise self.fault(key, f"is {value!r}, must lie within {low!r} and {high!r}")
        return number

    def _numbers(self, key: str, value: object) -> tuple[float, ...]:
        if not isinstance(value, list) or not value:
            raise self.fault(key, "must be a list of numbers that is not empty")
        return tuple(self._number(key, item) for item in value)
