"""The report: what `ident.analyse` returns and what the service serialises, key by key.

Arrays are tuples here, so that the dataclasses serialise as they stand and two reports can be compared.
What is not known is None or (); times are s, frequencies rad/s unless a key says otherwise.
"""

from __future__ import annotations

from dataclasses import dataclass, field

from ident.estimate import Friction
from ident.evidence import Covariance, Estimate, Statistics
from ident.findings import Finding
from ident.judge import Advice, CrossCheck, Excitation, Operation
from ident.loop import Margins, PidSettings
from ident.realise import Realisations
from ident.tune import LimitedOutcome, Predicted, Rule, WorstCase

REPORT_VERSION = "1"

Series = tuple[float, ...]
Gappy = tuple[float | None, ...]  # None where a segment ends


@dataclass(frozen=True, slots=True)
class LogInfo:
    """The log as it was read."""

    sha256: str | None
    rows: int
    start: str | None
    end: str | None
    duration_s: float
    sample_time_s: float | None
    speed_unit: str
    command_unit: str
    columns: dict[str, str]
    findings: tuple[Finding, ...]


@dataclass(frozen=True, slots=True)
class Span:
    """Part of the record in time, and why it stands out."""

    start_s: float
    end_s: float
    rows: int
    note: str


@dataclass(frozen=True, slots=True)
class RecordInfo:
    """What kind of record the log became.

    operation    of the whole: closed-loop where any part is;  operations  part by part, the `note` saying which
    """

    operation: Operation
    excitation: Excitation
    advice: Advice | None
    segments: tuple[Span, ...]
    operations: tuple[Span, ...]
    excluded: tuple[Span, ...]


@dataclass(frozen=True, slots=True)
class FitReport:
    """One fitted model. `derived` holds what follows from the parameters, such as K/T.

    spread  what plausible plants are drawn from: the covariance of log K, the logarithms of the times (T; S = T1 + T2
            and P = T1 T2, P left out where the lags are equal) and L
    """

    model: str  # fopdt | sopdt | arx
    parameters: dict[str, Estimate]
    derived: dict[str, Estimate]
    covariance: Covariance
    friction: Friction | None
    statistics: Statistics
    findings: tuple[Finding, ...]
    spread: Covariance | None = None


@dataclass(frozen=True, slots=True)
class TuningReport:
    """One proposal: settings, the margins they have, the predicted outcome, and what to type for them.

    realisations  with coefficients for the recommended proposal alone
    limited       a setpoint step as large as the log's own within the command's limits; None where those are not known
    on_other_fits max(Ms, Mt) of these settings on the fits that were not selected, by model; None where the loop would
                  be unstable
    """

    method: str
    form: str  # pi | pid
    settings: PidSettings
    margins: Margins
    worst_case: WorstCase | None
    predicted: Predicted | None
    realisations: Realisations | None
    findings: tuple[Finding, ...]
    limited: LimitedOutcome | None = None
    on_other_fits: dict[str, float | None] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class Installed:
    """The controller in the machine, as the log shows it, or as told where the log does not.

    settings    trapezoidal reading; what is not seen is 0 (b: 1) with std None
    margins     of the recovered difference equation on the selected plant; None without one
    source      log | told;  form  PI | PID | PI-D (derivative of the speed alone)
    filter_on   what the filter Tf acts on: none | derivative | speed | speed, second order
    readings    Kp and Ti of the same controller summing by the backward and the forward rule
    period_s    of the controller;  late_s  from a logged speed to the command that answers to it
    R2          share of the command's movement that the settings explain, over so many rows
    predicted   on the selected plant; None where the loop is unstable, the plant is not one that is simulated, or the
                controller filters otherwise than by a second-order filter on the speed
    """

    settings: PidSettings
    std: dict[str, float | None]
    margins: Margins | None
    source: str = "log"
    form: str = "PI"
    filter_on: str = "none"
    readings: dict[str, dict[str, float]] = field(default_factory=dict)
    period_s: float | None = None
    late_s: float | None = None
    R2: float | None = None
    rows: int | None = None
    reading: str = "trapezoidal"
    predicted: Predicted | None = None


@dataclass(frozen=True, slots=True)
class Trend:
    """The log thinned for drawing: extremes kept, None between segments."""

    time_s: Series
    setpoint: Gappy | None
    command: Gappy
    speed: Gappy
    fitted: Gappy | None
    residual: Gappy | None


@dataclass(frozen=True, slots=True)
class Autocorrelation:
    """Residual autocorrelation per lag, with the 95 % bound for white noise."""

    lag: tuple[int, ...]
    value: Series
    bound: float


@dataclass(frozen=True, slots=True)
class Profile:
    """Sum of squared residuals over its minimum, along one parameter, the others refitted.

    limit   the ratio that bounds the 95 % interval
    """

    parameter: str
    value: Series
    ratio: Series
    limit: float
    unit: str


@dataclass(frozen=True, slots=True)
class Locus:
    """The loop transfer function along frequency, of one tuning or (None) of the installed controller."""

    tuning: int | None
    w: Series
    real: Series
    imag: Series
    sensitivity: Series


@dataclass(frozen=True, slots=True)
class Curves:
    """What the page draws."""

    trend: Trend
    autocorrelation: Autocorrelation | None = None
    profile: Profile | None = None
    loci: tuple[Locus, ...] = ()
    installed: Locus | None = None


@dataclass(frozen=True, slots=True)
class Report:
    """Everything one log says, and what to do with it."""

    engine_version: str
    log: LogInfo
    record: RecordInfo
    fits: tuple[FitReport, ...]
    selected: int | None
    selected_because: str
    installed: Installed | None
    tunings: tuple[TuningReport, ...]
    recommended: int | None
    recommended_because: str
    curves: Curves
    findings: tuple[Finding, ...]
    cautions: tuple[str, ...]
    cross_checks: tuple[CrossCheck, ...] = ()
    options: dict[str, float | int | str | None] = field(default_factory=dict)
    rules: tuple[Rule, ...] = ()
    report_version: str = REPORT_VERSION
