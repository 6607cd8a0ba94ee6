"""Standstill: the spans in which a motor that turns both ways stands, and which way it turns in the others.

Where it stands dry friction is no known force but whatever holds the motor, so those rows say nothing of it. Each span
of motion starts afresh; its commands of before the start are kept, for the motor still answers to them.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import TypeVar

import numpy as np

from ident.estimate.layout import SHORTEST, Layout, Stretch, levelled
from ident.record.segments import Flags, Floats, spans

SMOOTHED = 0.1  # of T + L: over so long the speed is averaged before it is called standing
CLEAR = 4.0  # standard deviations of that average
SLIGHT = 0.01  # of the usual speed: slower is standing in any case
LINGERS = 3.0  # times as long as the speed takes through that band on its way: longer is standing
TURNS = 0.2  # of the usual speed: slower may be noise about standstill
BOTH = 0.05  # of the rows: what each direction must have at least beyond that
BREAKAWAY = 0.4  # of T + L after standstill: over so long the direction of breaking away is seen
LEAD = 4.0  # times T + L of commands kept before each span of motion
MOST_TURNS = 1.0  # in T + L: more is noise about standstill
USUAL = 0.9  # quantile of the speed's size that is called the usual speed

Series = TypeVar("Series", Floats, Flags)


@dataclass(frozen=True, slots=True, eq=False)
class Motion:
    """rows of a layout's stretches together, skipped ones included.

    sense     (rows,), the smoothed speed, absolute;  slow  (rows,), it cannot be told from standstill
    passing   rows that the speed takes through that band on its way;  lag  T + L, s
    """

    sense: Floats
    slow: Flags
    passing: float
    lag: float


def motion(layout: Layout, lag: float) -> Motion | None:
    """How a motor moves, for a plant with T + L = `lag` s; None where it does not turn both ways, or only trembles."""
    absolute = [s.speed + layout.speed_level for s in layout.stretches]
    whole = np.concatenate(absolute)
    usual = float(np.quantile(np.abs(whole), USUAL))
    if min(np.mean(whole > TURNS * usual), np.mean(whole < -TURNS * usual)) < BOTH:
        return None
    width = max(int(SMOOTHED * lag / layout.step), 1)
    sense = np.concatenate([_averaged(part, width) for part in absolute])
    clearly = sense[np.abs(sense) > TURNS * usual]
    if np.count_nonzero(np.diff(clearly > 0.0)) * lag > MOST_TURNS * layout.duration:
        return None
    band = max(CLEAR * noise(whole) / math.sqrt(width), SLIGHT * usual)
    return Motion(sense, np.abs(sense) < band, 2.0 * band / usual * lag / layout.step, lag)


@dataclass(frozen=True, slots=True, eq=False)
class Standing:
    """rows   (rows,), which stand;  toward  (rows,), the direction in which a motor standing there would break away."""

    rows: Flags
    toward: Floats


def lingering(layout: Layout, seen: Motion) -> Standing:
    """Standstill as far as the speed alone tells: slow for longer than it takes to turn round."""
    least = max(int(LINGERS * seen.passing), SHORTEST)
    rows = np.concatenate([_runs_of(part, least) for part in _parts(layout, seen.slow)])
    soon = max(int(BREAKAWAY * seen.lag / layout.step), SHORTEST)
    ahead = [np.cumsum(part[::-1])[::-1] for part in _parts(layout, seen.sense)]
    toward = [np.sign(sums - np.append(sums[soon:], np.zeros(min(soon, len(sums))))) for sums in ahead]
    return Standing(rows, np.concatenate(toward))


def moving(layout: Layout, seen: Motion, standing: Standing) -> Layout | None:
    """The spans of motion, each with some commands of before it; None where too little is left.

    The direction in which one breaks away is that of its skipped rows.
    """
    pieces: list[Stretch] = []
    parts = zip(
        layout.stretches,
        _parts(layout, standing.rows),
        _parts(layout, standing.toward),
        _parts(layout, seen.sense),
        _parts(layout, seen.slow),
        strict=True,
    )
    for stretch, stands, toward, sense, slow in parts:
        whole = replace(stretch, direction=direction(sense))
        for start, stop in spans(~stands).tolist():
            first = max(start, stretch.skip)
            if stop - first < SHORTEST:
                continue
            # Until it is seen to move it is taken to move as it does then, or as it broke away.
            quick = ~slow[first:stop]
            crept = first + (int(np.argmax(quick)) if quick.any() else stop - first - 1)
            if first == stretch.skip:
                pieces.append(_starting(whole.until(stop), crept, float(np.sign(sense[crept])) or 1.0))
                continue
            before = int(np.searchsorted(stretch.time, stretch.time[first] - LEAD * seen.lag))
            pieces.append(_from(whole.until(stop), before, crept - before, first - before, float(toward[first])))
    if sum(p.rows - p.skip for p in pieces) < 2 * SHORTEST:
        return None
    return replace(levelled(tuple(pieces), layout.command_level, layout.speed_level), drifting=layout.drifting)


def direction(speed: Floats) -> Floats:
    """(n,) of motion from each row to the next, -1 to 1: in between where the speed crosses zero on the way.

    The slope changes at the crossing, as friction turns: when it comes is told by the slope before it.
    """
    before = speed - np.concatenate((speed[:1], speed[:-1]))
    ahead = np.append(speed[1:], speed[-1])
    with np.errstate(divide="ignore", invalid="ignore"):
        share = np.clip(np.where(before * speed < 0.0, -speed / before, 0.5), 0.0, 1.0)
    here = np.sign(speed)
    return np.asarray(np.where(here * ahead < 0.0, here * (2.0 * share - 1.0), np.sign(speed + ahead)))


def _parts(layout: Layout, rows: Series) -> list[Series]:
    return np.split(rows, np.cumsum([s.rows for s in layout.stretches])[:-1])


def _starting(stretch: Stretch, row: int, sense: float) -> Stretch:
    assert stretch.direction is not None
    turned = stretch.direction.copy()
    turned[: max(row, 1)] = sense
    return replace(stretch, direction=turned)


def _from(stretch: Stretch, row: int, crept: int, skip: int, sense: float) -> Stretch:
    assert stretch.direction is not None
    turned = stretch.direction[row:].copy()
    turned[:crept] = sense
    return Stretch(
        stretch.row0 + row,
        stretch.time[row:] - stretch.time[row],
        stretch.step,
        stretch.command[row:],
        stretch.speed[row:],
        "free",
        skip,
        stretch.straight,
        stretch.began + float(stretch.time[row]),
        direction=turned,
    )


def _averaged(values: Floats, width: int) -> Floats:
    """Running mean over `width` rows, centred; fewer at the ends."""
    if width == 1:
        return values
    ones = np.ones(min(width, len(values)))
    return np.asarray(np.convolve(values, ones, "same") / np.convolve(np.ones(len(values)), ones, "same"))


def noise(speed: Floats) -> float:
    """Std of the noise from row to row, by the middle of the second differences."""
    return 1.4826 * float(np.median(np.abs(np.diff(speed, 2)))) / math.sqrt(6.0)


def _runs_of(flags: Flags, least: int) -> Flags:
    """Only the runs of at least so many rows."""
    out = np.zeros_like(flags)
    for start, stop in spans(flags).tolist():
        if stop - start >= least:
            out[start:stop] = True
    return out
