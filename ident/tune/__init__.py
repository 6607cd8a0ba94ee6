"""Tuning: settings under a robustness target, published rules, predicted responses, worst case."""

from ident.tune.limited import LimitedOutcome, limited_outcome, saturates
from ident.tune.predict import lagged, predict
from ident.tune.predicted import LoadStep, Predicted, Response, SetpointStep
from ident.tune.propose import Proposals, propose
from ident.tune.rules import Rule
from ident.tune.setpoint_weight import choose_setpoint_weight
from ident.tune.simc import simc
from ident.tune.tuning import Tuning, tune
from ident.tune.worst_case import Cloud, WorstCase, cloud, worst_case

__all__ = [
    "Cloud",
    "LimitedOutcome",
    "LoadStep",
    "Predicted",
    "Proposals",
    "Response",
    "Rule",
    "SetpointStep",
    "Tuning",
    "WorstCase",
    "choose_setpoint_weight",
    "cloud",
    "lagged",
    "limited_outcome",
    "predict",
    "propose",
    "saturates",
    "simc",
    "tune",
    "worst_case",
]
