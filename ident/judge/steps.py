"""Steps: the step response of any model at the rows of a log, for as long as it takes to settle."""

from __future__ import annotations

from typing import Any

import numpy as np
from scipy import fft

from ident.plants.arx import Arx
from ident.record.segments import Floats

SETTLED = 0.02  # of the static gain
POINTS = 2**13  # of a period
FIRST, LONGER, TRIES = 8.0, 4.0, 8  # first half-period over the average residence time, and how it grows


def settling_step(model: Any, h: float, most: int) -> Floats:
    """Response of a model to a unit step at rows 0, h, 2 h, ... until within 2 % of the static gain for good.

    model  an Arx with sample time h, or anything stable with frequency_response(w) and static_gain
    most   rows at most
    """
    response = model.simulate(np.ones(most)) if isinstance(model, Arx) else _by_fourier(model, h, most)
    away = np.flatnonzero(np.abs(response - model.static_gain) > SETTLED * abs(model.static_gain))
    return response[: min(int(away[-1]) + 2 if len(away) else 2, most)]


def _by_fourier(model: Any, h: float, most: int) -> Floats:
    """From the answer to a square wave slow enough to settle in each half: its series has the response as factors."""
    K, slow = model.static_gain, 1e-6 / h
    residence = -float((model.frequency_response(np.array([slow]))[0] / K).imag) / slow
    half = FIRST * (abs(residence) + h) / LONGER
    for _ in range(TRIES):
        half *= LONGER
        harmonics = np.arange(1, POINTS // 2, 2)
        spectrum = np.zeros(POINTS // 2 + 1, dtype=np.complex128)
        spectrum[harmonics] = -2j / (np.pi * harmonics) * model.frequency_response(np.pi / half * harmonics)
        wave = fft.irfft(spectrum, POINTS) * POINTS / 2.0 + K / 2.0
        rising = wave[: POINTS // 2]
        if float(np.abs(rising[3 * POINTS // 8 :] - K).max()) <= SETTLED / 10 * abs(K):
            break
    times = h * np.arange(most)
    return np.asarray(np.interp(times, half / (POINTS // 2) * np.arange(POINTS // 2), rising, right=K))
