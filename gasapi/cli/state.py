"""``gasapi state``: the density of a gas without a server, by the same path that a request takes."""

from __future__ import annotations

import argparse
import json
import sys
from pathlib import Path
from typing import Any

__all__ = ["add_parser"]

_EXIT_BAD_ANSWER = 1
_EXIT_BAD_QUESTION = 2

_EXAMPLES = """\
examples:
  gasapi state nitrogen -p 40 barg -t 25 degC
  gasapi state methane=0.92 nitrogen=0.08 -p 60 bar -t 15 degC --unit density=lb/ft3
  gasapi state --question question.json --json

exit code: 0 with an answer, 1 where the answer is bad (no number is given), 2 where the question does not make sense
"""


def add_parser(commands: Any) -> None:
    """Add the subcommand."""
    parser: argparse.ArgumentParser = commands.add_parser(
        "state",
        help="answer one question without a server",
        description="The density, compressibility factor and molar volume of a gas at a pressure and a temperature.",
        epilog=_EXAMPLES,
        formatter_class=argparse.RawDescriptionHelpFormatter,
    )
    parser.add_argument("gas", nargs="*", help="name of a gas, or name=fraction for each component of a mixture")
    parser.add_argument("-p", "--pressure", nargs="+", metavar=("VALUE", "UNIT"), help="pressure, in Pa unless a unit is given")
    parser.add_argument(
        "-t", "--temperature", nargs="+", metavar=("VALUE", "UNIT"), help="temperature, in K unless a unit is given"
    )
    parser.add_argument("--basis", choices=("mole", "mass"), help="what the fractions are of (default mole)")
    parser.add_argument("--fraction-unit", choices=("1", "%", "ppm"), help="what the fractions are in (default 1)")
    parser.add_argument("--model", help="id of an equation of state (default auto)")
    parser.add_argument("--ambient-pressure", help="Pa, for gauge units")
    parser.add_argument(
        "--unit", action="append", default=[], metavar="QUANTITY=UNIT", help="a unit of the answer; may be repeated"
    )
    parser.add_argument(
        "--question",
        type=Path,
        help="a file with the question as JSON, in place of all the above; - reads it from standard input",
    )
    parser.add_argument("--json", action="store_true", help="print the answer as the service gives it")
    parser.add_argument(
        "--replay",
        type=Path,
        metavar="ANSWER",
        help="a file with a JSON answer: ask again what it answers and compare bit for bit (exit code 1 where they differ)",
    )
    parser.set_defaults(run=_run)


def _run(options: argparse.Namespace) -> int:
    if options.replay is not None:
        from gasapi.cli.replay import replay

        return replay(options.replay)
    from gasapi.app import create_context
    from gasapi.errors import GasapiError
    from gasapi.service.state import answer_state
    from gasapi.settings import Settings
    from gasapi.web.answers import state_json, state_members
    from gasapi.web.problems import Problem
    from gasapi.web.questions import StateReader

    try:
        context = create_context(Settings.from_environment())
        reader = StateReader(context.catalogue, context.ambient_pressure)
        if options.question is not None:
            asked = reader.of_body(_question_file(options.question))
        else:
            asked = reader.of_members(_members(options))
        try:
            answered = answer_state(context, asked.question)
        except GasapiError as error:
            raise asked.problem(error) from None
    except Problem as problem:
        for line in [f"{fault.pointer.lstrip('/') or 'question'}: {fault.detail}" for fault in problem.faults] or [
            problem.detail
        ]:
            print(f"gasapi state: {line}", file=sys.stderr)
        return _EXIT_BAD_QUESTION
    except (GasapiError, OSError) as error:
        print(f"gasapi state: {error}", file=sys.stderr)
        return _EXIT_BAD_QUESTION
    if options.json:
        print(state_json(asked, answered).decode())
    else:
        members = state_members(asked, answered)
        members["units"] = dict(asked.units.names)
        print(_block(members))
    return _EXIT_BAD_ANSWER if answered.answer.quality.level == "bad" else 0


def _question_file(path: Path) -> bytes:
    return sys.stdin.buffer.read() if str(path) == "-" else path.read_bytes()


def _members(options: argparse.Namespace) -> dict[str, Any]:
    """Return the members of the question as a body would have them; what cannot be a number stays text and is refused there."""
    members: dict[str, Any] = {"gas": _gas(options)} if options.gas else {}
    units = dict(text.split("=", 1) if "=" in text else (text, "") for text in options.unit)
    for quantity in ("pressure", "temperature"):
        words = getattr(options, quantity)
        if words is not None:
            members[quantity] = _number(words[0])
            if len(words) > 1:
                units[quantity] = " ".join(words[1:])
    if units:
        members["units"] = units
    if options.model is not None:
        members["model"] = options.model
    if options.ambient_pressure is not None:
        members["ambient_pressure"] = _number(options.ambient_pressure)
    return members


def _gas(options: argparse.Namespace) -> Any:
    if not any("=" in word for word in options.gas):
        return " ".join(options.gas)
    parts = [word.rpartition("=") for word in options.gas]
    gas: dict[str, Any] = {"fractions": {name or value: _number(value) for name, _, value in parts}}
    if options.basis is not None:
        gas["basis"] = options.basis
    if options.fraction_unit is not None:
        gas["fraction_unit"] = options.fraction_unit
    return gas


def _number(text: str) -> Any:
    try:
        value = json.loads(text)
    except ValueError:
        return text
    return value if type(value) in (int, float) and value - value == 0 else text


def _block(answer: dict[str, Any]) -> str:
    """Return an answer as lines for a person."""
    units, result, model, phase, quality = (answer[key] for key in ("units", "result", "model", "phase", "quality"))
    name = answer["gas"]["id"] or ", ".join(f"{id} {x:.6g}" for id, x in answer["gas"]["fractions"].items())
    uncertainty = model["relative_uncertainty"]
    rows = [
        ("gas", f"{name} ({answer['gas']['molar_mass']:.7g} {units['molar_mass']})"),
        ("state", f"{answer['state']['pressure']:.9g} Pa absolute, {answer['state']['temperature']:.9g} K"),
        ("density", _value(result["density"], units["density"])),
        ("compressibility factor", _value(result["compressibility_factor"], "")),
        ("molar volume", _value(result["molar_volume"], units["molar_volume"])),
        ("phase", phase["region"]),
        ("dew point", _value(phase["dew_point_temperature"], units["temperature"])),
        ("equation", f"{model['name']} ({model['id']}): {model['selected_because']}"),
        ("source", model["source"]),
        (
            "uncertainty",
            "not known"
            if uncertainty is None
            else f"{100.0 * uncertainty:.3g} % of density (k = 2, {model['uncertainty_basis']})",
        ),
        ("quality", " ".join([quality["level"], *([f"({', '.join(quality['reasons'])})"] if quality["reasons"] else [])])),
        *(("warning", warning["message"]) for warning in phase["warnings"]),
        *(("caution", caution) for caution in answer["cautions"]),
    ]
    width = max(len(label) for label, _ in rows)
    return "\n".join(f"{label:<{width}}  {text}" for label, text in rows)


def _value(number: float | None, unit: str) -> str:
    return "none" if number is None else f"{number:.10g} {unit}".rstrip()
