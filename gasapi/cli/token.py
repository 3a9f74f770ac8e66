"""``gasapi token``: make a token, and the line of the token file that lets it in."""

from __future__ import annotations

import argparse
from datetime import UTC, datetime, timedelta
from typing import Any

__all__ = ["add_parser"]

_DAYS = 365


def add_parser(commands: Any) -> None:
    """Add the subcommand."""
    parser: argparse.ArgumentParser = commands.add_parser(
        "token",
        help="make a token and the line that lets it in",
        description="Print a new token for its holder, and the line to add to the file that GASAPI_TOKEN_FILE names.",
    )
    parser.add_argument("name", help="whose token it is: one word")
    parser.add_argument("--days", type=int, default=_DAYS, help=f"for how many days it is good (default {_DAYS})")
    parser.set_defaults(run=_run)


def _run(options: argparse.Namespace) -> int:
    from gasapi.web.tokens import new_token

    last_day = datetime.now(UTC).date() + timedelta(days=options.days)
    token, line = new_token(options.name, last_day)
    print(f"token (is shown once): {token}")
    print(f"line of the token file: {line}")
    return 0
