"""Tuning: settings under a robustness target, published rules, predicted responses, worst case."""

from ident.tune.predict import predict
from ident.tune.predicted import LoadStep, Predicted, Response, SetpointStep
from ident.tune.propose import Proposals, propose
from ident.tune.rules import Rule
from ident.tune.setpoint_weight import choose_setpoint_weight
from ident.tune.simc import simc
from ident.tune.tuning import Tuning, tune
from ident.tune.worst_case import Cloud, WorstCase, cloud, worst_case

__all__ = [
    "Cloud",
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
    "predict",
    "propose",
    "simc",
    "tune",
    "worst_case",
]
