"""Forms and coefficients against CHECKS.md section 8 and python-control."""

from __future__ import annotations

import math

import control
import numpy as np
import pytest

from ident import Arx, Fopdt, PidSettings, Refused, Sopdt, UnderdampedSopdt, margins, realise
from ident.loop.simulate import zero_order
from ident.realise.digital import digital
from ident.realise.fixed_point import fixed_point
from ident.realise.forms import forms, ideal_form, series_form
from ident.realise.running import after_gain_change, run_pi, start_value
from ident.realise.sampled import sampled_margins

CHECKED = PidSettings(2.0, 0.5, 0.05)  # CHECKS.md section 8, with N 10 and h .01


def test_forms() -> None:
    # CHECKS.md section 7: Kp 2, Ti 1, Td .2.
    series, _ = series_form(PidSettings(2.0, 1.0, 0.2))
    assert series is not None
    assert (series.Kc, series.tauI, series.tauD) == pytest.approx((1.44721360, 0.72360680, 0.27639320), abs=5e-9)
    back = ideal_form(series)
    assert (back.Kp, back.Ti, back.Td) == pytest.approx((2.0, 1.0, 0.2), rel=1e-14)
    none, because = series_form(PidSettings(2.0, 1.0, 0.26))
    assert none is None
    assert "4 Td" in because
    shown = forms(PidSettings(0.02, 0.5, 0.05), speed_span=3000.0, command_span=24.0)
    # By definition: 2.5 % of the command's span per percent of speed, 120 repeats of the proportional move a minute.
    assert shown.gain_percent == pytest.approx(2.5)
    assert shown.proportional_band_percent == pytest.approx(40.0)
    assert shown.resets_per_minute == pytest.approx(120.0)
    assert (shown.parallel.Kp, shown.parallel.ki, shown.parallel.kd) == pytest.approx((0.02, 0.04, 0.001))
    bare = forms(PidSettings(0.02, 0.5))
    assert bare.gain_percent is None
    assert "speed_span" in bare.percent_because
    with pytest.raises(Refused, match="speed_span"):
        forms(CHECKED, speed_span=0.0)


def test_backward_differences() -> None:
    one = digital(CHECKED, 0.01, filter_on="derivative", N=10.0)
    assert one.derivative.den == pytest.approx((1.0, -1 / 3))
    assert one.derivative.num == pytest.approx((20 / 3, -20 / 3))
    assert one.integral_step == pytest.approx(0.04)
    assert one.positional.num == pytest.approx((8.706666667, -16.013333333, 7.333333333), abs=5e-10)
    assert one.positional.den == pytest.approx((1.0, -1.333333333, 0.333333333), abs=5e-10)


def test_tustin() -> None:
    one = digital(CHECKED, 0.01, rule="tustin", filter_on="derivative", N=10.0)
    assert one.derivative.num == pytest.approx((10.0, -10.0))
    assert one.integral_step == pytest.approx(0.02)
    assert one.positional.num == pytest.approx((12.02, -21.98, 10.0), abs=1e-12)
    assert np.pad(one.positional.den, (0, 3 - len(one.positional.den))) == pytest.approx((1.0, -1.0, 0.0), abs=1e-12)
    assert not digital(CHECKED, 0.00999, rule="tustin", filter_on="derivative", N=10.0).rings
    assert digital(CHECKED, 0.0101, rule="tustin", filter_on="derivative", N=10.0).rings  # h > 2 Td/N


def test_velocity_form_without_filter() -> None:
    one = digital(CHECKED, 0.01)
    assert one.velocity.num == pytest.approx((12.04, -22.0, 10.0))
    assert one.velocity.den == (1.0,)


@pytest.mark.parametrize("filter_on", ["speed", "derivative"])
@pytest.mark.parametrize("rule", ["backward", "tustin"])
def test_both_forms_and_the_terms_run_alike(rule: str, filter_on: str) -> None:
    """Positional, velocity and the terms apart agree on a random sequence to rounding."""
    one = digital(PidSettings(2.0, 0.5, 0.05, 0.012), 0.01, rule=rule, filter_on=filter_on)  # type: ignore[arg-type]
    e = np.random.default_rng(0).normal(size=300)

    def run(num: tuple[float, ...], den: tuple[float, ...], x: np.ndarray) -> np.ndarray:
        y = np.zeros(len(x))
        for k in range(len(x)):
            y[k] = sum(b * x[k - i] for i, b in enumerate(num) if k >= i)
            y[k] -= sum(a * y[k - i] for i, a in enumerate(den) if 0 < i <= k)
        return y

    positional = run(one.positional.num, one.positional.den, e)
    moves = run(one.velocity.num, one.velocity.den, e)
    assert np.abs(positional - np.cumsum(moves)).max() < 1e-12 * np.abs(positional).max()
    filtered = run(one.speed_filter.num, one.speed_filter.den, e)
    pair = filtered + (np.concatenate(([0.0], filtered[:-1])) if rule == "tustin" else 0.0)
    terms = one.Kp * filtered + one.integral_step * np.cumsum(pair) + run(one.derivative.num, one.derivative.den, e)
    assert np.abs(terms - positional).max() < 1e-12 * np.abs(positional).max()


@pytest.mark.parametrize("seed", range(10))
@pytest.mark.parametrize("filter_on", ["speed", "derivative"])
def test_tustin_equals_sample_system_of_python_control(seed: int, filter_on: str) -> None:
    random = np.random.default_rng(seed)
    Kp, Ti, Td, Tf, h = (float(v) for v in np.exp(random.uniform(-3, 1, 5)))
    s = control.tf("s")
    if filter_on == "speed":
        continuous = Kp * (1 + 1 / (s * Ti) + s * Td) / (1 + s * Tf + (s * Tf) ** 2 / 2)
    else:
        continuous = Kp * (1 + 1 / (s * Ti) + s * Td / (1 + s * Tf))
    sampled = control.sample_system(continuous, h, method="tustin")
    one = digital(PidSettings(Kp, Ti, Td, Tf), h, rule="tustin", filter_on=filter_on)  # type: ignore[arg-type]
    w = np.geomspace(1e-2, 0.99, 40) * np.pi / h
    assert np.allclose(one.feedback.frequency_response(w), sampled(np.exp(1j * w * h)), rtol=1e-9)
    own = control.tf(list(one.positional.num), list(one.positional.den), h)
    same = own(np.exp(1j * w * h)) * np.exp(1j * w * h * (len(one.positional.den) - len(one.positional.num)))
    assert np.allclose(same, sampled(np.exp(1j * w * h)), rtol=1e-9)


@pytest.mark.parametrize(
    ("plant", "h", "numerator", "denominator", "delay"),
    [
        (Fopdt(1, 1, 0.35), 0.2, (0.0487705754993, 0.132498671423), (1.0, -0.818730753078), 2),
        (Fopdt(2, 0.5, 0.105), 0.01, (0.0199003325017, 0.0197023208848), (1.0, -0.980198673307), 11),
        (Fopdt(1.5, 0.8, 0.4), 0.1, (0.176254646123,), (1.0, -0.882496902585), 5),
        (Fopdt(1, 1, 0), 0.1, (0.095162581964,), (1.0, -0.904837418036), 1),
        (Sopdt(1, 1, 0.3, 0), 0.1, (0.0144599644803, 0.0125156479115), (1.0, -1.62136872861, 0.648344341002), 1),
        (Sopdt(1, 0.5, 0.5, 0), 0.1, (0.0175230963064, 0.0153354435733), (1.0, -1.63746150616, 0.670320046036), 1),
    ],
)
def test_the_plant_behind_its_hold(
    plant: Fopdt, h: float, numerator: tuple[float, ...], denominator: tuple[float, ...], delay: int
) -> None:
    """CHECKS.md section 8, zero-order hold with fractional dead time, all digits."""
    first, num, den = zero_order(plant, h)
    whole = np.concatenate((np.zeros(first), num))
    assert whole[delay : delay + len(numerator)] == pytest.approx(numerator, rel=1e-11)
    rest = np.concatenate((whole[:delay], whole[delay + len(numerator) :]))
    assert np.abs(rest).max(initial=0.0) < 1e-12
    assert np.asarray(den) == pytest.approx(denominator, rel=1e-11)


@pytest.mark.parametrize(
    ("h", "with_L", "with_half"),
    [(0.01, 1.60107, 1.59266), (0.05, 1.64540, 1.60149), (0.1, 1.70579, 1.61287), (0.2, 1.80526, 1.61048)],
)
def test_ms_of_the_sampled_loop(h: float, with_L: float, with_half: float) -> None:
    """CHECKS.md section 8: FOPDT T 1, L .5, PI with backward integral by SIMC, tauc = theta."""
    plant = Fopdt(1.0, 1.0, 0.5)
    for theta, Ms in ((0.5, with_L), (0.5 + h / 2, with_half)):
        settings = PidSettings(1.0 / (2 * theta), min(1.0, 8 * theta))
        found = sampled_margins(plant, digital(settings, h).feedback, h)
        assert found.Ms == pytest.approx(Ms, abs=6e-6)


@pytest.mark.parametrize("rule", ["backward", "tustin"])
@pytest.mark.parametrize(
    "plant", [Fopdt(125, 0.2, 0.0437), Sopdt(125, 0.2, 0.03, 0.02), UnderdampedSopdt(125, 9, 0.4, 0.02)]
)
def test_margins_of_the_sampled_loop_against_python_control(plant: Fopdt, rule: str) -> None:
    """Ms by brute force over C(z)P(z), P(z) from control.sample_system with whole dead time; stability by its poles."""
    h = 0.01
    whole = round(plant.L / h)
    exact = type(plant)(*[getattr(plant, n) for n in plant.__slots__[:-1]], whole * h)
    one = digital(PidSettings(0.004, 0.15, 0.02, 0.01), h, rule=rule)  # type: ignore[arg-type]
    s = control.tf("s")
    P = exact.K / (exact.T * s + 1) if isinstance(exact, Fopdt) else exact.K / (exact.P * s * s + exact.S * s + 1)
    w = np.linspace(1e-3, 1.0, 200_001) * np.pi / h
    z = np.exp(1j * w * h)
    q = 1 / z
    C = np.polyval(one.positional.num[::-1], q) / np.polyval(one.positional.den[::-1], q)
    L = C * control.sample_system(P, h, "zoh")(z) * q**whole
    found = sampled_margins(exact, one.feedback, h)
    assert found.stable
    assert found.Ms == pytest.approx(np.abs(1 / (1 + L)).max(), abs=1e-6)


def test_what_sampling_costs_is_computed() -> None:
    plant = Fopdt(125.0, 0.2, 0.02)
    shown = realise(PidSettings(0.03, 0.068), plant, period=0.005, compute_delay=0.001)
    for coded in shown.digital:
        assert shown.continuous == margins(plant, PidSettings(0.03, 0.068))
        assert shown.add_half is not None
        assert shown.continuous.Ms is not None
        assert coded.margins is not None
        assert coded.margins.Ms is not None
        assert coded.Ms_lost == coded.margins.Ms - shown.continuous.Ms
        # The rule of thumb, for a short period.
        assert coded.margins.Ms == pytest.approx(shown.add_half.Ms, rel=0.01)
        assert coded.Ms_lost > 0.1
    other = realise(PidSettings(0.03, 0.068), Arx([-0.9], [12.5], 3, 0.01), period=0.005)
    assert other.digital[0].margins is None
    assert "own period" in other.digital[0].because
    same = realise(PidSettings(0.003, 0.068), Arx([-0.9], [12.5], 3, 0.01), period=0.01)
    assert same.digital[0].margins is not None


@pytest.mark.parametrize("rule", ["backward", "tustin"])
@pytest.mark.parametrize("bits", [12, 16, 24])
def test_rounding_to_words(bits: int, rule: str) -> None:
    settings = PidSettings(0.049, 0.045, 0.0096, 0.002)
    one = digital(settings, 0.002, rule=rule)  # type: ignore[arg-type]
    words = fixed_point(one, bits=bits, scale=3000 / 24)
    for word in (*words.words, words.integral_step):
        assert -(2 ** (bits - 1)) <= word.integer < 2 ** (bits - 1)
    assert max(abs(w.integer) for w in words.words) >= 2 ** (bits - 2)  # the word is used
    assert sum(words.feedback.num) == pytest.approx(sum(one.feedback.num), rel=2.0 ** -(bits - 2))
    w = np.geomspace(1e-2, 0.99, 30) * np.pi / 0.002
    error = np.abs(words.feedback.frequency_response(w) / one.feedback.frequency_response(w) - 1).max()
    assert error < 40 * 2.0**-bits * max(map(abs, one.feedback.num)) / abs(sum(one.feedback.num)) ** 0.5
    assert words.integral_step.value == math.ldexp(words.integral_step.integer, -words.integral_step.shift)


def test_rounding_is_paid_in_margin() -> None:
    plant, settings = Fopdt(125.0, 0.2, 0.02), PidSettings(0.045, 0.045, 0.0096, 0.002)
    lost = []
    for bits in (8, 16):
        coded = realise(settings, plant, period=0.002, bits=bits).digital[0]
        assert coded.rounded is not None
        assert coded.rounded.margins is not None
        assert coded.rounded.Ms_lost is not None
        assert coded.margins is not None
        assert coded.rounded.Ms_lost == (coded.rounded.margins.Ms or 0) - (coded.margins.Ms or 0)
        lost.append(abs(coded.rounded.Ms_lost))
    assert lost[1] < 0.01 < lost[0] + 0.01
    assert lost[1] < lost[0]
    with pytest.raises(Refused, match="8 to 32 bits"):
        realise(settings, plant, period=0.002, bits=4)


def test_start_value_and_gain_change() -> None:
    """CHECKS.md section 8: Kp 2, e .1, u .3 -> I .1, first output .3, next .304 with Ti .5, h .01."""
    integral = start_value(0.3, 2.0, 0.1)
    assert integral == pytest.approx(0.1)
    free = {"Kp": 2.0, "Ti": 0.5, "h": 0.01, "Tt": 0.5, "low": -9.0, "high": 9.0}
    first, integral = run_pi(integral, 0.1, **free)
    second, _ = run_pi(integral, 0.1, **free)
    assert (first, second) == pytest.approx((0.3, 0.304))
    assert after_gain_change(0.1, 2.0, 3.0, 0.1) + 3.0 * 0.1 == pytest.approx(0.1 + 2.0 * 0.1)


@pytest.mark.parametrize(
    ("Tt", "peak", "at", "sum_"),
    [
        (math.inf, 1.19452563, 5.39, 1.22889743),
        (1.0, 1.11451607, 2.66, 0.74039471),
        (0.25, 1.02485381, 2.08, 0.65152859),
        (0.1, 1.01337551, 2.12, 0.64510469),
        (0.05, 1.01236546, 2.14, 0.64475049),
    ],
)
def test_anti_windup(Tt: float, peak: float, at: float, sum_: float) -> None:
    """CHECKS.md section 8, reference case: 1/(s+1) behind its hold, PI Kp 4, Ti .25, h .01, abs(u) <= 1.2."""
    a = math.exp(-0.01)
    y, integral, speeds, errors = 0.0, 0.0, [], []
    for _ in range(600):
        e = 1.0 - y
        u, integral = run_pi(integral, e, Kp=4.0, Ti=0.25, h=0.01, Tt=Tt, low=-1.2, high=1.2)
        y = a * y + (1.0 - a) * u
        errors.append(1.0 - y)  # the table sums them after the plant's update
        speeds.append(y)
    k = int(np.argmax(speeds))
    assert speeds[k] == pytest.approx(peak, abs=5e-9)
    assert (k + 1) * 0.01 == pytest.approx(at, abs=1e-9)
    assert np.abs(errors).sum() * 0.01 == pytest.approx(sum_, abs=5e-9)


def test_tracking_time_and_refusals() -> None:
    # Åström and Hägglund, Advanced PID Control (2006), section 3.5.
    assert digital(CHECKED, 0.01).tracking_time == pytest.approx(math.sqrt(0.5 * 0.05))
    assert digital(PidSettings(2.0, 0.5), 0.01).tracking_time == 0.5
    for code, call in {
        "period-out-of-range": lambda: digital(CHECKED, 0.0),
        "derivative-without-filter": lambda: digital(CHECKED, 0.01, rule="tustin"),
        "no-integral-action": lambda: digital(PidSettings(2.0, math.inf), 0.01),
        "filter-out-of-range": lambda: digital(CHECKED, 0.01, filter_on="derivative", N=0.0),
    }.items():
        with pytest.raises(Refused) as refused:
            call()
        assert refused.value.code == code
    assert len(realise(CHECKED, Fopdt(1, 1, 0.5), period=0.01).digital) == 1
    assert realise(CHECKED).digital == ()
