"""Shared fixtures: the published values and measured logs beside the checkout, where they are."""

from __future__ import annotations

import os
from pathlib import Path

import pytest

SHARED = Path(__file__).resolve().parents[2] / "shared"


@pytest.fixture(scope="session")
def shared() -> Path:
    """The folder ../shared; a user's machine has none, so the test is skipped there. CI must have it."""
    if not SHARED.is_dir():
        if os.environ.get("CI") == "true":
            pytest.fail("CI needs ../shared beside the checkout")
        pytest.skip("no ../shared beside this checkout: checks against its published values are left out")
    return SHARED
