"""Difference: a controller as the difference equation that a processor runs."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.polynomial import polynomial
from numpy.typing import ArrayLike, NDArray

Complex = NDArray[np.complex128]
Rule = Literal["backward", "tustin"]
Row = tuple[float, ...]


@dataclass(frozen=True, slots=True)
class Difference:
    """num(q)/((1 - q) rest(q)) in q = z^-1 at the period h, s: the feedback path of a controller that integrates.

    num, rest   coefficients of q^0, q^1, ...; rest[0] is not 0
    Ti, Td, Tf  s, of the continuous controller that it stands for
    """

    num: Row
    rest: Row
    h: float
    Ti: float
    Td: float
    Tf: float

    def frequency_response(self, w: ArrayLike) -> Complex:
        """At z = exp(jwh), w in rad/s, 0 < w <= pi/h."""
        turn = 1j * np.asarray(w, dtype=np.float64) * self.h
        q = np.exp(-turn)
        # 1 - q without the cancellation at low frequencies.
        below = -np.expm1(-turn) * polynomial.polyval(q, self.rest)
        return np.asarray(polynomial.polyval(q, self.num) / below, dtype=np.complex128)


def substitute(num: Row, den: Row, h: float, rule: Rule) -> tuple[Row, Row]:
    """num(s)/den(s), coefficients of s^0, s^1, ..., as num(q)/den(q) with den[0] = 1.

    backward  s = (1 - q)/h;  tustin  s = 2 (1 - q)/(h (1 + q))
    (Åström and Wittenmark, Computer-Controlled Systems, 1997, section 8.2.)
    """
    rise = np.array([1.0, -1.0]) * (1.0 if rule == "backward" else 2.0) / h
    sum_ = np.array([1.0]) if rule == "backward" else np.array([1.0, 1.0])
    order = max(len(num), len(den)) - 1
    new = []
    for row in (num, den):
        total = np.zeros(order + 1)
        for power, value in enumerate(row):
            term = value * polynomial.polymul(polynomial.polypow(rise, power), polynomial.polypow(sum_, order - power))
            total[: len(term)] += term
        new.append(total)
    above, below = (row / new[1][0] for row in new)
    return tuple(above.tolist()), tuple(below.tolist())
