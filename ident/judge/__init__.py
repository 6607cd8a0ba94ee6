"""What to believe: excitation, kind of operation, the next test to run."""

from ident.judge.choice import Choice, choose, fit
from ident.judge.crosscheck import CrossCheck, CrossChecks, cross_check
from ident.judge.excitation import Advice, Excitation, advice, excitation
from ident.judge.operation import Operation, operation

__all__ = [
    "Advice",
    "Choice",
    "CrossCheck",
    "CrossChecks",
    "Excitation",
    "Operation",
    "advice",
    "choose",
    "cross_check",
    "excitation",
    "fit",
    "operation",
]
