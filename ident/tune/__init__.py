"""Tuning: settings under a robustness target, published rules, predicted responses, worst case."""

from ident.tune.predicted import LoadStep, Predicted, Response, SetpointStep
from ident.tune.simc import simc
from ident.tune.tuning import Tuning, tune
from ident.tune.worst_case import WorstCase

__all__ = ["LoadStep", "Predicted", "Response", "SetpointStep", "Tuning", "WorstCase", "simc", "tune"]
