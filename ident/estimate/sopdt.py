"""The SOPDT fit: two lags, equal lags or an underdamped pair, whichever the log shows.

Estimated in S = T1 + T2 and P = T1 T2, where nothing happens as the lags meet; near there T1 and T2 themselves have
no covariance worth the name, so their intervals are the ends of the likelihood's 95 % region mapped through.
"""

from __future__ import annotations

import math

import numpy as np

from ident.estimate.diagnostics import statistics
from ident.estimate.driven import driven
from ident.estimate.fit import Fit, Spread
from ident.estimate.friction import friction_levels
from ident.estimate.ground import Ground, friction_on_record, on_record, with_noise
from ident.estimate.known import require_known
from ident.estimate.layout import Layout
from ident.estimate.noticed import findings
from ident.estimate.point import Point
from ident.estimate.refine import refine
from ident.estimate.search import leading_part, says_plainly
from ident.estimate.second_order import SecondOrder
from ident.estimate.start import thinning
from ident.estimate.uncertainty import (
    Uncertainty,
    covariance_of,
    dead_time_estimate,
    log_estimate,
    uncertainty,
)
from ident.estimate.units import gain_rate_unit, gain_unit
from ident.estimate.validation import validation_fit
from ident.evidence.colour import inverse_gram
from ident.evidence.estimates import NORMAL_95, Estimate
from ident.plants import Sopdt, UnderdampedSopdt
from ident.record.segments import Floats

# Shares of the first-order fit's dead time kept, and P/S^2 of the rest: unlike lags, like ones, and pairs that ring a
# little and more (damping ratios 0.7 and 0.35).
DELAYS = (0.0, 0.5, 0.9)
RATIOS = (0.05, 0.2, 0.5, 2.0)
TRIED = 2  # best starts descended
ROUGHLY = 1e-2  # of one residual's variance: enough to choose between them
EQUAL = 3.84  # of a residual's variance: less than this in the sum of squares does not tell lags from equal ones
FAR = 4.0  # times EQUAL, by the slopes or by the coarse rows alone: plainly not equal
CLOSELY = 1e-4  # of one residual's variance: a hundredth of a standard deviation
ANGLES = 720


def fit_sopdt(base: Ground) -> Fit:
    """Least-squares SOPDT. Raises NotIdentifiable where neither its gain nor K/(T1 + T2) comes out."""
    coarse = _coarse(base)
    rough = _search(base, coarse)
    found = with_noise(base, _equal_if_untold(base, _refined(base, coarse, rough), coarse, rough))
    layout, at = found.layout, found.at
    shape = at.shape
    assert isinstance(shape, SecondOrder)
    known = uncertainty(layout, at, found.colour)
    K_std, L_std = (math.sqrt(max(float(known.log_covariance[i, i]), 0.0)) for i in (0, -1))
    require_known(found, known)
    model, times, slopes = _plant(at, shape, known)
    parameters = {
        "K": log_estimate(at.K, K_std, gain_unit(base.record)),
        **times,
        "L": dead_time_estimate(at.L, L_std, None),
    }
    derived = {
        "K/(T1 + T2)": log_estimate(at.K / shape.S, known.std_log_ratio(), gain_rate_unit(base.record)),
        "T1 + T2": log_estimate(shape.S, math.sqrt(max(float(known.log_covariance[1, 1]), 0.0)), "s"),
    }
    figures = statistics(layout, at, found.colour, validation_fit(layout, at))
    return Fit(
        name="sopdt",
        model=model,
        parameters=parameters,
        derived=derived,
        covariance=covariance_of(tuple(parameters), slopes, known),
        friction=friction_levels(layout, at, found.colour, base.record.command_unit),
        statistics=figures,
        findings=findings(found, parameters, derived, figures),
        simulated=on_record(base, at),
        profile=None,
        spread=Spread(at.shape, known.log_covariance),
        driven=driven(base, found),
        noise=found.colour,
        friction_speed=friction_on_record(base, found),
    )


def _coarse(base: Ground) -> Layout:
    """Block means of the rows, the first of them alone where those are enough."""
    even = base.layout.evened()
    coarse = even.thinned(thinning(even))
    head = leading_part(coarse)
    return head if head is not None and says_plainly(head, 1.0 - base.unexplained) else coarse


def _search(base: Ground, coarse: Layout) -> Point:
    """The best of a few starts around the first-order fit, descended on the coarse rows."""
    total = base.first.shape.lags + base.first.L
    delays = sorted({delay * base.first.L for delay in DELAYS})
    starts = [(SecondOrder(total - L, ratio * (total - L) ** 2), L) for L in delays for ratio in RATIOS]
    starts.sort(key=lambda start: _unexplained(coarse, *start))
    return min((refine(coarse, shape, L, ROUGHLY) for shape, L in starts[:TRIED]), key=lambda p: p.rss)


def _refined(base: Ground, coarse: Layout, rough: Point) -> Point:
    """The same on every row."""
    # A mean of rows stands half a block later than its first row, at which its command begins.
    return refine(base.layout, rough.shape, rough.L + 0.5 * (coarse.step - base.layout.step), CLOSELY)


def _unexplained(layout: Layout, shape: SecondOrder, L: float) -> float:
    """Sum of squares that gain and offset leave of the speed."""
    answer = np.concatenate([shape.response(s, L)[0] for s in layout.stretches])
    answer = answer - answer.mean()
    speed = layout.speed - layout.speed.mean()
    size = float(answer @ answer)
    return float(speed @ speed) - (float(answer @ speed) ** 2 / size if size > 0.0 else 0.0)


def _equal_if_untold(base: Ground, at: Point, coarse: Layout, rough: Point) -> Point:
    """Equal lags in place of nearly equal or faintly ringing ones that the sum of squares does not tell from them."""
    S = at.shape.lags
    assert isinstance(at.shape, SecondOrder)
    # How far P is from equal lags, in the units of its logarithm's standard deviation; a small P acts linearly.
    ratio = S * S / (4.0 * at.shape.P)
    apart = ratio - 1.0 if ratio > 1.0 else math.log(ratio)
    information = inverse_gram(at.gram)[2, 2]
    if apart**2 > FAR * EQUAL * information * at.rss / base.layout.rows:
        return at
    lags = SecondOrder(S, S * S / 4.0, True)
    # Most that are plainly unlike are so in the coarse rows already.
    if refine(coarse, lags, rough.L, ROUGHLY).rss - rough.rss > FAR * EQUAL * rough.rss / coarse.rows:
        return at
    equal = refine(base.layout, lags, at.L)
    return equal if equal.rss - at.rss <= EQUAL * at.rss / base.layout.rows else at


def _plant(
    at: Point, shape: SecondOrder, known: Uncertainty
) -> tuple[Sopdt | UnderdampedSopdt, dict[str, Estimate], Floats]:
    """The plant, the estimates of its time constants, and slopes of (K, the two, L) in the logarithms."""
    S, P = shape.S, shape.P
    root = S * S / 4.0 - P
    slopes = np.zeros((4, len(known.log_covariance)))
    slopes[0, 0], slopes[3, -1] = at.K, 1.0
    if shape.equal or abs(root) <= 1e-9 * S * S:
        slopes[1, 1] = slopes[2, 1] = S / 2.0
        std = math.sqrt(max(float(known.log_covariance[1, 1]), 0.0))
        lag = log_estimate(S / 2.0, std, "s")
        return Sopdt(at.K, S / 2.0, S / 2.0, at.L), {"T1": lag, "T2": lag}, slopes
    if root < 0.0:
        w0, zeta = 1.0 / math.sqrt(P), S / (2.0 * math.sqrt(P))
        slopes[1, 2], slopes[2, 1], slopes[2, 2] = -w0 / 2.0, zeta, -zeta / 2.0
        stds = [math.sqrt(max(float(s @ known.log_covariance @ s), 0.0)) for s in slopes[1:3]]
        times = {"w0": log_estimate(w0, stds[0] / w0, "rad/s"), "zeta": log_estimate(zeta, stds[1] / zeta, "1")}
        return UnderdampedSopdt(at.K, w0, zeta, at.L), times, slopes
    T1 = S / 2.0 + math.sqrt(root)
    T2 = P / T1
    lows, highs = _region(S, P, known)
    gap = T1 - T2
    # dT/dS at fixed P, dT/dP at fixed S, in the logarithms.
    slopes[1, 1], slopes[1, 2] = T1 * S / gap, -P / gap
    slopes[2, 1], slopes[2, 2] = -T2 * S / gap, P / gap
    times = {
        name: Estimate(value, (high - low) / (2.0 * NORMAL_95), (low, high), "s")
        for name, value, low, high in zip(("T1", "T2"), (T1, T2), lows, highs, strict=True)
    }
    return Sopdt(at.K, T1, T2, at.L), times, slopes


def _region(S: float, P: float, known: Uncertainty) -> tuple[list[float], list[float]]:
    """Ends of T1 and T2 over the ellipse where each alone would be at its 95 % limit."""
    values, vectors = np.linalg.eigh(known.log_covariance[1:3, 1:3])
    angle = np.linspace(0.0, 2.0 * np.pi, ANGLES, endpoint=False)
    steps = vectors @ (np.sqrt(np.maximum(values, 0.0))[:, None] * np.stack((np.cos(angle), np.sin(angle))))
    # Beyond e^50 a time constant is unknown in any unit.
    half, product = (
        value * np.exp(np.clip(NORMAL_95 * s, -50.0, 50.0)) for value, s in zip((S / 2.0, P), steps, strict=True)
    )
    root = np.sqrt(np.maximum(half * half - product, 0.0))  # complex pairs count as equal lags
    T1 = half + root
    T2 = np.where(root > 0.0, product / T1, half)
    return [float(T1.min()), float(T2.min())], [float(T1.max()), float(T2.max())]
