"""The version of the installed distribution."""

from __future__ import annotations

from importlib import metadata


def version() -> str:
    return metadata.version("gainwright")
