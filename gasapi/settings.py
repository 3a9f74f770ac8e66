"""The settings of a running service, and the only place that reads the environment."""

from __future__ import annotations

import os
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path

from gasapi.errors import GasapiError

__all__ = ["Settings", "SettingsError"]

_MEBIBYTE = 1024 * 1024


class SettingsError(GasapiError):
    """A setting cannot be used as it stands."""

    def __init__(self, setting: str, value: str, why: str) -> None:
        self.setting = setting
        self.value = value
        self.why = why
        super().__init__(f"{setting}={value}: {why}")


@dataclass(frozen=True)
class Settings:
    """What can be set; ``json_limit`` is read from ``GASAPI_JSON_LIMIT``, and so on.

    ``host``, ``port`` (also ``PORT``) and ``workers`` are where and how ``gasapi serve`` runs unless its options say
    otherwise, ``open_access`` (``GASAPI_OPEN=1``) lets it answer other machines without tokens, ``request_log`` (``1``)
    writes a line for each request. ``token_file`` holds the bearer tokens, one a line; without it no token is asked for.
    ``site_file`` is the TOML file of the site's own gases and ambient pressure. ``json_limit`` and ``csv_limit`` are the
    largest bodies in bytes, ``memo_entries`` and ``memo_bytes`` bound the memo of answers of each worker (0 turns it off).
    ``metrics_folder`` is where workers share their counters (``PROMETHEUS_MULTIPROC_DIR``, as the Prometheus client has it).
    """

    host: str = "127.0.0.1"
    port: int = 8080
    workers: int = 0
    open_access: bool = False
    request_log: bool = False
    token_file: Path | None = None
    site_file: Path | None = None
    metrics_folder: Path | None = None
    json_limit: int = 32 * _MEBIBYTE
    csv_limit: int = 256 * _MEBIBYTE
    memo_entries: int = 8192
    memo_bytes: int = 16 * _MEBIBYTE

    @classmethod
    def from_environment(cls, environment: Mapping[str, str] | None = None) -> Settings:
        """Return the settings of an environment, that of the process by default; empty variables count as not set.

        :raises SettingsError: a number that is none, or a file that cannot be read
        """
        env = os.environ if environment is None else environment
        return cls(
            host=env.get("GASAPI_HOST") or cls.host,
            port=_count(env, "GASAPI_PORT", _count(env, "PORT", cls.port)),
            workers=_count(env, "GASAPI_WORKERS", cls.workers),
            open_access=_flag(env, "GASAPI_OPEN"),
            request_log=_flag(env, "GASAPI_REQUEST_LOG"),
            token_file=_file(env, "GASAPI_TOKEN_FILE"),
            site_file=_file(env, "GASAPI_SITE_FILE"),
            metrics_folder=Path(env["PROMETHEUS_MULTIPROC_DIR"]) if env.get("PROMETHEUS_MULTIPROC_DIR") else None,
            json_limit=_count(env, "GASAPI_JSON_LIMIT", cls.json_limit),
            csv_limit=_count(env, "GASAPI_CSV_LIMIT", cls.csv_limit),
            memo_entries=_count(env, "GASAPI_MEMO_ENTRIES", cls.memo_entries),
            memo_bytes=_count(env, "GASAPI_MEMO_BYTES", cls.memo_bytes),
        )


def _file(env: Mapping[str, str], name: str) -> Path | None:
    value = env.get(name)
    if not value:
        return None
    path = Path(value)
    if not path.is_file():
        raise SettingsError(name, value, "there is no such file")
    return path


def _flag(env: Mapping[str, str], name: str) -> bool:
    value = env.get(name) or "0"
    if value not in ("0", "1"):
        raise SettingsError(name, value[:80], "give 1 or 0")
    return value == "1"


def _count(env: Mapping[str, str], name: str, default: int) -> int:
    value = env.get(name)
    if not value:
        return default
    if not (value.isascii() and value.isdigit()):
        raise SettingsError(name, value[:80], "give a whole number of 0 or more")
    return int(value)
