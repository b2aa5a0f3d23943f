"""Definitions hold from an instant on, are corrected at the same instant, and stay readable as they were."""

from __future__ import annotations

import random

import pytest

from app.store import definitions
from app.store.definitions import Definition, EffectiveFromNeeded
from app.store.engine import Store
from app.store.sites import number, watermark
from app.store.tables import ALWAYS

T0 = 1_767_225_600_000_000
DAY = 86_400_000_000


def put(store: Store, site: str, body: str, effective_from: int | None = None, name: str = "tk-1") -> tuple[str, int]:
    with store.writing(site, create=True) as writing:
        outcome = definitions.put(writing, "vessel", name, effective_from, body)
    return outcome, writing.recorded_at


def held(store: Store, site: str, at: int, known: int = 2**62) -> str | None:
    with store.reading() as connection:
        found = definitions.in_force(connection, number(connection, site), "vessel", at, known, ["tk-1"])
    return found[0].body if found else None


def test_the_first_body_may_hold_for_all_time_before(store: Store, site_id: str) -> None:
    assert put(store, site_id, "A")[0] == "created"
    assert held(store, site_id, T0 - 10**15) == "A"
    assert held(store, site_id, T0) == "A"


def test_a_body_that_is_dated_does_not_hold_before(store: Store, site_id: str) -> None:
    assert put(store, site_id, "A", T0)[0] == "created"
    assert held(store, site_id, T0 - 1) is None
    assert held(store, site_id, T0) == "A"


def test_the_same_body_twice_changes_nothing(store: Store, site_id: str) -> None:
    assert put(store, site_id, "A")[0] == "created"
    assert put(store, site_id, "A")[0] == "unchanged"
    assert put(store, site_id, "B", T0)[0] == "revised"
    assert put(store, site_id, "B", T0)[0] == "unchanged"
    assert put(store, site_id, "B")[0] == "unchanged"
    assert put(store, site_id, "A")[0] == "unchanged"  # a folder that is loaded again
    with store.reading() as connection:
        kept = definitions.revisions(connection, number(connection, site_id), "vessel", "tk-1", 2**62)
    assert [(one.body, one.effective_from, one.revision) for one in kept] == [("A", ALWAYS, 1), ("B", T0, 1)]


def test_a_later_body_must_say_from_when(store: Store, site_id: str) -> None:
    put(store, site_id, "A", T0)
    with pytest.raises(EffectiveFromNeeded):
        put(store, site_id, "B")
    assert held(store, site_id, T0) == "A"


def test_the_same_instant_again_corrects_it_and_the_former_text_stays_readable(store: Store, site_id: str) -> None:
    _, first = put(store, site_id, "A", T0)
    outcome, second = put(store, site_id, "A corrected", T0)
    assert outcome == "revised"
    assert held(store, site_id, T0) == held(store, site_id, T0, second) == "A corrected"
    assert held(store, site_id, T0, first) == held(store, site_id, T0, second - 1) == "A"
    assert held(store, site_id, T0, first - 1) is None
    assert put(store, site_id, "A", T0)[0] == "revised"  # taken back on purpose
    assert held(store, site_id, T0) == "A"


def test_random_histories_hold_as_a_dictionary_would(store: Store, site_id: str) -> None:
    dice = random.Random(20260314)
    said: list[tuple[int, str, int, str]] = []  # recorded_at, name, effective_from, body
    for _ in range(60):
        name, body = dice.choice("abc"), dice.choice("ABCD")
        begins = T0 + dice.randrange(6) * DAY
        with store.writing(site_id, create=True) as writing:
            outcome = definitions.put(writing, "vessel", name, begins, body)
        former = [one for one in said if one[1] == name]
        same = [one for one in former if one[2] == begins]
        expected = "unchanged" if same and same[-1][3] == body else "revised" if former else "created"
        assert outcome == expected
        if outcome != "unchanged":
            said.append((writing.recorded_at, name, begins, body))

    def expected_at(name: str, at: int, known: int) -> str | None:
        rows = [one for one in said if one[1] == name and one[2] <= at and one[0] <= known]
        return max(rows, key=lambda one: (one[2], one[0]))[3] if rows else None

    with store.reading() as connection:
        site = number(connection, site_id)
        for _ in range(60):
            at, known = T0 + dice.randrange(-1, 7) * DAY + dice.choice((-1, 0, 1)), dice.choice(said)[0]
            found = definitions.in_force(connection, site, "vessel", at, known)
            bodies = {name: expected_at(name, at, known) for name in "abc"}
            held_then = {name: text for name, text in bodies.items() if text is not None}
            assert {one.name: one.body for one in found} == held_then
            assert [one.name for one in found] == sorted(held_then)
            end = at + dice.randrange(1, 4) * DAY
            line = definitions.timeline(connection, site, "vessel", at, end, known)
            for moment in (at, at + DAY // 2, end - 1):
                for name in "abc":
                    of_name = [one for one in line if one.name == name and one.effective_from <= moment]
                    assert (of_name[-1].body if of_name else None) == expected_at(name, moment, known)
            assert all(one.effective_from < end for one in line)
            for name in "abc":
                assert sum(one.effective_from <= at for one in line if one.name == name) <= 1


def test_kinds_and_sites_do_not_meet(store: Store, site_id: str) -> None:
    with store.writing(site_id, create=True) as writing:
        for kind in ("vessel", "meter"):
            assert definitions.put(writing, kind, "one", None, kind) == "created"
    put(store, f"{site_id}-b", "other", name="one")
    with store.reading() as connection:
        site = number(connection, site_id)
        for kind in ("vessel", "meter"):
            assert [one.body for one in definitions.in_force(connection, site, kind, T0, 2**62)] == [kind]


def test_a_listing_is_paged_by_name_in_the_order_of_bytes(store: Store, site_id: str) -> None:
    names = ["a-1", "a.1", "a1", "a_1", "b", "ba", "z"]
    for name in reversed(names):
        put(store, site_id, name.upper(), name=name)
    put(store, site_id, "later", T0 + DAY, name="later")
    listed: list[Definition] = []
    with store.reading() as connection:
        site, after = number(connection, site_id), ""
        known = watermark(connection, site)
        while True:
            page, cursor = definitions.listing(connection, site, "vessel", T0, known, after=after, limit=3)
            listed += page
            if cursor is None:
                break
            after = cursor
    assert [one.name for one in listed] == sorted(names, key=str.encode)
    assert all(one.body == one.name.upper() for one in listed)
