"""Nights of one loop as CSV logs: a plant under PI with ordinary setpoint moves, simulated outside the package."""

from __future__ import annotations

from datetime import UTC, datetime, timedelta

import numpy as np

from tests.reference.nightly import H, Loop, closed_loop, setpoints

FIRST = datetime(2026, 11, 2, 2, 0, tzinfo=UTC)
ROWS = 1200
INSTALLED = {"Kp": Loop.Kp, "Ti": Loop.Ti}


def nights(count: int, *, gain: dict[int, float] | None = None, seed: int = 1, dated: bool = True) -> list[bytes]:
    """Logs of nights 0, 1, ...; `gain` scales the plant's gain from a night on."""
    rng = np.random.default_rng(seed)
    scale = np.ones(count)
    for night, factor in (gain or {}).items():
        scale[night:] = factor
    r = setpoints(rng, ROWS, count, (40.0, 120.0), (10.0, 25.0))
    u, y = closed_loop(Loop(), r, rng, scale)
    return [_csv(n, r[:, n], u[:, n], y[:, n], dated) for n in range(count)]


def still(night: int) -> bytes:
    """A night on which nothing was asked of the loop: noise alone."""
    rng = np.random.default_rng(night)
    return _csv(night, np.full(ROWS, 600.0), np.full(ROWS, 41.1), 600.0 + 2.0 * rng.standard_normal(ROWS), True)


def _csv(night: int, r: np.ndarray, u: np.ndarray, y: np.ndarray, dated: bool) -> bytes:
    start = FIRST + timedelta(days=night)
    stamps = (
        [(start + timedelta(seconds=H * k)).isoformat(timespec="milliseconds") for k in range(ROWS)]
        if dated
        else [f"{H * k:.1f}" for k in range(ROWS)]
    )
    rows = [f"{t},{a:.1f},{b:.4f},{c:.2f}" for t, a, b, c in zip(stamps, r, u, y, strict=True)]
    head = "time" if dated else "time [s]"
    return "\n".join([f"{head},setpoint [rpm],command [%],speed [rpm]", *rows, ""]).encode()
