"""What to believe: excitation, kind of operation, the next test to run."""

from ident.judge.advice import Advice, advice
from ident.judge.choice import Choice, believed, choose, fit
from ident.judge.crosscheck import CrossCheck, CrossChecks, cross_check
from ident.judge.excitation import Excitation, excitation
from ident.judge.information import unlogged_setpoint
from ident.judge.load_moved import load_moved
from ident.judge.operation import Operated, Operation, mixed, operation, operations
from ident.judge.oscillation import sustained

__all__ = [
    "Advice",
    "Choice",
    "CrossCheck",
    "CrossChecks",
    "Excitation",
    "Operated",
    "Operation",
    "advice",
    "believed",
    "choose",
    "cross_check",
    "excitation",
    "fit",
    "load_moved",
    "mixed",
    "operation",
    "operations",
    "sustained",
    "unlogged_setpoint",
]
