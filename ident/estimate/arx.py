"""The ARX fit: linear least squares of the one-step prediction, judged by its simulated response."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from ident.errors import NotIdentifiable, Refused
from ident.estimate.arx_noticed import findings
from ident.estimate.arx_worth import statistics
from ident.estimate.equation import Equation, fit_equation
from ident.estimate.fit import DeadTimeProfile, Fit
from ident.estimate.lagged import Runs, even_runs
from ident.estimate.orders import Orders, search_orders
from ident.evidence.estimates import NORMAL_95, Covariance, Estimate
from ident.record import LoopRecord
from ident.record.segments import Floats

# The command's part of the equation, in its own standard deviations. Over all orders and delays of the search pure
# noise reaches four or five.
CLEAR = 6.0
HIGHEST = 100  # order or delay that a caller may ask for: beyond it the step of the log is too short


def fit_arx(record: LoopRecord, orders: Sequence[int] | None = None) -> Fit:
    """Least-squares ARX model of a record, at given orders or at those with the least BIC.

    orders  (na, nb, delay), na >= 0, nb and delay >= 1; None: na, nb 1..4 and delay 1..21 are searched

    Raises NotIdentifiable: irregular-sampling, too-short, or not-identifiable where command or speed never moves,
    the speed does not answer, the record cannot tell the coefficients apart or the equation comes out unstable;
    Refused: orders-out-of-range.
    """
    asked = None if orders is None else _orders(orders)
    runs = even_runs(record)
    found = search_orders(runs) if asked is None else None
    na, nb, delay = asked or (found.na, found.nb, found.delay)  # type: ignore[union-attr]
    fitted = fit_equation(runs, na, nb, delay)
    _require_answer(fitted)
    _require_stable(fitted)
    simulated = [fitted.simulate(r) for r in runs.runs]
    figures = statistics(runs, fitted, simulated, searched=found is not None)
    profile = _delay_profile(found, runs.step) if found and not fitted.exact else None
    y, u = (_bare(record.speed_unit or "speed"), _bare(record.command_unit or "command"))
    return Fit(
        name="arx",
        model=fitted.model,
        parameters=_parameters(fitted, f"{y}/{u}"),
        derived={
            "K": gain(fitted, f"{y}/{u}"),
            "T_r": residence_time(fitted),
            "L": _dead_time(fitted, profile),
        },
        covariance=Covariance(_names(fitted), tuple(tuple(float(v) for v in row) for row in fitted.covariance)),
        friction=None,
        statistics=figures,
        findings=findings(runs, found, figures),
        simulated=_on_record(record, runs, simulated),
        profile=profile,
    )


def _orders(orders: Sequence[int]) -> tuple[int, int, int]:
    try:
        na, nb, delay = (int(v) if v == int(v) else -1 for v in orders)
    except (TypeError, ValueError, OverflowError):
        na = nb = delay = -1
    if not (0 <= na <= HIGHEST and 1 <= nb <= HIGHEST and 1 <= delay <= HIGHEST):
        raise Refused(
            "orders-out-of-range",
            "ARX orders are three whole numbers (na, nb, delay): na from 0, nb and delay from 1, none above "
            f"{HIGHEST}.",
            {"orders": str(orders)},
        )
    return na, nb, delay


def _require_answer(fitted: Equation) -> None:
    if fitted.exact:
        return
    b, na = np.array(fitted.model.b), len(fitted.model.a)
    clear = math.sqrt(max(float(b @ np.linalg.pinv(fitted.covariance[na:, na:], hermitian=True) @ b), 0.0))
    if clear < CLEAR:
        raise NotIdentifiable(
            "not-identifiable",
            "The speed does not answer to the command by clearly more than its noise. Log a larger or longer step of "
            "the command.",
            {"response_in_stds": clear},
        )


def _require_stable(fitted: Equation) -> None:
    if not fitted.model.stable:
        raise NotIdentifiable(
            "not-identifiable",
            "The fitted ARX equation is unstable, as happens where the plant integrates or noise has the larger part: "
            "it can be neither simulated nor tuned. Take a first-order model, or log a longer test.",
            {"largest_pole": max(abs(z) for z in fitted.model.poles)},
        )


def _names(fitted: Equation) -> tuple[str, ...]:
    return (
        *(f"a{i}" for i in range(1, len(fitted.model.a) + 1)),
        *(f"b{i}" for i in range(1, len(fitted.model.b) + 1)),
    )


def _parameters(fitted: Equation, gain_unit: str) -> dict[str, Estimate]:
    stds = np.sqrt(np.maximum(np.diag(fitted.covariance), 0.0))
    return {
        name: _normal(float(value), float(std), "" if name[0] == "a" else gain_unit)
        for name, value, std in zip(_names(fitted), fitted.coefficients, stds, strict=True)
    }


def gain(fitted: Equation, unit: str) -> Estimate:
    """Static gain sum(b)/(1 + sum(a)); its interval is Fieller's, open where the equation may integrate.

    (Fieller 1954, J. R. Stat. Soc. B 16, 175-185: the interval of a ratio of two normal estimates.)
    """
    na = len(fitted.model.a)
    above, below = sum(fitted.model.b), 1.0 + sum(fitted.model.a)
    V = fitted.covariance
    v_above, v_below, v_both = float(V[na:, na:].sum()), float(V[:na, :na].sum()), float(V[na:, :na].sum())
    z = NORMAL_95**2
    bounded = below**2 - z * v_below
    value = fitted.model.static_gain
    if bounded <= 0.0 or not math.isfinite(value):
        return Estimate(value, None, (None, None), unit)
    middle = above * below - z * v_both
    reach = math.sqrt(max(middle**2 - bounded * (above**2 - z * v_above), 0.0))
    std = math.sqrt(max(v_above - 2.0 * value * v_both + value**2 * v_below, 0.0)) / abs(below)
    return Estimate(value, std, ((middle - reach) / bounded, (middle + reach) / bounded), unit)


def residence_time(fitted: Equation) -> Estimate:
    """Average residence time -P'(0)/P(0), s, the hold's half sample left out: T + L of a first-order plant."""
    model, h = fitted.model, fitted.model.h
    a, b = np.array(model.a), np.array(model.b)
    lag_a, lag_b = np.arange(1, len(a) + 1), model.delay + np.arange(len(b))
    above, below = float(b.sum()), 1.0 + float(a.sum())
    if above == 0.0 or below == 0.0:
        return Estimate(math.inf, None, (None, None), "s")
    at_b, at_a = float(lag_b @ b) / above, float(lag_a @ a) / below
    slope = h * np.concatenate((-(lag_a - at_a) / below, (lag_b - at_b) / above))
    return _normal(h * (at_b - at_a - 0.5), math.sqrt(max(float(slope @ fitted.covariance @ slope), 0.0)), "s")


def _delay_profile(found: Orders, h: float) -> DeadTimeProfile:
    ratio = found.over_delay / found.over_delay.min()
    return DeadTimeProfile(
        np.asarray(h * np.arange(len(ratio)), dtype=np.float64), ratio, math.exp(NORMAL_95**2 / found.rows)
    )


def _dead_time(fitted: Equation, profile: DeadTimeProfile | None) -> Estimate:
    """(delay - 1) h. A plant with this delay has a dead time between (delay - 1) h and delay h: the interval holds
    those of all delays that the search could not exclude; a delay that the caller gave has none."""
    L = fitted.model.dead_time
    if profile is None:
        return Estimate(L, None, (None, None), "s")
    allowed = profile.L[profile.ratio <= profile.limit]
    return Estimate(L, None, (min(float(allowed[0]), L), max(float(allowed[-1]), L) + fitted.model.h), "s")


def _normal(value: float, std: float, unit: str) -> Estimate:
    return Estimate(value, std, (value - NORMAL_95 * std, value + NORMAL_95 * std), unit)


def _bare(unit: str) -> str:
    """A unit that may stand beside a solidus: compound ones go into brackets."""
    return f"({unit})" if any(sign in unit for sign in "/ ·*") else unit


def _on_record(record: LoopRecord, runs: Runs, simulated: list[Floats]) -> Floats:
    out = np.full(record.rows, np.nan)
    for run, speeds in zip(runs.runs, simulated, strict=True):
        out[run.row0 : run.row0 + run.rows] = speeds + runs.speed_level
    out.flags.writeable = False
    return out
