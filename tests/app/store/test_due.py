"""What is due is closed once, and what becomes due during a close stays due."""

from __future__ import annotations

from collections.abc import Sequence
from concurrent.futures import ThreadPoolExecutor

from app.store import books, due
from app.store.due import ATTEMPTS
from app.store.engine import Store
from app.store.sites import number

T0 = 1_767_225_600_000_000
DAY = 86_400_000_000
NIGHTS = [(T0 + index * DAY, T0 + (index + 1) * DAY) for index in range(5)]


def mark(store: Store, site: str, periods: Sequence[tuple[int, int]], cause: str = "night") -> int:
    with store.writing(site, create=True) as writing:
        due.mark(writing, periods, cause)
    return writing.recorded_at


def listed(store: Store, site: str) -> list[tuple[int, int]]:
    with store.reading() as connection:
        return [(one.opening, one.closing) for one in due.listing(connection, number(connection, site))]


def take(store: Store, site: str, ended_by: int = 2**62) -> due.Due | None:
    with store.writing(site) as writing:
        return due.take(writing, ended_by)


def test_periods_come_in_the_order_in_which_books_chain(store: Store, site_id: str) -> None:
    mark(store, site_id, [NIGHTS[2], NIGHTS[0], NIGHTS[1], NIGHTS[0]])
    assert listed(store, site_id) == NIGHTS[:3]
    first = take(store, site_id)
    assert first is not None
    assert (first.opening, first.closing, first.cause, first.attempts) == (*NIGHTS[0], "night", 1)
    with store.reading() as connection:
        everywhere = [(one.site_id, one.closing) for one in due.listing(connection)]
        assert (number(connection, site_id), NIGHTS[2][1]) in everywhere


def test_a_period_that_has_not_ended_is_not_taken(store: Store, site_id: str) -> None:
    mark(store, site_id, [NIGHTS[0]])
    assert take(store, site_id, NIGHTS[0][1] - 1) is None
    assert take(store, site_id, NIGHTS[0][1]) is not None


def test_a_finished_period_is_due_no_more(store: Store, site_id: str) -> None:
    marked = mark(store, site_id, NIGHTS[:2])
    with store.writing(site_id) as writing:
        assert due.finish(writing, *NIGHTS[0], known_at=marked)
        assert not due.finish(writing, *NIGHTS[0], known_at=marked)
    assert listed(store, site_id) == [NIGHTS[1]]


def test_late_data_during_a_close_keep_the_period_due(store: Store, site_id: str) -> None:
    known = mark(store, site_id, [NIGHTS[0]])
    assert take(store, site_id) is not None
    mark(store, site_id, [NIGHTS[0]], "late_reading")
    with store.writing(site_id) as writing:
        assert not due.finish(writing, *NIGHTS[0], known_at=known)
    again = take(store, site_id)
    assert again is not None
    assert (again.cause, again.attempts) == ("late_reading", 1)


def test_a_period_that_keeps_failing_waits_for_new_data(store: Store, site_id: str) -> None:
    mark(store, site_id, [NIGHTS[0]])
    for attempt in range(ATTEMPTS):
        taken = take(store, site_id)
        assert taken is not None
        assert taken.attempts == attempt + 1
        with store.writing(site_id) as writing:
            due.fail(writing, *NIGHTS[0], error="no level")
    assert take(store, site_id) is None
    with store.reading() as connection:
        (waiting,) = due.listing(connection, number(connection, site_id))
    assert waiting.error == "no level"
    mark(store, site_id, [NIGHTS[0]])
    again = take(store, site_id)
    assert again is not None
    assert again.error is None


def test_closed_periods_that_late_data_touch_become_due(store: Store, site_id: str) -> None:
    with store.writing(site_id, create=True) as writing:
        for opening, closing in NIGHTS:
            books.write_book(writing, opening, closing, "d", 1, "1.0", "{}", [])
    with store.writing(site_id) as writing:
        touched = due.mark_touched(writing, NIGHTS[1][1] + 1, NIGHTS[2][1] - 1, "late_reading")
    assert touched == listed(store, site_id) == [NIGHTS[2]]
    with store.writing(site_id) as writing:
        assert due.mark_touched(writing, NIGHTS[3][0], NIGHTS[3][0], "late_reading") == NIGHTS[2:4]
        assert due.mark_touched(writing, NIGHTS[4][1] + 1, 2**62, "late_reading") == []
    assert listed(store, site_id) == NIGHTS[2:4]


def test_a_night_closed_anew_makes_the_periods_due_that_open_with_it(store: Store, site_id: str) -> None:
    month = (NIGHTS[1][0], NIGHTS[4][1])
    with store.writing(site_id, create=True) as writing:
        for opening, closing in (*NIGHTS, month):
            books.write_book(writing, opening, closing, "d", 1, "1.0", "{}", [])
    with store.writing(site_id) as writing:
        assert due.mark_opening_at(writing, NIGHTS[0][1], "the night before") == [NIGHTS[1], month]
        assert due.mark_opening_at(writing, NIGHTS[4][1], "the night before") == []
    assert listed(store, site_id) == [NIGHTS[1], month]


def test_workers_at_once_count_every_attempt(store: Store, site_id: str) -> None:
    mark(store, site_id, [NIGHTS[0]])
    with ThreadPoolExecutor(8) as pool:
        taken = list(pool.map(lambda _: take(store, site_id), range(8)))
    assert sorted(one.attempts for one in taken if one is not None) == list(range(1, ATTEMPTS + 1))
