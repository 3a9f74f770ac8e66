"""Settings from the environment."""

from __future__ import annotations

from pathlib import Path

import pytest

from gasapi.settings import Settings, SettingsError


def test_an_empty_environment_has_the_defaults():
    """Nothing set, and set to nothing, are the same: loopback, 32 MiB of JSON, 256 MiB of CSV."""
    names = ("GASAPI_HOST", "GASAPI_PORT", "GASAPI_TOKEN_FILE", "GASAPI_JSON_LIMIT", "PROMETHEUS_MULTIPROC_DIR")
    settings = Settings.from_environment({})
    assert Settings() == settings == Settings.from_environment(dict.fromkeys(names, ""))
    assert (settings.host, settings.json_limit, settings.csv_limit) == ("127.0.0.1", 32 * 2**20, 256 * 2**20)


def test_variables_are_read(tmp_path):
    """Each setting has its variable."""
    file = tmp_path / "file"
    file.touch()
    environment = {
        "GASAPI_HOST": "0.0.0.0",
        "PORT": "9000",
        "GASAPI_WORKERS": "3",
        "GASAPI_OPEN": "1",
        "GASAPI_REQUEST_LOG": "1",
        "GASAPI_TOKEN_FILE": str(file),
        "GASAPI_SITE_FILE": str(file),
        "GASAPI_JSON_LIMIT": "1000",
        "GASAPI_CSV_LIMIT": "2000",
        "GASAPI_MEMO_ENTRIES": "5",
        "GASAPI_MEMO_BYTES": "0",
        "PROMETHEUS_MULTIPROC_DIR": "/metrics",
    }
    assert Settings.from_environment(environment) == Settings(
        host="0.0.0.0",
        port=9000,
        workers=3,
        open_access=True,
        request_log=True,
        token_file=file,
        site_file=file,
        metrics_folder=Path("/metrics"),
        json_limit=1000,
        csv_limit=2000,
        memo_entries=5,
        memo_bytes=0,
    )
    assert Settings.from_environment({"PORT": "9000", "GASAPI_PORT": "9001"}).port == 9001


@pytest.mark.parametrize(
    ("name", "value"),
    [
        ("GASAPI_PORT", "http"),
        ("GASAPI_JSON_LIMIT", "-1"),
        ("GASAPI_JSON_LIMIT", "32MiB"),
        ("GASAPI_MEMO_ENTRIES", "1.5"),
        ("GASAPI_WORKERS", "\u0663"),
        ("GASAPI_OPEN", "yes"),
        ("GASAPI_TOKEN_FILE", "/no/such/file"),
    ],
)
def test_a_setting_that_cannot_be_used_is_named(name, value):
    """The words name the variable and what it held."""
    with pytest.raises(SettingsError) as caught:
        Settings.from_environment({name: value})
    assert (caught.value.setting, caught.value.value) == (name, value)
    assert name in str(caught.value)
