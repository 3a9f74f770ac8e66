"""``gasapi state --replay answer.json``: ask again what an answer on file answers, and compare the two bit for bit.

An answer carries its question: the mole fractions, pressure and temperature in SI, the equation and the units. What it does
not carry (a dew-point margin of one's own, uncertainties of the readings) is left out of the comparison.
"""

from __future__ import annotations

import json
import sys
from collections.abc import Iterator, Mapping
from pathlib import Path
from typing import Any

__all__ = ["replay"]

_SAME, _DIFFERENT, _NOT_POSSIBLE = 0, 1, 2

# why the equation was chosen depends on whether it was named; whether the answer was held, on what was asked before
_NOT_COMPARED = {("model", "selected_because"), ("trace", "cached"), ("result", "density_expanded_uncertainty")}


class _NotReplayable(Exception):
    """The file holds no answer that can be asked again; the words say why."""


def replay(path: Path) -> int:
    """Print whether an answer on file is what the installed program answers, and return the exit code."""
    from gasapi.errors import GasapiError

    try:
        given = _read(path)
        again = _ask_again(given)
    except (_NotReplayable, GasapiError, OSError) as error:
        print(f"gasapi state: {error}", file=sys.stderr)
        return _NOT_POSSIBLE
    differing = list(_differences((), given, again))
    if not differing:
        print(f"same bits: density {given['result']['density']!r} {given['units']['density']}, {given['trace']['data']}")
        return _SAME
    if given["trace"].get("data") != again["trace"]["data"]:
        print("the answer was given by other data or another engine than are installed here")
    for line in differing:
        print(line)
    return _DIFFERENT


def _read(path: Path) -> dict[str, Any]:
    try:
        given = json.loads(path.read_bytes())
    except ValueError:
        raise _NotReplayable(f"{path.name} is not JSON") from None
    members = ("gas", "state", "result", "units", "phase", "model", "quality", "trace")
    if not isinstance(given, dict) or not all(isinstance(given.get(member), dict) for member in members):
        raise _NotReplayable(f"{path.name} is not the answer of a state: it has {', '.join(members)}")
    return given


def _ask_again(given: Mapping[str, Any]) -> dict[str, Any]:
    """Return the members of the answer that the installed program gives."""
    from gasapi.app import create_context
    from gasapi.service.quality import Reason, quality_of
    from gasapi.service.questions import GasSpec, StateQuestion
    from gasapi.service.state import answer_state
    from gasapi.settings import Settings
    from gasapi.units import unit_map
    from gasapi.web.answers import state_members
    from gasapi.web.questions import STANDARD_ATMOSPHERE, Asked

    try:
        reasons = given["quality"]["reasons"]
        id = given["gas"]["id"]
        fractions = tuple((str(name), float(value)) for name, value in given["gas"]["fractions"].items())
        model = given["model"]["id"]
        question = StateQuestion(
            gas=GasSpec(name=id) if id is not None else GasSpec(fractions=fractions),
            pressure=float(given["state"]["pressure"]),
            temperature=float(given["state"]["temperature"]),
            model="auto" if model == "none" else model,
            ambient_pressure=STANDARD_ATMOSPHERE if "ambient_pressure_assumed" in reasons else None,
            accept_two_phase="two_phase_accepted" in reasons,
        )
        units = unit_map(tuple(given["units"].items()))
    except (KeyError, TypeError, ValueError, AttributeError):
        raise _NotReplayable("the answer lacks a part, or something in it is not what an answer has") from None
    context = create_context(Settings.from_environment())
    answered = answer_state(context, question)
    if "fractions_scaled" in reasons:
        # the fractions on file are those after scaling
        flags = Reason.FRACTIONS_SCALED
        for word in answered.answer.quality.reasons:
            flags |= Reason[word.upper()]
        answered = answered._replace(answer=answered.answer._replace(quality=quality_of(int(flags))))
    members = state_members(Asked(question, units, lambda path: ""), answered)
    members["units"] = dict(units.names)
    again: dict[str, Any] = json.loads(json.dumps(members))
    return again


def _differences(at: tuple[str, ...], given: Any, again: Any) -> Iterator[str]:
    """Yield a line for each member that is not the same; numbers are compared by their bits, as JSON carries them whole."""
    if at in _NOT_COMPARED:
        return
    if isinstance(given, dict) and isinstance(again, dict):
        for name in dict.fromkeys((*given, *again)):
            yield from _differences((*at, name), given.get(name), again.get(name))
    elif given != again or type(given) is not type(again):
        yield f"{'.'.join(at)}: {given!r} on file, {again!r} here"
