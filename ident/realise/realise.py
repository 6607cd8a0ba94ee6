"""realise: settings as the controller that is there takes them."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

from ident.errors import Refused
from ident.loop import Margins, PidSettings
from ident.realise.card import CardReport
from ident.realise.digital import Digital, FilterOn, digital
from ident.realise.fixed_point import FixedPoint, fixed_point
from ident.realise.forms import Forms, forms
from ident.realise.sampled import Cost, sampled_margins, sampling_cost

RULES = ("backward", "tustin")


@dataclass(frozen=True, slots=True)
class Rounded:
    """Whole-number coefficients, the margins they leave and what rounding cost of Ms; None where not known."""

    coefficients: FixedPoint
    margins: Margins | None
    Ms_lost: float | None


@dataclass(frozen=True, slots=True)
class Coded:
    """Coefficients by one rule, what sampling costs, and the same in whole numbers if a word length was given."""

    digital: Digital
    cost: Cost
    rounded: Rounded | None


@dataclass(frozen=True, slots=True)
class Realisations:
    """One tuning for a panel, a processor or a card.

    digital   by backward difference and by Tustin's rule; () with the reason in `digital_because`
    card      the op-amp card, where one was asked for
    """

    forms: Forms
    digital: tuple[Coded, ...] = ()
    digital_because: str = ""
    card: CardReport | None = None


def realise(
    settings: PidSettings,
    plant: Any = None,
    *,
    period: float = 0.0,
    compute_delay: float = 0.0,
    speed_span: float | None = None,
    command_span: float | None = None,
    filter_on: FilterOn = "speed",
    N: float | None = None,
    bits: int | None = None,
) -> Realisations:
    """Every form of a controller and, with a period, its coefficients and their margins on the plant.

    plant         as for `margins`; None: coefficients without margins are not given, so forms alone
    period        of the controller, s; 0: analogue;  compute_delay  s
    speed_span, command_span   of the controller's scales; None: no gains in percent
    filter_on, N  second-order filter on the speed, or first-order on the derivative with Tf = Td/N
    bits          word length for whole-number coefficients, 8 to 32; None: none. Where both spans are given the
                  signals are fractions of them.
    For an op-amp card see `choose_card`: it is chosen for the plant, not for these settings.
    Raises Refused: span-out-of-range, period-out-of-range, filter-out-of-range, word-out-of-range and those of
    `margins`.
    """
    shown = forms(settings, speed_span=speed_span, command_span=command_span)
    if period == 0.0 or plant is None:
        return Realisations(shown, (), "The controller is analogue: it has no period to make coefficients for.")
    scale = 1.0 if speed_span is None or command_span is None else speed_span / command_span
    made, because = [], ""
    for rule in RULES:
        try:
            one = digital(settings, period, rule=rule, filter_on=filter_on, N=N)  # type: ignore[arg-type]
        except Refused as error:
            if error.code not in ("derivative-without-filter", "no-integral-action"):
                raise
            because = error.message
            continue
        cost = sampling_cost(plant, settings, one.feedback, period, compute_delay)
        rounded = None if bits is None else _rounded(plant, one, cost, bits, scale, compute_delay)
        made.append(Coded(one, cost, rounded))
    return Realisations(shown, tuple(made), because)


def _rounded(plant: Any, one: Digital, cost: Cost, bits: int, scale: float, delay: float) -> Rounded:
    words = fixed_point(one, bits=bits, scale=scale)
    if cost.exact is None:
        return Rounded(words, None, None)
    found = sampled_margins(plant, words.feedback, one.h, delay)
    known = found.Ms is not None and cost.exact.Ms is not None
    lost = found.Ms - cost.exact.Ms if known else math.nan  # type: ignore[operator]
    return Rounded(words, found, lost if known else None)
