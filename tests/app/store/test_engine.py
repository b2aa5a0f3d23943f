"""One writer a site, one commit, one recorded_at; and the driver's errors in the store's words."""

from __future__ import annotations

import signal
import sqlite3
import subprocess
import sys
import threading
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from itertools import pairwise
from pathlib import Path

import pytest
import sqlalchemy as sa

from app.store import readings, sites
from app.store.engine import DiskFull, Store, StoreUnavailable, UnknownSite, Writing, normalised
from app.store.lock import LockTimeout, WriterLock
from app.store.readings import Value
from app.store.tables import RECORDING, SITE

T0 = 1_767_225_600_000_000
ROOT = Path(__file__).resolve().parents[3]


def recorded(store: Store, site: str) -> list[int]:
    with store.reading() as connection:
        number = sites.number(connection, site)
        query = sa.select(RECORDING.c.recorded_at).where(RECORDING.c.site_id == number)
        return list(connection.scalars(query.order_by(RECORDING.c.recorded_at)))


def level(store: Store, site: str, at: int, value: float) -> Writing:
    with store.writing(site, create=True) as writing:
        readings.write_values(writing, [Value("tk-1", "level_m", "radar", at, value)])
    return writing


def test_a_site_is_made_once_and_only_when_asked(store: Store, site_id: str) -> None:
    with pytest.raises(UnknownSite), store.writing(site_id):
        pass
    with store.writing(site_id, create=True) as first:
        assert first.created
    with store.writing(site_id, create=True) as second:
        assert not second.created
    assert (first.site_id, first.site) == (second.site_id, site_id)


def test_many_clients_that_define_sites_at_once_get_numbers_of_their_own(store: Store, site_id: str) -> None:
    def define(number: int) -> int:
        with store.writing(f"{site_id}-{number % 8}", create=True) as writing:
            return writing.site_id

    with ThreadPoolExecutor(16) as pool:
        numbers = list(pool.map(define, range(32)))
    assert len(set(numbers)) == 8
    assert numbers[:8] == numbers[8:16] == numbers[16:24] == numbers[24:]


def test_recorded_at_only_grows_even_when_the_clock_stands_or_goes_back(store: Store, site_id: str) -> None:
    instants = iter([1000, 1000, 500, 2000])
    told = Store(store.url, store._engine, store._lock, lambda: next(instants))
    seen = []
    for index in range(4):
        seen.append(level(told, site_id, T0 + index, 1.0).recorded_at)
    assert seen == [1000, 1001, 1002, 2000]
    assert recorded(store, site_id) == seen


def test_writers_of_one_site_take_turns_and_readers_see_whole_transactions(store: Store, site_id: str) -> None:
    """Eight writers add rows two by two; a reader never sees a single one, nor what comes after its watermark."""
    level(store, site_id, T0, 0.0)
    stop = threading.Event()

    def write(thread: int) -> list[int]:
        mine = []
        for turn in range(6):
            at = T0 + 1 + 2 * (thread * 6 + turn)
            with store.writing(site_id) as writing:
                for offset in (0, 1):  # two statements of one transaction
                    readings.write_values(writing, [Value("tk-1", "level_m", "radar", at + offset, 1.0)])
            mine.append(writing.recorded_at)
        return mine

    def read() -> int:
        looks = 0
        while not stop.is_set() or looks < 3:
            with store.reading() as connection:
                site = sites.number(connection, site_id)
                known = sites.watermark(connection, site)
                (series,) = readings.series_of(connection, site)
                first = readings.course(connection, site, [series.series_id], T0 + 1, T0 + 1000, known)
                second = readings.course(connection, site, [series.series_id], T0 + 1, T0 + 1000, 2**62)
                assert len(first.value) % 2 == 0
                assert first == second
            looks += 1
        return looks

    with ThreadPoolExecutor(10) as pool:
        readers = [pool.submit(read) for _ in range(2)]
        writers = [pool.submit(write, thread) for thread in range(8)]
        try:
            seen = sorted(instant for writer in writers for instant in writer.result(timeout=60))
        finally:
            stop.set()
        assert all(reader.result(timeout=60) >= 3 for reader in readers)
    assert len(set(seen)) == 48
    assert recorded(store, site_id)[1:] == seen
    assert all(later > earlier for earlier, later in pairwise(seen))


def test_what_fails_leaves_nothing(store: Store, site_id: str) -> None:
    level(store, site_id, T0, 1.0)
    before = recorded(store, site_id)
    with pytest.raises(KeyError), store.writing(site_id) as writing:
        readings.write_values(writing, [Value("tk-9", "level_m", "new", T0, 1.0)])
        raise KeyError("the service changed its mind")
    assert recorded(store, site_id) == before
    with store.reading() as connection:
        assert [one.vessel for one in readings.series_of(connection, sites.number(connection, site_id))] == ["tk-1"]


def test_the_nth_statement_that_fails_leaves_nothing(store: Store, site_id: str) -> None:
    """Whichever statement fails, the transaction is kept as a whole or not at all."""
    level(store, site_id, T0, 1.0)
    density = Value("tk-2", "observed_density_kg_m3", "lab", T0, 742.0, "S1")
    batch = [density, Value("tk-2", "sample", "lab", T0, None, "S1")]
    failures = 0
    for fail_at in range(1, 40):
        fail = failing_at(fail_at)

        sa.event.listen(store._engine, "before_cursor_execute", fail)
        try:
            with store.writing(site_id) as writing:
                readings.write_values(writing, batch)
            break
        except OSError:
            failures += 1
        finally:
            sa.event.remove(store._engine, "before_cursor_execute", fail)
        with store.reading() as connection:
            assert len(readings.series_of(connection, sites.number(connection, site_id))) == 1
        assert len(recorded(store, site_id)) == 1
    else:
        pytest.fail("the transaction never ran to its end")
    assert failures >= 8
    assert len(recorded(store, site_id)) == 2


def failing_at(turn: int) -> Callable[..., None]:
    left = turn

    def fail(*_: object) -> None:
        nonlocal left
        left -= 1
        if left == 0:
            raise OSError("the cable was cut")

    return fail


def test_a_reading_transaction_cannot_write(store: Store) -> None:
    with pytest.raises(StoreUnavailable), store.reading() as connection:
        connection.execute(sa.insert(SITE), {"site_id": 2**30, "name": "written by a reader"})
    with store.reading() as connection:
        assert sites.find(connection, "written by a reader") is None


def test_a_fault_of_ours_is_not_taken_for_an_outage(store: Store) -> None:
    with pytest.raises(sa.exc.DBAPIError), store.reading() as connection:
        connection.exec_driver_sql("SELECT nothing FROM nowhere")


def test_sqlite_keeps_what_it_acknowledged(sqlite_store: Store) -> None:
    def pragma(connection: sa.Connection, name: str) -> object:
        return connection.exec_driver_sql(f"PRAGMA {name}").scalar()

    with sqlite_store.reading() as connection:
        assert pragma(connection, "journal_mode") == "wal"
        assert pragma(connection, "synchronous") == 2  # FULL
        assert pragma(connection, "foreign_keys") == 1
        assert pragma(connection, "busy_timeout") == 30_000
        assert pragma(connection, "mmap_size") == 0


def test_a_sqlite_writer_holds_its_locks_from_before_it_begins_until_it_ends(sqlite_store: Store) -> None:
    path = Path(str(sqlite_store.url.database))
    other = WriterLock(path.with_name(path.name + ".lock"), 0.02)
    foreign = sqlite3.connect(path, timeout=0, isolation_level=None)
    with sqlite_store.transaction(lock_key=1):
        with pytest.raises(LockTimeout), other.held():
            pass
        with pytest.raises(sqlite3.OperationalError, match="locked"):
            foreign.execute("BEGIN IMMEDIATE")
    with other.held():
        foreign.execute("BEGIN IMMEDIATE")
        foreign.execute("ROLLBACK")
    foreign.close()


# A process of its own, not a fork: SQLite must not carry connections across one.
WRITE_UNTIL_KILLED = f"""
import itertools, sys
from app.store import readings
from app.store.engine import Store

url, site, first = sys.argv[1:]
store = Store.open(url)
for number in itertools.count(int(first)):
    with store.writing(site) as writing:
        batch = [readings.Value(f"tk-{{number}}", "level_m", "radar", {T0} + index, 1.0) for index in range(3)]
        readings.write_values(writing, batch)
    print(f"tk-{{number}}", flush=True)
"""


def test_what_was_acknowledged_survives_a_kill_and_nothing_is_kept_in_part(store: Store, site_id: str) -> None:
    with store.writing(site_id, create=True):
        pass
    url, acknowledged = store.url.render_as_string(hide_password=False), list[str]()
    for turn in range(3):
        arguments = [sys.executable, "-c", WRITE_UNTIL_KILLED, url, site_id, str(turn * 1000)]
        with subprocess.Popen(arguments, cwd=ROOT, stdout=subprocess.PIPE, text=True) as process:
            assert process.stdout is not None
            acknowledged += [process.stdout.readline().strip() for _ in range(6)]
            process.kill()
            acknowledged += process.stdout.read().split()
        assert process.returncode == -signal.SIGKILL
    with store.writing(site_id):  # the lock of the killed is free
        pass
    with store.reading() as connection:
        site = sites.number(connection, site_id)
        kept = {one.vessel: one.series_id for one in readings.series_of(connection, site)}
        course = readings.course(connection, site, list(kept.values()), T0, T0 + 3, 2**62)
    assert len(acknowledged) >= 18
    assert set(acknowledged) <= set(kept)
    assert sorted(course.series_id) == sorted(3 * list(kept.values()))


def test_a_full_disk_says_so_and_what_was_kept_stays_readable(tmp_path: Path, site_id: str) -> None:
    store = Store.open(f"sqlite:///{tmp_path}/full.db")
    store.migrate()
    level(store, site_id, T0, 1.0)
    batch = [Value("tk-1", "level_m", "radar", T0 + index, 1.0) for index in range(1, 20_000)]
    with pytest.raises(DiskFull), store.writing(site_id) as writing:
        pages = writing.connection.exec_driver_sql("PRAGMA page_count").scalar()
        writing.connection.exec_driver_sql(f"PRAGMA max_page_count = {pages}")
        readings.write_values(writing, batch)
    assert len(recorded(store, site_id)) == 1
    store.close()
    again = Store.open(f"sqlite:///{tmp_path}/full.db")
    assert len(recorded(again, site_id)) == 1
    level(again, site_id, T0 + 1, 1.0)
    again.close()


def unreachable_server(tmp_path: Path) -> str:
    return f"postgresql+psycopg://nobody@/nothing?host={tmp_path}"


def no_folder(tmp_path: Path) -> str:
    (tmp_path / "file").write_text("not a folder")
    return f"sqlite:///{tmp_path}/file/brimbook.db"


def no_database(tmp_path: Path) -> str:
    (tmp_path / "text.db").write_text("this is not a database, and long enough for its header " * 20)
    return f"sqlite:///{tmp_path}/text.db"


def a_folder(tmp_path: Path) -> str:
    (tmp_path / "folder.db").mkdir()
    return f"sqlite:///{tmp_path}/folder.db"


@pytest.mark.parametrize("url", [unreachable_server, no_folder, no_database, a_folder])
def test_a_database_that_cannot_be_reached_is_unavailable(tmp_path: Path, url: Callable[[Path], str]) -> None:
    with pytest.raises(StoreUnavailable):
        store = Store.open(url(tmp_path))
        try:
            store.migrate()
        finally:
            store.close()


def test_a_server_that_goes_away_is_unavailable_and_found_again(postgresql_store: Store, site_id: str) -> None:
    level(postgresql_store, site_id, T0, 1.0)
    end_all = """SELECT pg_terminate_backend(pid) FROM pg_stat_activity
                 WHERE pid <> pg_backend_pid() AND datname = current_database()"""
    with pytest.raises(StoreUnavailable), postgresql_store.writing(site_id) as writing:
        with postgresql_store.reading() as connection:
            connection.exec_driver_sql(end_all)
        readings.write_values(writing, [Value("tk-1", "level_m", "radar", T0 + 1, 1.0)])
    level(postgresql_store, site_id, T0 + 2, 1.0)
    assert len(recorded(postgresql_store, site_id)) == 2


@pytest.mark.parametrize(
    ("given", "driver"),
    [
        ("postgres://u:p%40ss@db:5433/brim", "postgresql+psycopg"),
        ("postgresql://u@db/brim", "postgresql+psycopg"),
        ("postgresql+psycopg://u@db/brim", "postgresql+psycopg"),
        ("sqlite:////var/lib/brim.db", "sqlite"),
    ],
)
def test_urls_are_normalised(given: str, driver: str) -> None:
    assert normalised(given).drivername == driver
    assert normalised("postgres://u:p%40ss@db:5433/brim").password == "p@ss"


@pytest.mark.parametrize("given", ["sqlite://", "sqlite:///:memory:", "mysql://u@db/brim", "postgresql+asyncpg://u@db/b"])
def test_other_databases_are_refused(given: str) -> None:
    with pytest.raises(ValueError, match="database is"):
        normalised(given)


def test_the_folder_of_the_database_is_made(tmp_path: Path) -> None:
    store = Store.open(f"sqlite:///{tmp_path}/a/b/brimbook.db")
    store.migrate()
    store.close()
    assert sorted(path.name for path in (tmp_path / "a" / "b").iterdir()) == ["brimbook.db", "brimbook.db.lock"]
    with sqlite3.connect(tmp_path / "a" / "b" / "brimbook.db") as other:
        assert other.execute("PRAGMA integrity_check").fetchone() == ("ok",)
    other.close()
