"""Installed: the controller that made a log, recovered from setpoint, speed and command.

A digital controller is a difference equation without noise: given what it saw, its command follows exactly, up to
rounding. So its gains come from plain least squares of the command on the law's columns (installed_law.py), under
feedback too, and a poor fit means that something else moved the command. (Åström and Hägglund, Advanced PID Control,
2006, chapter 13: digital implementation.)
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np

from ident.estimate.by_hand import hand_rows
from ident.estimate.installed_forms import FLOOR, Law, names, parts
from ident.estimate.installed_law import R, Structure, moves
from ident.estimate.installed_polish import polish, slopes
from ident.estimate.installed_rows import Answers, answers, quantum
from ident.estimate.installed_search import Search
from ident.evidence.colour import coloured_covariance, noise_colour
from ident.evidence.normal import solve_normal
from ident.findings import Finding
from ident.loop import ControlLaw, PidSettings
from ident.record import LoopRecord
from ident.record.segments import Flags, Floats
from ident.record.segments import spans as runs_of

MOST_ROWS = 3_000  # searched for the structure; the gains come from all rows
UNEXPLAINED = 0.03  # of what the proportional part moves; more is another law, or another error than r - y
ZERO = 3.0  # standard deviations within which a proportional part is none
CLEAR = 10.0  # standard deviations that Kp and ki must stand from zero: known to 10 % or not at all
SAME_WEIGHT = 0.02  # a setpoint weight this close to 1 is 1
NO_DERIVATIVE = 0.1  # Td over the period; less cannot be told from the rule of integration
MOVED = 0.03  # relative: what rounding the law's own command may move its gains by
ALONE = 3.0  # times what the law leaves of the moves, for the setpoint alone to explain them as well
MOST = 0.1  # share of the moves that the setpoint alone may leave, at most
NEARLY = 6.0  # of the criterion
PHASES = (0.0, 0.25, 0.5, 0.75)
FEWEST_STEPS = 5  # that a run of a coarse command must go through
COARSE = 0.05  # share of the command's moves that rounding makes up


@dataclass(frozen=True, slots=True)
class Reading:
    """The same difference equation read with another rule of integration."""

    Kp: float
    Ti: float


@dataclass(frozen=True, slots=True)
class Recovered:
    """A controller recovered from a log.

    settings     trapezoidal reading of the samples; Tf is of the first-order filter on `filter_on`
    std          of Kp, Ti, Td, Tf, b; None where not estimated (Td, Tf not seen; b not visible or 1 within 2 %)
    form         PI, PID or PI-D (derivative of the speed alone)
    backward, forward   readings of the same equation with those rules of integration; None where one has no
                 proportional part of its own
    period_s     of the controller;  late_s  from the logged speed to the command that answers to it
    R2           share of the command's movement that the law explains;  rows  used for it
    law          the difference equation, for margins
    step         of the grid on which the command is written down; 0: none to speak of
    """

    settings: PidSettings
    std: dict[str, float | None]
    form: str
    filter_on: str
    backward: Reading | None
    forward: Reading | None
    period_s: float
    late_s: float
    R2: float
    rows: int
    law: ControlLaw
    step: float


def recover(record: LoopRecord, by_hand: Flags | None = None) -> tuple[Recovered | None, tuple[Finding, ...]]:
    """The controller behind a record, or None with the reason as a finding.

    by_hand   (rows,): rows in which the controller did not act; None: found from the log
    """
    if record.setpoint is None or np.isnan(record.setpoint).all():
        return None, (_hidden("no setpoint is in the log", {}),)
    spans = answers(record, hand_rows(record) if by_hand is None else by_hand)
    if not spans:
        return None, (_hidden("its command never moves by itself off its limits for long enough", {}),)
    slowest = max(s.held for s in spans)
    spans = tuple(s for s in spans if s.held == slowest or slowest == 1)
    q = quantum(spans)
    rounding = q**2 / 12.0
    moving = any(np.any(np.diff(s.setpoints[0])) for s in spans)
    uneven = any(s.step is None for s in record.segments)
    coarse = _coarse(spans, rounding)
    spans = tuple(_wide_runs(s, FEWEST_STEPS * q) for s in spans) if coarse else spans
    if not any(s.usable.any() for s in spans):
        return None, (_hidden("the command is written down in steps too coarse for how little it moves", {"step": q}),)
    look = Search(_some(spans), rounding, coarse, uneven, moving)
    law = look.law()
    law = law and _simplest(replace(look, spans=spans), law)
    if law is None:
        return None, (_hidden("the command does not follow the error r - y as that of a PI or PID does", {}),)
    if moving and _follows_setpoint(spans, law):
        return None, (_hidden("the command follows the setpoint alone, without looking at the speed", {}),)
    covariance, unexplained = _quality(spans, law, rounding)
    spread = np.sqrt(np.diag(covariance))
    R2 = 1.0 - law.left / law.total
    figures: dict[str, float | int | str | bool | None] = {"R2": R2, "unexplained": unexplained, "rows": law.rows}
    if unexplained > UNEXPLAINED:
        share = f"{100.0 * unexplained:.0f} %" if unexplained < 1.0 else "more than all"
        reason = f"what the closest PI or PID leaves unexplained is {share} of what its proportional part does"
        return None, (_hidden(reason, figures),)
    if q > 0.0 and (moved := _moved_by_rounding(spans, law, q)) > MOVED:
        figures["moved_by_rounding"] = moved
        return None, (_hidden("the command is written down in steps too coarse for how little it moves", figures),)
    if np.any(np.abs(law.gains[:2]) < CLEAR * spread[:2]):
        return None, (_hidden("the log moves too little to tell its gains from zero", figures),)
    found = _read(spans[0], law, covariance, q, moving=moving)
    return found, tuple(_noticed(record, spans[0], law, found, moving=moving))


def _simplest(look: Search, law: Law) -> Law | None:
    """The law on all rows, without a setpoint weight of 1 or a derivative too short to tell."""
    best = look.forms(law.structure)
    for _ in range(5):
        if best is None:
            return None
        if best.structure.filter_on != "none" or best.structure.shaping != "none":
            best = polish(look.spans, best, look.forms) or best
        gain, form, structure = _gains(best), best.form, best.structure
        if gain["kd"] < NO_DERIVATIVE * look.spans[0].step * gain["Kp"]:
            form = form.replace("PI-D", "PI").replace("PID", "PI")
        if abs(gain["Kp b"] / gain["Kp"] - 1.0) < SAME_WEIGHT:
            form = form.replace(", weighted", "")
        if form.startswith("PI") and "D" not in form and structure.filter_on == "derivative":
            structure = replace(structure, filter_on="none", pole=0.0)
        if (form, structure) == (best.form, best.structure):
            # Nearly the same equation can be read with the filter on the derivative alone, which is the commoner one
            # (common practice, no source): so where the log does not speak against it.
            twin = look.forms(replace(structure, filter_on="derivative")) if structure.filter_on == "speed" else None
            if twin is None or twin.criterion >= best.criterion + NEARLY:
                break
            best = twin
            continue
        best = look.forms(structure, (form,))
    return best


def _wide_runs(span: Answers, least: float) -> Answers:
    """Without the runs in which the command moves by less: there its rounding follows its own movement."""
    use = span.usable.copy()
    for start, stop in runs_of(use).tolist():
        if float(np.ptp(span.command[start - 1 : stop])) < least:
            use[start:stop] = False
    return replace(span, usable=use)


def _moved_by_rounding(spans: tuple[Answers, ...], law: Law, q: float) -> float:
    """How far, relative, the gains move when the law's own command is rounded and fitted again: rounding that follows
    a slow command is no noise, and no residual tells."""
    found = moves(spans, law.structure)
    exact = replace(found, command=np.array(law.gains) @ parts(law.form, found.columns))
    if law.summed:
        start = np.concatenate([s.command[s.usable] for s in spans])
        level = np.add.reduceat(start, np.cumsum([0, *found.lengths[:-1]])) / found.lengths
        exact = exact.summed()
        # Where between two steps a run lies is not known: several places are tried.
        tries = [exact.command + np.repeat(level + q * phase, exact.runs) for phase in PHASES]
        rounded = np.array([exact.levelled(q * np.round(command / q)) for command in tries])
    else:
        rounded = q * np.round(exact.command / q)[None]
    rows = parts(law.form, exact.columns)
    again = solve_normal(np.broadcast_to(rows @ rows.T, (len(rounded), len(rows), len(rows))), rounded @ rows.T)
    # A setpoint weight may be 0: it is measured by Kp.
    size = np.array([law.gains[1] if name == "Kp b" else gain for name, gain in law.named.items()])
    return float(np.max(np.abs((again - law.gains) / size)))


def _follows_setpoint(spans: tuple[Answers, ...], law: Law) -> bool:
    """Whether a plain factor on the setpoint explains the command's moves as well as the law does.

    Then the speed, which answers to that command, only seems to be in the law.
    """
    found = moves(spans, Structure())
    found = found.summed() if law.summed else found
    own, total = found.columns[R], float(found.command @ found.command)
    power = float(own @ own)
    alone = total - float(own @ found.command) ** 2 / power if power > 0.0 else total
    return alone <= min(max(ALONE * law.left, FLOOR * total), MOST * total)


def _coarse(spans: tuple[Answers, ...], rounding: float) -> bool:
    """Whether the rounding of the command makes up a large part of its moves."""
    moved = np.concatenate([np.diff(s.command)[s.usable[1:]] for s in spans])
    return 2.0 * rounding > COARSE * float(np.mean(moved**2))


def _gains(law: Law) -> dict[str, float]:
    return {"Kp b": law.named["Kp"], "kd": 0.0} | law.named


def _quality(spans: tuple[Answers, ...], law: Law, rounding: float) -> tuple[Floats, float]:
    """Covariance of the gains (then of pole and shape, where there are), and what is left beyond rounding over what the
    proportional part moves from row to row.

    Where the controller saw another noise than was logged, that share is also how far Kp comes out too small.
    """
    at = slopes(spans, law)
    covariance = coloured_covariance(at.jacobian, noise_colour(np.split(at.left, np.cumsum(at.runs)[:-1])))
    moved = law.gains[1] * parts(law.form, moves(spans, law.structure).columns)[1]
    proportional = float(moved @ moved) / (2.0 if law.summed else 1.0)
    # Squares of uniform rounding scatter by 0.8 of their mean squared.
    own = rounding * (1.0 if law.summed else 2.0) * (law.rows + 3.0 * np.sqrt(0.8 * law.rows))
    beyond = max(float(at.left @ at.left) - own, 0.0)
    return covariance, float(beyond / proportional) if proportional else np.inf


def _read(span: Answers, law: Law, covariance: Floats, q: float, *, moving: bool) -> Recovered:
    gain, structure, h = _gains(law), law.structure, span.step
    ki, Kp = gain["ki"], gain["Kp"]
    known = [*names(law.form), *(["pole"] if structure.filter_on != "none" else [])]
    Tf = h * structure.pole / (1.0 - structure.pole) if structure.filter_on != "none" else 0.0

    def std(**slopes: float) -> float | None:
        if not set(slopes) <= set(known):
            return None
        row = np.array([slopes.get(n, 0.0) for n in known])
        variance = row @ covariance[: len(known), : len(known)] @ row
        return float(np.sqrt(max(float(variance), 0.0)))

    settings = PidSettings(Kp, Kp / ki, gain["kd"] / Kp, Tf, gain["Kp b"] / Kp if moving else 1.0)
    half = ki * h / 2.0
    return Recovered(
        settings,
        {
            "Kp": std(Kp=1.0),
            "Ti": std(Kp=1.0 / ki, ki=-Kp / ki**2),
            "Td": std(kd=1.0 / Kp, Kp=-gain["kd"] / Kp**2),
            "Tf": std(pole=h / (1.0 - structure.pole) ** 2),
            "b": std(**{"Kp b": 1.0 / Kp, "Kp": -gain["Kp b"] / Kp**2}),
        },
        law.form.replace(", weighted", ""),
        structure.filter_on,
        _reading(Kp - half, ki, std(Kp=1.0, ki=-h / 2.0)),
        _reading(Kp + half, ki, std(Kp=1.0, ki=h / 2.0)),
        h,
        structure.late * h / span.held,
        1.0 - law.left / law.total,
        law.rows,
        ControlLaw(settings, h, structure.late * h / span.held, structure.filter_on),
        q,
    )


def _reading(Kp: float, ki: float, std: float | None) -> Reading | None:
    return Reading(Kp, Kp / ki) if Kp * ki > 0.0 and abs(Kp) > ZERO * (std or 0.0) else None


def _noticed(record: LoopRecord, span: Answers, law: Law, found: Recovered, *, moving: bool) -> Iterator[Finding]:
    structure = law.structure
    unit = record.speed_unit or "speed units"
    if structure.shaping == "ramp":
        yield Finding(
            "setpoint-ramped",
            "info",
            f"The controller does not follow the logged setpoint at once: it ramps it, at {structure.shape:.4g} {unit} "
            "per s.",
            {"rate_per_s": structure.shape},
        )
    if structure.shaping == "lag":
        yield Finding(
            "setpoint-filtered",
            "info",
            f"The controller does not follow the logged setpoint at once: it sees it through a lag of "
            f"{structure.shape:.4g} s.",
            {"time_constant_s": structure.shape},
        )
    if span.held > 1:
        yield Finding(
            "controller-slower-than-log",
            "info",
            f"The command moves only every {span.held} rows: the controller's period is {span.step:.4g} s.",
            {"period_s": span.step, "rows": span.held},
        )
    if structure.late:
        yield Finding(
            "controller-answers-late",
            "info",
            f"The command of a row answers to the speed logged {found.late_s:.4g} s earlier; the margins of the "
            "installed settings contain that delay. Give it as computing delay, so that the proposals do too.",
            {"late_s": found.late_s, "rows": structure.late},
        )
    if structure.counted:
        yield Finding(
            "integral-counts-rows",
            "info",
            "The integral adds the same share of the error at every row, however long ago the last one was: Ti holds "
            f"for the usual step of {span.step:.4g} s.",
            {"step_s": span.step},
        )
    if found.backward is None or found.forward is None:
        yield Finding(
            "integral-only",
            "info",
            "The controller only integrates: with a plain sum of the error its proportional part is zero as far as the "
            "log can tell. The Kp stated here is half of what the integral adds per period.",
            {"Kp": found.settings.Kp, "Kp_std": found.std["Kp"]},
        )
    if not moving:
        yield Finding(
            "setpoint-weight-not-visible",
            "info",
            "The setpoint never moves in automatic, so its weight b cannot be seen; 1 stands for it.",
        )


def _some(spans: tuple[Answers, ...]) -> tuple[Answers, ...]:
    """The rows to search: all, or those around the setpoint's largest move where they are very many."""
    if sum(len(s.time) for s in spans) <= MOST_ROWS:
        return spans
    span = max(spans, key=lambda s: float(np.abs(np.diff(s.setpoints[0])).max()))
    at = int(np.argmax(np.abs(np.diff(span.setpoints[0]))))
    start = max(min(at - MOST_ROWS // 2, len(span.time) - MOST_ROWS), 0)
    part = slice(start, start + MOST_ROWS)
    return (
        replace(
            span,
            time=span.time[part],
            command=span.command[part],
            speeds=span.speeds[:, part],
            setpoints=span.setpoints[:, part],
            usable=span.usable[part] & (np.arange(len(span.time[part])) >= (6 if start else 0)),
        ),
    )


def _hidden(reason: str, evidence: dict[str, float | int | str | bool | None]) -> Finding:
    return Finding(
        "installed-not-visible", "info", f"The installed controller cannot be read from this log: {reason}.", evidence
    )
