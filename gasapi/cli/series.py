"""``gasapi series``: a CSV history answered row for row without a server, by the same path that a request takes."""

from __future__ import annotations

import argparse
import os
import shutil
import sys
import tempfile
import time
from pathlib import Path
from typing import IO, Any
from urllib.parse import urlencode

__all__ = ["add_parser"]

_EXIT_BAD_ROWS = 1
_EXIT_BAD_QUESTION = 2
_BAR = 24
_EVERY = 0.2  # s between two states of the progress bar

_EXAMPLES = """\
examples:
  gasapi series history.csv -o density.csv --gas nitrogen --keep tag
  gasapi series rig.csv -o density.csv --gas methane=0.92 nitrogen=0.08 --unit density=g/L
  gasapi series chromatograph.csv -o density.csv --fraction-unit %

columns: pressure [barg], temperature [degC], timestamps, input_status, fraction.<name> [%], units in brackets where wanted;
other columns are named by --keep, or all kept by --keep-all

exit code: 0 where every row has its number, 1 where some rows are bad, 2 where the question does not make sense
"""


def add_parser(commands: Any) -> None:
    """Add the subcommand."""
    parser: argparse.ArgumentParser = commands.add_parser(
        "series",
        help="answer a CSV history without a server",
        description="Density, compressibility factor and molar volume for every row of a CSV file with a header.",
        epilog=_EXAMPLES,
        formatter_class=argparse.RawDescriptionHelpFormatter,
    )
    parser.add_argument("input", help="the CSV file; - reads standard input")
    parser.add_argument("-o", "--output", default="-", help="where the answer goes (default: standard output)")
    parser.add_argument("--gas", nargs="+", help="name of a gas, or name=fraction for each component of a mixture")
    parser.add_argument("--basis", choices=("mole", "mass"), help="what the fractions are of (default mole)")
    parser.add_argument("--fraction-unit", choices=("1", "%", "ppm"), help="what the fractions are in (default 1)")
    parser.add_argument("--model", help="id of an equation of state (default auto); one serves all rows")
    parser.add_argument("--ambient-pressure", help="Pa, for gauge units")
    parser.add_argument("--pressure", help="a pressure for all rows, where no column has it")
    parser.add_argument("--temperature", help="a temperature for all rows, where no column has it")
    parser.add_argument("--input-status-kind", choices=("opc-ua", "opc-classic"), help="what input_status is (default opc-ua)")
    parser.add_argument("--dew-point-margin", help="K, where nearness to the dew point begins (default 5)")
    parser.add_argument("--accept-two-phase", action="store_true", help="give the density of two-phase mixtures, as uncertain")
    parser.add_argument("--accuracy", help="a relative error that allows a certified table, such as 1e-6")
    parser.add_argument("--unit", action="append", default=[], metavar="QUANTITY=UNIT", help="a unit; may be repeated")
    parser.add_argument("--keep", action="append", default=[], metavar="COLUMN", help="another column to keep; may be repeated")
    parser.add_argument("--keep-all", action="store_true", help="keep every other column")
    parser.add_argument("--quiet", action="store_true", help="show no progress")
    parser.set_defaults(run=_run)


def _run(options: argparse.Namespace) -> int:
    from gasapi.app import create_context
    from gasapi.errors import GasapiError
    from gasapi.settings import Settings
    from gasapi.web.problems import Problem

    try:
        context = create_context(Settings.from_environment())
        with _source(options.input) as body:
            return _answer(options, context, body)
    except Problem as problem:
        for line in [f"{fault.pointer.lstrip('/') or 'file'}: {fault.detail}" for fault in problem.faults] or [problem.detail]:
            print(f"gasapi series: {line}", file=sys.stderr)
        return _EXIT_BAD_QUESTION
    except (GasapiError, OSError) as error:
        print(f"gasapi series: {error}", file=sys.stderr)
        return _EXIT_BAD_QUESTION


def _answer(options: argparse.Namespace, context: Any, body: IO[bytes]) -> int:
    from gasapi.errors import GasapiError
    from gasapi.service.series import Series, Survey
    from gasapi.web.csv_body import CsvSeriesReader
    from gasapi.web.series_answers import csv_header, csv_lines
    from gasapi.web.series_questions import SeriesReader

    reader = CsvSeriesReader(SeriesReader(context.catalogue, context.ambient_pressure))
    asked = reader.of_body(body, _query(options, body))
    progress = _Progress(_size(body), sys.stderr if sys.stderr.isatty() and not options.quiet else None)
    survey = Survey(asked.terms.question)
    for block in asked.blocks():
        survey.add(block.columns)
        progress.show("reading", len(block.texts), body.tell())
    progress.start_again()
    try:
        series = Series(context, asked.terms.question, survey)
    except GasapiError as error:
        raise asked.terms.problem(error) from None
    with _Target(options.output) as target:
        target.write(csv_header(asked.header, asked.terms.units))
        for block in asked.blocks():
            rows = series.answer(block.columns)
            target.write(csv_lines(block.texts, rows, asked.terms.units, block.unreadable))
            progress.show("answering", len(block.texts), body.tell())
    progress.end()
    counts = dict(series.summary().counts)
    if not options.quiet:
        said = ", ".join(f"{count} {level}" for level, count in counts.items())
        print(f"{sum(counts.values())} rows: {said}; {series.summary().model.name}", file=sys.stderr)
    return _EXIT_BAD_ROWS if counts["bad"] else 0


def _query(options: argparse.Namespace, body: IO[bytes]) -> str:
    """Return the members of the question as a query would have them."""
    pairs: list[tuple[str, str]] = []
    if options.gas:
        if any("=" in word for word in options.gas):
            parts = [word.rpartition("=") for word in options.gas]
            pairs += [(f"fraction.{name or value}", value) for name, _, value in parts]
        else:
            pairs.append(("gas", " ".join(options.gas)))
    pairs += [(f"{quantity}_unit", unit) for quantity, _, unit in (text.partition("=") for text in options.unit)]
    for name in (
        "basis",
        "fraction_unit",
        "model",
        "ambient_pressure",
        "pressure",
        "temperature",
        "input_status_kind",
        "dew_point_margin",
        "accuracy",
    ):
        value = getattr(options, name)
        if value is not None:
            pairs.append((name, value))
    if options.accept_two_phase:
        pairs.append(("accept_two_phase", "true"))
    keep = [*options.keep, *(_other_columns(body) if options.keep_all else ())]
    return urlencode([*pairs, *(("keep", name) for name in dict.fromkeys(keep))])


def _other_columns(body: IO[bytes]) -> list[str]:
    from gasapi.web.csv_body import is_known_column
    from gasapi.web.csv_table import read_header

    header = read_header(body)
    body.seek(0)
    return [] if header is None else [name for name in header[1] if not is_known_column(name)]


def _source(name: str) -> IO[bytes]:
    if name != "-":
        return open(name, "rb")
    # the rows are read twice, which a pipe does not allow
    held = tempfile.TemporaryFile()  # noqa: SIM115
    shutil.copyfileobj(sys.stdin.buffer, held)
    held.seek(0)
    return held


def _size(body: IO[bytes]) -> int:
    return os.fstat(body.fileno()).st_size


class _Target:
    """Where the answer goes: a file appears under its name once it is complete."""

    def __init__(self, name: str) -> None:
        self._path = None if name == "-" else Path(name)
        self._part = None if self._path is None else self._path.with_name(self._path.name + ".part")

    def __enter__(self) -> IO[bytes]:
        self._file = sys.stdout.buffer if self._part is None else self._part.open("wb")
        return self._file

    def __exit__(self, kind: Any, value: Any, traceback: Any) -> None:
        if self._part is None or self._path is None:
            self._file.flush()
            return
        self._file.close()
        if kind is None:
            self._part.replace(self._path)
        else:
            self._part.unlink(missing_ok=True)


class _Progress:
    """A bar on a terminal: rows, rows a second, time left.

    :param size: bytes of the file
    :param stream: None where nothing is to be shown
    """

    def __init__(self, size: int, stream: IO[str] | None) -> None:
        self._size = max(1, size)
        self._stream = stream
        self.start_again()

    def start_again(self) -> None:
        """Begin the next pass through the file."""
        self._start = self._shown = time.monotonic()
        self._rows = 0

    def show(self, what: str, rows: int, place: int) -> None:
        """Count rows, and show the bar where it is due."""
        self._rows += rows
        now = time.monotonic()
        if self._stream is None or now - self._shown < _EVERY:
            return
        self._shown = now
        spent = now - self._start
        part = min(1.0, place / self._size)
        filled = round(_BAR * part)
        left = spent / part - spent if part > 0.0 else 0.0
        self._stream.write(
            f"\r{what:<9} [{'#' * filled}{'.' * (_BAR - filled)}] {self._rows:>10,} rows  "
            f"{self._rows / spent:>9,.0f} rows/s  {_clock(left)} left \x1b[K"
        )
        self._stream.flush()

    def end(self) -> None:
        """Take the bar away."""
        if self._stream is not None:
            self._stream.write("\r\x1b[K")
            self._stream.flush()


def _clock(seconds: float) -> str:
    whole = round(seconds)
    return f"{whole // 3600}:{whole // 60 % 60:02d}:{whole % 60:02d}" if whole >= 3600 else f"{whole // 60}:{whole % 60:02d}"
