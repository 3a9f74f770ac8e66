"""The named reference conditions at which a gas volume is stated, from ``reference_conditions.json``."""

from __future__ import annotations

import json
from collections.abc import Mapping
from importlib.resources import files
from types import MappingProxyType
from typing import NamedTuple

__all__ = ["REFERENCE_CONDITIONS", "ReferenceCondition"]


class ReferenceCondition(NamedTuple):
    """A state at which a volume is stated: K and Pa, with a name and where it comes from."""

    temperature: float
    pressure: float
    name: str = ""
    source: str = ""


def _read_conditions() -> dict[str, ReferenceCondition]:
    document = json.loads(files("gasapi.units").joinpath("reference_conditions.json").read_text(encoding="utf-8"))
    return {key: ReferenceCondition(**row) for key, row in document.items()}


REFERENCE_CONDITIONS: Mapping[str, ReferenceCondition] = MappingProxyType(_read_conditions())
"""Every named reference condition by its id."""
