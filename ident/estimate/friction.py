"""Friction: dry friction per direction of motion."""

from __future__ import annotations

from dataclasses import dataclass

from ident.evidence import Estimate


@dataclass(frozen=True, slots=True)
class Friction:
    """Dry friction per direction, in command units."""

    forward: Estimate
    backward: Estimate
