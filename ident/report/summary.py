"""summary: a report as text that can be read at the machine."""

from __future__ import annotations

import math
from collections.abc import Iterator

from ident.evidence import Estimate
from ident.findings import Finding
from ident.realise import Realisations
from ident.report.shape import FitReport, Installed, Report, TuningReport


def summary(report: Report) -> str:
    """The report in plain lines: model, statistics, settings, margins, findings, cautions."""
    return "\n".join(_lines(report)) + "\n"


def _lines(report: Report) -> Iterator[str]:
    log = report.log
    step = "irregular" if log.sample_time_s is None else f"every {log.sample_time_s:.4g} s"
    yield f"Log         {log.rows} rows, {log.duration_s:.6g} s, {step}, {report.record.operation}"
    if log.start:
        yield f"            {log.start} to {log.end}"
    if len(report.record.operations) > 1:
        parts = (f"{s.note} {s.start_s:.4g} to {s.end_s:.4g} s" for s in report.record.operations)
        yield f"            {', '.join(parts)}"
    for role, header in log.columns.items():
        yield f"            {role:<9} from column {header!r}"
    if report.selected is None:
        yield ""
        yield f"No model    {report.record.excitation.reason}"
        if report.record.advice:
            yield f"Next test   {report.record.advice.message}"
    else:
        yield from _model(report.fits[report.selected], report)
    for i, tuning in enumerate(report.tunings):
        yield from _tuning(tuning, report, recommended=i == report.recommended)
    if report.installed:
        yield from _installed(report.installed, report)
    if report.recommended_because:
        yield ""
        yield f"Why         {report.recommended_because}"
    yield from _findings(report)
    yield ""
    yield "Cautions"
    yield from (f"  - {caution}" for caution in report.cautions)


def _model(fit: FitReport, report: Report) -> Iterator[str]:
    yield ""
    yield f"Model       {_formula(fit)}"
    for name, estimate in (fit.parameters | fit.derived).items():
        yield f"  {name:<9} {quantity(estimate)}"
    s = fit.statistics
    percent = "not defined" if s.fit_percent is None else f"{s.fit_percent:.2f} %"
    held_out = (
        "no held-out span moves"
        if s.validation_fit_percent is None
        else f"{s.validation_fit_percent:.2f} % on rows it was not fitted to"
    )
    yield f"  fit       {percent} (NRMSE of the simulated response); {held_out}"
    if len(report.fits) > 1:
        yield f"  chosen    {report.selected_because}"
    for check in report.cross_checks:
        yield f"  checked   by {check.method}: step responses agree to {check.agreement_percent:.1f} %"
    yield f"  residual  {s.rms_residual:.4g} {report.log.speed_unit} rms over {s.rows_used} rows"


def _formula(fit: FitReport) -> str:
    if "T" in fit.parameters:
        return "K exp(-L s)/(T s + 1)"
    if "T1" in fit.parameters:
        return "K exp(-L s)/((T1 s + 1)(T2 s + 1))"
    if "zeta" in fit.parameters:
        return "K w0^2 exp(-L s)/(s^2 + 2 zeta w0 s + w0^2)"
    return fit.model


def _tuning(tuning: TuningReport, report: Report, *, recommended: bool) -> Iterator[str]:
    s, m = tuning.settings, tuning.margins
    unit = f"{report.log.command_unit or 'command'}/{report.log.speed_unit or 'speed'}"
    yield ""
    yield f"Settings    {tuning.method}, {tuning.form}{'   << recommended' if recommended else ''}"
    yield f"  Kp {s.Kp:.5g} {unit}   Ti {s.Ti:.5g} s   Td {s.Td:.5g} s   Tf {s.Tf:.5g} s   b {s.b:.3g}"
    if not m.stable:
        yield "  the loop would be unstable"
        return
    yield (
        f"  Ms {_number(m.Ms)}   Mt {_number(m.Mt)}   gain margin {_number(m.gain_margin)}   "
        f"phase margin {_number(m.phase_margin_deg)} deg   delay margin {_number(m.delay_margin_s)} s"
    )
    if recommended and tuning.realisations is not None:
        yield from _to_set(tuning.realisations)
    if tuning.worst_case:
        w = tuning.worst_case
        yield (
            f"  over {w.plants} plants that the log allows: Ms {_number(w.Ms_median)} (median), "
            f"{_number(w.Ms_p95)} (95 %), unstable on {100.0 * w.unstable_share:.1f} %"
        )
    if tuning.predicted:
        step, load = tuning.predicted.setpoint_step, tuning.predicted.load_step
        yield (
            f"  setpoint step: overshoot {step.overshoot_percent:.1f} %, settled in {_number(step.settling_time_s)} s; "
            f"unit load step: peak {load.peak_deviation:.4g} {report.log.speed_unit}, "
            f"back in {_number(load.recovery_time_s)} s"
        )


def _installed(one: Installed, report: Report) -> Iterator[str]:
    s, m = one.settings, one.margins
    unit = f"{report.log.command_unit or 'command'}/{report.log.speed_unit or 'speed'}"
    yield ""
    yield f"Installed   {one.form}, {'as the log shows' if one.source == 'log' else 'as told'}"
    yield f"  Kp {s.Kp:.5g} {unit}   Ti {s.Ti:.5g} s   Td {s.Td:.5g} s   Tf {s.Tf:.5g} s   b {s.b:.3g}"
    if m is not None:
        yield (
            f"  Ms {_number(m.Ms)}   Mt {_number(m.Mt)}   gain margin {_number(m.gain_margin)}   "
            f"phase margin {_number(m.phase_margin_deg)} deg"
            if m.stable
            else "  unstable on the fitted plant"
        )


def _to_set(made: Realisations) -> Iterator[str]:
    """The numbers to type, by what the controller asks for."""
    forms = made.forms
    yield f"  to type     ideal: Kp {forms.ideal.Kp:.5g}, {forms.resets_per_minute:.4g} resets per minute"
    parallel = forms.parallel
    yield (
        f"              parallel: Kp {parallel.Kp:.5g}, ki {parallel.ki:.5g} (Kp's unit per s), "
        f"kd {parallel.kd:.5g} (Kp's unit times s)"
    )
    if forms.series is None:
        yield f"              series: none. {forms.series_because}"
    else:
        s = forms.series
        yield f"              series: Kc {s.Kc:.5g}, tauI {s.tauI:.5g} s, tauD {s.tauD:.5g} s"
    for coded in made.digital:
        one = coded.digital
        num = " ".join(f"{v:.8g}" for v in one.velocity.num)
        den = " ".join(f"{v:.8g}" for v in one.velocity.den[1:])
        past = f", past moves {den}" if den else ""
        yield f"              code ({one.rule}, every {one.h:.4g} s): move of the command, errors {num}{past}"
        if coded.margins is not None:
            yield f"                exact sampled loop: Ms {_number(coded.margins.Ms)}"
    if made.digital:
        yield f"              {made.digital[0].digital.bumpless}"


def _findings(report: Report) -> Iterator[str]:
    found: list[Finding] = [*report.log.findings, *report.findings]
    if report.selected is not None:
        found += report.fits[report.selected].findings
    for tuning in report.tunings:
        found += tuning.findings
    if found:
        yield ""
        yield "Findings"
        yield from (f"  {f.severity:<8} {f.code}: {f.message}" for f in found)


def quantity(estimate: Estimate) -> str:
    """Value and 95 % interval with the decimals that the standard deviation supports."""
    if estimate.std is None or estimate.std <= 0.0:
        digits = 4 - _exponent(estimate.value)
    else:
        digits = 1 - _exponent(estimate.std)
    digits = min(max(digits, 0), 12)
    low, high = (("open" if v is None else f"{v:.{digits}f}") for v in estimate.ci95)
    return f"{estimate.value:.{digits}f} {estimate.unit}   95 %: {low} to {high}"


def _exponent(value: float) -> int:
    return math.floor(math.log10(abs(value))) if value else 0


def _number(value: float | None) -> str:
    return "-" if value is None else f"{value:.4g}"
