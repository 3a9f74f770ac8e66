"""Counters for Prometheus; the services know nothing of them.

In several workers the Prometheus client shares its numbers through files in ``PROMETHEUS_MULTIPROC_DIR``, and any worker
can tell the sum of all.
"""

from __future__ import annotations

from collections.abc import Iterable
from pathlib import Path

from prometheus_client import CollectorRegistry, Counter, Gauge, Histogram, generate_latest
from prometheus_client.multiprocess import MultiProcessCollector

from gasapi.service.answers import StateAnswer

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
        self._info = Gauge(
            "gasapi_build_info", "Always 1", ("version", "data"), registry=self._registry, multiprocess_mode="max"
        )
        states = Counter("gasapi_states", "States answered beyond the memo of requests", ("source",), registry=self._registry)
        self._solved, self._held = states.labels("solved"), states.labels("held")
        self._quality = Counter("gasapi_quality", "States and rows by quality", ("model", "level"), registry=self._registry)
        self._not_converged = Counter(
            "gasapi_not_converged", "States whose solution did not converge", ("model",), registry=self._registry
        )
        self._outside = Counter(
            "gasapi_outside_validity", "States outside the published range, by gas", ("gas",), registry=self._registry
        )
        self._rows = Counter("gasapi_rows", "Rows of series answered", ("level",), registry=self._registry)
        self._large = Gauge(
            "gasapi_large_in_flight",
            "Large questions under way or in line",
            registry=self._registry,
            multiprocess_mode="livesum",
        )
        self._audit_failures = Counter(
            "gasapi_audit_failures", "Lines of the audit file that could not be written", registry=self._registry
        )
        self._gases: frozenset[str] = frozenset()
        self._by_quality: dict[tuple[str, str], Counter] = {}
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

    def built(self, version: str, data: str, gases: Iterable[str]) -> None:
        """Tell what is at work.

        :param gases: ids that may be told by name; others were typed by a caller
        """
        self._info.labels(version, data).set(1.0)
        self._gases = frozenset(gases)

    def state(self, answer: StateAnswer, held: bool) -> None:
        """Count a state that was solved, or held from before."""
        (self._held if held else self._solved).inc()
        self._level(answer.model.id, answer.quality.level, 1)
        reasons = answer.quality.reasons
        if reasons:
            if "not_converged" in reasons:
                self._not_converged.labels(answer.model.id).inc()
            if "outside_validity" in reasons or "outside_limits" in reasons:
                gas = answer.gas.id
                self._outside.labels("mixture" if gas is None else gas if gas in self._gases else "other").inc()

    def rows(self, model: str, counts: Iterable[tuple[str, int]]) -> None:
        """Count the rows of a series by level."""
        for level, count in counts:
            if count:
                self._rows.labels(level).inc(count)
                self._level(model, level, count)

    def _level(self, model: str, level: str, count: int) -> None:
        counter = self._by_quality.get((model, level))
        if counter is None:
            counter = self._by_quality[model, level] = self._quality.labels(model, level)
        counter.inc(count)

    def large(self, change: int) -> None:
        """Count large questions in, or out."""
        self._large.inc(change)

    def audit_failure(self) -> None:
        """Count a line of the audit file that could not be written."""
        self._audit_failures.inc()

    def exposition(self) -> bytes:
        """Return all counters in the text format, summed over the workers."""
        if self._folder is None:
            return generate_latest(self._registry)
        registry = CollectorRegistry()
        MultiProcessCollector(registry, path=str(self._folder))
        return generate_latest(registry)
