"""Choose: the parts of a series that come nearest to a wanted network and keep the target."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from ident.errors import Refused
from ident.realise.forms import Series
from ident.realise.grid import Floats, Grid, highest_peak, settles
from ident.realise.network import CardScale, Leak, Parts, response
from ident.realise.preferred import values

NEAREST = 3  # values of the series tried round each wanted one
KEPT = 1500  # of all networks, those nearest to the wanted one go through the frequency grid
SLACK = 0.003  # of Ms that a grid may miss


@dataclass(frozen=True, slots=True)
class Limits:
    """What there is to solder. Series of IEC 60063; resistors in ohm, capacitors in F.

    Common practice, no source: film capacitors in E6 up to a few microfarad, resistors from some kilohm (the op-amp
    must drive them) to a megohm (leakage and bias currents count beyond).
    """

    R_series: str = "E24"
    C_series: str = "E6"
    R_low: float = 4.7e3
    R_high: float = 1e6
    Rd_low: float = 470.0
    C_low: float = 1e-9
    C_high: float = 4.7e-6


def candidates(
    wanted: Series, on: Grid, limits: Limits, scale: CardScale, *, target: float, N: float, leak: Leak, Rl: float | None
) -> Iterator[Parts]:
    """Networks that keep the target on the grid, largest integral gain first.

    wanted.Kc  command unit per speed unit, > 0; Ra is the resistor nearest to 10 kilohm
    Raises Refused no-parts-in-range.
    """
    table = _enumerate(wanted, limits, scale, N)
    Ra = table["Ra"]
    Kc = table["Rb"] / Ra * table["R2"] / table["R1"] * scale.gain
    off = np.log(Kc / wanted.Kc) ** 2 + np.log(table["R2"] * table["C2"] / wanted.tauI) ** 2
    if "C1" in table:
        off += np.log((table["R1"] + table["Rd"]) * table["C1"] / wanted.tauD) ** 2
        off += 0.1 * np.log((table["R1"] + table["Rd"]) / table["Rd"] / N) ** 2
    kept = np.argsort(off, kind="stable")[:KEPT]
    chosen = {name: column[kept] for name, column in table.items()}
    if Rl is not None:
        chosen["Rl"] = np.full(len(kept), Rl)
    columns = {name: column[:, None] for name, column in chosen.items()}
    loop = np.asarray(on.plant * scale.gain * response(on.w, columns, leak), dtype=np.complex128)
    keeps = highest_peak(loop) <= target + SLACK
    keeps[keeps] = settles(loop[keeps])
    ki = Kc[kept] / (chosen["R2"] * chosen["C2"])
    order = np.argsort(-ki, kind="stable")
    for i in order[keeps[order]]:
        yield Parts(**{name: float(column[i]) for name, column in chosen.items()}, leak=leak)


def _enumerate(wanted: Series, limits: Limits, scale: CardScale, N: float) -> dict[str, Floats]:
    R = values(limits.R_series, limits.R_low, limits.R_high)
    C = values(limits.C_series, limits.C_low, limits.C_high)
    Ra = float(R[np.argmin(np.abs(np.log(R / 10e3)))])
    C2, R2 = _round_to(R, wanted.tauI / C, C)
    if wanted.tauD > 0.0:
        small = values(limits.R_series, limits.Rd_low, limits.R_high)
        C1, R1 = _round_to(R, wanted.tauD * (1.0 - 1.0 / N) / C, C)
        place, Rd = _round_to(small, R1 / (N - 1.0), np.arange(float(len(R1))))
        C1, R1 = C1[place.astype(int)], R1[place.astype(int)]
        first = {"C1": C1, "R1": R1, "Rd": Rd}
    else:
        first = {"R1": R}
    # Every input network with every feedback network, the error amplifier making up the gain.
    inputs, feedbacks = len(first["R1"]), len(R2)
    if inputs and feedbacks:
        table = {name: np.repeat(column, feedbacks) for name, column in first.items()}
        table |= {"R2": np.tile(R2, inputs), "C2": np.tile(C2, inputs)}
        Rb_wanted = wanted.Kc / scale.gain * table["R1"] / table["R2"] * Ra
        place, Rb = _round_to(R, Rb_wanted, np.arange(float(len(Rb_wanted))))
        table = {name: column[place.astype(int)] for name, column in table.items()}
        if len(Rb):
            return table | {"Rb": Rb, "Ra": np.full(len(Rb), Ra)}
    raise Refused(
        "no-parts-in-range",
        f"No parts within the limits make Kc {wanted.Kc:.3g}, tauI {wanted.tauI:.3g} s, tauD {wanted.tauD:.3g} s: "
        "widen the limits of R and C, or say how many volts the card has per unit of speed and command.",
    )


def _round_to(series: Floats, wanted: Floats, beside: Floats) -> tuple[Floats, Floats]:
    """(beside, value) of each wanted value that lies within the series, with the NEAREST of its neighbours."""
    inside = (wanted >= series[0] * 0.97) & (wanted <= series[-1] * 1.03)
    at = np.searchsorted(series, wanted[inside])
    index = np.clip(at[:, None] + np.arange(NEAREST) - NEAREST // 2, 0, len(series) - 1)
    keys = np.repeat(beside[inside], NEAREST)
    pairs = np.unique(np.stack([keys.astype(float), series[index].ravel()]), axis=1)
    return pairs[0], pairs[1]
