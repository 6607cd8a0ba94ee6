"""Where nothing in the residuals asks for a second time constant, none is looked for; where it would win, one is."""

from __future__ import annotations

import numpy as np

import ident
from ident.estimate.ground import ground
from ident.estimate.second_lag import nothing_left
from tests.ident.test_fit_sopdt import H, random_binary, respond


def record(T2: float, noise: float, seed: int) -> ident.LoopRecord:
    u = random_binary(seed=seed)
    y = respond(u, 2.0, 0.5 * T2, 0.5 + T2, 23)
    return ident.LoopRecord(H * np.arange(len(u)), u, y + noise * np.random.default_rng(seed).standard_normal(len(u)))


def test_a_second_lag_that_would_be_taken_is_not_passed_over() -> None:
    # Noise so high that about half of these logs show it: python-control's plant, T2 of five rows.
    taken = 0
    for seed in range(20):
        log = record(0.05, 0.3, seed)
        first, second = ident.fit(log, "fopdt"), ident.fit(log, "sopdt")
        gained = (first.statistics.aicc or 0.0) - (second.statistics.aicc or 0.0)
        if gained > 10.0:
            taken += 1
            assert not nothing_left(ground(log), first.statistics)
    assert taken > 4


def test_most_first_order_logs_are_seen_to_be_that_at_once() -> None:
    skipped = 0
    for seed in range(30):
        log = record(1e-6, 0.1, seed)
        skipped += nothing_left(ground(log), ident.fit(log, "fopdt").statistics)
    assert skipped >= 12
    report = ident.analyse(log, subspace=False)
    assert report.selected == 0
    assert len(report.fits) == 1 or "no richer model" in report.selected_because
