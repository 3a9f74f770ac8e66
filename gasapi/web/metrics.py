"""Counters for Prometheus; the services know nothing of them.

In several workers the Prometheus client shares its numbers through files in ``PROMETHEUS_MULTIPROC_DIR``, and any worker
can tell the sum of all.
"""

from __future__ import annotations

from pathlib import Path

from prometheus_client import CollectorRegistry, Counter, Gauge, Histogram, generate_latest
from prometheus_client.multiprocess import MultiProcessCollector

from gasapi import __version__

__all__ = ["CONTENT_TYPE", "Metrics"]

CONTENT_TYPE = "text/plain; version=0.0.4; charset=utf-8"
"""The text format of the Prometheus exposition, version 0.0.4."""

_SECONDS = (0.0005, 0.001, 0.0025, 0.005, 0.01, 0.025, 0.05, 0.1, 0.25, 1.0, 5.0, 30.0)


class Metrics:
    """The counters of one worker.

    :param folder: where workers share their numbers; None where there is one process
    """

    def __init__(self, folder: Path | None = None) -> None:
        self._folder = folder
        self._registry = CollectorRegistry()
        self._requests = Counter("gasapi_requests", "Requests answered", ("route", "method", "status"), registry=self._registry)
        self._seconds = Histogram(
            "gasapi_request_seconds", "Time from head to answer", ("route",), buckets=_SECONDS, registry=self._registry
        )
        memo = Counter("gasapi_memo", "Look-ups in the memo of answers", ("outcome",), registry=self._registry)
        self._hits, self._misses = memo.labels("hit"), memo.labels("miss")
        info = Gauge("gasapi_build_info", "Always 1", ("version",), registry=self._registry, multiprocess_mode="max")
        info.labels(__version__).set(1.0)
        self._by_request: dict[tuple[str, str, str], Counter] = {}
        self._by_route: dict[str, Histogram] = {}

    def request(self, route: str, method: str, status: str, seconds: float) -> None:
        """Count one request.

        :param route: the rule of the route, never what a caller typed
        :param status: three digits
        """
        key = (route, method, status)
        counter = self._by_request.get(key)
        if counter is None:
            # the histogram first: a thread that finds the counter finds the other, too
            self._by_route[route] = self._seconds.labels(route)
            counter = self._by_request[key] = self._requests.labels(*key)
        counter.inc()
        self._by_route[route].observe(seconds)

    def memo(self, hit: bool) -> None:
        """Count a look-up in the memo."""
        (self._hits if hit else self._misses).inc()

    def exposition(self) -> bytes:
        """Return all counters in the text format, summed over the workers."""
        if self._folder is None:
            return generate_latest(self._registry)
        registry = CollectorRegistry()
        MultiProcessCollector(registry, path=str(self._folder))
        return generate_latest(registry)
