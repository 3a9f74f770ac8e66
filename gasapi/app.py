"""The application: built in a function from explicit settings; nothing happens on import."""

from __future__ import annotations

import logging
import sys
from collections.abc import Callable

from flask import Flask, Response, request
from werkzeug.exceptions import HTTPException, MethodNotAllowed

from gasapi import __version__
from gasapi.gases.catalogue import Catalogue
from gasapi.gases.site import load_site
from gasapi.service.context import Context
from gasapi.settings import Settings
from gasapi.web import problems
from gasapi.web.audit import Audit
from gasapi.web.caching import Freshness
from gasapi.web.edge import FAILURE, ROUTE, Edge, House
from gasapi.web.memo import Memo
from gasapi.web.metrics import Metrics
from gasapi.web.origins import Origins
from gasapi.web.parts import Parts
from gasapi.web.problems import Problem
from gasapi.web.rate_limit import RateLimit
from gasapi.web.representations import OrjsonProvider
from gasapi.web.request_log import RequestLog
from gasapi.web.routes.catalogue import catalogue_routes
from gasapi.web.routes.guide import guide_routes
from gasapi.web.routes.jobs import job_routes
from gasapi.web.routes.lookup_table import lookup_table_routes
from gasapi.web.routes.operations import operation_routes
from gasapi.web.routes.page import page_routes
from gasapi.web.routes.series import series_routes
from gasapi.web.routes.state import PATH, state_answerer, state_routes
from gasapi.web.routes.states import states_routes
from gasapi.web.tokens import TokenList
from gasapi.web.turns import Gate, Share

__all__ = ["create_app", "create_context"]

_log = logging.getLogger("gasapi")

_WORDS = {
    400: "the request cannot be read",
    404: "nothing is found at this address; / and /openapi.json tell what there is",
    408: "the request took too long to arrive",
    413: "the body is too large",
}


def create_context(settings: Settings) -> Context:
    """Return what the service holds while it runs: the catalogue, with the site's own gases where a site file is set.

    :raises DataError: the site file, or a data file, does not hold what it must
    """
    catalogue = Catalogue.load()
    if settings.site_file is None:
        return Context(catalogue)
    site = load_site(settings.site_file, catalogue)
    return Context(catalogue.with_site(site), site)


def create_app(settings: Settings | None = None, context: Context | None = None, tokens: TokenList | None = None) -> Flask:
    """Return the WSGI application.

    :param settings: those of the environment by default
    :param context: made from the settings by default
    :param tokens: read from the file that the settings name by default
    :raises SettingsError: a setting cannot be used
    :raises TokenFileError: a line of the token file cannot be used
    :raises DataError: the site file, or a data file, does not hold what it must
    """
    settings = settings or Settings.from_environment()
    if tokens is None and settings.token_file is not None:
        tokens = TokenList.from_file(settings.token_file)
    metrics = Metrics(settings.metrics_folder)
    context = context or create_context(settings)
    house = _house(settings, context, metrics.audit_failure)
    parts = Parts(context, settings, metrics, house.gate, tokens)
    metrics.built(__version__, context.data, {gas.id for gas in context.catalogue.gases})
    app = Flask("gasapi", static_folder=None)
    app.json = OrjsonProvider(app)
    # an address with a doubled slash is another address, not a redirection
    app.url_map.merge_slashes = False
    answer = state_answerer(parts)
    for routes in (state_routes(answer), catalogue_routes(parts), operation_routes(parts), page_routes(parts)):
        app.register_blueprint(routes)
    jobs = (job_routes(parts), lookup_table_routes(parts), guide_routes())
    for routes in (*jobs, series_routes(parts), states_routes(parts)):
        app.register_blueprint(routes)
    app.before_request(_note_route)
    app.register_error_handler(Problem, _problem_answer)
    app.register_error_handler(HTTPException, _http_answer)
    app.register_error_handler(Exception, _failure_answer)
    log = RequestLog(sys.stdout.fileno(), settings.log_questions) if settings.request_log else None
    memo = Memo(settings.memo_entries, settings.memo_bytes)
    edge = Edge(app.wsgi_app, tokens, memo, metrics, house, log, {PATH: answer}, settings.json_limit)
    app.wsgi_app = edge  # type: ignore[method-assign]
    return app


def _house(settings: Settings, context: Context, audit_failed: Callable[[], None]) -> House:
    """Return the rules of the house."""
    site = None if context.site is None else context.site.hash
    share = Share(settings.large_active, settings.large_waiting, settings.deadline, settings.large_bytes)
    limit = None
    if settings.rate_limit:
        folder = settings.metrics_folder
        file = None if folder is None else folder / "rates"
        limit = RateLimit(settings.rate_limit, settings.rate_burst or 2.0 * settings.rate_limit, file)
    return House(
        freshness=Freshness(__version__, context.data, site, settings.token_file is not None, settings.max_age),
        gate=Gate(share),
        limit=limit,
        origins=Origins(settings.origins) if settings.origins else None,
        audit=Audit(settings.audit_file, context.data, audit_failed) if settings.audit_file is not None else None,
        proxies=settings.proxies,
    )


def _note_route() -> None:
    rule = request.url_rule
    if rule is not None:
        request.environ[ROUTE] = rule.rule


def _problem_answer(problem: Problem) -> Response:
    body = problems.body(problem, request.environ["PATH_INFO"])
    response = Response(body, status=problem.status, content_type=problems.MEDIA_TYPE)
    response.headers.extend(problem.headers)
    return response


def _http_answer(error: HTTPException) -> Response:
    status = error.code or 500
    headers = []
    if isinstance(error, MethodNotAllowed) and error.valid_methods:
        allowed = ", ".join(sorted(error.valid_methods))
        headers.append(("Allow", allowed))
        return _problem_answer(Problem(405, f"{request.method[:20]} is not allowed here; {allowed} are", headers=headers))
    if status not in problems.KINDS:
        status = 400 if status < 500 else 500
    return _problem_answer(Problem(status, _WORDS.get(status, "the request cannot be served"), headers=headers))


def _failure_answer(error: Exception) -> Response:
    _log.error("a request failed", exc_info=error)
    return _problem_answer(Problem(500, FAILURE))
