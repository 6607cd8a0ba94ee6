"""The rules that people know, on one plant, each with the margins it really has there."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ident.errors import Refused
from ident.loop import Margins, PidSettings
from ident.loop.held_plant import Complex, HeldPlant, held_plant
from ident.plants import Fopdt
from ident.tune.rules.amigo import amigo_pi, amigo_pid
from ident.tune.rules.chien_hrones_reswick import chien_hrones_reswick
from ident.tune.rules.cohen_coon import cohen_coon
from ident.tune.rules.imc import imc_pi, imc_pid, lambda_pi
from ident.tune.rules.tyreus_luyben import tyreus_luyben
from ident.tune.rules.ultimate import ultimate
from ident.tune.rules.ziegler_nichols import ziegler_nichols_step, ziegler_nichols_ultimate
from ident.tune.simc import improved_simc, simc_pid
from ident.tune.target import TOLERANCE

Floats = NDArray[np.float64]

POINTS = 1200
DECADES = (-3.0, 1.5)  # of the grid, about 1/(dead time in the loop)


@dataclass(frozen=True, slots=True)
class Rule:
    """A published rule on this plant: for comparison, never recommended.

    margins       read off a grid, right to about 0.1 % where Ms is below 5
    meets_target  Ms and Mt at most the target
    source        author and year
    """

    method: str
    form: str
    settings: PidSettings
    margins: Margins
    meets_target: bool
    source: str


def published(
    plant: Any, reduced: Fopdt, Ms: float, form: str, *, period: float = 0.0, compute_delay: float = 0.0
) -> tuple[Rule, ...]:
    """The rules for a form, PI or PID.

    plant    what the loop is closed around;  reduced  its first-order model, from which the rules take K, T and L
    Ms       target that each is held against
    () where the loop has no dead time at all: the rules divide by it.
    """
    held = held_plant(plant, period, compute_delay)
    K, T, L = reduced.K, reduced.T, reduced.L + period / 2.0 + compute_delay
    if L <= 0.0:
        return ()
    found = _pi(K, T, L) if form == "pi" else _pid(K, T, L)
    try:
        at = ultimate(plant, period=period, compute_delay=compute_delay)
    except Refused:  # a plant that never lags enough: these two rules say nothing of it
        pass
    else:
        found.append(("ziegler-nichols-ultimate", ziegler_nichols_ultimate(at, form), "Ziegler and Nichols 1942"))
        found.append(("tyreus-luyben", tyreus_luyben(at, form), "Tyreus and Luyben 1992"))
    margins = quick_margins(held, [settings for _, settings, _ in found], 1.0 / L)
    return tuple(
        Rule(method, form, settings, one, _meets(one, Ms), source)
        for (method, settings, source), one in zip(found, margins, strict=True)
    )


def _pi(K: float, T: float, L: float) -> list[tuple[str, PidSettings, str]]:
    return [
        ("improved-simc", improved_simc(K, T, L), "Grimholt and Skogestad 2012"),
        ("amigo", amigo_pi(K, T, L), "Astrom and Hagglund 2004"),
        ("lambda", lambda_pi(K, T, L, max(L, T)), "Dahlin 1968; time constant of the closed loop that of the plant"),
        ("imc", imc_pi(K, T, L, max(1.7 * L, 0.1 * T)), "Rivera, Morari and Skogestad 1986; the fastest they allow"),
        ("ziegler-nichols-step", ziegler_nichols_step(K * L / T, L, "pi"), "Ziegler and Nichols 1942"),
        ("cohen-coon", cohen_coon(K, T, L, "pi"), "Cohen and Coon 1953"),
        (
            "chien-hrones-reswick-setpoint",
            chien_hrones_reswick(K, T, L, "pi", "setpoint"),
            "Chien, Hrones and Reswick 1952",
        ),
        ("chien-hrones-reswick-load", chien_hrones_reswick(K, T, L, "pi", "load"), "Chien, Hrones and Reswick 1952"),
    ]


def _pid(K: float, T: float, L: float) -> list[tuple[str, PidSettings, str]]:
    return [
        ("improved-simc", simc_pid(K, T, L), "Grimholt and Skogestad 2018"),
        ("amigo", amigo_pid(K, T, L), "Astrom and Hagglund 2004"),
        ("imc", imc_pid(K, T, L, max(0.8 * L, 0.1 * T)), "Rivera, Morari and Skogestad 1986; the fastest they allow"),
        ("ziegler-nichols-step", ziegler_nichols_step(K * L / T, L, "pid"), "Ziegler and Nichols 1942"),
        ("cohen-coon", cohen_coon(K, T, L, "pid"), "Cohen and Coon 1953"),
        (
            "chien-hrones-reswick-setpoint",
            chien_hrones_reswick(K, T, L, "pid", "setpoint"),
            "Chien, Hrones and Reswick 1952",
        ),
        ("chien-hrones-reswick-load", chien_hrones_reswick(K, T, L, "pid", "load"), "Chien, Hrones and Reswick 1952"),
    ]


def _meets(found: Margins, Ms: float) -> bool:
    return found.Ms is not None and found.Mt is not None and max(found.Ms, found.Mt) <= Ms + TOLERANCE


def quick_margins(held: HeldPlant, settings: list[PidSettings], centre: float) -> list[Margins]:
    """Margins of several controllers on one plant, on one grid about `centre` rad/s: about 0.1 %."""
    w = centre * np.logspace(*DECADES, POINTS)
    w = w[w < held.w_max]
    loops = np.stack([s.frequency_response(w) for s in settings]) * held(w)
    return [_margins(w, loop) for loop in loops]


def _margins(w: Floats, loop: Complex) -> Margins:
    back = 1.0 + loop
    # With one integrator and a stable plant, 1 + L turns from -90 degrees to 0; each encirclement takes 360 off.
    turned = float(np.sum(np.angle(back[1:] / back[:-1])))
    if turned < -np.pi / 2.0:
        return Margins(False, None, None, None, None, None)
    S = 1.0 / np.abs(back)
    size = np.log(np.abs(loop))
    k = np.flatnonzero(np.sign(size[1:]) != np.sign(size[:-1]))
    share = size[k] / (size[k] - size[k + 1])
    at = w[k] + share * (w[k + 1] - w[k])
    turn = np.angle(-loop[k]) + share * np.angle(loop[k + 1] / loop[k])
    j = np.flatnonzero((np.sign(loop.imag[1:]) != np.sign(loop.imag[:-1])) & (loop.real[1:] < 0.0))
    cut = loop.imag[j] / (loop.imag[j] - loop.imag[j + 1])
    sizes = -(loop.real[j] + cut * (loop.real[j + 1] - loop.real[j]))
    below = sizes[(sizes > 0.0) & (sizes < 1.0)]
    return Margins(
        True,
        float(S.max()),
        max(float(np.max(np.abs(loop) * S)), 1.0),
        float(1.0 / below.max()) if len(below) else None,
        float(np.degrees(np.abs(turn).min())) if len(k) else None,
        float(np.min(np.mod(turn, 2.0 * np.pi) / at)) if len(k) else None,
    )
