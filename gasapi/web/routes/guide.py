"""``/guide``: the prose guide, open to everyone as the page for people is."""

from __future__ import annotations

from flask import Blueprint, Response, request

from gasapi.guide import Guide
from gasapi.web.problems import Problem

__all__ = ["guide_routes"]

_HEADERS = {
    "Content-Security-Policy": "default-src 'none'; style-src 'self'; img-src 'self'; base-uri 'none'; frame-ancestors 'none'",
    "X-Content-Type-Options": "nosniff",
    "Referrer-Policy": "no-referrer",
    "Cache-Control": "no-cache",
}


def guide_routes() -> Blueprint:
    """Return the route of the guide."""
    routes = Blueprint("guide", __name__)
    guide = Guide()

    @routes.get("/guide")
    def get_guide() -> Response:
        name = request.args.get("page")
        page = guide.index if name is None else guide.pages.get(name)
        if page is None:
            raise Problem(404, f"the guide has no such page; its pages: {', '.join(guide.pages)}")
        return Response(page, content_type="text/html; charset=utf-8", headers=_HEADERS)

    return routes
