"""The fits: start values, separable least squares, dead-time profile."""

from ident.estimate.friction import Friction

__all__ = ["Friction"]
