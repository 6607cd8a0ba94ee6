"""Store: loops, logs, analyses and reports, in a database with the uploads as files beside it. Knows no HTTP."""

from service.store.jobs import Job
from service.store.logs import Accepted, Analysis, KeptLog
from service.store.loops import KeptLoop
from service.store.reports import KeptReport
from service.store.store import Store

__all__ = ["Accepted", "Analysis", "Job", "KeptLog", "KeptLoop", "KeptReport", "Store"]
