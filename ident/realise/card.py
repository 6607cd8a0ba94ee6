"""A card: chosen for a target, or as found, with everything that is to be known before it is soldered."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from ident.errors import Refused
from ident.loop import Margins, PidSettings, margins
from ident.realise.choose_parts import Limits, candidates
from ident.realise.forms import Series
from ident.realise.grid import grid
from ident.realise.network import Card, CardScale, Leak, Parts
from ident.realise.preferred import nearest, trade
from ident.realise.repair import Change, repair
from ident.realise.series_optimum import series_optimum
from ident.realise.tolerance import Spread, spread

TOLERANCE = 0.005  # above the target, in Ms or Mt
TRIED = 40  # networks whose margins are computed in full before the search gives up
N_PID = 10.0  # common practice, no source: the damping resistor is much smaller than the resistor it sits beside

INVERSIONS = (
    "The network inverts once. With the error amplifier taking {} the command has the right sign for this plant{}; "
    "with {} put one inverter of gain 1 behind the network."
)
CARD_CAUTIONS = (
    "Clamp the output (Zener diodes or a diode clamp across R2 and C2) at the command's limits: the clamp is also what "
    "keeps the integrator from winding up. Without it the card has no anti-windup.",
    "Solder only with the drive off, locked out and its capacitors discharged. Card common may be at mains potential: "
    "check isolation before a meter or a laptop is connected.",
    "Figures are for ideal op-amps: gain and bandwidth of the real one must lie well above the high-frequency gain "
    "stated here, and its supply above the clamp.",
    "Short C2 while the drive is disabled, so that the command starts from 0.",
)


@dataclass(frozen=True, slots=True)
class CardReport:
    """One card on one plant.

    printed        the parts in the trade's notation
    series         Kc, tauI, tauD of the network;  settings  the same in ideal form, filter_time its pole, s
    margins        of the plant with the whole network, leak and filter pole included, without sampling
    low_gain, high_gain   V/V at 0 rad/s (None: integrates) and at high frequencies;  corners_hz  Hz by name
    wanted         the optimum that the parts were chosen for; None for a card as found
    change         the change to the fewest parts that reaches the target; None for a chosen card
    """

    parts: Parts
    printed: dict[str, str]
    scale: CardScale
    series: Series
    settings: PidSettings
    filter_time: float
    margins: Margins
    low_gain: float | None
    high_gain: float
    corners_hz: dict[str, float]
    spread: Spread | None
    inversions: str
    wanted: Series | None
    wanted_Ms: float | None
    change: Change | None
    cautions: tuple[str, ...]


def choose_card(
    plant: Any,
    *,
    Ms: float = 1.6,
    form: str = "pid",
    scale: CardScale | None = None,
    limits: Limits | None = None,
    leak: Leak = "none",
    Rl: float | None = None,
    R_tolerance: float = 0.01,
    C_tolerance: float = 0.05,
    N: float = N_PID,
    seed: int = 0,
) -> CardReport:
    """The card with the largest integral gain under a target, from parts that can be bought.

    plant   settles after a command step; Fopdt, Sopdt, UnderdampedSopdt, Arx, a fit, or frequency_response(w)
    Ms      max(Ms, Mt) at most this, with the network's own filter pole in the loop (zeros are real: Ti >= 4 Td)
    form    pi (without Rd and C1) or pid
    scale   volts on the card per speed unit and per command unit; None: 1 V each
    Rl      ohm, with leak "C2" or "both": rounded to the series;  N  (R1 + Rd)/Rd aimed at, > 1
    Common practice, no source: the integrating corner lies well below the differentiating one.
    Raises Refused: target-out-of-range, not-offered, unbounded, no-parts-in-range, card-needs-settled-plant,
    those of `Parts`, `CardScale` and `values`.
    """
    check_target(Ms)
    if form not in ("pi", "pid") or not N > 1.0:
        raise Refused("not-offered", f"form is pi or pid and N above 1; got {form}, {N}.")
    if (Rl is None) != (leak == "none"):
        raise Refused("parts-incomplete", 'Give the leak Rl together with where it lies: leak "C2" or "both".')
    scale, limits = scale or CardScale(), limits or Limits()
    on = grid(plant)
    wanted = series_optimum(on, Ms, N=N if form == "pid" else None)
    if form == "pid" and wanted.tauD < 1e-3 * wanted.tauI:
        wanted = Series(wanted.Kc, wanted.tauI, 0.0)  # the derivative buys nothing here
    leaking = None if Rl is None else nearest(limits.R_series, Rl)
    ranked = candidates(wanted, on, limits, scale, target=Ms, N=N, leak=leak, Rl=leaking)
    for _, parts in zip(range(TRIED), ranked, strict=False):
        card = Card(parts, scale, on.sign)
        found = margins(plant, card)
        if found.Ms is not None and found.Mt is not None and max(found.Ms, found.Mt) <= Ms + TOLERANCE:
            about = spread(plant, card, on, R=R_tolerance, C=C_tolerance, seed=seed)
            return _report(card, found, about, Series(on.sign * wanted.Kc, wanted.tauI, wanted.tauD), Ms, None)
    raise Refused(
        "no-parts-in-range",
        f"No card of these series keeps the target of {Ms:g} near its optimum: use a finer series or wider limits.",
    )


def card_as_found(
    plant: Any,
    parts: Parts,
    *,
    Ms: float | None = None,
    scale: CardScale | None = None,
    limits: Limits | None = None,
    R_tolerance: float = 0.01,
    C_tolerance: float = 0.05,
    seed: int = 0,
) -> CardReport:
    """What a card's parts make of a plant; with a target also the change to the fewest parts that reaches it.

    Arguments and errors as for `choose_card`.
    """
    if Ms is not None:
        check_target(Ms)
    on = grid(plant)
    card = Card(parts, scale or CardScale(), on.sign)
    found = margins(plant, card)
    about = spread(plant, card, on, R=R_tolerance, C=C_tolerance, seed=seed) if found.stable else None
    change = None if Ms is None else repair(plant, card, on, target=Ms, limits=limits or Limits(), found=found)
    return _report(card, found, about, None, None, change)


def check_target(Ms: float) -> None:
    if not 1.0 < Ms <= 5.0:
        raise Refused("target-out-of-range", f"Ms must be above 1 and at most 5; got {Ms:g}.")


def _report(
    card: Card, found: Margins, about: Spread | None, wanted: Series | None, target: float | None, change: Change | None
) -> CardReport:
    return CardReport(
        parts=card.parts,
        printed={name: trade(v, "F" if name.startswith("C") else "Ω") for name, v in card.parts.given.items()},
        scale=card.scale,
        series=Series(card.gain, card.tauI, card.tauD),
        settings=card.settings,
        filter_time=card.filter_time,
        margins=found,
        low_gain=card.low_gain,
        high_gain=card.high_gain,
        corners_hz=card.corners_hz,
        spread=about,
        inversions=INVERSIONS.format("speed minus setpoint", "", "setpoint minus speed")
        if card.sign > 0
        else INVERSIONS.format("setpoint minus speed", ", whose gain is negative", "speed minus setpoint"),
        wanted=wanted,
        wanted_Ms=target,
        change=change,
        cautions=CARD_CAUTIONS,
    )
