"""The page for people, the papers beside it, and the files that they are made of."""

from __future__ import annotations

import json
from importlib.resources import files

from flask import Blueprint, Response, request

from gasapi.errors import UnknownGas
from gasapi.gases.records import Gas
from gasapi.service.models import MODEL_IDS
from gasapi.web.page.assets import Assets
from gasapi.web.page.papers import Papers
from gasapi.web.parts import Parts
from gasapi.web.problems import Problem
from gasapi.web.routes.catalogue import gas_entry, gas_summary, model_entry

__all__ = ["page_routes"]

_HTML = "text/html; charset=utf-8"
_LONGEST_SEARCH = 200
_KEEP = "public, max-age=31536000, immutable"
_POLICY = "; ".join(
    (
        "default-src 'none'",
        "script-src 'self'",
        "style-src 'self'",
        "img-src 'self'",
        "connect-src 'self'",
        "form-action 'self'",
        "base-uri 'none'",
        "frame-ancestors 'none'",
    )
)
_HEADERS = {
    "Content-Security-Policy": _POLICY,
    "X-Content-Type-Options": "nosniff",
    "Referrer-Policy": "no-referrer",
    "Cache-Control": "no-cache",
}


def page_routes(parts: Parts) -> Blueprint:
    """Return the routes of the page and its papers."""
    routes = Blueprint("page", __name__)
    context = parts.context
    assets = Assets()
    papers = Papers(assets)
    models = [model_entry(id, context) for id in MODEL_IDS]
    sheet = papers.sheet(models)
    interface = papers.interface(json.loads(files("gasapi.web").joinpath("openapi.json").read_bytes()))
    # the papers are open to everyone: where tokens are asked for, what the site keeps to itself is left out of them
    closed = parts.settings.token_file is not None

    @routes.get("/")
    def get_page() -> Response:
        return _html(sheet)

    @routes.get("/assets/<digest>/<name>")
    def get_asset(digest: str, name: str) -> Response:
        asset = assets.find(digest, name)
        if asset is None:
            raise Problem(404, "there is no such file, or the page is of another version; load the page again")
        headers = {"Cache-Control": _KEEP, "X-Content-Type-Options": "nosniff"}
        return Response(asset.content, content_type=asset.content_type, headers=headers)

    @routes.get("/catalogue")
    def get_catalogue() -> Response:
        name = request.args.get("gas")
        if name is not None:
            return _html(papers.gas(gas_entry(_shown_gas(name), context)))
        search = request.args.get("search", "")[:_LONGEST_SEARCH]
        found = [gas_summary(gas, context) for gas in context.catalogue.search(search) if _is_shown(gas)]
        return _html(papers.catalogue(search, found, models))

    @routes.get("/interface")
    def get_interface() -> Response:
        return _html(interface)

    def _is_shown(gas: Gas) -> bool:
        return not (closed and gas.kind == "site")

    def _shown_gas(name: str) -> Gas:
        try:
            gas = context.catalogue.find(name[:_LONGEST_SEARCH])
        except UnknownGas as error:
            raise Problem(404, str(error)) from None
        if not _is_shown(gas):
            raise Problem(404, "there is no such gas in the open catalogue")
        return gas

    return routes


def _html(paper: bytes) -> Response:
    return Response(paper, content_type=_HTML, headers=_HEADERS)
