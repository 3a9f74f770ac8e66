"""The client: one session of kept connections, with what each call asks and gives."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from pathlib import Path
from typing import Any, Self

import numpy as np
import orjson
import requests
from requests.adapters import HTTPAdapter
from urllib3.util.retry import Retry

from gasapi.client.errors import AnswerUnreadable, ServiceProblem, ServiceUnreachable, problem_of
from gasapi.client.jobs import JobCalls
from gasapi.client.parts import joined_parts, series_columns, series_parts

__all__ = ["Client"]

_QUESTIONS_OF_A_CALL = 1000
_ROWS_OF_A_CALL = 100_000
_RETRIED = (502, 503, 504)
_PIECE = 1 << 18
_JSON = "application/json"

Gas = str | Mapping[str, Any]
"""A name, or ``{"fractions": {...}, ...}`` as the service takes it."""


class Client(JobCalls):
    """Asks a running service. One client is for one thread; it may be used in a ``with`` statement.

    A question changes nothing on the other side, so every call is tried again where the connection fails or the service
    says that it cannot answer now, with growing pauses, and as late as it asks for (``Retry-After``).

    :param address: such as ``http://127.0.0.1:8080``
    :param token: sent as ``Authorization: Bearer``
    :param timeout: s to connect, and s to wait for the answer
    :param retries: how often a call is tried again
    :param pause: s before the second retry; doubles with each one
    :param rows: rows of one call at most; a longer series is split
    """

    def __init__(
        self,
        address: str,
        *,
        token: str | None = None,
        timeout: tuple[float, float] = (5.0, 120.0),
        retries: int = 5,
        pause: float = 0.5,
        rows: int = _ROWS_OF_A_CALL,
    ) -> None:
        if rows < 1:
            raise ValueError("a call has at least one row")
        self._address = address.rstrip("/")
        self._timeout = timeout
        self._rows = rows
        self._session = requests.Session()
        policy = Retry(
            total=retries,
            backoff_factor=pause,
            status_forcelist=_RETRIED,
            allowed_methods=None,
            respect_retry_after_header=True,
            raise_on_status=False,
        )
        for scheme in ("http://", "https://"):
            self._session.mount(scheme, HTTPAdapter(max_retries=policy))
        self._session.headers["Accept"] = _JSON
        if token is not None:
            self._session.headers["Authorization"] = f"Bearer {token}"

    def __enter__(self) -> Self:
        return self

    def __exit__(self, *exception: object) -> None:
        self.close()

    def close(self) -> None:
        """Let the connections go."""
        self._session.close()

    def state(self, gas: Gas, pressure: float, temperature: float, **members: Any) -> dict[str, Any]:
        """Return the answer to one state.

        :param gas: a name, or fractions
        :param pressure: in the unit of ``units["pressure"]``, Pa by default
        :param temperature: in the unit of ``units["temperature"]``, K by default
        :param members: the other members of the question, such as ``units`` and ``model``
        :raises ServiceProblem: the service refused the question, or failed
        :raises ServiceUnreachable: no answer came
        """
        return self.ask("/v1/state", {"gas": gas, "pressure": pressure, "temperature": temperature, **members})

    def states(self, questions: Sequence[Mapping[str, Any]]) -> list[dict[str, Any] | ServiceProblem]:
        """Return the answers to independent states in their order, for one that was refused the exception in its place.

        :param questions: members of state questions; any number, in calls of 1000
        :raises ServiceProblem: the service refused a whole call, or failed
        :raises ServiceUnreachable: no answer came
        """
        found: list[dict[str, Any] | ServiceProblem] = []
        for i in range(0, len(questions), _QUESTIONS_OF_A_CALL):
            answers = self.ask("/v1/states", {"questions": questions[i : i + _QUESTIONS_OF_A_CALL]})["answers"]
            found += [problem_of(answer["problem"]) if "problem" in answer else answer for answer in answers]
        return found

    def series(self, gas: Gas, pressure: Any, temperature: Any, **members: Any) -> dict[str, Any]:
        """Return the answer to a history; bad rows have None in place of numbers, and their reasons in ``reasons``.

        A series longer than ``rows`` is asked in parts. So that one equation serves all of them, it is chosen first by rows
        from all over the series, and named in every part.

        :param gas: a name, or fractions; a fraction may be a sequence by the row
        :param pressure: a sequence, or a number for all rows; NaN and None stand for a missing reading
        :param temperature: likewise
        :param members: the other members, such as ``units``, ``model``, ``timestamps`` and ``input_status``
        :raises ServiceProblem: the service refused the question, or failed
        :raises ServiceUnreachable: no answer came
        """
        question, columns = series_columns({"gas": gas, "pressure": pressure, "temperature": temperature, **members})
        parts = series_parts(question, columns, self._rows)
        if len(parts) == 1:
            return self.ask("/v1/series", parts[0])
        because = None
        if question.get("model", "auto") == "auto":
            length = max(len(column) for column in columns.values())
            (sample,) = series_parts(question, {name: c[:: -(-length // self._rows)] for name, c in columns.items()}, length)
            chosen = self.ask("/v1/series", sample)["model"]
            if chosen["id"] != "none":
                because = chosen["selected_because"]
                parts = [{**part, "model": chosen["id"]} for part in parts]
        joined = joined_parts([self.ask("/v1/series", part) for part in parts])
        if because is not None:
            joined["model"]["selected_because"] = because
        return joined

    def series_file(
        self, source: str | Path, target: str | Path, *, keep: Iterable[str] = (), **parameters: str | float
    ) -> None:
        """Have a CSV file answered row for row into another; neither is held in memory.

        :param source: a CSV file with a header, columns such as ``pressure [barg]``
        :param target: where the answer goes
        :param keep: other columns to keep
        :param parameters: the question's other members as query parameters, such as ``gas`` and ``model``
        :raises ServiceProblem: the service refused the question, or failed
        :raises ServiceUnreachable: no answer came
        """
        query = [*((name, str(value)) for name, value in parameters.items()), *(("keep", name) for name in keep)]
        with Path(source).open("rb") as body:
            response = self._request(
                "POST",
                "/v1/series",
                params=query,
                data=body,
                headers={"Content-Type": "text/csv", "Accept": "text/csv"},
                stream=True,
            )
            try:
                with response, Path(target).open("wb") as file:
                    for piece in response.iter_content(_PIECE):
                        file.write(piece)
            except requests.RequestException as error:
                raise ServiceUnreachable(self._address, f"the answer broke off ({type(error).__name__})") from None

    def ask(self, path: str, question: Mapping[str, Any]) -> dict[str, Any]:
        """Return the answer to a question that is posted to any path, such as ``/v1/flow``.

        :param path: begins with ``/v1/``
        :param question: the members; NumPy numbers and arrays may stand among them
        :raises ServiceProblem: the service refused the question, or failed
        :raises ServiceUnreachable: no answer came
        """
        body = orjson.dumps(question, option=orjson.OPT_SERIALIZE_NUMPY, default=_plain)
        return self._answer(self._request("POST", path, data=body, headers={"Content-Type": _JSON}))

    def ask_text(self, path: str, question: Mapping[str, Any]) -> str:
        """Return the answer to a question that is given as text, such as a table in Structured Text.

        :param path: begins with ``/v1/``
        :param question: the members; NumPy numbers and arrays may stand among them
        :raises ServiceProblem: the service refused the question, or failed
        :raises ServiceUnreachable: no answer came
        """
        body = orjson.dumps(question, option=orjson.OPT_SERIALIZE_NUMPY, default=_plain)
        headers = {"Content-Type": _JSON, "Accept": "text/csv, text/plain"}
        return self._request("POST", path, data=body, headers=headers).text

    def fetch(self, path: str, **parameters: str) -> dict[str, Any]:
        """Return what is found at a path, such as ``/v1/gases`` with ``search``.

        :raises ServiceProblem: nothing is found there, or the service failed
        :raises ServiceUnreachable: no answer came
        """
        return self._answer(self._request("GET", path, params=parameters))

    def _request(self, method: str, path: str, **options: Any) -> requests.Response:
        try:
            response = self._session.request(method, self._address + path, timeout=self._timeout, **options)
        except requests.RequestException as error:
            reason = error.args[0] if error.args else error
            raise ServiceUnreachable(self._address, f"{type(error).__name__}: {reason}") from None
        if response.status_code != 200:
            try:
                problem = problem_of(orjson.loads(response.content))
            except (ValueError, KeyError, TypeError, AttributeError):
                raise AnswerUnreadable(self._address, response.status_code) from None
            raise problem
        return response

    def _answer(self, response: requests.Response) -> dict[str, Any]:
        try:
            answer = orjson.loads(response.content)
        except ValueError:
            answer = None
        if not isinstance(answer, dict):
            raise AnswerUnreadable(self._address, response.status_code)
        return answer


def _plain(value: Any) -> Any:
    """Return what the JSON writer does not know in a form that it does."""
    if isinstance(value, Mapping):
        return dict(value)
    if isinstance(value, np.ndarray):
        return value.tolist()
    if isinstance(value, Sequence):
        return list(value)
    raise TypeError(type(value).__name__)
