"""Preferred: the series of values that resistors and capacitors are sold in (IEC 60063)."""

from __future__ import annotations

import math
from typing import Final

import numpy as np
from numpy.typing import NDArray

from ident.errors import Refused

Floats = NDArray[np.float64]

# E3 to E24 are the standard's table (older than the rule); finer series are the rule, rounded to three digits.
E24: Final = (
    1.0, 1.1, 1.2, 1.3, 1.5, 1.6, 1.8, 2.0, 2.2, 2.4, 2.7, 3.0,
    3.3, 3.6, 3.9, 4.3, 4.7, 5.1, 5.6, 6.2, 6.8, 7.5, 8.2, 9.1,
)  # fmt: skip
COARSE, FINE = ("E3", "E6", "E12", "E24"), ("E48", "E96", "E192")


def series(name: str) -> tuple[float, ...]:
    """Values of one decade, 1 <= value < 10; name E3, E6, E12, E24, E48, E96 or E192.

    Raises Refused series-unknown.
    """
    if name in COARSE:
        return E24[:: 24 // int(name[1:])]
    if name not in FINE:
        raise Refused("series-unknown", f"The series are {', '.join(COARSE + FINE)}; got {name!r}.")
    n = int(name[1:])
    values = [round(10.0 ** (i / n), 2) for i in range(n)]
    return tuple(9.20 if v == 9.19 else v for v in values)  # the standard's one exception, in E192


def values(name: str, low: float, high: float) -> Floats:
    """Every value of a series from low to high, ohm or farad, increasing.

    Raises Refused: series-unknown, parts-out-of-range.
    """
    if not 0.0 < low <= high < math.inf:
        raise Refused("parts-out-of-range", f"Parts go from a value above 0 to a larger one; got {low} to {high}.")
    decades = range(math.floor(math.log10(low)) - 1, math.ceil(math.log10(high)) + 1)
    # Through text, so that 4.7e-9 is the very number one would type.
    found = np.array([float(f"{v:.2f}e{d}") for d in decades for v in series(name)])
    found = found[(found >= low * (1 - 1e-9)) & (found <= high * (1 + 1e-9))]
    if not len(found):
        raise Refused("parts-out-of-range", f"No value of {name} lies between {low:g} and {high:g}: widen the limits.")
    return found


def nearest(name: str, value: float) -> float:
    """The value of a series nearest to a wanted one by ratio."""
    around = values(name, value / 10.0, value * 10.0)
    return float(around[np.argmin(np.abs(np.log(around / value)))])


def trade(value: float, unit: str) -> str:
    """A part as it is printed: 4.7 kΩ, 100 nF."""
    power = math.floor(math.log10(value) / 3.0 + 1e-9)
    prefix = {-4: "p", -3: "n", -2: "µ", -1: "m", 0: "", 1: "k", 2: "M", 3: "G"}.get(power)
    return f"{value:.3g} {unit}" if prefix is None else f"{value / 1000.0**power:.4g} {prefix}{unit}"
