"""The op-amp card against nodal analysis, published parts and the E-series of another package."""

from __future__ import annotations

import eseries
import numpy as np
import pytest

from ident import CardScale, Fopdt, Limits, Parts, Refused, Sopdt, UnderdampedSopdt, card_as_found, choose_card, margins
from ident.realise.grid import grid
from ident.realise.network import Card
from ident.realise.preferred import nearest, series, trade
from ident.realise.series_optimum import series_optimum
from tests.reference import nodal

PLANT = Fopdt(125.0, 0.2, 0.02)  # rpm per V
SCALE = CardScale(10 / 3000, 10 / 24)
EXAMPLE = {"R1": 100e3, "Rd": 4.7e3, "C1": 100e-9, "R2": 220e3, "C2": 470e-9}


@pytest.mark.parametrize("name", ["E3", "E6", "E12", "E24", "E48", "E96", "E192"])
def test_series_equal_those_of_the_eseries_package(name: str) -> None:
    theirs = np.array(sorted(eseries.series(getattr(eseries, name))))
    assert np.allclose(series(name), theirs / theirs[0], rtol=1e-12)


def test_nearest_values_of_the_table() -> None:
    # CHECKS.md section 7 (IEC 60063).
    assert [nearest(s, 153850.0) for s in ("E24", "E96")] == [150e3, 154e3]
    assert [nearest(s, 197100.0) for s in ("E24", "E96", "E192")] == [200e3, 196e3, 198e3]
    assert [nearest(s, 47123.0) for s in ("E24", "E96")] == [47e3, 47.5e3]
    assert [nearest(s, 1234.0) for s in ("E24", "E96", "E192")] == [1200.0, 1240.0, 1230.0]
    assert [round(sum(series(s)), 2) for s in ("E24", "E96", "E192")] == [90.1, 370.70, 745.99]


def test_parts_are_printed_as_in_the_trade() -> None:
    assert [trade(4700.0, "Ω"), trade(100e-9, "F"), trade(1e6, "Ω"), trade(2.2e-6, "F"), trade(820.0, "Ω")] == [
        "4.7 kΩ", "100 nF", "1 MΩ", "2.2 µF", "820 Ω",
    ]  # fmt: skip


@pytest.mark.parametrize("leak", ["none", "C2", "both"])
@pytest.mark.parametrize("form", ["pi", "pid"])
def test_the_formula_is_what_nodal_analysis_finds(form: str, leak: str) -> None:
    """CHECKS.md section 7: 0.1 to 1e5 rad/s, error amplifier included."""
    values = EXAMPLE if form == "pid" else {k: v for k, v in EXAMPLE.items() if k not in ("Rd", "C1")}
    parts = Parts(**values, Rl=None if leak == "none" else 10e6, leak=leak, Ra=10e3, Rb=47e3)  # type: ignore[arg-type]
    resistors = [
        ("speed", "p", 10e3), ("p", "0", 47e3), ("setpoint", "m", 10e3), ("m", "e", 47e3),  # difference amplifier
        ("e", "x", parts.R1), ("x", "f", parts.R2),
    ]  # fmt: skip
    capacitors = [("f", "u", parts.C2)]
    if form == "pid":
        resistors.append(("e", "d", EXAMPLE["Rd"]))
        capacitors.append(("d", "x", EXAMPLE["C1"]))
    if leak != "none":
        resistors.append(("f" if leak == "C2" else "x", "u", 10e6))
    w = np.geomspace(0.1, 1e5, 61)
    # The network inverts once; speed on the error amplifier's plus input makes the feedback path -C.
    reference = [
        nodal.gain(
            1j * x, resistors, capacitors, [("p", "m", "e"), ("0", "x", "u")], {"speed": 1.0, "setpoint": 0.0}, "u"
        )
        for x in w
    ]
    assert np.allclose(Card(parts).frequency_response(w), -np.array(reference), rtol=1e-9)


def test_the_worked_card() -> None:
    """CHECKS.md section 7, every printed digit."""
    card = Card(Parts(**EXAMPLE))
    assert (card.gain, card.tauI, card.tauD, card.filter_time) == pytest.approx((2.2, 0.1034, 0.01047, 0.47e-3))
    assert card.tauD / card.filter_time == pytest.approx(22.2766, abs=5e-5)
    s = card.settings
    assert (s.Kp, s.Ti, s.Td) == pytest.approx((2.422766, 0.113870, 0.009507), abs=5e-7)
    assert list(card.corners_hz.values()) == pytest.approx([1.53922, 15.20105, 338.6275], abs=5e-5, rel=3e-6)
    across = Card(Parts(**EXAMPLE, Rl=10e6, leak="C2"))
    assert across.low_gain == pytest.approx(102.2)
    assert across.corners_hz["leak"] == pytest.approx(0.033863, abs=5e-7)
    assert Card(Parts(**EXAMPLE, Rl=10e6, leak="both")).low_gain == pytest.approx(100.0)
    for one in (card, across, Card(Parts(**EXAMPLE, Rl=10e6, leak="both"))):
        at_end = abs(one.frequency_response(np.array([1e9]))[0])
        assert one.high_gain == pytest.approx(at_end, rel=1e-6)


def test_ogatas_worked_network() -> None:
    """Ogata, Modern Control Engineering (2010), section 8-2, example 8-1: Kp 39.42, Ti 3.077 s, Td 0.7692 s.

    His first op-amp, Z1 = R1 parallel C1 and Z2 = R2 + C2, is our network without the damping resistor; R4/R3 of the
    second stands where our Rb/Ra does. Rd is small here instead of missing.
    """
    parts = Parts(R1=153.85e3, R2=153.85e3, C1=10e-6, C2=10e-6, Rd=1e-6, Ra=10e3, Rb=197.1e3)
    s = Card(parts).settings
    assert (s.Kp, s.Ti, s.Td) == pytest.approx((39.42, 3.077, 0.76925), rel=1e-6)
    w = np.geomspace(0.1, 1e2, 21)
    resistors = [("in", "x", 153.85e3), ("x", "f", 153.85e3), ("a", "y", 10e3), ("y", "u", 197.1e3)]
    capacitors = [("in", "x", 10e-6), ("f", "a", 10e-6)]
    reference = [
        nodal.gain(1j * x, resistors, capacitors, [("0", "x", "a"), ("0", "y", "u")], {"in": 1.0}, "u") for x in w
    ]
    assert np.allclose(Card(parts).frequency_response(w), reference, rtol=1e-8)


@pytest.mark.parametrize("target", [1.4, 1.8])
@pytest.mark.parametrize("form", ["pi", "pid"])
@pytest.mark.parametrize(
    "plant", [PLANT, Sopdt(125.0, 0.2, 0.05, 0.01), UnderdampedSopdt(125.0, 20.0, 0.6, 0.02), Fopdt(-125.0, 0.2, 0.1)]
)
def test_a_chosen_card_keeps_the_target_with_parts_that_can_be_bought(plant: Fopdt, form: str, target: float) -> None:
    card = choose_card(plant, Ms=target, form=form, scale=SCALE)
    # The margins stated are those of the network's own response, and of nothing simpler.
    assert card.margins == margins(plant, Card(card.parts, SCALE, np.sign(plant.K)))
    assert card.margins.Ms is not None
    assert card.margins.Mt is not None
    assert max(card.margins.Ms, card.margins.Mt) <= target + 0.005
    for name, value in card.parts.given.items():
        assert nearest("E6" if name.startswith("C") else "E24", value) == value
    # Rounding to parts costs little of what the best such network could have.
    assert card.wanted is not None
    reached, best = card.series.Kc / card.series.tauI, card.wanted.Kc / card.wanted.tauI
    assert 0.88 < reached / best < 1.1
    assert card.series.tauI >= card.series.tauD


def test_finer_series_come_nearer() -> None:
    def reached(R: str, C: str) -> float:
        card = choose_card(PLANT, scale=SCALE, limits=Limits(R_series=R, C_series=C))
        return card.series.Kc / card.series.tauI

    assert reached("E192", "E24") > reached("E12", "E3")


def test_the_optimum_is_not_beaten_by_a_random_search() -> None:
    """300 random networks scaled to the target by brute force on a dense grid: none has a larger integral gain."""
    on = grid(PLANT)
    best = series_optimum(on, 1.6, N=10.0)
    random = np.random.default_rng(1)
    s = 1j * np.geomspace(1.0, 400.0, 1500)
    plant = PLANT.frequency_response(s.imag)
    most = 0.0
    for _ in range(300):
        tauI = best.tauI * random.uniform(0.6, 1.7)
        tauD = tauI * random.uniform(0.05, 1.0)
        shape = plant * (1 + 1 / (s * tauI)) * (1 + s * tauD) / (1 + s * tauD / 10)
        k = np.linspace(0.3, 1.5, 400)[:, None] * best.Kc
        peak = (np.maximum(1.0, np.abs(k * shape)) / np.abs(1 + k * shape)).max(axis=1)
        bad = np.flatnonzero(peak > 1.6)
        if len(bad) and bad[0] > 0:
            most = max(most, float(k[bad[0] - 1, 0] / tauI))
    assert most <= 1.005 * best.Kc / best.tauI
    assert most >= 0.9 * best.Kc / best.tauI


def test_the_worst_corner_is_worse_than_any_draw() -> None:
    card = choose_card(PLANT, scale=SCALE)
    spread = card.spread
    assert spread is not None
    assert spread.stable
    assert spread.Ms_worst is not None
    assert spread.peak_p95 is not None
    random = np.random.default_rng(5)
    given = card.parts.given
    for _ in range(40):
        factor = {n: 1 + random.uniform(-1, 1) * (0.05 if n.startswith("C") else 0.01) for n in given}
        found = margins(PLANT, Card(Parts(**{n: v * factor[n] for n, v in given.items()}), SCALE))
        assert found.Ms is not None
        assert found.Mt is not None
        assert max(found.Ms, found.Mt) <= spread.Ms_worst + 1e-6
    assert spread.peak_p95 < spread.Ms_worst


def test_a_card_as_found_is_put_right_with_the_fewest_parts() -> None:
    good = choose_card(PLANT, scale=SCALE)
    same = card_as_found(PLANT, good.parts, Ms=1.6, scale=SCALE)
    assert same.margins == good.margins
    assert same.change is not None
    assert same.change.change == {}
    # One part wrong: one part puts it right.
    wrong = Parts(**(good.parts.given | {"Rb": good.parts.Rb * 2}))
    found = card_as_found(PLANT, wrong, Ms=1.6, scale=SCALE)
    assert found.change is not None
    assert found.change.margins is not None
    assert found.change.parts is not None
    assert len(found.change.change) == 1
    assert margins(PLANT, Card(found.change.parts, SCALE)) == found.change.margins
    # A target that no single part reaches takes two.
    harder = card_as_found(PLANT, wrong, Ms=1.3, scale=SCALE)
    assert harder.change is not None
    assert len(harder.change.change) == 2


def test_what_has_no_answer_is_refused() -> None:
    def code(**given: object) -> str:
        with pytest.raises(Refused) as refused:
            choose_card(given.pop("plant", PLANT), **given)  # type: ignore[arg-type]
        return refused.value.code

    assert code(scale=CardScale(1e-6, 10.0)) == "no-parts-in-range"
    assert code(plant=Fopdt(125.0, 0.2, 0.0), form="pi") == "unbounded"
    assert code(limits=Limits(R_series="E7")) == "series-unknown"
    assert code(Ms=0.9) == "target-out-of-range"
    assert code(Rl=1e6) == "parts-incomplete"
    with pytest.raises(Refused, match="both, or neither"):
        Parts(R1=1e5, R2=1e5, C2=1e-7, Rd=1e3)
