"""Settings: each an environment variable with a default that works, each in the README."""

from __future__ import annotations

from pathlib import Path

import pytest
from conftest import ROOT
from pydantic import ValidationError

from service.settings import PREFIX, Settings, user_data_dir


def test_the_defaults_work() -> None:
    settings = Settings()
    assert (settings.host, settings.port) == ("127.0.0.1", 8000)
    assert settings.max_upload_bytes == 200 * 2**20
    assert settings.workers >= 1


@pytest.mark.parametrize("name", Settings.model_fields)
def test_every_setting_is_explained_in_the_readme(name: str) -> None:
    readme = (ROOT / "README.md").read_text()
    assert f"`{PREFIX}{name.upper()}`" in readme


@pytest.mark.parametrize("name", Settings.model_fields)
def test_every_setting_says_what_it_is(name: str) -> None:
    described = Settings.model_fields[name].description
    assert described
    assert described.endswith(".")


def test_the_environment_is_read_and_checked(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("GAINWRIGHT_MAX_UPLOAD_BYTES", "1000")
    assert Settings().max_upload_bytes == 1000
    monkeypatch.setenv("GAINWRIGHT_WORKERS", "0")
    with pytest.raises(ValidationError, match="workers"):
        Settings()


def test_data_go_where_the_system_keeps_them(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    # XDG Base Directory Specification 0.8
    monkeypatch.setattr("sys.platform", "linux")
    monkeypatch.setenv("XDG_DATA_HOME", str(tmp_path))
    assert user_data_dir() == tmp_path / "gainwright"
    monkeypatch.delenv("XDG_DATA_HOME")
    monkeypatch.setenv("HOME", str(tmp_path))
    assert user_data_dir() == tmp_path / ".local" / "share" / "gainwright"
