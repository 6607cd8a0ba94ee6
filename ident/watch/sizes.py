"""Practical sizes: how far a parameter must move before anybody should be called.

A PI of the largest integral gain for Ms = 1.6 comes to 1.66 ... 1.69 when K is 10 % up, over L/T from 0.1 to 3. That
is the least change worth a walk to the machine. T 15 % off comes to at most 1.68, so it may move further; K/T as far as
T. L 20 % up comes to 1.8: by margin alone it should be held tighter, but nights seldom know it better, and a size
no night can see would only make nights say nothing. Where L is small against T, it is known to a share of T at best: so
the size is 5 % of T + L where that is more. (Figures: `tests/ident/test_drift_margin.py`.)

Two healthy nights do not agree for ever: oil warms, loads differ. `REPEATS` of the practical size is taken as one
standard deviation of what a night differs from the next, on top of the fits' own errors, whatever the baseline shows:
a fit of a million rows must not make a hair's breadth significant.

A fit whose residual still answers to the command says itself that the plant is another, and its parameters then
depend on the moves of the night by more than its covariance. How much, only several nights can tell. `MISFIT` of the
practical size is assumed of one baseline night, with a variance that falls as 1/n: the scatter that n nights show takes
over. (All three are engineering judgement, tried on simulated nights; no source.)
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ident.errors import Refused
from ident.record.segments import Floats
from ident.watch.coordinates import readings, slopes

REPEATS = (0.1, 0.1, 0.1)  # of K, T, L
MISFIT = (0.15, 0.5, 0.5)
T_KNOWN = 0.25  # std of T over T; beyond, T says nothing about what is large for L


@dataclass(frozen=True, slots=True)
class PracticalSize:
    """Least changes that count, as fractions of the baseline's values.

    K, T, K_per_T   of the parameter itself
    L               of L;  L_of_sum  of T + L: the larger of the two counts, the first alone where T is not known
    Raises Refused practical-out-of-range.
    """

    K: float = 0.10
    T: float = 0.15
    K_per_T: float = 0.15
    L: float = 0.20
    L_of_sum: float = 0.05

    def __post_init__(self) -> None:
        if not all(np.isfinite(v) and v >= 0 for v in (self.K, self.T, self.K_per_T, self.L, self.L_of_sum)):
            raise Refused("practical-out-of-range", "A practical size is a fraction, 0 or more: 0.1 for 10 %.")

    def at(self, z: Floats, std_T: float) -> dict[str, float]:
        """The sizes at a plant's coordinates, each in its parameter's unit; std_T, s."""
        value = {name: reading.value for name, reading in readings(z).items()}
        whole = value["T"] + value["L"] if std_T <= T_KNOWN * value["T"] else 0.0
        return {
            "K": self.K * abs(value["K"]),
            "T": self.T * value["T"],
            "L": max(self.L * value["L"], self.L_of_sum * whole),
            "K/T": self.K_per_T * abs(value["K/T"]),
        }


def differing(sizes: dict[str, float], shares: tuple[float, float, float], K: float, T: float) -> Floats:
    """(3, 3) covariance, in coordinates, of nights that differ by these shares of the practical sizes, one std."""
    to = slopes(K, T)
    std = np.array(shares) * np.array([sizes["K"], sizes["T"], sizes["L"]])
    return np.asarray((to * std**2) @ to.T)
