"""Ellipses: what the limits on abs(S) and abs(T) forbid at one frequency, and the answer when all is forbidden."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ident.errors import Refused

FILTER = 10.0  # Td/Tf


@dataclass(frozen=True, slots=True)
class Limits:
    """What a loop must keep: abs(S), abs(T) <= M and, where given, abs(C F S) <= noise; with Tf = Td/ratio.

    noise     command unit per speed unit: the most by which the command answers to noise of one frequency
    combined  one circle around both instead (Astrom and Hagglund 2004, J. Process Control 14, 635-650): stricter
    """

    M: float
    noise: float | None = None
    ratio: float = FILTER
    combined: bool = False

    @property
    def circles(self) -> tuple[tuple[float, float], ...]:
        """(c, r) of abs(L + c) >= r for abs(S) <= M and for abs(T) <= M."""
        M = self.M
        if self.combined:
            across = 2.0 * M * (M - 1.0)
            return (((2.0 * M * M - 2.0 * M + 1.0) / across, (2.0 * M - 1.0) / across),)
        return (1.0, 1.0 / M), (M * M / (M * M - 1.0), M / (M * M - 1.0))


def not_found(limits: Limits) -> Refused:
    """The refusal where no settings keep the limits."""
    noise = "" if limits.noise is None else f" and the command's answer to noise at or below {limits.noise:.4g}"
    return Refused(
        "no-settings-found",
        f"No settings that keep Ms and Mt at or below {limits.M:g}{noise} were found for this plant: "
        "try another target.",
    )


def largest_gain(inverse: NDArray[np.complex128], c: float, r: float) -> float:
    """The least Kp > 0 that some circle forbids without integral action."""
    half = (r * np.abs(inverse)) ** 2 - (c * inverse.imag) ** 2
    low = -c * inverse.real - np.sqrt(np.maximum(half, 0.0))
    return float(np.min(low, initial=np.inf, where=(half > 0) & (low > 0)))
