"""A second-order fit on the page, in its report and in the history of its loop."""

from __future__ import annotations

import re
from collections.abc import Callable

import numpy as np
import pytest
from browsing import Visit
from playwright.sync_api import expect
from watched_loop import Api, here


def second_order(poles: tuple[complex, complex]) -> bytes:
    """A step test of K = 12, L = 0.3 s with these poles (1/s), sampled exactly every 0.1 s; noise of 1 rpm."""
    h, n, delay = 0.1, 900, 3
    a, b = poles
    # Residues of 1/s times the unit-gain plant: its step response, by hand.
    t = h * np.arange(n)
    step = (1 + (b * np.exp(a * t) - a * np.exp(b * t)) / (a - b)).real
    u = np.repeat([40.0, 50.0, 42.0, 55.0, 45.0, 50.0, 40.0, 52.0, 47.0], n // 9)
    y = np.full(n, 600.0)
    for k in np.flatnonzero(np.diff(u)) + 1:
        y[k + delay :] += 12.0 * (u[k] - u[k - 1]) * step[: n - k - delay]
    y += np.random.default_rng(3).standard_normal(n)
    rows = [f"{t[k]:.1f},{u[k]:.2f},{y[k]:.3f}" for k in range(n)]
    return "\n".join(["time [s],command [%],speed [rpm]", *rows, ""]).encode()


# Time constants 1.5 s and 0.8 s; w0 = 2 rad/s with zeta = 0.4.
LAGS, RINGING = (-1 / 1.5, -1 / 0.8), (complex(-0.8, 1.8330303), complex(-0.8, -1.8330303))


@pytest.mark.parametrize(
    ("poles", "truth", "formula"),
    [
        (LAGS, {"K": 12.0, "T1": 1.5, "T2": 0.8, "L": 0.3}, "K exp(−L s)/((T1 s + 1)(T2 s + 1))"),
        (RINGING, {"K": 12.0, "w0": 2.0, "zeta": 0.4, "L": 0.3}, "K ω0² exp(−L s)/(s² + 2 ζ ω0 s + ω0²)"),
    ],
    ids=["two lags", "ringing"],
)
def test_a_second_order_fit_is_shown_as_what_it_is(
    visit: Callable[..., Visit], poles: tuple[complex, complex], truth: dict[str, float], formula: str
) -> None:
    one = visit()
    told = one.report("second.csv", second_order(poles))
    chosen = told["fits"][told["selected"]]
    assert chosen["model"] == "sopdt"
    for name, value in truth.items():
        shown, _ = one.value(f"headline-{name}")
        assert shown == chosen["parameters"][name]["value"]
        assert shown == pytest.approx(value, rel=0.15)
    assert one.page.get_by_test_id("formula").inner_text().split() == formula.split()
    expect(one.page.get_by_test_id("selected-because")).to_have_text(told["selected_because"])
    (other,) = (fit for fit in told["fits"] if fit is not chosen)
    expect(one.page.get_by_test_id("fit-fopdt")).to_contain_text(f"{other['statistics']['fit_percent']:.2f}")
    expect(one.page.get_by_test_id("fit-sopdt")).to_contain_text("chosen")
    # What was noticed about the first-order fit alone is not said of the chosen one.
    alone = {f["code"] for f in other["findings"]} - {f["code"] for f in chosen["findings"]}
    assert alone
    for code in alone:
        expect(one.page.get_by_test_id("part-findings").get_by_test_id(f"finding-{code}")).to_have_count(0)
        expect(one.page.get_by_test_id("other-fopdt").get_by_test_id(f"finding-{code}")).to_have_count(1)
    one.clean()


def test_a_second_order_night_stands_in_the_history_with_the_sum_of_its_time_constants(
    visit: Callable[..., Visit], api: Api
) -> None:
    name = "drum 11"
    told = api("POST", f"{api.loop(name)}/logs", second_order(LAGS))
    report = api("GET", f"/reports/{told['report_id']}")
    sum_of_lags = report["fits"][report["selected"]]["derived"]["T1 + T2"]
    (first,) = (fit["parameters"] for fit in report["fits"] if fit["model"] == "fopdt")
    one = visit(here(name))
    one.page.get_by_role("button", name="Later night").click()
    shown = one.page.get_by_test_id("panel-T").locator("output").inner_text()
    numbers = [float(text) for text in re.findall(r"\d+\.\d+", shown)]
    both = [one for each in (sum_of_lags, first["T"]) for one in (each["value"], *each["ci95"])]
    assert numbers == pytest.approx(both, abs=6e-3)
    for name in "KTL":
        expect(one.page.get_by_test_id(f"panel-{name}").locator("svg .ring")).to_have_count(1)
    expect(one.page.get_by_test_id("night")).to_contain_text("first order")
    expect(one.page.get_by_test_id("part-history")).to_contain_text("the first-order fits, which the verdict compares")
    one.clean()
