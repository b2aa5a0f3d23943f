"""Tickets are revised, struck and found by the periods that they overlap."""

from __future__ import annotations

import random

import pytest
import sqlalchemy as sa

from app.store import transfers
from app.store.engine import Store
from app.store.sites import number
from app.store.tables import LONGEST_TRANSFER, TRANSFER
from app.store.transfers import Transfer

T0 = 1_767_225_600_000_000
HOUR = 3_600_000_000
DAY = 24 * HOUR


def put(
    store: Store, site: str, name: str, started: int, ended: int | None, body: str = "{}", void: bool = False
) -> tuple[str, int]:
    with store.writing(site, create=True) as writing:
        outcome = transfers.put(writing, name, started, ended, body, void=void)
    return outcome, writing.recorded_at


def names(store: Store, site: str, lo: int, hi: int, known: int = 2**62, void: bool = False) -> list[str]:
    with store.reading() as connection:
        found = transfers.overlapping(connection, number(connection, site), lo, hi, known, void=void)
    return [one.name for one in found]


def test_a_ticket_that_comes_late_is_seen_from_then_on(store: Store, site_id: str) -> None:
    _, first = put(store, site_id, "t-1", T0, T0 + HOUR)
    outcome, second = put(store, site_id, "t-0", T0 - DAY, T0 + HOUR)
    assert outcome == "created"
    assert names(store, site_id, T0, T0 + DAY, first) == ["t-1"]
    assert names(store, site_id, T0, T0 + DAY, second) == ["t-0", "t-1"]


def test_the_same_ticket_again_changes_nothing(store: Store, site_id: str) -> None:
    for expected in ("created", "unchanged", "unchanged"):
        assert put(store, site_id, "t-1", T0, T0 + HOUR, '{"mass_kg":1.0}')[0] == expected
    with store.reading() as connection:
        assert len(transfers.revisions(connection, number(connection, site_id), "t-1", 2**62)) == 1


@pytest.mark.parametrize(
    ("started", "ended", "body", "void"),
    [
        (T0 + 1, T0 + HOUR, "{}", False),
        (T0, T0 + HOUR + 1, "{}", False),
        (T0, None, "{}", False),
        (T0, T0 + HOUR, '{"mass_kg":1.0}', False),
        (T0, T0 + HOUR, "{}", True),
    ],
)
def test_any_other_content_is_a_revision(
    store: Store, site_id: str, started: int, ended: int | None, body: str, void: bool
) -> None:
    _, first = put(store, site_id, "t-1", T0, T0 + HOUR)
    assert put(store, site_id, "t-1", started, ended, body, void)[0] == "revised"
    with store.reading() as connection:
        site = number(connection, site_id)
        now, before = (transfers.current(connection, site, "t-1", known) for known in (2**62, first))
    assert now is not None
    assert (now.revision, now.started_at, now.running, now.body, now.void) == (2, started, ended is None, body, void)
    assert before == Transfer("t-1", 1, first, T0, T0 + HOUR, False, False, "{}")


def test_a_ticket_that_moved_out_of_the_period_is_gone_from_it(store: Store, site_id: str) -> None:
    _, first = put(store, site_id, "t-1", T0, T0 + HOUR)
    put(store, site_id, "t-1", T0 + 2 * DAY, T0 + 2 * DAY + HOUR)
    assert names(store, site_id, T0, T0 + DAY) == []
    assert names(store, site_id, T0 + 2 * DAY, T0 + 3 * DAY) == ["t-1"]
    assert names(store, site_id, T0, T0 + DAY, first) == ["t-1"]


def test_a_struck_ticket_stays_readable(store: Store, site_id: str) -> None:
    _, first = put(store, site_id, "t-1", T0, T0 + HOUR)
    put(store, site_id, "t-1", T0, T0 + HOUR, void=True)
    assert names(store, site_id, T0, T0 + DAY) == []
    assert names(store, site_id, T0, T0 + DAY, void=True) == ["t-1"]
    assert names(store, site_id, T0, T0 + DAY, first) == ["t-1"]


def test_a_running_ticket_overlaps_until_it_must_have_ended(store: Store, site_id: str) -> None:
    put(store, site_id, "t-1", T0, None)
    assert names(store, site_id, T0 + 30 * DAY, T0 + 31 * DAY) == ["t-1"]
    assert names(store, site_id, T0 + 31 * DAY, T0 + 32 * DAY) == []


@pytest.mark.parametrize("ended", [T0 - 1, T0 + LONGEST_TRANSFER + 1])
def test_a_ticket_that_no_transfer_could_have_is_refused_here_and_by_the_database(
    store: Store, site_id: str, ended: int
) -> None:
    with pytest.raises(ValueError, match="31 days"):
        put(store, site_id, "t-1", T0, ended)
    put(store, site_id, "t-2", T0, T0)
    row = {"name": "t-3", "revision": 1, "started_at": T0, "ended_at": ended, "source": "", "target": "",
           "running": 0, "void": 0, "body": ""}  # fmt: skip
    with pytest.raises(sa.exc.IntegrityError, match="transfer_period"), store.writing(site_id) as writing:
        row |= {"site_id": writing.site_id, "recorded_at": writing.recorded_at}
        writing.connection.execute(sa.insert(TRANSFER), row)


def test_random_tickets_overlap_as_a_list_would_have_it(store: Store, site_id: str) -> None:
    dice = random.Random(20260314)
    last: dict[str, tuple[int, int, bool]] = {}
    for _ in range(120):
        name = f"t-{dice.randrange(60)}"
        started = T0 + dice.randrange(0, 60) * DAY + dice.randrange(3) * HOUR
        ended = started + dice.choice((0, HOUR, DAY, 30 * DAY, LONGEST_TRANSFER))
        void = dice.random() < 0.2
        put(store, site_id, name, started, ended, void=void)
        last[name] = (started, ended, void)
    for _ in range(60):
        lo = T0 + dice.randrange(-2, 64) * DAY + dice.choice((0, 0, HOUR, -1))
        hi = lo + dice.choice((HOUR, DAY, 40 * DAY))
        # half open: a ticket takes part if it has an instant of the period inside, its start counting
        inside = {
            name: ended for name, (started, ended, void) in last.items()
            if not void and started < hi and (ended > lo or started == ended == lo)
        }  # fmt: skip
        assert names(store, site_id, lo, hi) == sorted(inside, key=lambda name: (inside[name], name.encode()))
        listed: list[str] = []
        cursor = None
        with store.reading() as connection:
            site = number(connection, site_id)
            while True:
                page, cursor = transfers.listing(connection, site, lo, hi, 2**62, cursor=cursor, limit=7)
                listed += [one.name for one in page]
                if cursor is None:
                    break
        assert [name for name in listed if not last[name][2]] == names(store, site_id, lo, hi)
        assert len(set(listed)) == len(listed)


def test_periods_that_follow_each_other_share_no_short_ticket_and_miss_none(store: Store, site_id: str) -> None:
    for index in range(25):
        put(store, site_id, f"t-{index:02}", T0 + index * HOUR, T0 + index * HOUR)
    halves = [names(store, site_id, T0, T0 + 12 * HOUR), names(store, site_id, T0 + 12 * HOUR, T0 + 25 * HOUR)]
    assert halves == [[f"t-{index:02}" for index in range(12)], [f"t-{index:02}" for index in range(12, 25)]]


def test_what_touched_a_vessel_is_found_by_either_end_from_its_own_instant_on(store: Store, site_id: str) -> None:
    """Against a plain filter over a few hundred tickets between five vessels and the boundary."""
    draw = random.Random(26)
    kept: dict[str, tuple[int, int, str, str, bool]] = {}
    with store.writing(site_id, create=True) as writing:
        for number_of in range(300):
            name = f"t-{number_of % 250}"  # the last fifty revise the first ones
            source, target = draw.sample(["", "a", "b", "c", "d", "e"], 2)
            started = T0 + draw.randrange(20 * DAY)
            ended = started + draw.randrange(2 * DAY)
            void = draw.random() < 0.1
            transfers.put(writing, name, started, ended, f'{{"n":{number_of}}}', ends=(source, target), void=void)
            kept[name] = (started, ended, source, target, void)
    since = {"a": T0 + 3 * DAY, "b": T0 + 12 * DAY}
    before = T0 + 15 * DAY
    expected = {
        name for name, (started, ended, source, target, void) in kept.items()
        if not void and started < before and any(ended > since[end] for end in (source, target) if end in since)
    }  # fmt: skip
    with store.reading() as connection:
        found = transfers.touching(connection, number(connection, site_id), since, before, 2**62)
        assert transfers.touching(connection, number(connection, site_id), {}, before, 2**62) == []
    assert {one.name for one in found} == expected and len(found) == len(expected)
