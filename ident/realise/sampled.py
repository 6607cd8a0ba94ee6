"""Sampled: the margins that a digital controller really has."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

from ident.errors import Refused
from ident.loop import Margins
from ident.loop.controller import Controller
from ident.loop.held_plant import held_plant
from ident.loop.law import HoldEquivalent
from ident.loop.margins import loop_margins
from ident.loop.sweep import OpenLoop
from ident.plants import Arx, Fopdt, Sopdt, UnderdampedSopdt


def sampled_margins(plant: Any, feedback: Controller, h: float, compute_delay: float = 0.0) -> Margins:
    """Margins of C(z) with the plant behind a zero-order hold, exact for lags with dead time.

    plant  Fopdt, Sopdt, UnderdampedSopdt, an Arx sampled at h, or a fit of one
    Raises Refused sampled-plant-unknown.
    """
    model = plant if hasattr(plant, "frequency_response") else getattr(plant, "model", plant)
    if isinstance(model, Fopdt | Sopdt | UnderdampedSopdt):
        held = HoldEquivalent(replace(model, L=model.L + compute_delay), h)
        return loop_margins(OpenLoop(held_plant(held), feedback))
    if isinstance(model, Arx) and abs(model.h - h) <= 1e-9 * h:
        return loop_margins(OpenLoop(held_plant(model, compute_delay=compute_delay), feedback))
    raise Refused(
        "sampled-plant-unknown",
        "The exact sampled loop is known for plants of one or two lags, and for a difference equation at the "
        "controller's own period; use the margins with half a period added.",
    )
