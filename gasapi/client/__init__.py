"""A client for a running service: kept connections, time-outs, retries with back-off, errors as exceptions.

With pandas, in three lines::

    found = Client("http://127.0.0.1:8080").series("nitrogen", frame["p"], frame["t"], units={"pressure": "barg"})
    frame["density"] = found["result"]["density"]
    frame["status"] = found["status_code"]

pandas is not needed; any sequence of numbers will do. It imports nothing of gasapi but its exceptions.
"""

from gasapi.client.errors import (
    AccessRefused,
    AnswerUnreadable,
    ClientError,
    NotFound,
    QuestionRefused,
    QuestionTooLarge,
    ServiceFailed,
    ServiceOverloaded,
    ServiceProblem,
    ServiceUnreachable,
)
from gasapi.client.session import Client

__all__ = [
    "AccessRefused",
    "AnswerUnreadable",
    "Client",
    "ClientError",
    "NotFound",
    "QuestionRefused",
    "QuestionTooLarge",
    "ServiceFailed",
    "ServiceOverloaded",
    "ServiceProblem",
    "ServiceUnreachable",
]
