"""The plant of a kept report: the chosen model rebuilt from its parameters."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import ident

Plant = ident.Fopdt | ident.Sopdt | ident.UnderdampedSopdt | ident.Arx


def plant_of(report: Mapping[str, Any]) -> Plant:
    """Of a report's JSON, parsed; the very numbers that were fitted, for JSON keeps every digit of them.

    Raises Refused: no-fit, not-offered.
    """
    selected = report["selected"]
    if selected is None:
        raise ident.Refused(
            "no-fit", "This report has no model to tune from. " + report["record"]["excitation"]["reason"]
        )
    fit = report["fits"][selected]
    value = {name: one["value"] for name, one in fit["parameters"].items()}
    match fit["model"]:
        case "fopdt":
            return ident.Fopdt(value["K"], value["T"], value["L"])
        case "sopdt" if "w0" in value:
            return ident.UnderdampedSopdt(value["K"], value["w0"], value["zeta"], value["L"])
        case "sopdt":
            return ident.Sopdt(value["K"], value["T1"], value["T2"], value["L"])
        case "arx":
            h = report["log"]["sample_time_s"]
            samples = fit["derived"]["L"]["value"] / h + 1.0
            if abs(samples - round(samples)) < 1e-6:
                return ident.Arx(_run("a", value), _run("b", value), round(samples), h)
    raise ident.Refused(
        "not-offered", f"A model {fit['model']!r} cannot be taken up again: send the log with the options you want."
    )


def _run(letter: str, value: Mapping[str, float]) -> list[float]:
    """Coefficients letter1, letter2, ..."""
    return [value[f"{letter}{i}"] for i in range(1, 1 + sum(name[0] == letter for name in value))]
