"""What to believe: excitation, kind of operation, validation."""

from ident.judge.excitation import Advice, Excitation

__all__ = ["Advice", "Excitation"]
