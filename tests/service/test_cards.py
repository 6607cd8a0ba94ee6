"""Realisations over HTTP: coefficients and cards for a kept report, and a card's parts as found."""

from __future__ import annotations

from typing import Any

import expect
import pytest
from starlette.testclient import TestClient

import ident

SCALE = {"speed_volts": 10 / 3000, "command_volts": 0.1}
PARTS = {"R1": 1e5, "R2": 2.2e5, "C2": 4.7e-7, "Rb": 4.7e4}
PLANT = {"K": 125.0, "T": 0.2, "L": 0.02}


@pytest.fixture(scope="module")
def kept(client: TestClient, step_test: bytes) -> str:
    client.put("/v1/loops/cards", json={})
    analysis = client.post("/v1/loops/cards/logs", content=step_test, headers={"Prefer": "wait=20"}).json()
    return str(analysis["report_id"])


def best(answer: Any) -> Any:
    return answer["tunings"][answer["recommended"]]["realisations"]


def test_a_report_says_what_to_type(client: TestClient, kept: str) -> None:
    report = client.get(f"/v1/reports/{kept}").json()
    made = best(report)
    settings = report["tunings"][report["recommended"]]["settings"]
    assert made["forms"]["ideal"] == settings
    assert made["forms"]["parallel"]["ki"] == pytest.approx(settings["Kp"] / settings["Ti"])
    assert [one["digital"]["rule"] for one in made["digital"]] == ["backward", "tustin"]
    assert made["forms"]["gain_percent"] is None
    assert made["card"] is None


def test_coefficients_as_asked(client: TestClient, kept: str) -> None:
    wanted = {"kind": "digital", "speed_span": 1500.0, "command_span": 100.0, "bits": 16}
    made = best(client.post(f"/v1/reports/{kept}/tunings", json={"realisation": wanted}).json())
    assert made["forms"]["gain_percent"] == pytest.approx(made["forms"]["ideal"]["Kp"] * 15.0)
    for one in made["digital"]:
        assert one["rounded"]["coefficients"]["bits"] == 16
        assert abs(one["rounded"]["Ms_lost"]) < 0.05


def test_a_card_for_a_kept_fit(client: TestClient, kept: str) -> None:
    wanted = {"kind": "analogue", "R_series": "E96", **SCALE}
    answer = client.post(f"/v1/reports/{kept}/tunings", json={"form": "pid", "Ms": 1.5, "realisation": wanted})
    card = best(answer.json())["card"]
    assert max(card["margins"]["Ms"], card["margins"]["Mt"]) <= 1.505
    assert card["printed"]["R1"].endswith("Ω")
    # The parts it chose are judged the same as a card that is found with them.
    parts = {name: value for name, value in card["parts"].items() if value is not None}
    again = client.post("/v1/cards", json={"parts": parts, "report_id": kept, "Ms": 1.5, **SCALE}).json()
    assert again["margins"] == card["margins"]
    assert again["change"]["change"] == {}


def test_a_card_as_found_on_a_given_plant(client: TestClient) -> None:
    answer = client.post("/v1/cards", json={"parts": PARTS, "plant": PLANT, "Ms": 1.6, **SCALE})
    assert answer.status_code == 200
    scale = ident.CardScale(SCALE["speed_volts"], SCALE["command_volts"])
    same = ident.card_as_found(ident.Fopdt(**PLANT), ident.Parts(**PARTS), Ms=1.6, scale=scale)
    told = answer.json()
    assert told["settings"]["Kp"] == same.settings.Kp
    assert same.change is not None
    assert told["change"]["change"] == same.change.change


@pytest.mark.parametrize(
    ("body", "status", "code"),
    [
        ({"parts": PARTS}, 422, "invalid-body"),
        ({"parts": PARTS, "plant": PLANT, "report_id": "x"}, 422, "invalid-body"),
        ({"parts": PARTS, "report_id": "none"}, 404, "no-such-report"),
        ({"parts": PARTS | {"Rd": 1e3}, "plant": PLANT}, 422, "parts-incomplete"),
        ({"parts": PARTS | {"R1": -1.0}, "plant": PLANT}, 422, "invalid-body"),
        ({"parts": PARTS, "plant": PLANT | {"K": 0.0}}, 422, "plant-out-of-range"),
        ({"parts": PARTS, "plant": PLANT, "R_low": 1e5, "R_high": 1e4, "Ms": 1.2}, 422, "parts-out-of-range"),
        # Found by tests/service/test_openapi.py: the loop's gain overflows.
        ({"parts": {"R1": 6.492146439582028e-266, "R2": 301168866147190.1, "C2": 645905482983618.5},
          "plant": {"K": -3.951571883940449e+16, "T": 2.5459434942820748e-79, "L": 507456368268770.2},
          "speed_volts": 73451439948605.05, "command_volts": 1e6, "C_high": 822062546219964.6},
         422, "low-frequency-unclear"),
    ],
)  # fmt: skip
def test_what_cannot_be_judged_is_refused(client: TestClient, body: dict[str, Any], status: int, code: str) -> None:
    expect.answer(client.post("/v1/cards", json=body), expected=status, code=code)


def test_a_card_without_parts_in_reach_is_refused(client: TestClient, kept: str) -> None:
    wanted = {"kind": "analogue", "speed_volts": 1e-9, "command_volts": 1e6}
    answer = client.post(f"/v1/reports/{kept}/tunings", json={"realisation": wanted})
    expect.answer(answer, expected=422, code="no-parts-in-range")
