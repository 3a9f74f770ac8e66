"""What routes are made with: handed over once, when the application is built."""

from __future__ import annotations

from typing import NamedTuple

from gasapi.service.context import Context
from gasapi.settings import Settings
from gasapi.web.metrics import Metrics

__all__ = ["Parts"]


class Parts(NamedTuple):
    """The service's context, the settings and the counters of one worker."""

    context: Context
    settings: Settings
    metrics: Metrics
