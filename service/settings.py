"""Settings of the service: environment variables GAINWRIGHT_..., each with a default that works."""

from __future__ import annotations

import os
import sys
from pathlib import Path
from typing import Literal

from pydantic import Field
from pydantic_settings import BaseSettings, SettingsConfigDict

PREFIX = "GAINWRIGHT_"


def user_data_dir() -> Path:
    """The per-user folder for data, by the custom of the system at hand."""
    if sys.platform == "win32":
        return Path(os.environ.get("LOCALAPPDATA") or Path.home() / "AppData" / "Local") / "gainwright"
    if sys.platform == "darwin":
        return Path.home() / "Library" / "Application Support" / "gainwright"
    return Path(os.environ.get("XDG_DATA_HOME") or Path.home() / ".local" / "share") / "gainwright"


def one_per_core() -> int:
    return min(os.cpu_count() or 1, 4)


class Settings(BaseSettings):
    """Read once, by `create_app` or the command, never at import."""

    model_config = SettingsConfigDict(env_prefix=PREFIX, frozen=True, extra="ignore")

    host: str = Field(default="127.0.0.1", min_length=1, description="Address to listen on.")
    port: int = Field(default=8000, ge=0, le=65535, description="Port to listen on; 0 takes a free one.")
    data_dir: Path = Field(default_factory=user_data_dir, description="Folder for what the service keeps.")
    database_url: str | None = Field(
        default=None,
        min_length=1,
        description="Database of what is kept, such as postgresql://user@host/name (with the extra `postgres`); "
        "unset: an SQLite file in the data folder.",
    )
    max_upload_bytes: int = Field(
        default=200 * 2**20, gt=0, description="Largest log accepted, in bytes, both as sent and unpacked."
    )
    upload_time_limit_s: float = Field(
        default=300.0, gt=0, allow_inf_nan=False, description="Longest time one upload may take, in seconds."
    )
    workers: int = Field(
        default_factory=one_per_core, ge=1, le=64, description="Processes that analyse logs, one log each."
    )
    max_waiting: int = Field(
        default=16,
        ge=0,
        description="Logs that may wait for a free process; beyond them the answer is 503, busy.",
    )
    time_limit_s: float = Field(
        default=120.0,
        gt=0,
        allow_inf_nan=False,
        description="Longest time one analysis may take, in seconds.",
    )
    log_level: Literal["debug", "info", "warning", "error"] = Field(
        default="warning", description="Least severe message that is logged to standard error."
    )
