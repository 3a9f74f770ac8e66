"""What can go wrong between a client and the service. A question changes nothing, so any may be asked again."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any, NamedTuple

from gasapi.errors import GasapiError

__all__ = [
    "AccessRefused",
    "AnswerUnreadable",
    "ClientError",
    "Fault",
    "NotFound",
    "QuestionRefused",
    "QuestionTooLarge",
    "ServiceFailed",
    "ServiceOverloaded",
    "ServiceProblem",
    "ServiceUnreachable",
    "problem_of",
]

_FAULTS_TOLD = 5


class Fault(NamedTuple):
    """What is wrong with one member: a JSON pointer (RFC 6901) and the words."""

    pointer: str
    detail: str


class ClientError(GasapiError):
    """The root of the family."""


class ServiceUnreachable(ClientError):
    """No answer came: no connection, or none in time, after all retries. Asking again later may help."""

    def __init__(self, address: str, why: str) -> None:
        self.address = address
        self.why = why
        super().__init__(f"no answer from {address}: {why}")


class AnswerUnreadable(ClientError):
    """An answer came that is not one of this service; something else may stand at the address."""

    def __init__(self, address: str, status: int) -> None:
        self.address = address
        self.status = status
        super().__init__(f"{address} answered {status} with something that is no answer of gasapi")


class ServiceProblem(ClientError):
    """The service answered with a problem (RFC 9457): its status, title and detail, and the members at fault."""

    def __init__(self, status: int, title: str, detail: str, faults: Sequence[Fault] = (), instance: str = "") -> None:
        self.status = status
        self.title = title
        self.detail = detail
        self.faults = tuple(faults)
        self.instance = instance
        told = "".join(f"\n  {fault.pointer or '(body)'}: {fault.detail}" for fault in self.faults[:_FAULTS_TOLD])
        more = len(self.faults) - _FAULTS_TOLD
        super().__init__(f"{status} {title}: {detail}{told}" + (f"\n  and {more} more" if more > 0 else ""))


class QuestionRefused(ServiceProblem):
    """The question does not make sense, or not in this form (400, 405, 406, 415, 422). Asking it again does not help."""


class AccessRefused(ServiceProblem):
    """A token is needed, or the one that was sent is not good (401)."""


class NotFound(ServiceProblem):
    """Nothing is found at the address, or under the name (404)."""


class QuestionTooLarge(ServiceProblem):
    """The body is larger than the service takes (413); split the question."""


class ServiceOverloaded(ServiceProblem):
    """The service cannot answer now (503), after all retries. Asking again later helps."""


class ServiceFailed(ServiceProblem):
    """The service failed (500, 408 and others); its log tells why."""


_KINDS: Mapping[int, type[ServiceProblem]] = {
    400: QuestionRefused,
    401: AccessRefused,
    404: NotFound,
    405: QuestionRefused,
    406: QuestionRefused,
    413: QuestionTooLarge,
    415: QuestionRefused,
    422: QuestionRefused,
    503: ServiceOverloaded,
}


def problem_of(document: Mapping[str, Any]) -> ServiceProblem:
    """Return the exception of a problem document.

    :param document: the members of ``application/problem+json``
    :raises KeyError: it is none
    """
    status = int(document["status"])
    faults = [Fault(str(e.get("pointer", "")), str(e.get("detail", ""))) for e in document.get("errors", ())]
    kind = _KINDS.get(status, ServiceFailed)
    return kind(status, str(document["title"]), str(document.get("detail", "")), faults, str(document.get("instance", "")))
