"""Criteria, residual tests, intervals: arrays in, numbers out; knows no plant."""

from ident.evidence.estimates import Covariance, Estimate
from ident.evidence.statistics import Statistics

__all__ = ["Covariance", "Estimate", "Statistics"]
