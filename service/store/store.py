"""Store: everything that is kept, opened at start and closed at stop. Nothing is removed yet: no retention."""

from __future__ import annotations

import os
from pathlib import Path

from service.store import lock
from service.store.database import Database
from service.store.jobs import Jobs
from service.store.logs import Logs
from service.store.loops import Loops
from service.store.reports import Reports
from service.store.uploads import Uploads

FILE = "gainwright.db"


class Store:
    """Opened once; a closed one can be opened again.

    alone   whether no other service can be at work on the same data
    """

    loops: Loops
    logs: Logs
    jobs: Jobs
    reports: Reports
    uploads: Uploads

    def __init__(self, folder: Path, url: str | None = None) -> None:
        """folder: of the data;  url: of the database, None: an SQLite file in the folder. Nothing is opened yet."""
        self._folder = folder
        self._url = url
        self._lock: int | None = None
        self._database: Database | None = None

    @property
    def alone(self) -> bool:
        return self._lock is not None

    def open(self) -> None:
        """Lock the data, bring the tables up to date. Raises ProblemError: data-in-use, bad-database-url."""
        if self._database is not None:
            return
        uploads = self._folder / "uploads"
        uploads.mkdir(parents=True, exist_ok=True)
        url = self._url or f"sqlite:///{self._folder.resolve() / FILE}"
        if url.startswith("sqlite"):
            self._lock = lock.hold(self._folder)
        try:
            database = Database(url)
        except BaseException:
            self._unlock()
            raise
        self._database = database
        self.loops, self.logs, self.jobs = Loops(database), Logs(database), Jobs(database)
        self.reports, self.uploads = Reports(database), Uploads(uploads)
        if self.alone:
            self.uploads.remove_parts()

    def close(self) -> None:
        if self._database is not None:
            self._database.close()
            self._database = None
        self._unlock()

    def _unlock(self) -> None:
        if self._lock is not None:
            os.close(self._lock)
            self._lock = None
