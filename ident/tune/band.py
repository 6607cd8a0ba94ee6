"""Band: the frequencies where a controller for this plant is decided, and the plant's sign."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ident.errors import Refused
from ident.loop.held_plant import Complex, HeldPlant

Floats = NDArray[np.float64]

PER_DECADE_SCAN = 20
POINTS = 400
# rad of lag, counted from the low-frequency asymptote: a controller acts on the phase between these.
EARLY, LATE = 0.05, 3.5
TURN, FOLLOWED = 0.5, 12  # rad between neighbours of the scan; rounds of bisection
FADED = 0.05  # of abs(P) where the lag is LATE: what lies beyond is far too small to come near -1
# rad: a plant that never lags more than 90 degrees takes any gain of a PI, 180 degrees of a PID (the filter is
# a share of Td and moves out of the way).
UNBOUNDED_LAG = {"pi": 1.6, "pid": 3.2}


@dataclass(frozen=True, slots=True, eq=False)
class Band:
    """Plant response, sign taken out, on a grid where the loop is decided.

    sign      of the plant's low-frequency gain
    w, plant  (n,) rad/s increasing, (n,) sign * P(jw)
    residence average residence time -P'(0)/P(0) of the plant without the controller's delay, s; inf if integrating
    """

    source: HeldPlant
    sign: float
    w: Floats
    plant: Complex
    residence: float

    @property
    def turning(self) -> float:
        """rad/s where the plant has turned 180 degrees, or nearly as far as it ever does."""
        lag = -np.unwrap(np.angle(self.plant))
        return float(self.w[np.argmax(lag > min(np.pi, lag.max() * 0.999))])

    def with_points(self, w: Floats) -> Band:
        """The same band with further frequencies in it."""
        w = np.setdiff1d(w, self.w)
        both = np.concatenate([self.w, w])
        order = np.argsort(both)
        plant = np.concatenate([self.plant, self.sign * self.source(w)])
        return Band(self.source, self.sign, both[order], plant[order], self.residence)


def find_band(plant: HeldPlant, form: str, *, bounded: bool = False) -> Band:
    """Scan all decades for the phase between EARLY and LATE, then grid it finely.

    bounded   something else than dead time limits the gain
    Raises Refused: unbounded (no delay and too little lag), plant-without-gain, plant-response-unusable.
    """
    # One scan from nanoseconds to decades; a stated delay moves its centre, so that time scales out.
    centre = 1.0 / plant.known_delay if plant.known_delay > 0 else 1.0
    top = min(centre * 1e9, plant.w_max)
    bottom = min(centre * 1e-9, top * 1e-6)
    scan = np.geomspace(bottom, top, round(np.log10(top / bottom) * PER_DECADE_SCAN))
    response = plant(scan)
    order = round(-float(np.log10(np.abs(response[PER_DECADE_SCAN] / response[0]))))
    asymptote = (response[0] * (1j) ** order).real
    if order < 0 or asymptote == 0:
        raise Refused("plant-without-gain", "The plant has no gain at low frequency, so integral action cannot work.")
    sign = float(np.sign(asymptote))
    scan, response = _follow(plant, scan, response)
    lag = _lag(sign * response, order)
    if (
        not bounded
        and plant.known_delay == 0
        and np.isinf(plant.w_max)
        and lag[-1] < UNBOUNDED_LAG[form]
        and _settled(plant, top)
    ):
        raise _unbounded()
    late = np.flatnonzero(lag > LATE)
    last = int(late[0]) if len(late) else int(np.argmax(lag > lag.max() - 0.02))
    first = max(int(np.argmax(np.abs(lag - lag[0]) > EARLY)) - 1, 0)
    loud = np.flatnonzero(np.abs(response) > FADED * np.abs(response[last]))
    end = float(min(scan[max(last, int(loud[-1]))], scan[last] * 30.0))
    w = np.geomspace(scan[first] / 3.0, min(end * 3.0, plant.w_max), POINTS)
    w = np.union1d(w, scan[first : last + 1])
    return Band(plant, sign, w, sign * plant(w), _residence(plant, scan, lag, order))


def _lag(response: Complex, order: int) -> Floats:
    return np.asarray(order * np.pi / 2 - np.unwrap(np.angle(response * 1j**order)))


def _follow(plant: HeldPlant, w: Floats, response: Complex) -> tuple[Floats, Complex]:
    """Bisect a scan where the phase turns fast (a resonance), up to where it has turned LATE for good."""
    for _ in range(FOLLOWED):
        turn = np.abs(np.angle(response[1:] / response[:-1]))
        late = np.flatnonzero(np.cumsum(turn) > 3.0 * LATE)
        rough = turn > TURN
        rough[int(late[0]) + 1 if len(late) else len(rough) :] = False
        if not rough.any():
            break
        middle = np.sqrt(w[1:][rough] * w[:-1][rough])
        w = np.concatenate([w, middle])
        order = np.argsort(w)
        w, response = w[order], np.concatenate([response, plant(middle)])[order]
    return w, response


def _residence(plant: HeldPlant, w: Floats, lag: Floats, order: int) -> float:
    if order > 0:
        return np.inf
    # Where the lag is well above rounding and still grows in proportion to w.
    k = int(np.argmax(lag > 1e-3))
    return max(float(lag[k] / w[k]) - plant.lag, 0.0)


def _settled(plant: HeldPlant, w: float) -> bool:
    phase = np.angle(plant(w * np.array([1.0, 0.73, 0.51, 0.37])))
    return float(np.ptp(phase)) < 1e-3


def _unbounded() -> Refused:
    return Refused(
        "unbounded",
        "Without dead time, hold or computing delay this plant takes any gain, so no largest gain exists: "
        "give the controller's period, the computing delay, a model with dead time, or a limit on noise.",
    )
