"""Resonance: lightly damped poles of a high-order model at the log's own rate, and how high they stand."""

from __future__ import annotations

from typing import Any

import numpy as np

from ident.findings import Finding
from ident.judge.high_order import HighOrder

LIGHT = 0.1  # damping ratio below which a peak is narrow
ABOVE = 2.0  # times the fitted model's response at the same frequency
CLEAR = 5.0  # standard deviations above it
RESOLVED = 0.8  # of pi/h: above it, sampling itself makes peaks
HIGH = 0.03  # of the static gain: a lower peak moves no loop


def resonance(seen: HighOrder, model: Any) -> Finding | None:
    """The highest narrow peak that the fitted model does not have, or None."""
    z = seen.poles
    z = z[(z.imag > 0.0) & (np.abs(z) < 1.0) & (np.abs(z) > 0.0)]
    rate = -np.log(z) / seen.step  # -s of the pole, 1/s
    w = np.abs(np.angle(z)) / seen.step
    damping = rate.real / np.abs(rate)
    narrow = (damping < LIGHT) & (w < RESOLVED * np.pi / seen.step)
    w, damping = w[narrow], damping[narrow]
    if not len(w):
        return None
    height, std = seen.gain_at(w)
    expected = np.abs(model.frequency_response(w))
    K = abs(model.static_gain)
    clear = (height > ABOVE * expected) & (height - expected > CLEAR * std) & (height > HIGH * K)
    if not clear.any():
        return None
    i = int(np.argmax(np.where(clear, height, 0.0)))
    hertz = float(w[i] / (2.0 * np.pi))
    return Finding(
        "resonance-suspected",
        "warning",
        f"The log shows a narrow peak near {hertz:.3g} Hz, {height[i] / expected[i]:.2g} times what the fitted model "
        "has there: a shaft, belt or mounting may swing. A loop tuned without it can start to sing; keep the command "
        "free of that frequency (a filter, or slower settings) or repeat the test with a log taken faster.",
        {
            "frequency_rad_s": float(w[i]),
            "frequency_Hz": hertz,
            "damping_ratio": float(damping[i]),
            "height_over_static_gain": float(height[i] / K),
            "height_over_model": float(height[i] / expected[i]),
            "height_std_over_static_gain": float(std[i] / K),
        },
    )
