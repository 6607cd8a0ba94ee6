"""Broken: spans in which the speed does not answer the command as it does elsewhere in the log.

Two kinds are found. A *stuck* speed repeats one value while the model says it moved. A *load knock* takes the speed
away from the model and gives it back, with no move of the command before it. Fitted with the rest, either would bend
the gain and the time constant; in a live log, where the command always moves, a knock cannot be told from the answer
and is left in.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np

from ident.estimate.layout import Layout, Stretch
from ident.estimate.point import Point
from ident.findings import Finding
from ident.record import Exclusion
from ident.record.segments import Flags, Floats

QUIET = 4.0  # times T + L without a move of the command: what happens then is not its doing
MOVE = 0.05  # of the command's span, that counts as a move
CLEAR = 8.0  # standard deviations of the quiet residual about its recent level
NOTABLE = 0.1  # of the speed's std: a smaller knock bends nothing
BACK = 3.0  # standard deviations within which a knock is over
MOSTLY = 0.08  # of its size, within which it is over too: the fit that it is seen by is bent by it
LONGEST = 6.0  # times T + L: what has not come back by then is a load that stays
STUCK = 20  # equal rows at least, and
ODD = 5.0  # times as many as the speed usually repeats
MOST_SHARE = 0.3  # of the rows: where more seems broken, the model is, not the log

SMOOTHED = 3  # rows
PLACES = 3  # named in a finding

Kind = Literal["sensor-stuck", "load-knock"]
REASONS: dict[Kind, str] = {
    "sensor-stuck": "the speed repeats one value",
    "load-knock": "a load knock moves the speed",
}
NEXT: dict[str, str] = {
    "load-knock": "If they recur, find what loads the motor there before the loop is tuned tighter.",
    "sensor-stuck": "Check the sensor, its cable and what writes the log: a loop on a stuck sensor runs away.",
}


@dataclass(frozen=True, slots=True)
class Span:
    """Rows start..stop-1 of the record; s from and to; the largest distance from the model, speed units."""

    kind: Kind
    start: int
    stop: int
    from_s: float
    to_s: float
    distance: float

    @property
    def exclusion(self) -> Exclusion:
        return Exclusion(self.start, self.stop, REASONS[self.kind])


def broken(layout: Layout, at: Point) -> tuple[Span, ...]:
    """The broken spans about a fitted point, in the order of the log; none where they would be much of it."""
    found: list[Span] = []
    lag = max(int((at.shape.lags + at.L) / layout.step), 1)
    command = np.concatenate([s.command for s in layout.stretches])
    move, notable = MOVE * float(np.ptp(command)), NOTABLE * float(layout.speed.std())
    for s, left in zip(layout.stretches, layout.parts(at.raw), strict=True):
        fitted = s.speed[s.skip :] - left
        found += [
            _span("sensor-stuck", s, a, b, float(np.abs(left[a:b]).max()))
            for a, b in _repeats(s.speed[s.skip :], layout.speed_level)
            if float(np.ptp(fitted[a:b])) > notable
        ]
        found += [
            _span("load-knock", s, a, b, size)
            for a, b, size in _knocks(left, _quiet(s, int(QUIET * lag), move), lag, notable)
        ]
    if sum(f.stop - f.start for f in found) > MOST_SHARE * layout.rows:
        return ()
    return tuple(sorted(found, key=lambda f: f.start))


def told(spans_found: tuple[Span, ...], unit: str) -> tuple[Finding, ...]:
    """One finding a kind, with the places."""
    out = []
    for kind, what in (
        ("load-knock", "the speed leaves the command's answer and comes back with no move of the command before it"),
        ("sensor-stuck", "the speed repeats one value while the command says that it moved"),
    ):
        own = [s for s in spans_found if s.kind == kind]
        if not own:
            continue
        places = ", ".join(f"{s.from_s:.4g} to {s.to_s:.4g} s" for s in own[:PLACES])
        places += f" and {len(own) - PLACES} more" if len(own) > PLACES else ""
        worst = max(s.distance for s in own)
        out.append(
            Finding(
                kind,
                "warning",
                f"From {places} {what} (by up to {worst:.3g} {unit or 'speed units'}). These rows were left out of the "
                "fit. " + NEXT[kind],
                {"count": len(own), "from_s": own[0].from_s, "to_s": own[0].to_s, "largest": worst},
            )
        )
    return tuple(out)


def _span(kind: Kind, s: Stretch, start: int, stop: int, distance: float) -> Span:
    first, last = s.skip + start, s.skip + stop - 1
    began = s.began
    return Span(
        kind, s.row0 + first, s.row0 + last + 1, began + float(s.time[first]), began + float(s.time[last]), distance
    )


def _repeats(speed: Floats, level: float) -> list[tuple[int, int]]:
    """Runs of one value, far longer than usual and not at standstill."""
    edges = np.concatenate(([0], np.flatnonzero(np.diff(speed)) + 1, [len(speed)]))
    lengths = np.diff(edges)
    if int(lengths.max()) < STUCK:
        return []  # as in most logs
    least = max(STUCK, ODD * float(np.quantile(lengths, 0.95)))
    still = np.abs(speed[edges[:-1]] + level) <= 0.01 * float(np.abs(speed + level).max())
    long = np.flatnonzero((lengths >= least) & ~still)
    return [(int(edges[i]), int(edges[i + 1])) for i in long]


def _quiet(s: Stretch, rows: int, move: float) -> Flags:
    """(used rows,): the command has kept within a move for so many rows, and the log has them."""
    turned = np.abs(np.diff(s.command, prepend=s.command[:1])) > move
    # A slow ramp moves too: compared with where the command was at the window's start.
    earlier = np.concatenate((np.full(min(rows, s.rows), np.nan), s.command[: max(s.rows - rows, 0)]))
    since = np.arange(s.rows) - np.maximum.accumulate(np.where(turned, np.arange(s.rows), 0))
    with np.errstate(invalid="ignore"):
        return np.asarray(((since >= rows) & (np.abs(s.command - earlier) <= move))[s.skip :])


def _knocks(left: Floats, quiet: Flags, lag: int, notable: float) -> list[tuple[int, int, float]]:
    """First row, row after the last, and size of each knock among residuals (used rows,)."""
    n = len(left)
    if int(quiet.sum()) < 4 * SMOOTHED or n < 2 * lag + SMOOTHED:
        return []
    smooth = np.convolve(left, np.full(SMOOTHED, 1.0 / SMOOTHED), "same")
    total = np.concatenate(([0.0], np.cumsum(left)))
    back = np.maximum(np.arange(n) - lag, 0)
    level = (total[np.arange(n)] - total[back]) / np.maximum(np.arange(n) - back, 1)
    away = smooth - level
    std = 1.4826 * float(np.median(np.abs(away[quiet])))
    onsets = quiet & (np.abs(away) > max(CLEAR * std, notable))
    calm = max(lag // 2, SMOOTHED)  # rows on end within the band that end a knock
    found: list[tuple[int, int, float]] = []
    at = 0
    while (row := _next(onsets, at)) is not None:
        before = float(level[max(row - lag // 2, 0)])
        off = np.abs(smooth - before)
        near = off < max(BACK * std, MOSTLY * float(off[row : row + lag].max()))
        start = row - int(np.argmax(near[row::-1])) if near[: row + 1].any() else row
        settled = np.convolve(near[row:].astype(np.float64), np.ones(calm), "valid") > calm - 0.5
        stop = row + int(np.argmax(settled)) if settled.any() else n
        at = stop + 1
        if stop - start <= LONGEST * lag:
            found.append((start, stop, float(off[start:stop].max())))
    return found


def _next(flags: Flags, start: int) -> int | None:
    ahead = flags[start:]
    return start + int(np.argmax(ahead)) if ahead.any() else None
