"""The store: tables as the migrations leave them, times in UTC, uploads that are whole, leases that hold."""

from __future__ import annotations

import threading
from collections.abc import Iterator
from datetime import UTC, datetime, timedelta, timezone
from pathlib import Path

import pytest
from alembic import command
from alembic.autogenerate import compare_metadata
from alembic.runtime.migration import MigrationContext
from sqlalchemy import CheckConstraint, inspect, select, text, update

from service.errors import Problem, ProblemError
from service.store import Accepted, Job, Store
from service.store import tables as t
from service.store.database import Database, alembic_config
from service.store.jobs import MOST_ATTEMPTS, Result
from service.store.uploads import Uploads

NOW = datetime(2026, 11, 17, 6, 40, tzinfo=UTC)
LEASE = timedelta(seconds=60)
LOST = Problem("lost", "It was lost.")


@pytest.fixture
def store(tmp_path: Path) -> Iterator[Store]:
    store = Store(tmp_path)
    store.open()
    yield store
    store.close()


def put(uploads: Uploads, source: bytes) -> str:
    with uploads.part() as log:
        log.write_bytes(source)
        return uploads.put(log)


def get(uploads: Uploads, sha256: str) -> bytes:
    with uploads.part() as log:
        uploads.get(sha256, log)
        return log.read_bytes()


def accept(store: Store, source: bytes = b"a,b", loop: str = "pan", options: str = "{}") -> Accepted:
    sha256 = put(store.uploads, source)
    return store.logs.accept(loop, sha256, len(source), options, NOW, loop_settings="{}", try_again={"lost"})


def claim(store: Store, owner: str = "me") -> Job:
    job = store.jobs.claim(owner, "reading", NOW, LEASE)
    assert job is not None
    return job


# --- migrations


def test_the_migrations_end_at_the_tables(tmp_path: Path) -> None:
    database = Database(f"sqlite:///{tmp_path / 'new.db'}")
    with database.read() as connection:
        context = MigrationContext.configure(connection, opts={"compare_type": True, "render_as_batch": True})
        assert compare_metadata(context, t.metadata) == []
        # What the comparison does not see.
        found = inspect(connection)
        for table in t.metadata.tables.values():
            checks = {check["name"] for check in found.get_check_constraints(table.name)}
            assert checks == {str(c.name) for c in table.constraints if isinstance(c, CheckConstraint)}
    database.close()


def test_the_migrations_can_go_back_and_come_again(tmp_path: Path) -> None:
    database = Database(f"sqlite:///{tmp_path / 'new.db'}")
    with database.write() as connection:
        command.downgrade(alembic_config(connection), "base")
        assert set(inspect(connection).get_table_names()) == {"alembic_version"}
    database.upgrade()
    with database.read() as connection:
        assert set(t.metadata.tables) < set(inspect(connection).get_table_names())
    database.close()


def test_an_old_store_keeps_its_data_when_it_is_opened_again(tmp_path: Path) -> None:
    store = Store(tmp_path)
    store.open()
    first = accept(store)
    store.close()
    store.open()
    assert store.logs.analysis(first.analysis.id) == first.analysis
    store.close()


# --- transactions and times


def test_sqlite_is_set_up_for_it(tmp_path: Path) -> None:
    database = Database(f"sqlite:///{tmp_path / 'gainwright.db'}")
    with database.read() as connection:
        found = [connection.exec_driver_sql(f"PRAGMA {name}").scalar() for name in ("journal_mode", "foreign_keys")]
        assert found == ["wal", 1]
        assert connection.exec_driver_sql("PRAGMA synchronous").scalar() == 2  # FULL
    database.close()


def test_those_who_read_and_then_write_wait_for_each_other(tmp_path: Path) -> None:
    """With a plain BEGIN most of these would fail at once with "database is locked"."""
    database = Database(f"sqlite:///{tmp_path / 'new.db'}")
    with database.write() as connection:
        connection.execute(t.loops.insert().values(name="n", settings="0", created=NOW))
    faults: list[Exception] = []

    def count() -> None:
        try:
            for _ in range(25):
                with database.write() as connection:
                    before = connection.scalar(select(t.loops.c.settings))
                    connection.execute(update(t.loops).values(settings=str(int(before or 0) + 1)))
        except Exception as error:
            faults.append(error)

    threads = [threading.Thread(target=count) for _ in range(6)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    with database.read() as connection:
        assert (faults, connection.scalar(select(t.loops.c.settings))) == ([], "150")
    database.close()


def test_times_come_back_in_utc_and_naive_ones_are_refused(tmp_path: Path) -> None:
    database = Database(f"sqlite:///{tmp_path / 'new.db'}")
    berlin = datetime(2026, 11, 17, 7, 40, 0, 250, timezone(timedelta(hours=1)))
    with database.write() as connection:
        connection.execute(t.loops.insert().values(name="n", settings="{}", created=berlin))
        found = connection.scalar(select(t.loops.c.created))
        assert (found, found.tzinfo) == (berlin, UTC)
        assert connection.scalar(text("SELECT created FROM loops")) == "2026-11-17 06:40:00.000250"
    with pytest.raises(Exception, match="without zone"), database.write() as connection:
        connection.execute(t.loops.insert().values(name="m", settings="{}", created=datetime(2026, 11, 17)))
    database.close()


@pytest.mark.parametrize("url", ["mysql://a/b", "nonsense", "oracle+cx://a"])
def test_other_databases_are_refused(tmp_path: Path, url: str) -> None:
    with pytest.raises(ProblemError) as refused:
        Store(tmp_path, url).open()
    assert refused.value.problem.code == "bad-database-url"


def test_a_folder_is_one_service_s_at_a_time(store: Store, tmp_path: Path) -> None:
    with pytest.raises(ProblemError) as refused:
        Store(tmp_path).open()
    assert refused.value.problem.code == "data-in-use"
    assert str(tmp_path) in refused.value.problem.detail
    store.close()
    store.open()


# --- uploads


def test_uploads_come_back_and_take_little_room(tmp_path: Path) -> None:
    uploads = Uploads(tmp_path)
    source = b"0.1,42.00,591.5\n" * 10_000
    sha256 = put(uploads, source)
    assert put(uploads, source) == sha256
    assert get(uploads, sha256) == source
    (file,) = tmp_path.glob("*/*")
    assert file.stat().st_size < len(source) / 10


def test_a_damaged_upload_is_told_and_can_be_sent_again(tmp_path: Path) -> None:
    uploads = Uploads(tmp_path)
    sha256 = put(uploads, b"speed")
    (file,) = tmp_path.glob("*/*")
    file.write_bytes(file.read_bytes()[:-6])  # into the content, beyond the checksum
    for _ in range(2):
        with pytest.raises(ProblemError, match="upload-damaged"):
            get(uploads, sha256)
    put(uploads, b"speed")
    assert get(uploads, sha256) == b"speed"


def test_what_a_kill_cut_off_is_removed_at_the_next_start(store: Store, tmp_path: Path) -> None:
    kept = put(store.uploads, b"speed")
    parts = [tmp_path / "uploads" / folder / "part-x" for folder in (kept[:2], "parts")]
    for part in parts:
        part.write_bytes(b"sp")
    store.close()
    store.open()
    assert not any(part.exists() for part in parts)
    assert get(store.uploads, kept) == b"speed"


# --- jobs


def test_the_same_log_is_kept_once(store: Store) -> None:
    first, again, other = accept(store), accept(store), accept(store, options='{"Ms": 1.4}')
    assert (first.new, again.new, other.new) == (True, False, True)
    assert again.analysis == first.analysis
    assert other.analysis.log_id == first.analysis.log_id
    elsewhere = accept(store, loop="kiln")
    assert elsewhere.new
    assert elsewhere.analysis.log_id != first.analysis.log_id
    assert [len(asked) for _, asked in store.logs.page("pan", 0, 10)] == [2]


def test_a_job_goes_through_its_stages(store: Store) -> None:
    id = accept(store).analysis.id
    job = claim(store)
    assert store.jobs.claim("other", "reading", NOW, LEASE) is None
    assert store.jobs.renew(job, "fitting", 0.5, NOW, LEASE)
    running = store.logs.analysis(id)
    assert running is not None
    assert (running.status, running.stage, running.progress) == ("running", "fitting", 0.5)
    assert store.jobs.finish(job, Result(b'{"a": 1}', NOW, "{}"), NOW)
    done = store.logs.analysis(id)
    assert done is not None
    assert (done.status, done.progress, done.finished, done.problem) == ("done", 1.0, NOW, None)
    assert store.reports.body(done.report_id or "") == b'{"a": 1}'


def test_who_lost_the_lease_cannot_write(store: Store) -> None:
    accept(store)
    late = claim(store, "late")
    assert store.jobs.reclaim(LOST, NOW, everybody=False) == 0
    assert store.jobs.reclaim(LOST, NOW + 2 * LEASE, everybody=False) == 1
    job = claim(store, "next")
    assert not store.jobs.renew(late, "fitting", 0.5, NOW, LEASE)
    assert not store.jobs.finish(late, Result(b"late", None, "{}"), NOW)
    assert not store.jobs.finish(late, LOST, NOW)
    assert not store.jobs.lost(late, LOST, NOW)
    assert store.jobs.finish(job, Result(b"next", None, "{}"), NOW)
    (report,) = store.reports.history("pan")
    assert store.reports.body(report.id) == b"next"
    assert report.place == NOW  # of receipt: the log had no time of its own


@pytest.mark.parametrize("by", ["death of the worker", "death of the service"])
def test_after_three_attempts_it_has_failed(store: Store, by: str) -> None:
    id = accept(store).analysis.id
    for _ in range(MOST_ATTEMPTS):
        job = claim(store)
        if by == "death of the worker":
            store.jobs.lost(job, LOST, NOW)
        else:
            store.jobs.reclaim(LOST, NOW, everybody=True)
    assert store.jobs.claim("me", "reading", NOW, LEASE) is None
    failed = store.logs.analysis(id)
    assert failed is not None
    assert (failed.status, failed.problem) == ("failed", LOST)
    # Sent again it is tried again, under the same id.
    again = accept(store)
    assert (again.new, again.analysis.id, again.analysis.status) == (False, id, "queued")
    assert claim(store).attempt == 1


def test_an_orderly_stop_does_not_count_as_an_attempt(store: Store) -> None:
    accept(store)
    for _ in range(MOST_ATTEMPTS + 1):
        assert claim(store).attempt == 1
        assert store.jobs.release("me") == 1


def test_a_problem_s_figures_are_json(store: Store) -> None:
    id = accept(store).analysis.id
    odd: dict[str, float | str | None] = {"row": 3.0, "value": float("nan"), "limit": float("inf"), "said": "\0\ud800"}
    store.jobs.finish(claim(store), Problem("odd", "A sentence.", dict(odd)), NOW)
    failed = store.logs.analysis(id)
    assert failed is not None
    assert failed.problem == Problem("odd", "A sentence.", {**odd, "value": None, "limit": None})


def test_history_is_in_the_order_of_the_logs_own_time(store: Store) -> None:
    starts = [NOW + timedelta(days=d) for d in (3, -1, 2)]
    for i, start in enumerate([*starts, None]):
        accept(store, source=str(i).encode())
        store.jobs.finish(claim(store), Result(b"{}", start, "{}"), NOW)
    found = store.reports.history("pan")
    assert [report.start for report in found] == [starts[1], None, starts[2], starts[0]]
    for i, report in enumerate(found):
        assert store.reports.history("pan", report) == found[i + 1 :]
    assert store.reports.history("pan", found[0], 1) == found[1:2]
