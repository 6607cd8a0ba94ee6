"""Target: what the user asks of a loop, and the limits under which the best settings meet it.

A limit on Ms and Mt is met by the search itself. Gain and phase margin, a closed-loop time constant and a limit on the
noise in the command are met by turning one knob until the best settings just meet them: the limit on Ms and Mt, or the
limit on the peak of abs(C F S).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np

from ident.errors import Refused
from ident.loop.held_plant import HeldPlant
from ident.loop.margins import Margins, control_sensitivity, loop_margins
from ident.loop.settings import PidSettings
from ident.loop.sweep import OpenLoop, sweep
from ident.tune.ellipses import Limits

DEFAULT_MS = 1.6
TOLERANCE = 0.005  # above the target, in Ms or Mt
CALMEST, SHARPEST = 1.05, 3.0  # of Ms, within which other targets are looked for
LOOSEST = 5.0  # beyond, a loop is so close to unstable that no target means anything
TURNS, CLOSE = 40, 1e-3  # of a knob; relative
SAMPLES = 400  # frequencies of the noise integral
QUIETEST = 1.1  # times the least peak of abs(C F S): the calmest loop that is tried against noise

Best = Callable[[Limits], PidSettings]


@dataclass(frozen=True, slots=True)
class Target:
    """What a loop must keep.

    Ms                    at most this, and Mt too; where None the following decide, with Ms at most 3
    gain_margin           factor, at least;  phase_margin_deg  degrees, at least
    closed_loop_s         s: crossover at 1/(closed_loop_s + dead time), as of the loop exp(-Ls)/((Tc + L) s) that the
                          SIMC and lambda rules aim at
    noise_peak            command unit per speed unit: max over frequency of abs(C F S), at most
    command_noise_std     command unit, at most, where white noise of speed_noise_std (speed unit) is read every sample
    """

    Ms: float | None = None
    gain_margin: float | None = None
    phase_margin_deg: float | None = None
    closed_loop_s: float | None = None
    noise_peak: float | None = None
    command_noise_std: float | None = None
    speed_noise_std: float | None = None

    def __post_init__(self) -> None:
        if self.Ms is not None and not 1.0 < self.Ms <= LOOSEST:
            raise Refused(
                "target-out-of-range",
                f"Ms must be above 1 and at most {LOOSEST:g}; 1.2 (calm) to 2 (sharp) is sensible. Got {self.Ms:g}.",
            )
        for name, least, most in (
            ("gain_margin", 1.0, np.inf),
            ("phase_margin_deg", 0.0, 90.0),
            ("closed_loop_s", 0.0, np.inf),
            ("noise_peak", 0.0, np.inf),
            ("command_noise_std", 0.0, np.inf),
            ("speed_noise_std", 0.0, np.inf),
        ):
            value = getattr(self, name)
            if value is not None and not least < value < most:
                raise Refused(
                    "target-out-of-range", f"{name} must be above {least:g} and below {most:g}; got {value:g}."
                )
        if self.command_noise_std is not None and self.speed_noise_std is None:
            raise Refused(
                "target-out-of-range",
                "A limit on the command's noise needs speed_noise_std, the noise of the measured speed.",
            )

    @property
    def bounds(self) -> bool:
        """Whether a loop without any dead time has a best answer under this target."""
        return self.noise_peak is not None or self.command_noise_std is not None

    @property
    def alone(self) -> bool:
        """Whether Ms is all that is asked."""
        rest = (self.gain_margin, self.phase_margin_deg, self.closed_loop_s, self.noise_peak, self.command_noise_std)
        return self.Ms is not None and all(one is None for one in rest)

    def kept_by(self, found: Margins) -> bool:
        """Whether a loop is stable with the margins asked for, Ms and Mt within TOLERANCE."""
        if not found.stable or found.Ms is None or found.Mt is None:
            return False
        return (
            max(found.Ms, found.Mt) <= (SHARPEST if self.Ms is None else self.Ms) + TOLERANCE
            and (self.gain_margin is None or (found.gain_margin or np.inf) >= self.gain_margin * (1.0 - CLOSE))
            and (
                self.phase_margin_deg is None
                or (found.phase_margin_deg or np.inf) >= self.phase_margin_deg * (1.0 - CLOSE)
            )
        )

    def quiet(self, held: HeldPlant, settings: PidSettings) -> bool:
        """Whether a stable loop keeps the limits on noise."""
        if self.noise_peak is not None and noise_peak(held, settings) > self.noise_peak * (1.0 + CLOSE):
            return False
        if self.command_noise_std is None or self.speed_noise_std is None:
            return True
        allowed = self.command_noise_std / self.speed_noise_std
        return noise_gain(held, settings, sample_step(held)) <= allowed * (1.0 + CLOSE)

    @property
    def says(self) -> str:
        """The target in words."""
        parts = []
        if self.Ms is not None:
            parts.append(f"Ms and Mt at most {self.Ms:g}")
        if self.gain_margin is not None:
            parts.append(f"gain margin at least {self.gain_margin:g}")
        if self.phase_margin_deg is not None:
            parts.append(f"phase margin at least {self.phase_margin_deg:g} degrees")
        if self.closed_loop_s is not None:
            parts.append(f"closed-loop time constant {self.closed_loop_s:g} s")
        if self.noise_peak is not None:
            parts.append(f"at most {self.noise_peak:g} command units per speed unit of noise")
        if self.command_noise_std is not None:
            parts.append(f"command noise at most {self.command_noise_std:g} (std)")
        return ", ".join(parts)


def solve(target: Target, held: HeldPlant, gain: float, ratio: float, best: Best) -> tuple[PidSettings, Limits]:
    """The best settings that meet a target, and the limits under which they are the best; gain  abs(P) at rest.

    Raises Refused target-unreachable, with the nearest target that can be reached, and those of `best`.
    """
    _reachable_noise(target, 1.0 / gain)
    limits = Limits(SHARPEST if target.Ms is None else target.Ms, target.noise_peak, ratio)
    if target.gain_margin is not None or target.phase_margin_deg is not None:
        limits = _margin_limits(target, held, limits, best)
    if target.closed_loop_s is not None:
        limits = _speed_limits(target.closed_loop_s, held, limits, best)
    settings = best(limits)
    if target.command_noise_std is not None:
        assert target.speed_noise_std is not None
        allowed = target.command_noise_std / target.speed_noise_std
        settings, limits = _quiet(allowed, held, 1.0 / gain, limits, settings, best)
    return settings, limits


def target_of(Ms: float | None, **wanted: float | None) -> Target:
    """The target of a request: Ms 1.6 where neither it nor a margin nor a closed-loop time is given."""
    others = (wanted.get(name) for name in ("gain_margin", "phase_margin_deg", "closed_loop_s"))
    if Ms is None and all(one is None for one in others):
        Ms = DEFAULT_MS
    return Target(Ms, **wanted)


def sample_step(held: HeldPlant) -> float:
    """s between readings of the speed. Raises Refused target-out-of-range where that is not known."""
    step = 2.0 * held.lag if held.lag > 0 else float(np.pi / held.w_max)
    if step > 0.0:
        return step
    raise Refused(
        "target-out-of-range",
        "The noise of the command depends on how often the speed is read: give the controller's period.",
    )


def noise_gain(held: HeldPlant, settings: PidSettings, step: float) -> float:
    """std of the command per std of white measurement noise that is new every `step` s; command per speed unit."""
    top = np.pi / step
    w = np.concatenate([np.geomspace(1e-4, 0.02, 100, endpoint=False), np.linspace(0.02, 1.0, SAMPLES)]) * top
    answer = np.abs(settings.frequency_response(w) / (1.0 + held(w) * settings.frequency_response(w))) ** 2
    return float(np.sqrt(np.trapezoid(answer, w) / top))


def noise_peak(held: HeldPlant, settings: PidSettings) -> float:
    """max over frequency of abs(C F S), command per speed unit."""
    return control_sensitivity(sweep(OpenLoop(held, settings)), settings).supremum


def _margin_limits(target: Target, held: HeldPlant, limits: Limits, best: Best) -> Limits:
    def spare(knob: float) -> float:
        found = loop_margins(OpenLoop(held, best(replace(limits, M=knob))))
        ratios = []
        if target.gain_margin is not None:
            ratios.append((found.gain_margin or np.inf) / target.gain_margin)
        if target.phase_margin_deg is not None:
            ratios.append((found.phase_margin_deg or np.inf) / target.phase_margin_deg)
        return float(np.log(min(ratios)))

    if spare(limits.M) >= 0.0:
        # Ms asks for more than the margins do, or no sharper loop is offered.
        return limits
    if spare(CALMEST) < 0.0:
        found = loop_margins(OpenLoop(held, best(replace(limits, M=CALMEST))))
        raise Refused(
            "target-unreachable",
            f"These margins are not reached by any loop that is looked for here; the calmest has gain margin "
            f"{found.gain_margin or np.inf:.3g} and phase margin {found.phase_margin_deg or 90.0:.3g} degrees: "
            "ask for less than that.",
        )
    return replace(limits, M=_turn(spare, CALMEST, limits.M))


def _speed_limits(Tc: float, held: HeldPlant, limits: Limits, best: Best) -> Limits:
    wanted = 1.0 / (Tc + held.known_delay)

    def slack(knob: float) -> float:
        return float(np.log(wanted / _crossover(held, best(replace(limits, M=knob)))))

    for knob, beyond, word in ((limits.M, 1.0, "fastest"), (CALMEST, -1.0, "slowest")):
        found = slack(knob)
        if beyond * found > CLOSE:
            nearest = 1.0 / (wanted * np.exp(-found)) - held.known_delay
            raise Refused(
                "target-unreachable",
                f"A closed-loop time constant of {Tc:.4g} s is not reached: the {word} loop within Ms and Mt "
                f"{knob:g} has {max(nearest, 0.0):.4g} s. Ask for that, or another Ms.",
                {"nearest_s": max(nearest, 0.0)},
            )
    return replace(limits, M=_turn(slack, CALMEST, limits.M))


def _quiet(
    allowed: float, held: HeldPlant, least: float, limits: Limits, settings: PidSettings, best: Best
) -> tuple[PidSettings, Limits]:
    step = sample_step(held)

    def spare(knob: float) -> float:
        return float(np.log(allowed / noise_gain(held, best(replace(limits, noise=knob)), step)))

    if noise_gain(held, settings, step) <= allowed:
        return settings, limits
    peak = noise_peak(held, settings)
    quiet = least * QUIETEST
    try:
        missing = spare(quiet)
    except Refused:
        missing = -1.0
    if missing < 0.0:
        raise Refused(
            "target-unreachable",
            "The command's noise cannot be brought this low: with integral action the answer to noise peaks at "
            f"{least:.4g} command units per speed unit or more. Allow more noise in the command.",
        )
    limits = replace(limits, noise=_turn(spare, quiet, peak))
    return best(limits), limits


def _reachable_noise(target: Target, least: float) -> None:
    if target.noise_peak is not None and target.noise_peak < 1.05 * least:
        raise Refused(
            "target-unreachable",
            f"With integral action the command answers to slow noise by at least 1/K = {least:.4g} command units per "
            f"speed unit: a limit of {target.noise_peak:.4g} is not reached; ask for {1.1 * least:.3g} or more.",
            {"nearest": 1.1 * least},
        )


def _crossover(held: HeldPlant, settings: PidSettings) -> float:
    run = sweep(OpenLoop(held, settings))
    above = np.flatnonzero(np.abs(run.loop) >= 1.0)
    k = int(above[-1])
    size = np.log(np.abs(run.loop[k : k + 2]))
    share = size[0] / (size[0] - size[1])
    return float(np.exp(np.log(run.w[k]) + share * np.log(run.w[k + 1] / run.w[k])))


def _turn(spare: Callable[[float], float], low: float, high: float) -> float:
    """The knob, between low (spare >= 0) and high (spare < 0), with nothing to spare: regula falsi (Illinois)."""
    at_low, at_high = spare(low), spare(high)
    side = 0
    for _ in range(TURNS):
        middle = high - at_high * (high - low) / (at_high - at_low) if at_high != at_low else (low + high) / 2.0
        middle = min(max(middle, low + 0.02 * (high - low)), high - 0.02 * (high - low))
        at = spare(middle)
        if 0.0 <= at < CLOSE or high - low < 1e-4 * low:
            return middle if at >= 0.0 else low
        if at >= 0.0:
            low, at_low = middle, at
            at_high = at_high / 2.0 if side == 1 else at_high
            side = 1
        else:
            high, at_high = middle, at
            at_low = at_low / 2.0 if side == -1 else at_low
            side = -1
    return low
