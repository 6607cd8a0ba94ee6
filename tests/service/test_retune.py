"""Another target for a kept report: other kinds of target, the noise of the log, rules, refusals, the time it takes."""

from __future__ import annotations

import json
import time
from typing import Any

import numpy as np
import pytest

import ident
from service.errors import Problem
from service.work.report import report_bytes
from service.work.retune import Retarget, retuned_bytes
from tests.reference.held_fopdt import respond


@pytest.fixture(scope="module")
def report() -> bytes:
    n, h = 1500, 0.01
    u = np.where(np.arange(n) % 500 < 250, 2.0, 4.0)
    y = respond(u, h, 40.0, 0.4, 0.055) + 0.5 * np.random.default_rng(4).standard_normal(n)
    rows = "\n".join(f"{k * h:.3f},{a:.6g},{b:.6g}" for k, (a, b) in enumerate(zip(u, y, strict=True)))
    made = report_bytes(f"time,command,speed\n{rows}\n".encode(), Retarget(model="fopdt"))
    assert isinstance(made, bytes)
    return made


def retuned(report: bytes, **wanted: Any) -> dict[str, Any]:
    found = retuned_bytes(report, Retarget(**wanted))
    assert isinstance(found, bytes), found
    told: dict[str, Any] = json.loads(found)
    return told


def test_margins_instead_of_ms(report: bytes) -> None:
    told = retuned(report, gain_margin=3.0, phase_margin_deg=60.0)
    assert told["options"]["Ms"] is None
    best = told["tunings"][told["recommended"]]["margins"]
    assert min(best["gain_margin"] / 3.0, best["phase_margin_deg"] / 60.0) == pytest.approx(1.0, abs=2e-3)


def test_the_commands_noise_is_limited_by_what_the_log_shows(report: bytes) -> None:
    parsed = json.loads(report)
    seen = parsed["fits"][parsed["selected"]]["statistics"]["rms_residual"]
    assert seen == pytest.approx(0.5, rel=0.1)
    told = retuned(report, command_noise_std=0.015)
    assert told["options"]["speed_noise_std"] == seen
    loud, quiet = retuned(report)["tunings"][0]["settings"], told["tunings"][told["recommended"]]["settings"]
    assert abs(quiet["Kp"]) < abs(loud["Kp"])


def test_pid_offers_both_and_prefers_the_one_without_the_cliff(report: bytes) -> None:
    told = retuned(report, form="pid")
    methods = [one["method"] for one in told["tunings"]]
    assert methods[:2] == ["largest-ki-calm-derivative", "largest-ki"]
    assert told["recommended"] == 0
    assert "derivative" in told["recommended_because"]


def test_rules_come_with_every_answer(report: bytes) -> None:
    assert {"amigo", "cohen-coon", "tyreus-luyben"} <= {rule["method"] for rule in retuned(report)["rules"]}
    assert json.loads(report)["rules"]


def test_what_cannot_be_reached_is_told_with_what_can(report: bytes) -> None:
    found = retuned_bytes(report, Retarget(closed_loop_s=1e-4))
    assert isinstance(found, Problem)
    assert found.code == "target-unreachable"
    assert "fastest" in found.detail


def test_it_costs_no_more_than_forty_margins(report: bytes) -> None:
    # A ratio, so that a busy machine does not decide: proposals against the margins of one loop in the same run.
    plant, settings = ident.Fopdt(40.0, 0.4, 0.055), ident.PidSettings(0.05, 0.3)

    def least(run: Any) -> float:
        times = []
        for _ in range(5):
            start = time.process_time()
            run()
            times.append(time.process_time() - start)
        return min(times)

    one = least(lambda: ident.margins(plant, settings, period=0.01))
    assert least(lambda: retuned(report, Ms=1.4)) < 40 * one


def test_another_proposal_is_judged_on_the_plants_that_the_log_allowed(report: bytes) -> None:
    kept, told = json.loads(report), retuned(report)
    for before, after in zip(kept["tunings"], told["tunings"], strict=True):
        # The same settings on plants drawn anew: sampled quantiles of 200 of them, the dead time from its spread.
        assert after["settings"] == before["settings"]
        assert after["worst_case"]["plants"] == before["worst_case"]["plants"]
        assert after["worst_case"]["Ms_p95"] == pytest.approx(before["worst_case"]["Ms_p95"], rel=0.02)


def test_a_report_without_a_spread_says_no_worst_case(report: bytes) -> None:
    older = json.loads(report)
    for fit in older["fits"]:
        del fit["spread"]
    told = retuned(json.dumps(older).encode())
    assert all(one["worst_case"] is None for one in told["tunings"])
