"""``gasapi openapi``: print the OpenAPI document that the service serves."""

from __future__ import annotations

import argparse
import sys
from importlib.resources import files
from typing import Any

__all__ = ["add_parser"]


def add_parser(commands: Any) -> None:
    """Add the subcommand."""
    parser: argparse.ArgumentParser = commands.add_parser("openapi", help="print the OpenAPI document of the service")
    parser.set_defaults(run=_run)


def _run(options: argparse.Namespace) -> int:
    sys.stdout.write(files("gasapi.web").joinpath("openapi.json").read_text(encoding="utf-8"))
    return 0
