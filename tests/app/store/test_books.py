"""Books are fenced: of many closers of one night one writes, and nothing that was closed is ever overwritten."""

from __future__ import annotations

import threading
from concurrent.futures import ThreadPoolExecutor

import pytest

from app.store import books, readings
from app.store.books import Book, BookMove, BookVessel
from app.store.engine import Store
from app.store.readings import Value
from app.store.sites import number, watermark

T0 = 1_767_225_600_000_000
DAY = 86_400_000_000


def close(
    store: Store, site: str, night: int = 0, digest: str = "d1", known: int = 10, masses: dict[str, float] | None = None
) -> tuple[Book, bool]:
    vessels = [BookVessel(vessel, mass, "{}", mass < 0) for vessel, mass in (masses or {}).items()]
    opening = T0 + night * DAY
    with store.writing(site, create=True) as writing:
        return books.write_book(writing, opening, opening + DAY, digest, known, "1.0", f"body {digest}", vessels)


def test_the_same_inputs_give_the_same_revision(store: Store, site_id: str) -> None:
    first, made = close(store, site_id)
    again, made_again = close(store, site_id, known=99)
    assert (made, made_again) == (True, False)
    assert again == first
    assert first.revision == 1


def test_other_inputs_give_the_next_revision_and_the_former_stays(store: Store, site_id: str) -> None:
    first, _ = close(store, site_id, masses={"tk-1": 1.0})
    second, made = close(store, site_id, digest="d2", known=11, masses={"tk-1": 2.0})
    assert (made, second.revision) == (True, 2)
    with store.reading() as connection:
        site = number(connection, site_id)
        assert books.newest(connection, site, T0, T0 + DAY, 2**62) == second
        assert books.newest(connection, site, T0, T0 + DAY, first.recorded_at) == first
        assert books.newest(connection, site, T0, T0 + DAY, first.recorded_at - 1) is None
        assert books.revision(connection, site, T0, T0 + DAY, 1) == first
        assert books.revision(connection, site, T0, T0 + DAY, 3) is None
        assert books.revisions(connection, site, T0, T0 + DAY, 2**62) == [second, first]
        assert [one.mass_kg for one in books.vessels_of(connection, site, first)] == [1.0]
        assert [one.mass_kg for one in books.vessels_of(connection, site, second)] == [2.0]


def test_a_close_that_knew_less_comes_too_late(store: Store, site_id: str) -> None:
    newer, _ = close(store, site_id, digest="new", known=20)
    assert close(store, site_id, digest="old", known=19) == (newer, False)
    assert close(store, site_id, digest="other", known=20) == (newer, False)


def test_sixteen_closers_of_one_night_make_one_revision(store: Store, site_id: str) -> None:
    with store.writing(site_id, create=True) as writing:
        readings.write_values(writing, [Value("tk-1", "level_m", "radar", T0, 1.0)])
    together = threading.Barrier(16)

    def closer(_: int) -> tuple[Book, bool]:
        with store.reading() as connection:
            site = number(connection, site_id)
            known = watermark(connection, site)
            (series,) = readings.series_of(connection, site)
            digest = str(readings.newest(connection, site, [(series.series_id, 0)], T0 + DAY, known)[0].value)
        together.wait(timeout=30)
        return close(store, site_id, digest=digest, known=known, masses={"tk-1": 1.0})

    with ThreadPoolExecutor(16) as pool:
        told = list(pool.map(closer, range(16)))
    assert [made for _, made in told].count(True) == 1
    assert len({book for book, _ in told}) == 1
    with store.reading() as connection:
        assert len(books.revisions(connection, number(connection, site_id), T0, T0 + DAY, 2**62)) == 1


def test_closers_among_late_data_end_with_what_is_known(store: Store, site_id: str) -> None:
    """Whoever reads first and writes last, the newest knowledge stands in the end."""
    with store.writing(site_id, create=True):
        pass

    def work(index: int) -> None:
        if index % 2:
            with store.writing(site_id) as writing:
                readings.write_values(writing, [Value("tk-1", "level_m", "radar", T0 + index, float(index))])
        for _ in range(2):
            with store.reading() as connection:
                site = number(connection, site_id)
                known = watermark(connection, site)
                series = [one.series_id for one in readings.series_of(connection, site)]
                digest = str(len(readings.course(connection, site, series, T0, T0 + 100, known).value))
            close(store, site_id, digest=digest, known=known)

    with ThreadPoolExecutor(16) as pool:
        list(pool.map(work, range(16)))
    work(0)
    with store.reading() as connection:
        kept = books.revisions(connection, number(connection, site_id), T0, T0 + DAY, 2**62)
    assert kept[0].digest == "8"
    assert [book.known_at for book in kept] == sorted((book.known_at for book in kept), reverse=True)
    assert [book.revision for book in kept] == list(range(len(kept), 0, -1))


def test_the_book_before_opens_the_next(store: Store, site_id: str) -> None:
    night, _ = close(store, site_id, 30)
    with store.writing(site_id) as writing:  # a month that ends with the same night
        month, _ = books.write_book(writing, T0, T0 + 31 * DAY, "m", 10, "1.0", "{}", [])
    revised, _ = close(store, site_id, 30, digest="d2", known=11)
    with store.reading() as connection:
        site = number(connection, site_id)
        assert books.closing_at(connection, site, T0 + 31 * DAY, 2**62) == revised
        assert books.closing_at(connection, site, T0 + 31 * DAY, month.recorded_at) == night
        assert books.closing_at(connection, site, T0 + 30 * DAY, 2**62) is None
        assert books.newest_closing(connection, site) == T0 + 31 * DAY


def test_a_window_reads_the_last_known_nights_of_a_vessel(store: Store, site_id: str) -> None:
    for night in range(6):
        close(store, site_id, night, masses={"tk-1": float(night), "tk-2": -1.0})
    known, _ = close(store, site_id, 5, digest="x", known=12, masses={"tk-1": 5.5})
    close(store, site_id, 3, digest="late", known=12, masses={"tk-1": 33.0})
    with store.reading() as connection:
        site = number(connection, site_id)
        nights = books.nights(connection, site, "tk-1", T0 + 2 * DAY, T0 + 6 * DAY, 2**62)
        assert [(one.closing, one.mass_kg, one.revision) for one in nights] == [
            (T0 + 3 * DAY, 2.0, 1), (T0 + 4 * DAY, 33.0, 2), (T0 + 5 * DAY, 4.0, 1), (T0 + 6 * DAY, 5.5, 2),
        ]  # fmt: skip
        before = books.nights(connection, site, "tk-1", T0 + 2 * DAY, T0 + 6 * DAY, known.recorded_at)
        assert [one.mass_kg for one in before] == [2.0, 3.0, 4.0, 5.5]
        flagged = books.nights(connection, site, "tk-2", T0, T0 + 2 * DAY, 2**62)
        assert [(one.flagged, one.parts) for one in flagged] == [(True, "{}")] * 2


@pytest.mark.parametrize("limit", [1, 2, 5, 100])
def test_a_listing_shows_each_period_once(store: Store, site_id: str, limit: int) -> None:
    for night in range(4):
        close(store, site_id, night)
    newest, _ = close(store, site_id, 1, digest="d2", known=11)
    found: list[Book] = []
    cursor = None
    with store.reading() as connection:
        site = number(connection, site_id)
        while True:
            page, cursor = books.listing(connection, site, T0, T0 + 3 * DAY, 2**62, cursor=cursor, limit=limit)
            found += page
            if cursor is None:
                break
    assert [(one.closing, one.revision) for one in found] == [
        (T0 + DAY, 1), (T0 + 2 * DAY, 2), (T0 + 3 * DAY, 1),
    ]  # fmt: skip
    assert found[1] == newest


def test_a_chain_is_the_periods_that_open_each_other_with_what_moved_and_what_masses_follow(
    store: Store, site_id: str
) -> None:
    ship = BookMove("ship-1", "", "tk-1", 5.0, '{"t:ship-1": 0.1}', "m-7:2026")
    moves = [ship, BookMove("t-2", "tk-1", "", None, "{}", "")]
    with store.writing(site_id, create=True) as writing:
        for night in (0, 1, 3):  # the third night was never closed: nothing leads over the gap
            own = BookVessel("tk-1", float(night), "{}", False, f'{{"level": {night}.0}}')
            vessels, opening = [own, BookVessel("tk-2", None, "{}", False)], T0 + night * DAY
            moved = moves if night else []
            books.write_book(writing, opening, opening + DAY, f"d{night}", 1, "1", "{}", vessels, moved)
    with store.reading() as connection:
        site, known = number(connection, site_id), 2**62
        found = books.chain(connection, site, T0 + 2 * DAY, known, 30)
        assert [one.book.opening for one in found] == [T0, T0 + DAY]
        assert [[vessel.mass_kg for vessel in one.vessels] for one in found] == [[0.0, None], [1.0, None]]
        assert [one.slopes for one in found] == [{"tk-1": '{"level": 0.0}'}, {"tk-1": '{"level": 1.0}'}]
        assert [list(one.moves) for one in found] == [[], moves]
        assert books.chain(connection, site, T0 + 2 * DAY, known, 1)[0].book.opening == T0 + DAY
        assert books.chain(connection, site, T0 + 3 * DAY, known, 30) == []
