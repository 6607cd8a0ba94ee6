"""Ground: what every fit of a record shares: rows that may be used, the plain first-order fit, the noise's colour."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import Literal

import numpy as np

from ident.errors import NotIdentifiable
from ident.estimate.broken import Span, broken, told
from ident.estimate.by_hand import automatic
from ident.estimate.cells import Cells
from ident.estimate.coloured import coloured
from ident.estimate.columns import rubbed
from ident.estimate.dry_friction import turning
from ident.estimate.layout import Layout, lay_out
from ident.estimate.point import Point
from ident.estimate.refine import refine
from ident.estimate.search import Place, search, settle
from ident.estimate.slow_drift import allow_drift
from ident.estimate.unseen import seen
from ident.evidence.colour import Colour, noise_colour
from ident.evidence.feedback import feedback
from ident.findings import Finding
from ident.record import LoopRecord
from ident.record.segments import Floats

Hold = Literal["zero-order", "linear"]

# Taking the noise's colour into account costs some of the simulated fit: up to 1.4 times its sum of squares in
# simulated loops with slow disturbances. Past this factor the rest is not noise but dynamics that the shape lacks.
WORTH = 2.0
LOOKS = 2  # for broken spans
MOVING = 0.5  # share of rows with a move, above which a command may be smooth
SMOOTH = 0.7  # mean square of the second differences over that of the first; 2 for noise and for steps
TOLERATED = 1.3  # times the held sum of squares, for a smooth command
PLAIN = 0.1  # share of the speed's power left unexplained, below which the whole log is of one plant
AGREE = 2.0  # times the share that the better part of a log leaves unexplained, for more of it to be of the same plant
CLEARLY = 10.0  # fall of n ln(sum of squares) that decides between held and straight


@dataclass(frozen=True, slots=True, eq=False)
class Ground:
    """The layout of a record without the rows that answer to an unknown past, and its plain first-order point.

    window   the cells about that point, at its T, where they are known
    unseen   s of the record from and to which the command moved faster than the log shows, left out
    noticed  what the steps to that point gave rise to notice
    closed   the command answers to the speed, where it is not set by hand
    """

    record: LoopRecord
    layout: Layout
    first: Point
    window: Cells | None = None
    unseen: tuple[float, float] | None = None
    noticed: tuple[Finding, ...] = ()
    closed: bool = False

    @property
    def unexplained(self) -> float:
        """Share of the speed's variance that the point leaves."""
        return self.first.rss / _spread(self.layout.speed)


@dataclass(frozen=True, slots=True, eq=False)
class Found:
    """A point with the layout it was found on and the colour of its noise.

    set_aside   under feedback, but the noise model was given up: the shape leaves more than noise
    """

    layout: Layout
    at: Point
    colour: Colour
    set_aside: bool = False
    unseen: tuple[float, float] | None = None
    noticed: tuple[Finding, ...] = ()


def ground(record: LoopRecord, hold: Hold | None = None) -> Ground:
    """Lay out a record and find its plain least-squares FOPDT.

    hold  what the command did between samples; None: as the data have it

    Raises NotIdentifiable.
    """
    base = _ground(record, hold)
    if hold != "zero-order" and base.unexplained >= PLAIN:
        base = _where_seen(record, base, hold)
    base = _where_whole(base, hold)
    return replace(base, closed=_closed(base.record))


def _closed(record: LoopRecord) -> bool:
    runs = automatic(record)
    return bool(runs) and feedback(*map(list, zip(*runs, strict=True)))


def _where_whole(base: Ground, hold: Hold | None) -> Ground:
    """The ground of the rows that are not broken; found once more with those left out, as they bend the first look."""
    left_out: tuple[Span, ...] = ()
    for _ in range(LOOKS):
        more = broken(base.layout, base.first)
        if not more:
            break
        record = replace(base.record, excluded=(*base.record.excluded, *(s.exclusion for s in more)))
        try:
            shorter = _ground(record, hold)
        except NotIdentifiable:
            break
        left_out = (*left_out, *more)
        base = replace(shorter, unseen=base.unseen)
    noticed = told(tuple(sorted(left_out, key=lambda s: s.start)), base.record.speed_unit)
    return replace(base, noticed=(*base.noticed, *noticed)) if noticed else base


def _where_seen(record: LoopRecord, whole: Ground, hold: Hold | None) -> Ground:
    """The ground of the rows whose command is seen, where they say plainly more than the whole log.

    Rows on both sides of the unseen ones are used together where they agree on the plant, else the better side alone.
    """
    tries = [whole]
    for shorter in seen(record):
        try:
            base = _ground(shorter, hold)
        except NotIdentifiable:
            continue
        left = shorter.excluded[len(record.excluded)]
        span = (float(record.time[left.start]), float(record.time[left.stop - 1]))
        tries.append(replace(base, unseen=span))
    best = min(b.unexplained for b in tries)
    return next(b for b in tries if b.unexplained <= AGREE * best)


def _ground(record: LoopRecord, hold: Hold | None) -> Ground:
    layout = lay_out(record)
    _require_movement(record, layout)
    place = search(layout)
    if any(s.start == "joined" for s in layout.stretches):
        layout, at, window = _leave_out_unknown_past(layout, place)
    else:
        at, window = settle(layout, place)
    plain = at
    layout, at = _between_samples(layout, at, hold)
    layout, at = allow_drift(layout, at)
    base = Ground(record, layout, at, window if at is plain else None)
    rubbing, at, noticed = turning(layout, at, record.command_unit, lambda: _closed(record))
    if at is base.first:
        return replace(base, noticed=noticed)
    return replace(base, layout=rubbing, first=at, window=None, noticed=noticed)


def with_noise(base: Ground, at: Point) -> Found:
    """The plain fit where the loop is open or the noise white; else the fit with a model of the noise.

    In an open loop the plain fit is unbiased whatever the noise's colour, and stays so where the shape is too simple.
    """
    colour = noise_colour(base.layout.parts(at.raw))
    plain = Found(base.layout, at, colour, unseen=base.unseen, noticed=base.noticed)
    if colour.white or not base.closed:
        return plain
    layout, white = coloured(base.layout, at)
    if _spread(white.raw) > WORTH * _spread(at.raw):
        return replace(plain, set_aside=True)
    return replace(plain, layout=layout, at=white, colour=layout.colour)


def on_record(base: Ground, at: Point) -> Floats:
    """(rows of the record,): the simulated response; NaN on rows not used."""
    simulated = np.full(base.record.rows, np.nan)
    for s, left in zip(base.layout.stretches, base.layout.parts(at.raw), strict=True):
        simulated[np.arange(base.record.rows)[s.places][s.skip :]] = s.speed[s.skip :] - left + base.layout.speed_level
    simulated.flags.writeable = False
    return simulated


def friction_on_record(base: Ground, found: Found) -> Floats | None:
    """(rows of the record,): what dry friction adds to the speed; NaN on rows not used. None where none is fitted."""
    layout, at = found.layout, found.at
    if not layout.rubbing:
        return None
    share = np.full(base.record.rows, np.nan)
    added = float(at.nuisance[layout.first_transient - 1]) * rubbed(layout, at.shape)[0]
    for s, own in zip(layout.stretches, layout.parts(added), strict=True):
        share[s.row0 + s.skip : s.row0 + s.rows] = own
    share.flags.writeable = False
    return share


def _spread(values: Floats) -> float:
    deviation = values - values.mean()
    return float(deviation @ deviation)


def _between_samples(layout: Layout, at: Point, hold: Hold | None) -> tuple[Layout, Point]:
    """The command between samples as the caller or the data have it.

    Only a command that moves in most rows can be anything but held. A smooth one is taken as straight unless that
    explains the speed plainly worse: a hold would take half a step of its own out of the dead time, and by chance of
    where the samples fall can even fit a little better for it.
    """
    moves = [np.diff(s.given.command) for s in layout.stretches]
    seldom = float(np.mean(np.concatenate(moves) != 0.0)) < MOVING
    if layout.on_change or hold == "zero-order" or (hold is None and seldom):
        return layout, at
    straight = layout.straightened()
    # A straight command leads a held one by half a step.
    tries = [refine(straight, at.shape, at.L + share * layout.step) for share in (0.5, 0.0)]
    other = min(tries, key=lambda p: p.rss)
    better = layout.rows * math.log(max(at.rss, 1e-300) / max(other.rss, 1e-300))
    if hold == "linear" or better > CLEARLY or (_smooth(moves) and other.rss < TOLERATED * at.rss):
        return straight, other
    return layout, at


def _smooth(moves: list[Floats]) -> bool:
    """Whether the command's moves change little from row to row."""
    turns = np.concatenate([np.diff(m) for m in moves])
    return float(np.mean(turns**2)) < SMOOTH * float(np.mean(np.concatenate(moves) ** 2))


def _require_movement(record: LoopRecord, layout: Layout) -> None:
    for name, unit, series in (
        ("command", record.command_unit, [s.given.command for s in layout.stretches]),
        ("speed", record.speed_unit, [s.speed for s in layout.stretches]),
    ):
        values = np.concatenate(series)
        if float(np.ptp(values)) <= 1e-12 * float(np.abs(values).max()):
            raise NotIdentifiable(
                "not-identifiable",
                f"The {name} never moves, so the log cannot say what the motor does with a command: "
                "log a test in which the command takes at least one clear step and the speed follows.",
                {"constant": name, "unit": unit, "rows": len(values)},
            )


def _leave_out_unknown_past(layout: Layout, place: Place) -> tuple[Layout, Point, Cells | None]:
    """Without the rows that answer to a command before the log; again where L turns out longer."""
    for _ in range(4):
        # A place is good to the resolution of the level that it was found on.
        shorter = layout.skipping(place.L + 2.0 * place.window.step)
        at, window = settle(shorter, place)
        last = shorter.stretches[-1]
        if at.L <= last.time[last.skip] or last.start != "joined":
            break
        place = replace(place, T=at.shape.lags, L=at.L)
    return shorter, at, window
