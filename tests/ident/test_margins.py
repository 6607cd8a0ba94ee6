"""Margins: published tables, python-control on random loops, and loops that a careless count calls stable."""

from __future__ import annotations

import warnings
from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
import pytest
from numpy.typing import ArrayLike, NDArray

from ident.errors import Refused
from ident.loop import PidSettings, margins
from ident.loop.simulate import Clock, setpoint_step
from ident.plants import Fopdt

with warnings.catch_warnings():
    warnings.simplefilter("ignore")
    import control


@dataclass(frozen=True)
class Custom:
    """A plant as a caller would write one: nothing but a response."""

    of_s: Callable[[NDArray[np.complex128]], NDArray[np.complex128]]

    def frequency_response(self, w: ArrayLike) -> NDArray[np.complex128]:
        return self.of_s(1j * np.asarray(w))


# CHECKS.md section 1 (Skogestad 2003, J. Process Control 13, 291-309): tauc = theta.
SIMC_ROWS = {
    "fopdt": (
        Fopdt(1.0, 1.0, 1.0),
        PidSettings(0.5, 1.0),
        (3.141593, 61.352110, 1.590490, 1.000000, 2.141593),
    ),
    "integrating": (
        Custom(lambda s: np.exp(-s) / s),
        PidSettings(0.5, 8.0),
        (2.963402, 46.864287, 1.703522, 1.299418, 1.589637),
    ),
    # Series Kc 1/16, tauI = tauD = 8, here in ideal form.
    "double integrating": (
        Custom(lambda s: np.exp(-s) / s**2),
        PidSettings(0.125, 16.0, 4.0),
        (2.760988, 33.109398, 1.958819, 1.832274, 1.094403),
    ),
}


@pytest.mark.parametrize("row", SIMC_ROWS)
def test_simc_robustness_table(row: str) -> None:
    plant, settings, (gain, phase, Ms, Mt, delay) = SIMC_ROWS[row]
    m = margins(plant, settings)
    assert m.stable
    assert (m.gain_margin, m.phase_margin_deg, m.Ms, m.Mt, m.delay_margin_s) == pytest.approx(
        (gain, phase, Ms, Mt, delay), abs=0.51e-6
    )


@pytest.mark.parametrize(
    ("r", "Ms", "Mt"),
    [
        (0.5, 1.917163, 1.1889),
        (1.0, 1.590490, 1.0),
        (1.5, 1.437591, 1.0),
        (2.0, 1.348591, 1.0),
        (3.0, 1.248891, 1.0),
        (5.0, 1.159489, 1.0),
    ],
)
def test_simc_sweep(r: float, Ms: float, Mt: float) -> None:
    # CHECKS.md section 1, sweep of r = tauc/theta; GM and PM are exact there.
    m = margins(Fopdt(-2.0, 3.0, 0.4), PidSettings(-3.0 / (2.0 * 0.4 * (1 + r)), 3.0))
    assert m.Ms == pytest.approx(Ms, abs=0.51e-6)
    assert m.Mt == pytest.approx(Mt, abs=0.51e-4)
    assert m.gain_margin == pytest.approx(np.pi / 2 * (1 + r), rel=1e-10)
    assert m.phase_margin_deg == pytest.approx(90 - np.degrees(1 / (1 + r)), rel=1e-10)


def series(Kc: float, tauI: float, tauD: float = 0.0) -> PidSettings:
    f = 1 + tauD / tauI
    return PidSettings(Kc * f, tauI * f, tauD / f)


def _e2(s: NDArray[np.complex128]) -> NDArray[np.complex128]:
    lags = (2 * s + 1) * (s + 1) * (0.4 * s + 1) * (0.2 * s + 1) * (0.05 * s + 1) ** 3
    return (-0.3 * s + 1) * (0.08 * s + 1) / lags


PROCESSES: dict[str, Callable[[NDArray[np.complex128]], NDArray[np.complex128]]] = {
    "E1": lambda s: 1 / ((s + 1) * (0.2 * s + 1)),
    "E2": _e2,
    "E3": lambda s: 2 * (15 * s + 1) / ((20 * s + 1) * (s + 1) * (0.1 * s + 1) ** 2),
    "E4": lambda s: 1 / (s + 1) ** 4,
    "E5": lambda s: 1 / ((s + 1) * (0.2 * s + 1) * (0.04 * s + 1) * (0.008 * s + 1)),
    "E7": lambda s: (-2 * s + 1) / (s + 1) ** 3,
    "E8": lambda s: 1 / (s * (s + 1) ** 2),
    "E9": lambda s: np.exp(-s) / (s + 1) ** 2,
    "E10": lambda s: np.exp(-s) / ((20 * s + 1) * (2 * s + 1)),
    "E11": lambda s: (-s + 1) * np.exp(-s) / ((6 * s + 1) * (2 * s + 1) ** 2),
    "E12": lambda s: (6 * s + 1) * (3 * s + 1) * np.exp(-0.3 * s) / ((10 * s + 1) * (8 * s + 1) * (s + 1)),
    "E14": lambda s: (-s + 1) / s,
    "E15": lambda s: (-s + 1) / (s + 1),
}

# CHECKS.md section 1, examples of Skogestad 2003 on the original process, ideal-derivative series controller:
# Kc, tauI, tauD, then Ms, Mt, GM (None: infinite), PM. E6 and the PI row of E8 are marked NOT verified there.
EXAMPLES = [
    ("E1", series(5.5, 0.8), (1.5602, 1.2767, None, 46.48)),
    ("E2", series(2.5 / 2.94, 2.5), (1.6616, 1.0383, 3.370, 57.82)),
    ("E2", series(2 / 1.54, 2, 1.2), (1.7240, 1.0408, 2.896, 57.98)),
    ("E3", series(1.05 / 0.45, 1.05), (1.5503, 1.0775, 5.752, 55.33)),
    ("E3", series(1 / 0.15, 0.4, 0.15), (1.4979, 1.2220, None, 49.20)),
    ("E4", series(0.3, 1.5), (1.4630, 1.0, 4.944, 62.38)),
    ("E4", series(0.5, 1.5, 1.0), (1.4318, 1.0, 6.745, 62.45)),
    ("E5", series(1.1 / 0.296, 1.1), (1.5926, 1.1577, 6.697, 51.18)),
    ("E5", series(1 / 0.056, 0.224, 0.22), (1.8274, 1.5127, 6.528, 38.65)),
    ("E7", series(1.5 / 7, 1.5), (1.6604, 1.0, 2.831, 60.83)),
    ("E7", series(0.3, 1.5, 1.0), (1.8515, 1.0078, 2.324, 59.78)),
    ("E8", series(1.0, 4.0, 1.5), (1.6028, 1.3879, None, 43.18)),
    ("E9", series(0.5, 1.5), (1.6140, 1.0, 3.280, 60.41)),
    ("E9", series(0.5, 1.0, 1.0), (1.5905, 1.0, 3.142, 61.35)),
    ("E10", series(5.25, 16), (1.7156, 1.2343, 3.976, 47.85)),
    ("E10", series(10, 8, 2), (1.6512, 1.1579, 3.035, 52.51)),
    ("E11", series(0.7, 7), (1.6264, 1.0064, 3.336, 59.60)),
    ("E11", series(1.0, 6, 3), (1.6566, 1.0009, 3.021, 60.06)),
    ("E12", series(1 / (0.225 * 0.6), 1), (1.6571, 1.1817, 3.026, 51.67)),
    ("E14", series(0.5, 8), (2.0, 1.2857, 2.0, 47.40)),
    ("E15", series(0.5, 1), (2.0, 1.0, 2.0, 60.0)),
]


@pytest.mark.parametrize(("name", "settings", "printed"), EXAMPLES)
def test_simc_examples(name: str, settings: PidSettings, printed: tuple[float, float, float | None, float]) -> None:
    Ms, Mt, gain, phase = printed
    m = margins(Custom(PROCESSES[name]), settings)
    assert (m.Ms, m.Mt) == pytest.approx((Ms, Mt), abs=0.51e-4)
    assert m.gain_margin == (None if gain is None else pytest.approx(gain, abs=0.51e-3))
    assert m.phase_margin_deg == pytest.approx(phase, abs=0.51e-2)


@pytest.mark.parametrize(
    ("plant", "settings"),
    [
        (Fopdt(-1.0, 1.0, 0.0), PidSettings(3.0, 1.0)),  # abs(S) never exceeds 1.0001 here
        (Fopdt(1.0, 1.0, 0.2), PidSettings(15.0, 1.0)),
        (Fopdt(1.0, 1.0, 1.0), PidSettings(2.27, 100.0)),  # ultimate gain 2.2618, CHECKS.md section 3
        (Custom(lambda s: 1 / (s + 1) ** 4), PidSettings(4.5, 100.0)),  # ultimate gain 4
        (Fopdt(1.0, 1.0, 0.5), PidSettings(1.0, 1.0, 1.2)),  # abs(L) -> 1.2 under delay
        (Fopdt(1.0, 1.0, 0.5), PidSettings(0.5, 0.01)),
    ],
)
def test_unstable(plant: Fopdt, settings: PidSettings) -> None:
    m = margins(plant, settings)
    assert m.stable is False
    assert (m.Ms, m.Mt, m.gain_margin, m.phase_margin_deg, m.delay_margin_s) == (None,) * 5


def test_ultimate_gain_is_the_border() -> None:
    # exp(-s)/(s+1): Ku 2.261826 at wu 2.028758, CHECKS.md section 3. Integral action made negligible.
    assert margins(Fopdt(1, 1, 1), PidSettings(2.2618, 1e7)).stable
    assert not margins(Fopdt(1, 1, 1), PidSettings(2.2619, 1e7)).stable


def test_negative_gains_mirror_positive_ones() -> None:
    assert margins(Fopdt(-3.0, 2.0, 0.3), PidSettings(-0.7, 1.5, 0.1, 0.01)) == margins(
        Fopdt(3.0, 2.0, 0.3), PidSettings(0.7, 1.5, 0.1, 0.01)
    )


def test_time_scales_out() -> None:
    slow, fast = (
        margins(Fopdt(2, 1, 0.3), PidSettings(0.9, 0.8)),
        margins(Fopdt(2, 1e-6, 3e-7), PidSettings(0.9, 8e-7)),
    )
    assert (fast.Ms, fast.Mt, fast.gain_margin, fast.phase_margin_deg) == pytest.approx(
        (slow.Ms, slow.Mt, slow.gain_margin, slow.phase_margin_deg), rel=1e-9
    )
    assert fast.delay_margin_s is not None
    assert slow.delay_margin_s == pytest.approx(fast.delay_margin_s * 1e6, rel=1e-8)


def test_delay_that_does_not_fade() -> None:
    # PID without filter on a first-order plant: abs(L) -> Kp Td K/T = 0.3 while delay keeps turning it, so S
    # comes as close to 1/0.7 as one likes, and no factor above 1/0.3 is allowed.
    m = margins(Fopdt(1.0, 1.0, 0.5), PidSettings(0.05, 10.0, 6.0))
    assert m.Ms == pytest.approx(1 / 0.7, rel=1e-9)
    assert m.gain_margin == pytest.approx(1 / 0.3, rel=1e-9)


def test_period_and_computing_delay_act_as_dead_time() -> None:
    settings = PidSettings(0.5, 1.0)
    assert margins(Fopdt(1, 1, 0.6), settings, period=0.2, compute_delay=0.1).Ms == pytest.approx(
        margins(Fopdt(1, 1, 0.8), settings).Ms, rel=1e-9
    )


def test_sampled_plant_holds_itself() -> None:
    @dataclass(frozen=True)
    class Sampled:
        h: float = 0.1
        dead_time: float = 0.0

        def frequency_response(self, w: ArrayLike) -> NDArray[np.complex128]:
            w = np.asarray(w)
            assert w.max() <= np.pi / self.h * (1 + 1e-12)
            z = np.exp(1j * w * self.h)
            return np.asarray((1 - np.exp(-self.h)) / (z - np.exp(-self.h)))

    settings = PidSettings(2.0, 0.5)
    m = margins(Sampled(), settings, period=0.1, compute_delay=0.02)
    # Brute force over the valid band.
    w = np.linspace(1e-3, np.pi / 0.1, 2_000_001)
    loop = Sampled().frequency_response(w) * settings.frequency_response(w) * np.exp(-0.02j * w)
    assert m.Ms == pytest.approx(np.max(1 / np.abs(1 + loop)), rel=1e-8)
    assert m.Ms > margins(Fopdt(1, 1, 0), settings, compute_delay=0.02).Ms  # type: ignore[operator]
    # Still above 1 where the model ends: no crossover that it could vouch for.
    assert not margins(Sampled(), PidSettings(40.0, 1.0, 0.1, 0.01)).stable


def _random_loop(
    rng: np.random.Generator,
) -> tuple[NDArray[np.float64], NDArray[np.float64], PidSettings]:
    order = int(rng.integers(1, 6))
    poles: list[complex] = []
    while len(poles) < order:
        if order - len(poles) >= 2 and rng.random() < 0.4:
            zeta = rng.uniform(0.05, 1.0)
            pole = 10 ** rng.uniform(-1, 1) * complex(-zeta, np.sqrt(1 - zeta**2))
            poles += [pole, pole.conjugate()]
        else:
            poles.append(-(10 ** rng.uniform(-1, 1)))
    zeros = -(10 ** rng.uniform(-1, 1, rng.integers(0, order))) * rng.choice([1, 1, -1])
    num, den = np.atleast_1d(np.poly(zeros)).real, np.poly(poles).real
    gain = float(rng.choice([-1, 1]) * 10 ** rng.uniform(-1, 1))
    num = num * (gain * den[-1] / num[-1])
    Ti = float(10 ** rng.uniform(-1, 1))
    Kp = float(10 ** rng.uniform(-1, 1) / gain)
    return num, den, PidSettings(Kp, Ti, Ti / 4, Ti / 40) if rng.random() < 0.4 else PidSettings(Kp, Ti)


def test_python_control_agrees_on_random_loops() -> None:
    # python-control 0.10: closed-loop poles, stability_margins (polynomial roots); Mt by a dense sweep.
    rng = np.random.default_rng(20240607)
    stable_loops = 0
    for _ in range(200):
        num, den, s = _random_loop(rng)
        loop = (
            control.tf(num, den)
            * control.tf(s.Kp * np.array([s.Ti * s.Td, s.Ti, 1.0]), [s.Ti, 0.0])
            * control.tf([1.0], [s.Tf**2 / 2, s.Tf, 1.0])
        )
        top, bottom = loop.num[0][0], loop.den[0][0]
        m = margins(Custom(lambda z, n=num, d=den: np.polyval(n, z) / np.polyval(d, z)), s)  # type: ignore[misc]
        assert m.stable == bool((np.roots(np.polyadd(top, bottom)).real < 0).all())
        if not m.stable:
            continue
        stable_loops += 1
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            gains, phases, distances, *_ = control.stability_margins(loop, returnall=True)
        above = [g for g in gains if g > 1]
        assert m.gain_margin == (pytest.approx(min(above), rel=1e-6) if above else None)
        assert m.phase_margin_deg == (pytest.approx(min(abs(phases)), abs=1e-6) if len(phases) else None)
        assert pytest.approx(max([1.0, *(1 / d for d in distances)]), rel=1e-6) == m.Ms
        z = 1j * np.geomspace(1e-4, 1e4, 100_001)
        value = np.polyval(top, z) / np.polyval(bottom, z)
        assert m.Mt == pytest.approx(max(1.0, float(np.max(np.abs(value / (1 + value))))), rel=1e-4)
        assert m.Mt >= 1.0
    assert stable_loops > 80


@pytest.mark.parametrize(
    ("plant", "options", "code"),
    [
        (Fopdt(1, 1, 1), {"period": -1.0}, "period-out-of-range"),
        (Fopdt(1, 1, 1), {"compute_delay": float("nan")}, "compute-delay-out-of-range"),
        (object(), {}, "plant-without-response"),
        (Custom(lambda s: s * np.nan), {}, "plant-response-unusable"),
    ],
)
def test_refused(plant: object, options: dict[str, float], code: str) -> None:
    with pytest.raises(Refused) as caught:
        margins(plant, PidSettings(1.0, 1.0), **options)
    assert caught.value.code == code


@pytest.mark.parametrize("bad", [(0.0, 1.0), (1.0, 0.0), (1.0, -1.0), (np.nan, 1.0), (1.0, 1.0, -1.0)])
def test_settings_refused(bad: tuple[float, ...]) -> None:
    with pytest.raises(Refused, match="settings-out-of-range"):
        PidSettings(*bad)


def test_stability_agrees_with_simulation_on_random_loops_with_delay() -> None:
    # Independent of any frequency response: the closed loop simulated in time grows or dies out. Loops within
    # 3 % in gain of the border are left out; a finite simulation cannot tell there.
    rng = np.random.default_rng(77)
    decided = {True: 0, False: 0}
    for _ in range(120):
        plant = Fopdt(float(rng.choice([-2.0, 1.0])), 1.0, float(10 ** rng.uniform(-1, 1)))
        Kp = float(rng.choice([-0.05, 1.0])) * np.sign(plant.K) * 10 ** rng.uniform(-1.5, 0.8)
        settings = PidSettings(float(Kp), float(10 ** rng.uniform(-0.7, 1.5)))
        verdicts = {margins(plant, replace(settings, Kp=Kp * f)).stable for f in (1 / 1.03, 1.0, 1.03)}
        if len(verdicts) == 2:
            continue
        clock = Clock(0.02, 60_000, digital=False)
        with np.errstate(over="ignore", invalid="ignore"):
            error = np.abs(setpoint_step(plant, settings, clock).speed - 1.0)
        dies_out = bool(error[-6_000:].max() < 0.5 * max(error[:30_000].max(), 1e-9))
        assert verdicts == {dies_out}, (plant, settings)
        decided[dies_out] += 1
    assert min(decided.values()) > 25


def test_suprema_by_brute_force_on_random_loops_with_delay() -> None:
    rng = np.random.default_rng(78)
    checked = 0
    for _ in range(60):
        plant = Fopdt(1.0, 1.0, float(10 ** rng.uniform(-2, 1)))
        Ti = float(10 ** rng.uniform(-1, 1))
        Td = float(rng.choice([0.0, 0.2 * Ti]))
        settings = PidSettings(float(10 ** rng.uniform(-1, 1)), Ti, Td, Td / 10)
        m = margins(plant, settings)
        if not m.stable or m.Ms is None or m.Ms > 5:
            continue  # unstable, or too sharp a peak for a plain grid
        checked += 1
        w = np.geomspace(1e-3, 1e3 / plant.L, 400_001)
        loop = plant.frequency_response(w) * settings.frequency_response(w)
        assert m.Ms == pytest.approx(max(1.0, float(np.max(1 / np.abs(1 + loop)))), rel=1e-6)
        assert m.Mt == pytest.approx(max(1.0, float(np.max(np.abs(loop / (1 + loop))))), rel=1e-6)
        # The delay margin: with a little less the loop is stable, with a little more it is not.
        assert m.delay_margin_s is None or (
            margins(plant, settings, compute_delay=m.delay_margin_s * 0.999).stable
            and not margins(plant, settings, compute_delay=m.delay_margin_s * 1.001).stable
        )
        assert m.gain_margin is not None
        assert margins(plant, replace(settings, Kp=settings.Kp * m.gain_margin * 0.999)).stable
        assert not margins(plant, replace(settings, Kp=settings.Kp * m.gain_margin * 1.001)).stable
    assert checked > 25
