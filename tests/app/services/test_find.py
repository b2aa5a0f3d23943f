"""A site by its id, and what an answer may include."""

from __future__ import annotations

import pytest

from app.errors import NotFound
from app.services.find import ALL_TIME, site_number, watermark
from tests.app.services.plant import Plant, instant


def test_a_site_is_found_by_its_id_and_another_is_missing(plant: Plant) -> None:
    with plant.store.reading() as connection:
        assert isinstance(site_number(connection, plant.site), int)
        with pytest.raises(NotFound) as missing:
            site_number(connection, plant.site + "x")
    assert (missing.value.status, missing.value.code) == (404, "unknown_site")


def test_no_answer_includes_more_than_what_is_known(plant: Plant) -> None:
    known = plant.known()
    with plant.store.reading() as connection:
        number = site_number(connection, plant.site)
        assert watermark(connection, number, None) == known
        assert watermark(connection, number, known - 1) == known - 1
        # A future as_of promises nothing that is not there yet: it is what is known now.
        assert watermark(connection, number, known + 10**12) == known


def test_all_time_is_after_every_instant_that_can_be_written() -> None:
    assert instant("9999-12-31T23:59") < ALL_TIME
