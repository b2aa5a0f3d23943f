"""Names get a number once, whatever is in them."""

from __future__ import annotations

import pytest

from app.store.engine import Store
from app.store.series import cited, numbered, series_of
from app.store.tables import LABORATORY, QUANTITIES

NAMES = [
    (vessel, quantity, source)
    for vessel in ("", "tk-1")
    for quantity in QUANTITIES
    for source in ("", "radar", "Gauge 3 — östlich\n\t'\";--%s", "x" * 200)
]


def test_numbers_are_given_once_and_tell_laboratory_values_by_their_sign(store: Store, site_id: str) -> None:
    with store.writing(site_id, create=True) as writing:
        first = numbered(writing, NAMES[:60])
    with store.writing(site_id) as writing:
        second = numbered(writing, NAMES)
    assert {name: second[name] for name in NAMES[:60]} == first
    assert len(set(second.values())) == len(NAMES)
    for name, number in second.items():
        assert (number < 0) == (name[1] in LABORATORY)
    with store.reading() as connection:
        kept = series_of(connection, writing.site_id)
        assert {(one.vessel, one.quantity, one.source): one.series_id for one in kept} == second
        assert {one.vessel for one in series_of(connection, writing.site_id, ["tk-1"])} == {"tk-1"}


def test_an_unknown_quantity_is_a_fault_and_leaves_nothing(store: Store, site_id: str) -> None:
    with pytest.raises(KeyError), store.writing(site_id, create=True) as writing:
        numbered(writing, [("tk-1", "level_ft", "radar")])


def test_texts_are_cited_once_however_long(store: Store, site_id: str) -> None:
    texts = ["", "S17", "S18", "試料", '{"nitrogen":1.0}', "long" * 50_000]
    with store.writing(site_id, create=True) as writing:
        first = cited(writing, texts[:3])
        assert cited(writing, []) == {}
    with store.writing(site_id) as writing:
        second = cited(writing, texts)
    assert {text: second[text] for text in texts[:3]} == first
    assert len(set(second.values())) == len(texts)
