"""Curves: what the page draws, thinned so that a million rows stay a drawing."""

from __future__ import annotations

import math

import numpy as np

from ident.estimate import Fit
from ident.evidence.residuals import autocorrelation
from ident.loop.held_plant import held_plant
from ident.loop.sweep import OpenLoop
from ident.record import LoopRecord
from ident.record.segments import Floats
from ident.report.shape import Autocorrelation, Curves, Gappy, Locus, Profile, Series, Trend, TuningReport

BUCKETS = 500  # of the trend; each keeps the rows where command and speed are lowest and highest
LAGS = 40
DIGITS = 6  # significant, against a curve's own size
LOCUS_POINTS = 240


def curves(
    record: LoopRecord,
    fit: Fit | None,
    tunings: tuple[TuningReport, ...],
    *,
    period: float,
    compute_delay: float,
    installed: OpenLoop | None = None,
) -> Curves:
    """All curves of a report; without a fit the trend alone.

    installed   the loop of the fitted plant with the controller in the machine, where that is known
    """
    if fit is None:
        return Curves(_trend(record, None))
    plant = held_plant(fit.model, period, compute_delay)
    residual = (record.speed - fit.simulated)[~np.isnan(fit.simulated)]
    return Curves(
        trend=_trend(record, fit),
        autocorrelation=_autocorrelation(residual),
        profile=_profile(fit),
        loci=tuple(
            _locus(i, fit, OpenLoop(plant, tuning.settings), period=period, compute_delay=compute_delay)
            for i, tuning in enumerate(tunings)
        ),
        installed=None
        if installed is None
        else _locus(None, fit, installed, period=period, compute_delay=compute_delay),
    )


def _trend(record: LoopRecord, fit: Fit | None) -> Trend:
    rows: list[int] = []
    breaks: list[int] = []  # positions after which the line is interrupted
    for s in record.segments:
        rows += _kept(record, s.start, s.stop)
        breaks.append(len(rows))
    index = np.array(rows, dtype=int)

    def drawn(values: Floats) -> Gappy:
        shown = _rounded(values[index])
        out: list[float | None] = shown.tolist()
        for gap in np.flatnonzero(np.isnan(shown)).tolist():
            out[gap] = None
        for at in reversed(breaks[:-1]):
            out.insert(at, None)
        return tuple(out)

    time = _rounded(record.time[index], 9).tolist()
    for at in reversed(breaks[:-1]):
        time.insert(at, time[at - 1])
    return Trend(
        time_s=tuple(time),
        setpoint=None if record.setpoint is None else drawn(record.setpoint),
        command=drawn(record.command),
        speed=drawn(record.speed),
        fitted=None if fit is None else drawn(fit.simulated),
        residual=None if fit is None else drawn(record.speed - fit.simulated),
    )


def _kept(record: LoopRecord, start: int, stop: int) -> list[int]:
    """Rows that draw start..stop-1 as all of them would: the extremes of every bucket, first and last row."""
    share = (stop - start) / sum(s.rows for s in record.segments)
    buckets = max(int(BUCKETS * share), 1)
    width = -(-(stop - start) // buckets)
    if width <= 4:
        return list(range(start, stop))
    whole = (stop - start) // width
    kept = [np.arange(start, stop)[[0, -1]]]
    for values in (record.command, record.speed):
        block = values[start : start + whole * width].reshape(whole, width)
        origin = start + width * np.arange(whole)
        kept += [origin + block.argmin(axis=1), origin + block.argmax(axis=1)]
    # The rest that does not fill a bucket is drawn whole.
    kept.append(np.arange(start + whole * width, stop))
    rows: list[int] = np.unique(np.concatenate(kept)).tolist()
    return rows


def _autocorrelation(residual: Floats) -> Autocorrelation:
    r = autocorrelation(residual, min(LAGS, len(residual) // 4))
    return Autocorrelation(
        tuple(range(1, len(r) + 1)), tuple(_rounded(r).tolist()), float(1.96 / math.sqrt(len(residual)))
    )


def _profile(fit: Fit) -> Profile | None:
    if fit.profile is None:
        return None
    return Profile("L", _series(fit.profile.L), _series(fit.profile.ratio, 9), fit.profile.limit, "s")


def _locus(index: int | None, fit: Fit, loop: OpenLoop, *, period: float, compute_delay: float) -> Locus:
    """P C F with hold and delay, from well below to well above the frequency where it crosses 1."""
    delay = fit.model.dead_time + period / 2.0 + compute_delay
    residence = _residence(fit) + period / 2.0 + compute_delay
    centre = 1.0 / max(min(residence, 2.0 * delay), 1e-3 * residence)
    w = np.geomspace(1e-2 * centre, min(1e2 * centre, loop.plant.w_max), LOCUS_POINTS)
    response = loop(w)
    return Locus(
        index,
        _series(w),
        _series(response.real),
        _series(response.imag),
        _series(np.abs(1.0 / (1.0 + response))),
    )


def _residence(fit: Fit) -> float:
    """Average residence time -P'(0)/P(0), s: dead time and lags together."""
    w = 1e-4 / max(fit.model.dead_time, *(e.value for e in fit.parameters.values() if e.unit == "s"), 1e-9)
    turned = np.angle(fit.model.frequency_response(np.array([w])) / fit.model.static_gain)[0]
    return max(float(-turned / w), 1e-9)


def _series(values: Floats, digits: int = DIGITS) -> Series:
    return tuple(_rounded(values, digits).tolist())


def _rounded(values: Floats, digits: int = DIGITS) -> Floats:
    """Rounded to `digits` of the largest value: what a drawing can show."""
    largest = float(np.nanmax(np.abs(values))) if len(values) and not np.isnan(values).all() else 0.0
    if largest == 0.0:
        return values
    rounded: Floats = np.round(values, digits - 1 - math.floor(math.log10(largest)))
    return rounded
