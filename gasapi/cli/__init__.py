"""The command ``gasapi``: serve, or answer one question without a server.

Each subcommand is a module with ``add_parser``; what it needs is imported when it runs, so that the server's settings are
in place before anything heavy is loaded.
"""

from __future__ import annotations

import argparse
from collections.abc import Sequence

from gasapi import __version__
from gasapi.cli import jobs, openapi, series, serve, state, token, verify

__all__ = ["main"]


def main(arguments: Sequence[str] | None = None) -> int:
    """Run the command and return its exit code.

    :param arguments: those of the process by default
    """
    parser = argparse.ArgumentParser(
        prog="gasapi", description="Density, compressibility factor and molar volume of real gases, as a service or at once."
    )
    parser.add_argument("--version", action="version", version=__version__)
    commands = parser.add_subparsers(dest="command", metavar="COMMAND", required=True)
    for module in (serve, state, series, jobs, openapi, token, verify):
        module.add_parser(commands)
    options = parser.parse_args(arguments)
    code: int = options.run(options)
    return code
