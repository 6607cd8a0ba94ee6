"""Published rules: coefficients and worked examples of CHECKS.md sections 1 to 3, with the source beside each."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import pytest
from numpy.typing import ArrayLike, NDArray

from ident.errors import Refused
from ident.loop import PidSettings, margins
from ident.loop.held_plant import held_plant
from ident.plants import Fopdt, Sopdt
from ident.tune import propose, simc
from ident.tune.rules import (
    amigo_pi,
    amigo_pid,
    chien_hrones_reswick,
    cohen_coon,
    imc_pi,
    imc_pid,
    itae,
    lambda_pi,
    published,
    tyreus_luyben,
    ultimate,
    ziegler_nichols_step,
    ziegler_nichols_ultimate,
)
from ident.tune.rules.catalogue import quick_margins
from ident.tune.simc import improved_simc, simc_pid


@dataclass(frozen=True)
class Rational:
    """num(s)/den(s) exp(-L s), factors as given."""

    num: tuple[float, ...]
    lags: tuple[float, ...]
    L: float = 0.0
    K: float = 1.0

    def frequency_response(self, w: ArrayLike) -> NDArray[np.complex128]:
        s = 1j * np.asarray(w)
        response = self.K * np.exp(-self.L * s)
        for z in self.num:
            response = response * (1 + z * s)
        for T in self.lags:
            response = response / (1 + T * s)
        return np.asarray(response)


def three(s: PidSettings) -> tuple[float, float, float]:
    return s.Kp, s.Ti, s.Td


def test_simc_row_of_a_first_order_plant() -> None:
    # Skogestad 2003: GM 3.14, PM 61.4, Ms 1.59, Mt 1.00, delay margin 2.14 L; computed digits of CHECKS.md section 1.
    found = margins(Fopdt(1, 1, 0.5), simc(1, 1, 0.5))
    assert found.gain_margin == pytest.approx(np.pi, abs=1e-6)
    assert found.phase_margin_deg == pytest.approx(61.352110, abs=1e-6)
    assert found.Ms == pytest.approx(1.590490, abs=1e-6)
    assert found.Mt == pytest.approx(1.0, abs=1e-9)
    assert found.delay_margin_s == pytest.approx(0.5 * (np.pi - 1), abs=1e-6)


@pytest.mark.parametrize(
    ("r", "Ms", "Mt"),
    [(0.5, 1.917163, 1.1889), (1, 1.590490, 1), (1.5, 1.437591, 1), (2, 1.348591, 1), (3, 1.248891, 1)],
)
def test_sweep_of_the_closed_loop_time(r: float, Ms: float, Mt: float) -> None:
    # CHECKS.md section 1, sweep of Tc/L; GM = pi/2 (1 + r), PM = 90 degrees - 1/(1 + r) rad, exactly.
    for settings in (simc(1, 1, 0.3, Tc=0.3 * r), lambda_pi(1, 1, 0.3, 0.3 * r)):
        found = margins(Fopdt(1, 1, 0.3), settings)
        assert found.Ms == pytest.approx(Ms, abs=1e-6)
        assert found.Mt == pytest.approx(Mt, abs=5e-5)
        assert found.gain_margin == pytest.approx(np.pi / 2 * (1 + r), rel=1e-9)
        assert found.phase_margin_deg == pytest.approx(90 - np.degrees(1 / (1 + r)), rel=1e-9)


@pytest.mark.parametrize(
    ("plant", "model", "Ms", "Mt", "GM", "PM"),
    [
        # Skogestad 2003, examples E1 to E12 (PI), reduced models as printed; margins of CHECKS.md section 1.
        (Rational((), (1, 0.2)), (1, 1.1, 0.1), 1.5602, 1.2767, None, 46.48),
        (Rational((-0.3, 0.08), (2, 1, 0.4, 0.2, 0.05, 0.05, 0.05)), (1, 2.5, 1.47), 1.6616, 1.0383, 3.370, 57.82),
        (Rational((15,), (20, 1, 0.1, 0.1), K=2), (1.5, 1.05, 0.15), 1.5503, 1.0775, 5.752, 55.33),
        (Rational((), (1, 1, 1, 1)), (1, 1.5, 2.5), 1.4630, 1.0, 4.944, 62.38),
        (Rational((), (1, 0.2, 0.04, 0.008)), (1, 1.1, 0.148), 1.5926, 1.1577, 6.697, 51.18),
        (Rational((-2,), (1, 1, 1)), (1, 1.5, 3.5), 1.6604, 1.0, 2.831, 60.83),
        (Rational((), (1, 1), 1), (1, 1.5, 1.5), 1.6140, 1.0, 3.280, 60.41),
        (Rational((), (20, 2), 1), (1, 21, 2), 1.7156, 1.2343, 3.976, 47.85),
        (Rational((-1,), (6, 2, 2), 1), (1, 7, 5), 1.6264, 1.0064, 3.336, 59.60),
        (Rational((6, 3), (10, 8, 1), 0.3), (0.225, 1, 0.3), 1.6571, 1.1817, 3.026, 51.67),
    ],
)
def test_simc_pi_examples(
    plant: Any, model: tuple[float, float, float], Ms: float, Mt: float, GM: float | None, PM: float
) -> None:
    found = margins(plant, simc(*model))
    assert found.Ms == pytest.approx(Ms, abs=6e-5)
    assert found.Mt == pytest.approx(Mt, abs=6e-5)
    assert found.phase_margin_deg == pytest.approx(PM, abs=6e-3)
    assert found.gain_margin is None if GM is None else found.gain_margin == pytest.approx(GM, abs=6e-4)


@pytest.mark.parametrize(
    ("plant", "model", "printed", "Ms", "Mt"),
    [
        # The PID examples: series Kc, tauI, tauD as printed, ideal derivative.
        (
            Rational((-0.3, 0.08), (2, 1, 0.4, 0.2, 0.05, 0.05, 0.05)),
            (1, 2, 0.77, 1.2),
            (1.2987, 2, 1.2),
            1.7240,
            1.0408,
        ),
        (Rational((15,), (20, 1, 0.1, 0.1), K=2), (1.5, 1, 0.05, 0.15), (6.6667, 0.4, 0.15), 1.4979, 1.2220),
        (Rational((), (1, 1, 1, 1)), (1, 1.5, 1.5, 1), (0.5, 1.5, 1), 1.4318, 1.0),
        (Rational((), (1, 0.2, 0.04, 0.008)), (1, 1, 0.028, 0.22), (17.857, 0.224, 0.22), 1.8274, 1.5127),
        (Rational((-2,), (1, 1, 1)), (1, 1.5, 2.5, 1), (0.3, 1.5, 1), 1.8515, 1.0078),
        (Rational((), (1, 1), 1), (1, 1, 1, 1), (0.5, 1, 1), 1.5905, 1.0),
        (Rational((), (20, 2), 1), (1, 20, 1, 2), (10, 8, 2), 1.6512, 1.1579),
        (Rational((-1,), (6, 2, 2), 1), (1, 6, 3, 3), (1.0, 6, 3), 1.6566, 1.0009),
    ],
)
def test_simc_pid_examples(
    plant: Any, model: tuple[float, ...], printed: tuple[float, ...], Ms: float, Mt: float
) -> None:
    settings = simc_pid(model[0], model[1], model[2], model[3], ratio=np.inf)
    Kc, tauI, tauD = printed
    f = 1 + tauD / tauI
    assert three(settings) == pytest.approx((Kc * f, tauI * f, tauD / f), rel=1e-4)
    found = margins(plant, settings)
    assert found.Ms == pytest.approx(Ms, abs=6e-5)
    assert found.Mt == pytest.approx(Mt, abs=6e-5)


def test_improved_simc() -> None:
    # Grimholt and Skogestad 2012: Kp = (T + L/3)/(K (Tc + L)), Ti = min(T + L/3, 4 (Tc + L)); 2018: tauD = L/3.
    assert three(improved_simc(2, 1, 0.3)) == pytest.approx((1.1 / (2 * 0.6), 1.1, 0))
    assert three(improved_simc(2, 10, 0.3, Tc=0.5)) == pytest.approx((10.1 / (2 * 0.8), 3.2, 0))
    assert simc_pid(1, 1, 0.3).Td * (1 + 0.1 / 1) == pytest.approx(0.1)


@pytest.mark.parametrize(
    ("L", "T", "pi", "pid"),
    [
        # Astrom and Hagglund 2004, the three examples; the delay-dominated PI Ti by the formula (CHECKS.md section 2).
        (0.075, 1.04, (4.1333, 0.5389), (6.4400, 0.3612, 0.0367)),
        (1.42, 2.90, (0.4142, 2.6550), (1.1190, 2.3982, 0.6191)),
        (1.01, 0.0932, (0.1752, 0.3673), (0.2415, 0.4742, 0.1188)),
    ],
)
def test_amigo_examples(L: float, T: float, pi: tuple[float, float], pid: tuple[float, float, float]) -> None:
    assert three(amigo_pi(1, T, L))[:2] == pytest.approx(pi, abs=6e-5)
    assert three(amigo_pid(1, T, L)) == pytest.approx(pid, abs=6e-5)


@pytest.mark.parametrize(
    ("L", "Ms_pi", "Mt_pi", "Ms_pid", "Mt_pid"),
    [
        (0.05, 1.3570, 1.1368, 1.4229, 1.2123),
        (0.2, 1.2638, 1.0083, 1.4212, 1.1464),
        (0.5, 1.2123, 1, 1.4171, 1.0637),
        (1, 1.2489, 1, 1.4094, 1.0070),
        (2, 1.3720, 1, 1.4013, 1),
        (5, 1.4856, 1, 1.4118, 1),
    ],
)
def test_amigo_margins(L: float, Ms_pi: float, Mt_pi: float, Ms_pid: float, Mt_pid: float) -> None:
    # CHECKS.md section 2, computed there, with the second-order measurement filter Tf = Td/10.
    for settings, Ms, Mt in ((amigo_pi(1, 1, L), Ms_pi, Mt_pi), (amigo_pid(1, 1, L), Ms_pid, Mt_pid)):
        found = margins(Fopdt(1, 1, L), settings)
        assert found.Ms == pytest.approx(Ms, abs=6e-5)
        assert found.Mt == pytest.approx(Mt, abs=6e-5)


@pytest.mark.parametrize(
    ("plant", "Ku", "Pu", "tolerance"),
    [
        # Astrom and Hagglund, 1/(s+1)^3: 8, 3.63; Seborg, Edgar and Mellichamp: 7.88, 11.6 and 0.95, 12.
        (Rational((), (1, 1, 1)), 8.0, 3.627599, 1e-6),
        (Rational((), (10, 5), 1, 2), 7.875664, 11.659875, 1e-6),
        (Fopdt(4, 7, 3.5), 0.951721, 11.973855, 1e-6),
        (Fopdt(1, 1, 1), 2.261826, 3.097060, 1e-6),
        (Fopdt(1, 1, 0.2), 8.502425, 0.744152, 1e-6),
    ],
)
def test_ultimate_gain_and_period(plant: Any, Ku: float, Pu: float, tolerance: float) -> None:
    found = ultimate(plant)
    assert found.Ku == pytest.approx(Ku, rel=tolerance)
    assert found.Pu == pytest.approx(Pu, rel=tolerance)


def test_ultimate_of_a_plant_that_never_turns() -> None:
    with pytest.raises(Refused, match="no-ultimate-gain"):
        ultimate(Fopdt(1, 1, 0))
    assert ultimate(Fopdt(-1, 1, 1)).Ku == pytest.approx(-2.261826, rel=1e-6)


def test_ziegler_nichols_and_tyreus_luyben_examples() -> None:
    # Astrom and Hagglund, 1/(s+1)^3: ultimate PID 4.8, 1.81, 0.45; step PID 5.50, 1.61, 0.403 from a, L.
    third = ultimate(Rational((), (1, 1, 1)))
    assert three(ziegler_nichols_ultimate(third, "pid")) == pytest.approx((4.8, 1.8138, 0.4534), abs=6e-5)
    assert three(ziegler_nichols_step(0.218018, 0.805472, "pid")) == pytest.approx((5.5041, 1.6109, 0.4027), abs=6e-5)
    # Seborg, Edgar and Mellichamp, 2 exp(-s)/((10s+1)(5s+1)): 4.73, 5.8, 1.45 and 3.55, 25.8, 1.84 (1 %: Pu rounded).
    second = ultimate(Rational((), (10, 5), 1, 2))
    assert three(ziegler_nichols_ultimate(second, "pid")) == pytest.approx((4.73, 5.8, 1.45), rel=0.01)
    assert three(tyreus_luyben(second, "pid")) == pytest.approx((3.55, 25.8, 1.84), rel=0.01)
    # The same book, 4 exp(-3.5 s)/(7s+1): PI 0.43, 10 and 0.30, 26.4.
    first = ultimate(Fopdt(4, 7, 3.5))
    assert three(ziegler_nichols_ultimate(first, "pi"))[:2] == pytest.approx((0.4283, 9.9782), abs=6e-5)
    assert three(tyreus_luyben(first, "pi"))[:2] == pytest.approx((0.2974, 26.3425), abs=6e-5)
    assert three(ziegler_nichols_step(0.5, 2.0, "pi")) == pytest.approx((1.8, 6.0, 0.0))


@pytest.mark.parametrize(
    ("rule", "form", "Ms"),
    [
        ("zn-step", "pi", (3.0875, 2.2990, 1.8065)),
        ("zn-ultimate", "pi", (2.4272, 2.1981, 2.0484)),
        ("tl", "pi", (1.5909, 1.5394, 1.5029)),
        ("cc", "pi", (3.7592, 3.2338, 2.6635)),
    ],
)
def test_margins_of_the_classical_rules(rule: str, form: str, Ms: tuple[float, ...]) -> None:
    # CHECKS.md section 3, K = T = 1, L = 0.2, 0.5, 1 (PI rows; its PID rows use another filter).
    for L, expected in zip((0.2, 0.5, 1.0), Ms, strict=True):
        plant = Fopdt(1, 1, L)
        settings = {
            "zn-step": lambda L=L: ziegler_nichols_step(L, L, form),
            "zn-ultimate": lambda p=plant: ziegler_nichols_ultimate(ultimate(p), form),
            "tl": lambda p=plant: tyreus_luyben(ultimate(p), form),
            "cc": lambda L=L: cohen_coon(1, 1, L, form),
        }[rule]()
        assert margins(plant, settings).Ms == pytest.approx(expected, abs=6e-5)


def test_cohen_coon_coefficients() -> None:
    # CHECKS.md section 3: K = 1, L = 1, T = 2.
    assert three(cohen_coon(1, 2, 1, "pi")) == pytest.approx((1.883333, 1.657895, 0), abs=1e-6)
    assert three(cohen_coon(1, 2, 1, "pid")) == pytest.approx((2.916667, 2.058824, 0.333333), abs=1e-6)


@pytest.mark.parametrize(
    ("goal", "overshoot", "form", "expected"),
    [
        ("setpoint", 0, "pi", (0.35, 1.2, 0)),
        ("setpoint", 0, "pid", (0.6, 1.0, 0.5)),
        ("setpoint", 20, "pi", (0.6, 1.0, 0)),
        ("setpoint", 20, "pid", (0.95, 1.4, 0.47)),
        ("load", 0, "pi", (0.6, 4.0, 0)),
        ("load", 0, "pid", (0.95, 2.4, 0.42)),
        ("load", 20, "pi", (0.7, 2.3, 0)),
        ("load", 20, "pid", (1.2, 2.0, 0.42)),
    ],
)
def test_chien_hrones_reswick_coefficients(goal: str, overshoot: int, form: str, expected: tuple[float, ...]) -> None:
    # With K = T = L = 1 the coefficients stand alone (1952; CHECKS.md section 3).
    assert three(chien_hrones_reswick(1, 1, 1, form, goal, overshoot)) == pytest.approx(expected)


def test_imc_coefficients_and_limits() -> None:
    # Rivera, Morari and Skogestad 1986; CHECKS.md section 3: tau 2, theta 1, lam 1.3, k 1.5, and the fastest allowed.
    assert three(imc_pid(1.5, 2, 1, 1.3)) == pytest.approx((0.9259259, 2.5, 0.4), abs=1e-7)
    improved = margins(Fopdt(1, 2, 1), imc_pi(1, 2, 1, 1.7))
    assert (improved.Ms, improved.gain_margin) == pytest.approx((1.9535, 2.2491), abs=6e-5)
    plain = margins(Fopdt(1, 2, 1), lambda_pi(1, 2, 1, 0.7))  # Kc = tau/(k lam) with lam 1.7 = Tc + L
    assert (plain.Ms, plain.gain_margin) == pytest.approx((1.7500, 2.6704), abs=6e-5)
    assert plain.phase_margin_deg == pytest.approx(56.30, abs=6e-3)


def test_itae_examples() -> None:
    # 10 exp(-s)/(2s+1): load PI 0.169, 1.85 (Seborg, Edgar and Mellichamp); computed digits of CHECKS.md section 3.
    assert three(itae(10, 2, 1, "pi", "load"))[:2] == pytest.approx((0.16908, 1.85212), abs=6e-6)
    assert three(itae(10, 2, 1, "pi", "setpoint"))[:2] == pytest.approx((0.11057, 2.11082), abs=6e-6)
    assert three(itae(1, 1, 1, "pid", "load")) == pytest.approx((1.357, 1 / 0.842, 0.381))
    assert three(itae(1, 1, 1, "pid", "setpoint")) == pytest.approx((0.965, 1 / 0.6495, 0.308))


@pytest.mark.parametrize("form", ["pi", "pid"])
def test_quick_margins_equal_the_refined_ones(form: str) -> None:
    for plant in (Fopdt(1, 1, 0.2), Fopdt(-3, 0.1, 0.5), Sopdt(2, 1, 0.4, 0.05)):
        rules = published(plant, Fopdt(plant.K, 1, 0.2), 1.6, form, period=0.02)
        for rule in rules:
            exact = margins(plant, rule.settings, period=0.02)
            (quick,) = quick_margins(held_plant(plant, 0.02), [rule.settings], 1 / 0.21)
            assert quick.stable == exact.stable
            if exact.Ms is not None and exact.Ms < 5:  # a loop on the edge is told by any grid
                assert quick.Ms == pytest.approx(exact.Ms, rel=2e-3)
                assert quick.Mt == pytest.approx(exact.Mt, rel=2e-3)
                assert quick.gain_margin == pytest.approx(exact.gain_margin, rel=2e-3)
                assert quick.phase_margin_deg == pytest.approx(exact.phase_margin_deg, abs=0.1)


def test_rules_stand_beside_the_proposals_and_are_never_recommended() -> None:
    found = propose(Fopdt(1, 1, 0.2), Ms=1.6, period=0.01)
    assert len(found.rules) == 10
    assert {r.meets_target for r in found.rules} == {True, False}
    assert all(t.method not in {r.method for r in found.rules} for t in found.tunings)
    for rule in found.rules:
        worst = max(rule.margins.Ms or np.inf, rule.margins.Mt or np.inf)
        assert rule.meets_target == (worst <= 1.605)
