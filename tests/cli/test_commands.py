"""The other commands, and what they need when they start."""

from __future__ import annotations

import json
import subprocess
import sys
from datetime import UTC, datetime, timedelta

import pytest

from gasapi import __version__
from gasapi.cli import main
from gasapi.cli.serve import is_loopback
from gasapi.web.tokens import TokenList


def test_version(capsys):
    """--version prints the version of the package."""
    with pytest.raises(SystemExit) as ended:
        main(["--version"])
    assert ended.value.code == 0
    assert capsys.readouterr().out == f"{__version__}\n"


@pytest.mark.parametrize("arguments", [[], ["no-such-command"], ["serve", "--port", "x"], ["state", "--no-such-option"]])
def test_a_wrong_command_line_is_refused(arguments, capsys):
    """The usage is printed and the code is 2."""
    with pytest.raises(SystemExit) as ended:
        main(arguments)
    assert ended.value.code == 2
    assert "usage: gasapi" in capsys.readouterr().err


def test_openapi_prints_the_document(capsys):
    """The document that the service serves is printed."""
    assert main(["openapi"]) == 0
    assert json.loads(capsys.readouterr().out)["info"]["version"] == __version__


def test_token_makes_a_line_that_lets_it_in(capsys, tmp_path):
    """What is printed as token is good by what is printed as line, for so many days."""
    assert main(["token", "historian", "--days", "30"]) == 0
    lines = capsys.readouterr().out.splitlines()
    token, line = lines[0].rpartition(" ")[2], lines[1].partition(": ")[2]
    path = tmp_path / "tokens"
    path.write_text(line + "\n")
    known = TokenList.from_file(path)
    today = datetime.now(UTC).date()
    assert known.holder(f"Bearer {token}", today + timedelta(days=29)) == "historian"
    assert known.holder(f"Bearer {token}", today + timedelta(days=31)) is None


@pytest.mark.parametrize(
    ("host", "expected"),
    [
        ("127.0.0.1", True),
        ("127.8.9.10", True),
        ("::1", True),
        ("localhost", True),
        ("0.0.0.0", False),
        ("::", False),
        ("10.0.0.1", False),
        ("gas.example", False),
        ("", False),
    ],
)
def test_loopback(host, expected):
    """Only what this machine alone can reach is loopback (RFC 1122, section 3.2.1.3; RFC 4291, section 2.5.3)."""
    assert expected == is_loopback(host)


def test_the_command_starts_without_the_heavy_libraries():
    """The process that starts the workers sets their threads before the numeric library is loaded, so it must not load it."""
    code = "import sys, gasapi.cli; sys.exit(bool({'numpy', 'scipy', 'flask', 'marshmallow'} & sys.modules.keys()))"
    assert subprocess.run([sys.executable, "-c", code], timeout=30).returncode == 0
