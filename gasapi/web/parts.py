"""What routes are made with: handed over once, when the application is built."""

from __future__ import annotations

from typing import NamedTuple

from gasapi.service.context import Context
from gasapi.settings import Settings
from gasapi.web.metrics import Metrics
from gasapi.web.tokens import TokenList
from gasapi.web.turns import Gate

__all__ = ["Parts"]


class Parts(NamedTuple):
    """The service's context, the settings, the counters, the gate of large questions and the tokens of one worker."""

    context: Context
    settings: Settings
    metrics: Metrics
    gate: Gate
    tokens: TokenList | None = None
