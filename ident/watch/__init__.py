"""Watching: whether a loop has moved, from estimates with covariances."""

from ident.watch.drift import drift
from ident.watch.history import drift_history
from ident.watch.interval import MarginInterval, margin_interval
from ident.watch.margin import MarginDrift
from ident.watch.night import Night
from ident.watch.sizes import PracticalSize
from ident.watch.verdict import Drift, ParameterDrift

__all__ = [
    "Drift",
    "MarginDrift",
    "MarginInterval",
    "Night",
    "ParameterDrift",
    "PracticalSize",
    "drift",
    "drift_history",
    "margin_interval",
]
