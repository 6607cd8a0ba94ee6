"""Information: does what was moved on purpose tell enough of the plant to tune from?

The widths are those of 95 % intervals, from the information matrix of the driven movement alone with the noise as seen.
Wider than the limits, a gain could be half or double: no setting is worth deriving from that.
"""

from __future__ import annotations

from ident.errors import NotIdentifiable
from ident.estimate import Driven, Fit
from ident.evidence.estimates import NORMAL_95
from ident.findings import Finding

# Half-widths: of K (or of K/T, where the plant integrates within the log) and T over their values, of L over T + L.
LIMITS = {"K": 0.5, "T": 1.0, "L": 0.5}
PLAIN = 80.0  # % of simulated fit from which an unlogged setpoint may have moved: load noise alone seldom comes so far

MOVE_IT = (
    "Move the setpoint by a clear step, wait until the speed has settled, and move it back, twice; "
    "or switch to manual and move the command so."
)


def too_little(fit: Fit) -> NotIdentifiable | None:
    """Why a fit is not to be believed although it came out, or None where it is."""
    told = fit.driven
    if told is None or told.moved_by == "command":
        return None
    if told.moved_by == "unknown":
        shown = fit.statistics.fit_percent
        if shown is None or shown >= PLAIN:
            return None
        return NotIdentifiable(
            "not-identifiable",
            "The command answers to the speed, and no setpoint is in the log: what moved here may be load and noise "
            f"alone, from which no model can be trusted. Log the setpoint too. {MOVE_IT}",
            {"fit_percent": shown},
        )
    if told.moved_by == "nothing":
        return NotIdentifiable(
            "not-identifiable",
            "The loop is closed and its setpoint does not move, or not so that the command shows it: that "
            f"answers to load, noise or its own swinging, from which no model can be trusted. {MOVE_IT}",
            {"moved_by": "nothing"},
        )
    widths = relative_widths(fit, told)
    wide = [name for name, width in widths.items() if width > LIMITS[name]]
    if not wide:
        return None
    return NotIdentifiable(
        "not-identifiable",
        "The setpoint moves too little for this log's noise: its moves alone would tell "
        + ", ".join(
            f"{name} to {100 * min(widths[name], 99.0):.0f} % (limit {100 * LIMITS[name]:.0f})" for name in wide
        )
        + f". {MOVE_IT}",
        {f"width_{name}": min(width, 1e9) for name, width in widths.items()},
    )


def relative_widths(fit: Fit, told: Driven) -> dict[str, float]:
    """Half-widths of the 95 % intervals from the driven movement: of K or K/T, T, and L over T + L."""
    assert told.stds is not None
    K, K_per_T, T, L = told.stds
    whole = sum(float(fit.parameters[name].value) for name in fit.parameters if name in ("T", "T1", "T2", "L"))
    if "w0" in fit.parameters:
        whole += 2.0 * fit.parameters["zeta"].value / fit.parameters["w0"].value
    integrates = K_per_T < K
    return {
        "K": NORMAL_95 * min(K, K_per_T),
        "T": 0.0 if integrates and K > LIMITS["K"] / NORMAL_95 else NORMAL_95 * T,
        "L": NORMAL_95 * L / whole,
    }


def unlogged_setpoint(fit: Fit) -> tuple[Finding, ...]:
    """What to say of a model whose setpoint was not logged."""
    if fit.driven is None or fit.driven.moved_by != "unknown":
        return ()
    return (
        Finding(
            "setpoint-not-logged",
            "warning",
            "The command seems to answer to the speed, but no setpoint is in the log, so it cannot be told what was "
            "moved on purpose. Log the setpoint too, or say which rows are manual.",
        ),
    )
