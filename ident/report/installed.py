"""What the report says of the installed controller: recovered from the log, or as told, and whether the two agree."""

from __future__ import annotations

from ident.errors import Refused
from ident.estimate import Fit, Recovered
from ident.findings import Finding
from ident.loop import Margins, PidSettings, law_loop
from ident.loop.held_plant import held_plant
from ident.loop.margins import loop_margins
from ident.loop.sweep import OpenLoop
from ident.report.shape import Installed
from ident.tune import Predicted, predict

SAME = 0.02  # relative; typed settings are rounded
NORMAL_95 = 1.96
NAMES = ("Kp", "Ti", "Td", "b")
RULES = ("backward", "forward")


def installed_report(
    recovered: Recovered | None, told: PidSettings | None, fitted: Fit | None, *, period: float, compute_delay: float
) -> tuple[Installed | None, list[Finding]]:
    """The installed controller with its margins on the fitted plant; None where neither log nor caller knows it.

    What the log shows comes first; `told` is compared with it.
    """
    loop = installed_loop(recovered, told, fitted, period=period, compute_delay=compute_delay)
    margin = None if loop is None else _margins(loop)
    if recovered is not None:
        readings = {rule: getattr(recovered, rule) for rule in RULES}
        shown = Installed(
            recovered.settings,
            recovered.std,
            margin,
            source="log",
            form=recovered.form,
            filter_on=recovered.filter_on,
            readings={
                rule: {"Kp": reading.Kp, "Ti": reading.Ti} for rule, reading in readings.items() if reading is not None
            },
            period_s=recovered.period_s,
            late_s=recovered.late_s,
            R2=recovered.R2,
            rows=recovered.rows,
        )
        return shown, [*_unlike_log(margin), *(_compared(recovered, told) if told else ())]
    if told is None:
        return None, []
    form = "PID" if told.Td > 0.0 else "PI"
    return Installed(told, dict.fromkeys((*NAMES, "Tf")), margin, source="told", form=form), []


def installed_loop(
    recovered: Recovered | None, told: PidSettings | None, fitted: Fit | None, *, period: float, compute_delay: float
) -> OpenLoop | None:
    """The loop of the fitted plant with the recovered difference equation, else with the settings told."""
    if fitted is None or (recovered is None and told is None):
        return None
    if recovered is not None:
        return law_loop(fitted.model, recovered.law)
    assert told is not None
    return OpenLoop(held_plant(fitted, period, compute_delay), told)


def installed_outcome(shown: Installed, fitted: Fit, period: float, compute_delay: float) -> Predicted | None:
    """Setpoint and load step with the installed settings on the fitted plant, as the proposals have theirs; or None."""
    if shown.settings.Tf > 0.0 and shown.filter_on != "speed, second order" and shown.source == "log":
        return None
    every = shown.period_s or period
    delay = compute_delay if shown.late_s is None else shown.late_s
    try:
        return predict(fitted.model, shown.settings, period=every, compute_delay=delay)
    except Refused:
        return None


def _margins(loop: OpenLoop) -> Margins | None:
    try:
        return loop_margins(loop)
    except Refused:  # the plant's response carries no margins: the settings still stand
        return None


def _unlike_log(margin: Margins | None) -> list[Finding]:
    if margin is None or margin.stable:
        return []
    return [
        Finding(
            "installed-unstable",
            "warning",
            "On the fitted plant the installed controller would be unstable. If the loop did not swing in this log, "
            "the model misses something: believe neither it nor the proposals before a second test.",
        )
    ]


def _compared(recovered: Recovered, told: PidSettings) -> list[Finding]:
    apart = {
        name: (getattr(told, name), getattr(recovered.settings, name))
        for name in NAMES
        if not _same(getattr(told, name), getattr(recovered.settings, name), recovered.std[name])
        and (name != "b" or recovered.std["b"] is not None)
    }
    if not apart:
        return []
    for rule in RULES:
        reading = getattr(recovered, rule)
        if (
            reading
            and set(apart) <= {"Kp", "Ti"}
            and _same(told.Kp, reading.Kp, None)
            and _same(told.Ti, reading.Ti, None)
        ):
            return [
                Finding(
                    "installed-sums-otherwise",
                    "info",
                    f"The settings told as installed are those that the log shows, for a controller that sums the "
                    f"error by the {rule} rule; the report states the trapezoidal reading of the same controller.",
                    {"Kp_told": told.Kp, "Ti_told_s": told.Ti},
                )
            ]
    listed = ", ".join(f"{name} {one:.4g} told, {other:.4g} seen" for name, (one, other) in apart.items())
    return [
        Finding(
            "installed-differs",
            "warning",
            f"The controller in this log is not the one told as installed: {listed}. Correct the settings of the loop, "
            "or find out who changed the machine.",
            {
                key: v
                for name, (one, other) in apart.items()
                for key, v in ((f"{name}_told", one), (f"{name}_seen", other))
            },
        )
    ]


def _same(told: float, seen: float, std: float | None) -> bool:
    return abs(told - seen) <= max(SAME * max(abs(told), abs(seen)), NORMAL_95 * (std or 0.0))
