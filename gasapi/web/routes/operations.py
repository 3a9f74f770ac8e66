"""Health, counters and the OpenAPI document."""

from __future__ import annotations

from importlib.resources import files

import orjson
from flask import Blueprint, Response

from gasapi import __version__
from gasapi.web.metrics import CONTENT_TYPE
from gasapi.web.negotiation import JSON
from gasapi.web.parts import Parts

__all__ = ["operation_routes"]


def operation_routes(parts: Parts) -> Blueprint:
    """Return the routes of operation."""
    routes = Blueprint("operations", __name__)
    document = files("gasapi.web").joinpath("openapi.json").read_bytes()
    ready = orjson.dumps({"status": "ready", "version": __version__, "data": parts.context.data})

    @routes.get("/openapi.json")
    def get_openapi() -> Response:
        return Response(document, content_type=str(JSON))

    @routes.get("/livez")
    def get_livez() -> Response:
        return Response(b'{"status":"alive"}', content_type=str(JSON))

    @routes.get("/readyz")
    def get_readyz() -> Response:
        # the application is built only after its data were read and checked, so whoever is asked is ready
        return Response(ready, content_type=str(JSON))

    @routes.get("/metrics")
    def get_metrics() -> Response:
        return Response(parts.metrics.exposition(), content_type=CONTENT_TYPE)

    return routes
