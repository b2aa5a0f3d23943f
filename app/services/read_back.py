"""What was stored is read back as it was known: values of a vessel, and tickets of a site."""

from __future__ import annotations

import json
from collections.abc import Mapping
from typing import Any

from app.errors import NotFound
from app.schemas.transfer import Transfer
from app.services.find import ALL_TIME, site_number, watermark
from app.services.instants import in_order
from app.store import definitions, readings, transfers
from app.store.engine import Store
from app.store.tables import LABORATORY

QUALITY = ("good", "uncertain", "bad")
Period = tuple[int, int]
Place = tuple[int, str, int] | None


def values(
    store: Store, site: str, vessel: str, period: Period, source: str | None, place: Place, limit: int,
    as_of: int | None,
) -> tuple[list[dict[str, Any]], tuple[int, str] | None, int]:  # fmt: skip
    """A page of a vessel's values, the place behind it, and what all pages of the listing know."""
    in_order(period)
    with store.reading() as connection:
        site_id = site_number(connection, site)
        known = watermark(connection, site_id, as_of if place is None else place[2])
        if not definitions.in_force(connection, site_id, "vessel", ALL_TIME, known, [vessel]):
            raise NotFound("There is no vessel of that id here", code="unknown_vessel")
        page, following = readings.listing(
            connection, site_id, vessel, *period, known, source=source,
            cursor=None if place is None else place[:2], limit=limit,
        )  # fmt: skip
    found = []
    for one in page:
        said = {name: one.values[name] for name in LABELS if name in one.values}
        for quantity, value in sorted(one.values.items()):
            if quantity not in said:
                found.append(_stored(vessel, one.taken_at, one.source, quantity, value) | _labels(quantity, said))
    return found, following, known


LABELS = {
    "sample": LABORATORY,
    "sample_holds_from": LABORATORY,
    "observed_density_by": {"observed_density_kg_m3"},
    "density_basis": {"observed_density_kg_m3", "sediment_water_pct"},
}
"""What a reading says about its sample, and the values that it is said of."""


def _labels(quantity: str, said: Mapping[str, readings.Found]) -> dict[str, Any]:
    """What was said about a value's sample, beside the value."""
    return {
        name: found.cited if found.value is None else int(found.value)
        for name, found in said.items()
        if quantity in LABELS[name]
    }


def _stored(vessel: str, taken_at: int, source: str, quantity: str, value: readings.Found) -> dict[str, Any]:
    answer: dict[str, Any] = {
        "vessel": vessel, "quantity": quantity, "source": source, "taken_at": taken_at, "value": value.value,
        "quality": QUALITY[value.quality], "recorded_at": value.recorded_at, "revision": value.revision,
    }  # fmt: skip
    if value.cited is not None:
        answer["composition"] = json.loads(value.cited)
    return answer


def tickets(
    store: Store, site: str, period: Period, place: Place, limit: int, as_of: int | None
) -> tuple[list[tuple[transfers.Transfer, Transfer]], tuple[int, str] | None, int]:
    """A page of the tickets that touch a period, struck ones too, by end and id."""
    in_order(period)
    with store.reading() as connection:
        site_id = site_number(connection, site)
        known = watermark(connection, site_id, as_of if place is None else place[2])
        cursor = None if place is None else place[:2]
        page, following = transfers.listing(connection, site_id, *period, known, cursor=cursor, limit=limit)
    return [(one, Transfer.model_validate_json(one.body)) for one in page], following, known
