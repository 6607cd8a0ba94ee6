"""What to believe: excitation, kind of operation, the next test to run."""

from ident.judge.choice import Choice, choose, fit
from ident.judge.excitation import Advice, Excitation, advice, excitation
from ident.judge.operation import Operation, operation

__all__ = [
    "Advice",
    "Choice",
    "Excitation",
    "Operation",
    "advice",
    "choose",
    "excitation",
    "fit",
    "operation",
]
