"""``gasapi flow``, ``vessel``, ``pressure-decay``, ...: the jobs around a density without a server, by the path of a request.

Each subcommand turns its options into the members of the request; from there on everything is as the service has it, units,
refusals and quality included.
"""

from __future__ import annotations

import argparse
import json
import sys
from collections.abc import Callable, Iterator, Mapping, Sequence
from pathlib import Path
from typing import Any, Final, NamedTuple

__all__ = ["add_parser"]

_EXIT_BAD_ANSWER = 1
_EXIT_BAD_QUESTION = 2
_EXIT_CODES = """
exit code: 0 with an answer, 1 where the answer is bad (no number is given), 2 where the question does not make sense
"""

Members = dict[str, Any]


class _Job(NamedTuple):
    """A subcommand: its name, words for the help, an example, its options, and how they become members."""

    name: str
    help: str
    example: str
    options: Callable[[argparse.ArgumentParser], None]
    members: Callable[[argparse.Namespace, Members], None]
    quantities: Mapping[str, str]
    """The quantity of each member of the result that has a unit."""

    takes_gas: bool = True
    is_state: bool = True


def add_parser(commands: Any) -> None:
    """Add the subcommands."""
    for job in _JOBS:
        parser: argparse.ArgumentParser = commands.add_parser(
            job.name,
            help=job.help,
            description=f"{job.help[0].upper()}{job.help[1:]}.",
            epilog=f"example:\n  gasapi {job.name} {job.example}\n{_EXIT_CODES}",
            formatter_class=argparse.RawDescriptionHelpFormatter,
        )
        if job.takes_gas:
            parser.add_argument("gas", nargs="*", help="name of a gas, or name=fraction for each component of a mixture")
            parser.add_argument("--basis", choices=("mole", "mass"), help="what the fractions are of (default mole)")
        if job.is_state:
            parser.add_argument("-p", "--pressure", nargs="+", metavar="VALUE", help="pressure, and its unit unless Pa")
            parser.add_argument("-t", "--temperature", nargs="+", metavar="VALUE", help="temperature, and its unit unless K")
        job.options(parser)
        parser.add_argument("--model", help="id of an equation of state (default auto)")
        parser.add_argument("--ambient-pressure", help="Pa, for gauge units")
        parser.add_argument("--unit", action="append", default=[], metavar="QUANTITY=UNIT", help="a unit; may be repeated")
        parser.add_argument(
            "--question", type=Path, help="a file with the question as JSON, in place of all the above; - reads it"
        )
        parser.add_argument("--json", action="store_true", help="print the answer as the service gives it")
        parser.set_defaults(run=lambda options, job=job: _run(job, options))


def _run(job: _Job, options: argparse.Namespace) -> int:
    from gasapi.app import create_context
    from gasapi.errors import GasapiError
    from gasapi.settings import Settings
    from gasapi.web.problems import Problem

    try:
        context = create_context(Settings.from_environment())
        if options.question is None:
            body = json.dumps(_members_of(job, options)).encode()
        else:
            body = sys.stdin.buffer.read() if str(options.question) == "-" else options.question.read_bytes()
        answer, text = _answered(job.name, context, body)
    except Problem as problem:
        for line in [f"{fault.pointer.lstrip('/') or 'question'}: {fault.detail}" for fault in problem.faults] or [
            problem.detail
        ]:
            print(f"gasapi {job.name}: {line}", file=sys.stderr)
        return _EXIT_BAD_QUESTION
    except (GasapiError, OSError) as error:
        print(f"gasapi {job.name}: {error}", file=sys.stderr)
        return _EXIT_BAD_QUESTION
    if text is not None:
        sys.stdout.write(text)
        return 0
    print(json.dumps(answer, ensure_ascii=False) if options.json else _block(job, answer))
    return _EXIT_BAD_ANSWER if answer["quality"]["level"] == "bad" else 0


def _answered(name: str, context: Any, body: bytes) -> tuple[Members, str | None]:
    """Return the members of the answer, and the text where it was asked in another form."""
    from gasapi.errors import GasapiError
    from gasapi.web.routes.jobs import JOBS

    if name == "lookup-table":
        return _table(context, body)
    job = next(job for job in JOBS if job.name == name)
    asked = job.reader(context.ambient_pressure).of_body(body)
    try:
        answer = job.answer(context, asked.question)
    except GasapiError as error:
        raise asked.problem(error) from None
    return _plain(job.members(asked.question, asked.units, answer)), None


def _table(context: Any, body: bytes) -> tuple[Members, str | None]:
    from datetime import UTC, datetime

    from gasapi.errors import GasapiError
    from gasapi.service.lookup_table import answer_lookup_table
    from gasapi.web.job_questions import LookupTableReader
    from gasapi.web.table_answers import table_csv, table_members, table_text

    asked = LookupTableReader(context.ambient_pressure).of_body(body)
    try:
        answer = answer_lookup_table(context, asked.question.question)
    except GasapiError as error:
        raise asked.problem(error) from None
    if asked.question.form == "json" or answer.table is None:
        return _plain(table_members(asked.question, asked.units, answer)), None
    if asked.question.form == "csv":
        return {}, table_csv(asked.question, asked.units, answer, answer.table)
    today = datetime.now(UTC).date().isoformat()
    return {}, table_text(asked.question, asked.units, answer, answer.table, today)


def _plain(members: Members) -> Members:
    """Return members as JSON has them, fragments of it written out."""
    import orjson

    plain: Members = orjson.loads(orjson.dumps(members))
    return plain


def _members_of(job: _Job, options: argparse.Namespace) -> Members:
    """Return the members as a body would have them; what cannot be a number stays text and is refused there."""
    members: Members = {"units": dict(text.split("=", 1) if "=" in text else (text, "") for text in options.unit)}
    if job.takes_gas and options.gas:
        members["gas"] = _gas(options.gas, options.basis)
    if job.is_state:
        _measured(members, "pressure", options.pressure)
        _measured(members, "temperature", options.temperature)
    if options.model is not None:
        members["model"] = options.model
    if options.ambient_pressure is not None:
        members["ambient_pressure"] = _number(options.ambient_pressure)
    job.members(options, members)
    return members


def _gas(words: Sequence[str], basis: str | None) -> Any:
    if not any("=" in word for word in words):
        return " ".join(words)
    parts = [word.rpartition("=") for word in words]
    gas: Members = {"fractions": {name or value: _number(value) for name, _, value in parts}}
    return gas if basis is None else {**gas, "basis": basis}


def _number(text: str) -> Any:
    try:
        value = json.loads(text)
    except ValueError:
        return text
    return value if type(value) in (int, float) and value - value == 0 else text


def _measured(members: Members, name: str, words: Sequence[str] | None, quantity: str = "") -> None:
    """Set a member from a value and, where there is one, its unit."""
    if words is not None:
        members[name] = _number(words[0])
        if len(words) > 1:
            members["units"][quantity or name] = " ".join(words[1:])


def _with_own_unit(words: Sequence[str]) -> Members:
    """Return a value with its own unit."""
    value: Members = {"value": _number(words[0])}
    return {**value, "unit": " ".join(words[1:])} if len(words) > 1 else value


def _readings(words: Sequence[str], ambient: str | None = None) -> Members:
    """Return a pressure and a temperature in the units of the question."""
    pair: Members = dict(zip(("pressure", "temperature"), map(_number, words), strict=False))
    return pair if ambient is None else {**pair, "ambient_pressure": _number(ambient)}


def _given(options: argparse.Namespace, members: Members, *names: str) -> None:
    """Set members that are words or numbers as they stand."""
    for name in names:
        value = getattr(options, name)
        if value is not None:
            members[name] = value


def _uncertainty(options: argparse.Namespace, members: Members) -> None:
    """Set the standard uncertainties that were given as name=value."""
    if options.uncertainty:
        members["input_uncertainty"] = {
            name: _number(value) for name, _, value in (text.partition("=") for text in options.uncertainty)
        }


def _uncertainty_option(parser: argparse.ArgumentParser, names: str) -> None:
    parser.add_argument(
        "--uncertainty", action="append", metavar="NAME=VALUE", help=f"standard uncertainty of {names}; may be repeated"
    )


def _reference_option(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("--reference", help="reference condition by name, such as din-1343 or iso-13443")


def _flow_options(parser: argparse.ArgumentParser) -> None:
    kinds = ("actual_volume", "reference_volume", "mass", "amount")
    parser.add_argument("--flow", nargs="+", metavar="VALUE", help="the flow, and its unit unless SI")
    parser.add_argument("--kind", choices=kinds, default=kinds[0], help="what the flow is of (default actual_volume)")
    _reference_option(parser)
    parser.add_argument(
        "--meter", choices=("differential_pressure", "volumetric"), help="a meter whose reading is to be corrected"
    )
    parser.add_argument(
        "--design-density", nargs="+", metavar="VALUE", help="density that the meter was made for, and its unit"
    )
    parser.add_argument("--design", nargs=2, metavar=("PRESSURE", "TEMPERATURE"), help="state that the meter was made for")
    _uncertainty_option(parser, "pressure or temperature")


def _flow_members(options: argparse.Namespace, members: Members) -> None:
    if options.flow is not None:
        members["flow"] = {"kind": options.kind, **_with_own_unit(options.flow)}
    if options.meter is not None:
        meter: Members = {"principle": options.meter}
        if options.design_density is not None:
            meter["design_density"] = _number(options.design_density[0])
            if len(options.design_density) > 1:
                members["units"]["density"] = " ".join(options.design_density[1:])
        if options.design is not None:
            meter["design"] = _readings(options.design)
        members["meter"] = meter
    _given(options, members, "reference")
    _uncertainty(options, members)


def _vessel_options(parser: argparse.ArgumentParser) -> None:
    kinds = ("reference_volume", "mass", "amount")
    parser.add_argument("--volume", nargs="+", metavar="VALUE", help="inner (water) volume, and its unit unless m3")
    _reference_option(parser)
    parser.add_argument("--later", nargs=2, metavar=("PRESSURE", "TEMPERATURE"), help="a second state: what was used")
    parser.add_argument("--draw-off", nargs="+", metavar="VALUE", help="a steady draw-off, and its unit unless SI")
    parser.add_argument("--draw-off-kind", choices=kinds, default=kinds[0], help="what it is of (default reference_volume)")
    parser.add_argument("--minimum-pressure", help="where the draw-off ends, in the unit of the pressure")
    _uncertainty_option(parser, "pressure or temperature")


def _vessel_members(options: argparse.Namespace, members: Members) -> None:
    _measured(members, "volume", options.volume)
    if options.later is not None:
        members["later"] = _readings(options.later)
    if options.draw_off is not None:
        members["draw_off"] = {"kind": options.draw_off_kind, **_with_own_unit(options.draw_off)}
        if options.minimum_pressure is not None:
            members["draw_off"]["minimum_pressure"] = _number(options.minimum_pressure)
    _given(options, members, "reference")
    _uncertainty(options, members)


def _decay_options(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("--volume", nargs="+", metavar="VALUE", help="inner volume, and its unit unless m3")
    parser.add_argument("--duration", nargs="+", metavar="VALUE", help="time from start to end, and its unit unless s")
    for name in ("start", "end"):
        parser.add_argument(f"--{name}", nargs=2, metavar=("PRESSURE", "TEMPERATURE"), help=f"readings at the {name}")
        parser.add_argument(f"--{name}-ambient", help=f"ambient pressure at the {name}, Pa, for gauge units")
    _uncertainty_option(parser, "pressure or temperature")
    parser.add_argument("--leak-limit", nargs="+", metavar="VALUE", help="a leak rate to resolve, with its unit")
    _reference_option(parser)


def _decay_members(options: argparse.Namespace, members: Members) -> None:
    _measured(members, "volume", options.volume)
    _measured(members, "duration", options.duration)
    if options.start is not None:
        members["start"] = _readings(options.start, options.start_ambient)
    if options.end is not None:
        members["end"] = _readings(options.end, options.end_ambient)
    if options.leak_limit is not None:
        members["leak_limit"] = _with_own_unit(options.leak_limit)
    _given(options, members, "reference")
    _uncertainty(options, members)


def _fraction_options(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("gases", nargs="*", help="the two gases; the answer is the fraction of the first")
    parser.add_argument("--density", nargs="+", metavar="VALUE", help="as measured, and its unit unless kg/m3")
    _uncertainty_option(parser, "density, pressure or temperature")


def _fraction_members(options: argparse.Namespace, members: Members) -> None:
    members["gases"] = options.gases
    _measured(members, "density", options.density)
    _uncertainty(options, members)


def _mass_options(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("--density", nargs="+", metavar="VALUE", help="as measured, and its unit unless kg/m3")
    parser.add_argument("--mass", nargs="+", metavar="VALUE", help="as weighed, and its unit unless kg; with --volume")
    parser.add_argument("--volume", nargs="+", metavar="VALUE", help="of what was weighed, and its unit unless m3")
    parser.add_argument("--like", nargs="+", help="a gas that it resembles, by name or name=fraction")
    _uncertainty_option(parser, "density, mass, volume, pressure or temperature")


def _mass_members(options: argparse.Namespace, members: Members) -> None:
    for name in ("density", "mass", "volume"):
        _measured(members, name, getattr(options, name))
    if options.like is not None:
        members["like"] = _gas(options.like, None)
    _uncertainty(options, members)


def _no_options(parser: argparse.ArgumentParser) -> None:
    pass


def _no_members(options: argparse.Namespace, members: Members) -> None:
    pass


def _table_options(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("-p", "--pressure", nargs="+", metavar="VALUE", help="low and high end, and the unit unless Pa")
    parser.add_argument("-t", "--temperature", nargs="+", metavar="VALUE", help="low and high end, and the unit unless K")
    parser.add_argument("--tolerance", help="largest relative error, such as 0.001")
    parser.add_argument("--property", help="density (default), compressibility_factor or molar_volume")
    parser.add_argument("--format", choices=("json", "csv", "st"), help="st is IEC 61131-3 Structured Text")
    parser.add_argument("--name", help="name of the function block")


def _table_members(options: argparse.Namespace, members: Members) -> None:
    for name in ("pressure", "temperature"):
        words = getattr(options, name)
        if words is not None:
            members[name] = [_number(word) for word in words[:2]]
            if len(words) > 2:
                members["units"][name] = " ".join(words[2:])
    if options.tolerance is not None:
        members["tolerance"] = _number(options.tolerance)
    _given(options, members, "property", "format", "name")


_CONTENT: Final = {"mass": "mass", "amount": "amount", "reference_volume": "volume"}

_JOBS: Final = (
    _Job(
        "flow",
        "a flow in one measure into all others",
        "nitrogen -p 40 barg -t 25 degC --flow 120 m3/h --reference din-1343 --unit mass_flow=kg/h",
        _flow_options,
        _flow_members,
        {
            "actual_volume": "volume_flow",
            "reference_volume": "volume_flow",
            "mass": "mass_flow",
            "amount": "amount_flow",
            "design_density": "density",
        },
    ),
    _Job(
        "vessel",
        "what a vessel holds, what was used, how long it lasts",
        "argon --volume 50 L -p 200 barg -t 15 degC --reference iso-13443 --draw-off 12 L/min --minimum-pressure 20",
        _vessel_options,
        _vessel_members,
        {f"{prefix}{name}": of for prefix in ("", "used_", "usable_") for name, of in _CONTENT.items()}
        | {"duration": "duration"},
    ),
    _Job(
        "pressure-decay",
        "a leak test by pressure decay",
        "air --volume 500 L --duration 12 h --start 6.00 21.0 --end 5.91 18.5 --unit pressure=barg --unit temperature=degC",
        _decay_options,
        _decay_members,
        {
            "lost_mass": "mass",
            "leak_rate": "mass_flow",
            "lost_mass_expanded_uncertainty": "mass",
            "leak_rate_expanded_uncertainty": "mass_flow",
            "throughput_temperature": "temperature",
            "reference_volume_flow": "volume_flow",
            "duration_to_resolve": "duration",
        },
        is_state=False,
    ),
    _Job(
        "fraction-from-density",
        "the fraction of one gas in a blend of two, from a density",
        "hydrogen air --density 0.45 -p 4 bar -t 40 degC",
        _fraction_options,
        _fraction_members,
        {"molar_mass": "molar_mass"},
        takes_gas=False,
    ),
    _Job(
        "molar-mass",
        "the molar mass from a density, and the gases that it allows; never a proof of identity",
        "--mass 1.152 g --volume 1 L -p 101325 Pa -t 23 degC --like nitrogen",
        _mass_options,
        _mass_members,
        {"molar_mass": "molar_mass", "molar_mass_ideal": "molar_mass", "molar_mass_expanded_uncertainty": "molar_mass"},
        takes_gas=False,
    ),
    _Job(
        "comparison",
        "one state by every equation that can serve the gas",
        "carbon dioxide -p 50 bar -t 40 degC",
        _no_options,
        _no_members,
        {},
    ),
    _Job(
        "phase-boundary",
        "where a gas begins to condense",
        "methane=0.85 ethane=0.08 n-butane=0.07 --unit pressure=bar --unit temperature=degC",
        _no_options,
        _no_members,
        {},
        is_state=False,
    ),
    _Job(
        "lookup-table",
        "a small table for a controller",
        "nitrogen -p 1 60 bar -t -20 80 degC --tolerance 0.001 --format st > nitrogen.st",
        _table_options,
        _table_members,
        {},
        is_state=False,
    ),
)


def _block(job: _Job, answer: Members) -> str:
    """Return an answer as lines for a person."""
    units, model, phase, quality = answer["units"], answer["model"], answer["phase"], answer["quality"]
    rows: list[tuple[str, str]] = []
    if answer["gas"] is not None:
        gas = answer["gas"]
        name = gas["id"] or ", ".join(f"{id} {x:.6g}" for id, x in gas["fractions"].items())
        rows.append(("gas", f"{name} ({gas['molar_mass']:.7g} {units['molar_mass']})"))
    for member, value in answer["result"].items():
        rows += _result_rows(member, value, units.get(job.quantities.get(member, ""), ""), units)
    rows += [
        ("phase", phase["region"]),
        ("equation", f"{model['name']} ({model['id']}): {model['selected_because']}"),
        ("source", model["source"]),
        ("quality", " ".join([quality["level"], *([f"({', '.join(quality['reasons'])})"] if quality["reasons"] else [])])),
        *(("warning", warning["message"]) for warning in phase["warnings"]),
        *(("caution", caution) for caution in answer["cautions"]),
    ]
    width = max(len(label) for label, _ in rows)
    return "\n".join(f"{label:<{width}}  {text}" for label, text in rows)


def _result_rows(member: str, value: Any, unit: str, units: Mapping[str, str]) -> Iterator[tuple[str, str]]:
    label = member.replace("_", " ")
    if isinstance(value, list) and value and isinstance(value[0], dict):
        for item in value:
            toxic = ", TOXIC" if item.get("toxic") else ""
            difference = item["relative_difference"]
            by = "" if difference is None else f", {100.0 * difference:+.3g} %"
            yield label, f"{item['id']}: {_value(item['density'], units['density'])}{by}{toxic}"
    elif isinstance(value, dict):
        for name, inner in value.items():
            if isinstance(inner, dict):
                parts = (f"{part} {_value(number, units[part])}" for part, number in inner.items())
                yield name.replace("_", " "), ", ".join(parts)
            else:
                yield from _result_rows(f"{member}_{name}", inner, "", units)
    elif isinstance(value, list) and value and isinstance(value[0], list):
        for row in value:
            yield label, "  ".join(f"{x:.8g}" for x in row)
    elif isinstance(value, list):
        yield label, "  ".join(f"{x:.8g}" for x in value) or "none"
    elif isinstance(value, bool):
        yield label, "yes" if value else "no"
    elif isinstance(value, str):
        yield label, value
    else:
        yield label, _value(value, unit)


def _value(number: float | None, unit: str) -> str:
    return "none" if number is None else f"{number:.10g} {unit}".rstrip()
