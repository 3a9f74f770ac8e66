"""The settings of a running service, and the only place that reads the environment."""

from __future__ import annotations

import os
import re
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path

from gasapi.errors import GasapiError

__all__ = ["Settings", "SettingsError"]

_MEBIBYTE = 1024 * 1024
_NUMBER = re.compile(r"[0-9]{1,9}(\.[0-9]{1,9})?")
_ORIGIN = re.compile(r"https?://[a-z0-9.\-]+(:[0-9]{1,5})?|https?://\[[0-9a-f:.]+\](:[0-9]{1,5})?")


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

    Of large questions (series, many states, tables) each worker works on ``large_active`` at a time and keeps ``large_waiting``
    in line, with ``large_bytes`` of bodies in all, each for at most ``deadline`` s. ``rate_limit`` is how many requests a
    second one caller may send in the long run (0: any number) and ``rate_burst`` how many at once (0: twice that); a caller
    is the holder of a token or an address, behind ``proxies`` proxies of one's own. ``origins`` are those whose pages may ask
    (separated by commas). ``max_age`` is for how many seconds caches may keep an answer. ``log_questions`` (``1``) adds the
    question to the line of each request, ``audit_file`` is where questions and answers are recorded as hashes.
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
    large_active: int = 2
    large_waiting: int = 64
    large_bytes: int = 192 * _MEBIBYTE
    deadline: float = 60.0
    rate_limit: float = 0.0
    rate_burst: float = 0.0
    proxies: int = 0
    origins: tuple[str, ...] = ()
    max_age: int = 60
    log_questions: bool = False
    audit_file: Path | None = None

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
            large_active=_count(env, "GASAPI_LARGE_ACTIVE", cls.large_active, least=1),
            large_waiting=_count(env, "GASAPI_LARGE_WAITING", cls.large_waiting),
            large_bytes=_count(env, "GASAPI_LARGE_BYTES", cls.large_bytes),
            deadline=_number(env, "GASAPI_DEADLINE", cls.deadline),
            rate_limit=_number(env, "GASAPI_RATE_LIMIT", cls.rate_limit),
            rate_burst=_number(env, "GASAPI_RATE_BURST", cls.rate_burst),
            proxies=_count(env, "GASAPI_PROXIES", cls.proxies),
            origins=_origins(env, "GASAPI_ORIGINS"),
            max_age=_count(env, "GASAPI_MAX_AGE", cls.max_age),
            log_questions=_flag(env, "GASAPI_LOG_QUESTIONS"),
            audit_file=Path(env["GASAPI_AUDIT_FILE"]) if env.get("GASAPI_AUDIT_FILE") else None,
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


def _count(env: Mapping[str, str], name: str, default: int, least: int = 0) -> int:
    value = env.get(name)
    if not value:
        return default
    if not (value.isascii() and value.isdigit() and len(value) < 16 and int(value) >= least):
        raise SettingsError(name, value[:80], f"give a whole number of {least} or more")
    return int(value)


def _number(env: Mapping[str, str], name: str, default: float) -> float:
    value = env.get(name)
    if not value:
        return default
    if not _NUMBER.fullmatch(value):
        raise SettingsError(name, value[:80], "give a number of 0 or more, such as 30 or 0.5")
    return float(value)


def _origins(env: Mapping[str, str], name: str) -> tuple[str, ...]:
    found = tuple(origin.strip() for origin in (env.get(name) or "").split(",") if origin.strip())
    for origin in found:
        if not _ORIGIN.fullmatch(origin):
            raise SettingsError(
                name, origin[:80], "give scheme and host as a browser sends them, as in https://hmi.example:8443"
            )
    return found
