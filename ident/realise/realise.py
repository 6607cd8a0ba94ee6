"""realise: settings as the controller that is there takes them."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from ident.errors import Refused
from ident.loop import Margins, PidSettings, margins
from ident.loop.controller import Controller
from ident.realise.card import CardReport
from ident.realise.difference import Rule
from ident.realise.digital import Digital, FilterOn, digital
from ident.realise.fixed_point import FixedPoint, fixed_point
from ident.realise.forms import Forms, forms
from ident.realise.sampled import sampled_margins

RULES: tuple[Rule, ...] = ("backward", "tustin")


@dataclass(frozen=True, slots=True)
class Rounded:
    """Whole-number coefficients, the margins they leave and what rounding cost of Ms; None where not known."""

    coefficients: FixedPoint
    margins: Margins | None
    Ms_lost: float | None


@dataclass(frozen=True, slots=True)
class Coded:
    """Coefficients by one rule.

    margins  of the difference equation with the plant behind its hold, exact; None where `because` says why
    Ms_lost  to sampling and computing delay: Ms of these margins less that of the continuous loop
    rounded  the same in whole numbers, if a word length was given
    """

    digital: Digital
    margins: Margins | None
    Ms_lost: float | None
    because: str
    rounded: Rounded | None


@dataclass(frozen=True, slots=True)
class Realisations:
    """One tuning for a panel, a processor or a card.

    continuous  margins without sampling;  add_half  with h/2 and the computing delay as dead time, the rule of thumb
    digital     by backward difference and by Tustin's rule; what is missing has its reason in `digital_because`
    card        the op-amp card, where one was asked for
    """

    forms: Forms
    continuous: Margins | None = None
    add_half: Margins | None = None
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
    add_half: Margins | None = None,
) -> Realisations:
    """Every form of a controller and, with a period and a plant, its coefficients and the margins they have.

    plant         as for `margins`; None: forms alone
    period        of the controller, s; 0: analogue;  compute_delay  s
    speed_span, command_span   of the controller's scales; None: no gains in percent
    filter_on, N  second-order filter on the speed, or first-order on the derivative with Tf = Td/N
    bits          word length for whole-number coefficients, 8 to 32; None: none. Where both spans are given the
                  signals are fractions of them.
    add_half      the margins with half a period added, where they are already known
    For an op-amp card see `choose_card`: it is chosen for the plant, not for these settings.
    Raises Refused: span-out-of-range, period-out-of-range, filter-out-of-range, word-out-of-range and those of
    `margins`.
    """
    shown = forms(settings, speed_span=speed_span, command_span=command_span)
    if period == 0.0:
        return Realisations(shown, digital_because="An analogue controller has no period to make coefficients for.")
    if plant is None:
        return Realisations(shown, digital_because="Coefficients are given with their margins on a plant.")
    continuous = margins(plant, settings)
    scale = 1.0 if speed_span is None or command_span is None else speed_span / command_span
    made, because = [], ""
    for rule in RULES:
        try:
            one = digital(settings, period, rule=rule, filter_on=filter_on, N=N)
        except Refused as error:
            if error.code not in ("derivative-without-filter", "no-integral-action"):
                raise
            because = error.message
            continue
        exact, unknown = _sampled(plant, one.feedback, period, compute_delay)
        rounded = None
        if bits is not None:
            words = fixed_point(one, bits=bits, scale=scale)
            left, _ = _sampled(plant, words.feedback, period, compute_delay)
            rounded = Rounded(words, left, _lost(left, exact))
        made.append(Coded(one, exact, _lost(exact, continuous), unknown, rounded))
    add_half = add_half or margins(plant, settings, period=period, compute_delay=compute_delay)
    return Realisations(shown, continuous, add_half, tuple(made), because)


def _sampled(plant: Any, feedback: Controller, h: float, delay: float) -> tuple[Margins | None, str]:
    try:
        return sampled_margins(plant, feedback, h, delay), ""
    except Refused as error:
        return None, error.message


def _lost(after: Margins | None, before: Margins | None) -> float | None:
    if after is None or before is None or after.Ms is None or before.Ms is None:
        return None
    return after.Ms - before.Ms
