"""The papers of deployment against what they speak of; ``docker/check.sh`` builds and runs them."""

from __future__ import annotations

import re
import tomllib
from pathlib import Path

import pytest

from gasapi import __version__

ROOT = Path(__file__).resolve().parents[1]
DOCKER = ROOT / "docker"


def pinned(name: str) -> dict[str, tuple[str, str]]:
    """Return version and hashes of every package that a file pins."""
    text = re.sub(r"\\\n\s*", " ", (DOCKER / name).read_text(encoding="utf-8"))
    lines = [line.split(" ", 1) for line in text.splitlines() if line and not line.startswith("#")]
    return {pin.partition("==")[0].replace("_", "-"): (pin.partition("==")[2], rest) for pin, rest in lines}


def number(text: str) -> tuple[int, ...]:
    return tuple(int(part) for part in re.findall(r"\d+", text)[:3])


def test_every_dependency_is_pinned_by_hash():
    """The image has all that the project asks for, at least in the version that it asks for, and by hash alone."""
    asked = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))
    pins = pinned("requirements.txt")
    for requirement in asked["project"]["dependencies"]:
        name, least = requirement.split(">=")
        assert number(pins[name][0]) >= number(least), requirement
    for requirement in asked["build-system"]["requires"]:
        name, least = requirement.split(">=")
        assert number(pinned("requirements-build.txt")[name][0]) >= number(least), requirement
    for name, (_, rest) in {**pins, **pinned("requirements-build.txt")}.items():
        assert re.fullmatch(r"(--hash=sha256:[0-9a-f]{64} *)+", rest.strip()), name


def test_image_installs_wheels_by_hash_and_runs_as_a_number():
    """What the linter does not look for: the base by argument, no front end to fetch, hashes, a numeric user, exec form."""
    text = (DOCKER / "Dockerfile").read_text(encoding="utf-8")
    lines = text.splitlines()
    assert lines[0].startswith("ARG BASE_IMAGE=python:")
    assert {"FROM ${BASE_IMAGE}"} == {line.partition(" AS ")[0] for line in lines if line.startswith("FROM")}
    for install in re.findall(r"pip\S* (?:--python \S+ )?install [^\n]*", text):
        assert "--require-hashes" in install or "--no-index" in install
        assert "--no-cache-dir" in install
    assert re.search(r"^USER \d+:\d+$", text, re.MULTILINE)
    assert re.search(r"^HEALTHCHECK .*\\\n +CMD \[\"", text, re.MULTILINE)
    assert 'CMD ["gasapi", "serve"]' == lines[-1]


@pytest.mark.parametrize("name", ["Dockerfile", "compose.yaml"])
def test_version_and_base_agree(name):
    """One base image is named, the same everywhere; the tag of the image is the version of the program."""
    text = (DOCKER / name).read_text(encoding="utf-8")
    assert {"python:3.13-slim-trixie"} == set(re.findall(r"python:[\w.-]+", text))
    assert set(re.findall(r"gasapi:(\d[\w.]*)", text)) <= {__version__}


def test_every_setting_is_told():
    """The table of settings names each variable that the program reads, and no other."""
    read = set(re.findall(r'"(GASAPI_[A-Z_]+)"', (ROOT / "gasapi" / "settings.py").read_text(encoding="utf-8")))
    told = set(re.findall(r"`(GASAPI_[A-Z_]+)", (DOCKER / "README.md").read_text(encoding="utf-8")))
    assert read == told
