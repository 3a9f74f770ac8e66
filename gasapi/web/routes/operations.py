"""Health, counters and the OpenAPI document."""

from __future__ import annotations

from importlib.resources import files

import orjson
from flask import Blueprint, Response

from gasapi import __version__
from gasapi.web.metrics import CONTENT_TYPE
from gasapi.web.negotiation import JSON
from gasapi.web.parts import Parts
from gasapi.web.problems import Problem

__all__ = ["operation_routes"]

_READY = "ready"


def operation_routes(parts: Parts) -> Blueprint:
    """Return the routes of operation."""
    routes = Blueprint("operations", __name__)
    document = files("gasapi.web").joinpath("openapi.json").read_bytes()
    identity = {"version": __version__, "data": parts.context.data}

    @routes.get("/openapi.json")
    def get_openapi() -> Response:
        return Response(document, content_type=str(JSON))

    @routes.get("/livez")
    def get_livez() -> Response:
        return Response(b'{"status":"alive"}', content_type=str(JSON))

    @routes.get("/readyz")
    def get_readyz() -> Response:
        # the application is built only after its data were read and checked: what is left can change while it runs
        checks = {"data": _READY, "tokens": _READY, "large_questions": _READY}
        if parts.gate.is_full:
            # small questions are answered all the same, so that a replica in this state is not to be taken out of service
            checks["large_questions"] = "the line is full; those that come now hear 503"
        if parts.tokens is not None and not parts.tokens.any_good():
            raise Problem(503, "not ready: every token has expired, so that nobody can ask", headers=[("Retry-After", "60")])
        return Response(orjson.dumps({"status": _READY, **identity, "checks": checks}), content_type=str(JSON))

    @routes.get("/metrics")
    def get_metrics() -> Response:
        return Response(parts.metrics.exposition(), content_type=CONTENT_TYPE)

    return routes
