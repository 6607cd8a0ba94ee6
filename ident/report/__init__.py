"""The report: its shape, and the one place that knows the whole order."""

from ident.report.allowed import allowed_again
from ident.report.analyse import analyse
from ident.report.shape import Report, TuningReport
from ident.report.summary import summary

__all__ = ["Report", "TuningReport", "allowed_again", "analyse", "summary"]
