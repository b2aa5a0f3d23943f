"""Sites by name, and the audit of what was written at each."""

from __future__ import annotations

import pytest

from app.store import sites
from app.store.engine import Store, UnknownSite


def test_a_site_is_found_by_its_name(store: Store, site_id: str) -> None:
    with store.reading() as connection:
        assert sites.find(connection, site_id) is None
        with pytest.raises(UnknownSite, match=site_id):
            sites.number(connection, site_id)
    with store.writing(site_id, create=True) as writing:
        pass
    with store.reading() as connection:
        assert sites.find(connection, site_id) == sites.number(connection, site_id) == writing.site_id


def test_the_watermark_is_the_newest_recording(store: Store, site_id: str) -> None:
    with store.reading() as connection:
        assert sites.watermark(connection, 2**31 - 1) == 0
    for _ in range(3):
        with store.writing(site_id, create=True) as writing:
            pass
        with store.reading() as connection:
            assert sites.watermark(connection, writing.site_id) == writing.recorded_at


def test_the_audit_tells_who_did_what_by_which_request(store: Store, site_id: str) -> None:
    made = []
    for number in range(4):
        deed = f"put vessel tk-{number}"
        with store.writing(site_id, actor="key 7", deed=deed, request=f"r-{number}", create=True) as writing:
            made.append((writing.recorded_at, "key 7", deed, f"r-{number}"))
    with store.reading() as connection:
        site = sites.number(connection, site_id)
        assert sites.recordings(connection, site, 0, 2**62) == made
        assert sites.recordings(connection, site, made[1][0], made[2][0]) == made[1:3]
        assert sites.recordings(connection, site, 0, 2**62, limit=1) == made[:1]


def test_sites_are_listed_by_name_in_the_order_of_bytes(store: Store, site_id: str) -> None:
    names = [f"{site_id}{end}" for end in ("", "-", ".", "1", "_", "b")]
    for name in reversed(names):
        with store.writing(name, create=True):
            pass
    with store.reading() as connection:
        listed = [name for _, name in sites.listing(connection, after=f"{site_id[:-1]}", limit=10_000)]
        own = [name for name in listed if name.startswith(site_id)]
        assert own == sorted(names, key=str.encode)
        assert listed == sorted(listed, key=str.encode)
        after = sites.listing(connection, after=f"{site_id}-", limit=2)
        assert [name for _, name in after] == [f"{site_id}.", f"{site_id}1"]
