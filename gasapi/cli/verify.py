"""``gasapi verify``: repeat the published check values on this machine and print a report that can be signed off."""

from __future__ import annotations

import argparse
import json
import os
import platform
import sys
from datetime import UTC, datetime
from pathlib import Path
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from gasapi.verification.checks import Check, Group

__all__ = ["add_parser"]

_PASSED, _FAILED = 0, 1


def add_parser(commands: Any) -> None:
    """Add the subcommand."""
    parser: argparse.ArgumentParser = commands.add_parser(
        "verify",
        help="repeat published check values on this machine",
        description="Repeat the check values that come with the program and print a report. Exit code 1 where one fails.",
    )
    parser.add_argument("--all", action="store_true", help="list every value, not only those that failed")
    parser.add_argument("--json", action="store_true", help="print the report as JSON, every value in it")
    parser.add_argument("--output", type=Path, help="write the report to a file as well")
    parser.set_defaults(run=_run)


def _run(options: argparse.Namespace) -> int:
    from gasapi.app import create_context
    from gasapi.settings import Settings
    from gasapi.verification.checks import run_checks

    # the program as installed, without the site's own gases: what is verified does not depend on them
    context = create_context(Settings())
    groups = list(run_checks(context))
    identity = _identity(context.data)
    report = _json(identity, groups) if options.json else _text(identity, groups, options.all)
    sys.stdout.write(report)
    if options.output is not None:
        options.output.write_text(report, encoding="utf-8")
    return _PASSED if all(check.passed for group in groups for check in group.checks) else _FAILED


def _identity(data: str) -> dict[str, str]:
    """Return what was verified, and where."""
    import numpy
    import scipy

    import gasapi
    from gasapi import __version__

    return {
        "program": f"gasapi {__version__}",
        "data and engine": data,
        "installed in": os.path.dirname(gasapi.__file__),
        "Python": f"{platform.python_implementation()} {platform.python_version()}",
        "NumPy, SciPy": f"{numpy.__version__}, {scipy.__version__}",
        "machine": f"{platform.node()}, {platform.machine()}, {platform.system()} {platform.release()}",
        "carried out": datetime.now(UTC).isoformat(timespec="seconds"),
    }


def _text(identity: dict[str, str], groups: list[Group], every: bool) -> str:
    checks = [check for group in groups for check in group.checks]
    failed = [check for check in checks if not check.passed]
    lines = ["Verification of an installed program against published check values", ""]
    lines += [f"{name:<18}{value}" for name, value in identity.items()]
    for group in groups:
        passed = sum(check.passed for check in group.checks)
        worst = max((check.difference for check in group.checks), default=0.0)
        lines += ["", group.title, f"  source             {group.source}"]
        lines += [f"  passed             {passed} of {len(group.checks)}", f"  largest difference {worst:.2e} (relative)"]
        lines += [_line(check) for check in group.checks if every or not check.passed]
    verdict = "PASSED" if not failed else "FAILED"
    lines += ["", f"{verdict}: {len(checks) - len(failed)} of {len(checks)} values", ""]
    lines += ["The check values speak for the equations; whether the service fits its use is for its user to judge.", ""]
    lines += [f"{name:<18}{'_' * 40}" for name in ("carried out by", "date", "signature", "reviewed by", "date", "signature")]
    return "\n".join(lines) + "\n"


def _line(check: Check) -> str:
    mark = "passed" if check.passed else "FAILED"
    found = "no number" if check.found is None else repr(check.found)
    return (
        f"  {mark}  {check.subject}: {check.quantity} {check.expected!r} expected, {found} found, "
        f"difference {check.difference:.2e}, allowed {check.allowed:.2e}"
    )


def _json(identity: dict[str, str], groups: list[Group]) -> str:
    report = {
        "identity": identity,
        "passed": all(check.passed for group in groups for check in group.checks),
        "groups": [
            {
                "id": group.id,
                "title": group.title,
                "source": group.source,
                "checks": [{**check._asdict(), "passed": check.passed} for check in group.checks],
            }
            for group in groups
        ],
    }
    return json.dumps(report, indent=1) + "\n"
