"""The jobs around a density: one table of path, reader, service and writer; load, call, write down."""

from __future__ import annotations

from collections.abc import Callable
from functools import partial
from typing import Any, NamedTuple

import orjson
from flask import Blueprint, Response, request

from gasapi.errors import GasapiError
from gasapi.service.comparison import answer_comparison
from gasapi.service.context import Context
from gasapi.service.flow import answer_flow
from gasapi.service.fraction_from_density import answer_fraction_from_density
from gasapi.service.molar_mass import answer_molar_mass
from gasapi.service.phase_boundary import PhaseBoundaryAnswer, answer_phase_boundary
from gasapi.service.pressure_decay import answer_pressure_decay
from gasapi.service.vessel import answer_vessel
from gasapi.web import job_answers, job_questions
from gasapi.web.body import read_body, require_json
from gasapi.web.job_questions import JobReader, PhaseBoundaryAsked
from gasapi.web.negotiation import JSON, accepted
from gasapi.web.parts import Parts
from gasapi.web.problems import Fault, invalid, pointer
from gasapi.web.query import parameter_pairs
from gasapi.web.turns import give_way

__all__ = ["JOBS", "Job", "job_routes", "refuse_parameters"]

_FORMS = (JSON,)


class Job(NamedTuple):
    """A job: its name in the path, and who reads, answers and writes it."""

    name: str
    reader: type[JobReader[Any]]
    answer: Callable[..., Any]
    members: Callable[..., dict[str, Any]]


def _answer_phase_boundary(context: Context, question: PhaseBoundaryAsked) -> PhaseBoundaryAnswer:
    return answer_phase_boundary(context, question.state)


JOBS = (
    Job("flow", job_questions.FlowReader, answer_flow, job_answers.flow_members),
    Job("vessel", job_questions.VesselReader, answer_vessel, job_answers.vessel_members),
    Job("pressure-decay", job_questions.PressureDecayReader, answer_pressure_decay, job_answers.pressure_decay_members),
    Job(
        "fraction-from-density",
        job_questions.FractionFromDensityReader,
        answer_fraction_from_density,
        job_answers.fraction_from_density_members,
    ),
    Job(
        "molar-mass", job_questions.MolarMassReader, partial(answer_molar_mass, pause=give_way), job_answers.molar_mass_members
    ),
    Job(
        "phase-boundary",
        job_questions.PhaseBoundaryReader,
        _answer_phase_boundary,
        job_answers.phase_boundary_members,
    ),
    Job("comparison", job_questions.ComparisonReader, answer_comparison, job_answers.comparison_members),
)
"""Every job whose answer is JSON alone."""


def job_routes(parts: Parts) -> Blueprint:
    """Return the routes of the jobs."""
    routes = Blueprint("jobs", __name__)
    context, limit = parts.context, parts.settings.json_limit

    def add(job: Job) -> None:
        reader = job.reader(context.ambient_pressure)

        def post() -> Response:
            environ = request.environ
            accepted(environ.get("HTTP_ACCEPT", ""), _FORMS)
            require_json(environ)
            refuse_parameters(environ["QUERY_STRING"])
            asked = reader.of_body(read_body(environ, limit))
            try:
                answer = job.answer(context, asked.question)
            except GasapiError as error:
                raise asked.problem(error) from None
            return Response(orjson.dumps(job.members(asked.question, asked.units, answer)), content_type=str(JSON))

        routes.add_url_rule(f"/v1/{job.name}", f"post_{job.name.replace('-', '_')}", post, methods=["POST"])

    for job in JOBS:
        add(job)
    return routes


def refuse_parameters(query: str) -> None:
    """Check that a posted question has no parameters.

    :raises Problem: 422 where it has
    """
    names = parameter_pairs(query)
    if names:
        words = "a posted question has no parameters; give the member in the body"
        raise invalid([Fault(pointer((name,)), words) for name in names])
