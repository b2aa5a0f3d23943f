"""Definitions are put, dated, and read back as they were in force and as they were known."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, TypeVar

from pydantic import BaseModel

from app.errors import Conflict, FieldError, NotFound, Unprocessable
from app.schemas.meter import Meter
from app.schemas.site import Site
from app.schemas.substance import Substance
from app.schemas.types import canonical
from app.schemas.vessel import Vessel
from app.services import mark
from app.services.compile import compile_bodies
from app.services.compositions import components_of
from app.services.find import ALL_TIME, site_number, watermark
from app.services.instants import check_zone
from app.store import books, definitions, sites
from app.store.definitions import Definition, EffectiveFromNeeded, Outcome
from app.store.engine import Store, Writing
from app.store.tables import ALWAYS
from models.components import COMPONENTS
from models.errors import ModelError

T = TypeVar("T")
KINDS: dict[str, type[BaseModel]] = {"site": Site, "substance": Substance, "vessel": Vessel, "meter": Meter}


@dataclass(frozen=True)
class Put:
    """What became of a definition."""

    outcome: Outcome
    known_at: int


def put_site(store: Store, name: str, body: Site, request: str = "") -> Put:
    """Define a site or revise it; the first definition makes it."""
    check(lambda: check_zone(body.time_zone), "time_zone")
    with store.writing(name, deed="site", request=request, create=True) as writing:
        if not writing.created:
            _zone_is_free(writing, name, body)
        return _put(writing, "site", name, body)


def put(store: Store, site: str, kind: str, name: str, body: Substance | Vessel | Meter, request: str = "") -> Put:
    """Define a substance, a vessel or a meter of a site, or revise it."""
    with store.reading() as connection:
        site_number(connection, site)
    if isinstance(body, Substance):
        check(lambda: _substance_can_be(body), "")
    with store.writing(site, deed=kind, request=request) as writing:
        if isinstance(body, Vessel):
            _vessel_fits(writing, site, name, body)
        return _put(writing, kind, name, body)


def _put(writing: Writing, kind: str, name: str, body: Any) -> Put:
    try:
        outcome = definitions.put(writing, kind, name, body.effective_from, canonical(body))
    except EffectiveFromNeeded:
        raise Unprocessable(
            f"This {kind} is defined already: another definition says from when it holds, in effective_from",
            code="effective_from_missing",
            errors=[FieldError("/effective_from", "missing", "effective_from is an RFC 3339 instant with an offset")],
        ) from None
    if outcome != "unchanged":
        # A meter's proving measures the interval before it, which began with the proving before.
        begins = ALWAYS if body.effective_from is None or kind == "meter" else body.effective_from
        mark.period(writing, begins, ALL_TIME, f"{kind} defined anew")
    return Put(outcome, writing.recorded_at)


PLACES = {"datum_m": "gauging/datum_m", "courses": "shell/courses"}
"""Where a field that the models name stands in a body, if not at its top."""
SUBSTANCE = ("liquid", "vapour", "components", "substance")
"""Fields that the models name of a substance."""


def check(act: Callable[[], T], pointer: str, of_substance: str | None = None) -> T:
    """What the models refuse of a definition, as a refusal of the body; ``of_substance`` is where that stands."""
    try:
        return act()
    except ModelError as refused:
        if of_substance is not None and (refused.field or "").partition("/")[0] in SUBSTANCE:
            pointer = of_substance
        place = f"{pointer}/{PLACES.get(refused.field, refused.field)}" if refused.field else pointer
        raise Unprocessable(
            refused.detail, code=refused.code, errors=[FieldError(place, refused.code, refused.detail, refused.index)]
        ) from None


def _zone_is_free(writing: Writing, name: str, body: Site) -> None:
    """The zone and the start of the day stand for closed days; they change only from the last close on."""
    newest = books.newest_closing(writing.connection, writing.site_id)
    if newest is None:
        return
    begins = ALWAYS if body.effective_from is None else body.effective_from
    found = definitions.in_force(
        writing.connection, writing.site_id, "site", max(begins, newest - 1), writing.recorded_at
    )
    former = Site.model_validate_json(found[0].body) if found else body
    changed = (former.time_zone, former.day_starts_at) != (body.time_zone, body.day_starts_at)
    if changed and begins < newest:
        raise Conflict(
            "Days are closed by this time_zone and day_starts_at; "
            "they change only from the end of the last closed day on",
            code="zone_in_use",
        )


def check_components(body: Substance, within: str = "") -> None:
    """Refuse a component that is neither in the table nor given in full, with its place and not its name."""
    detail = (
        "That component is not in the table: give critical_temperature_k, critical_pressure_kpa_abs, "
        f"acentric_factor and molar_mass_g_mol with it, or take one of {', '.join(sorted(COMPONENTS))}"
    )
    unknown = [
        FieldError(f"{within}/{part}/components/{place}/id", "unknown_component", detail, place)
        for part, found in components_of(body).items()
        for place, one in enumerate(found)
        if one.id not in COMPONENTS and one.critical_temperature_k is None
    ]
    if unknown:
        raise Unprocessable(detail, code="unknown_component", errors=unknown)


def _substance_can_be(body: Substance) -> None:
    """Compile the substance in a vessel of its own kind: impossible values show."""
    check_components(body)
    shape: dict[str, Any] = {"kind": "fixed_volume", "volume_m3": 1.0}
    if body.liquid is not None:
        shape = {"kind": "sphere", "diameter_m": 1.0}
    vessel = Vessel.model_validate({"name": "any", "substance": "any", "shape": shape})
    compile_bodies("any", PLAIN_SITE, vessel, body)


PLAIN_SITE = Site.model_validate({"name": "any", "time_zone": "UTC"})


def _vessel_fits(writing: Writing, site: str, name: str, body: Vessel) -> None:
    """The vessel's substance exists when the vessel begins, and the two go together."""
    if body.substance is None:
        return
    begins = ALWAYS if body.effective_from is None else body.effective_from
    at = max(begins, 0)
    found = definitions.in_force(
        writing.connection, writing.site_id, "substance", at, writing.recorded_at, [body.substance]
    ) or definitions.in_force(
        writing.connection, writing.site_id, "substance", ALL_TIME, writing.recorded_at, [body.substance]
    )
    if not found:
        raise Unprocessable(
            "The vessel's substance is not defined at this site: put the substance first",
            code="unknown_substance",
            errors=[FieldError("/substance", "unknown_substance", "substance names one of this site's substances")],
        )
    substance = Substance.model_validate_json(found[0].body)
    own = definitions.in_force(writing.connection, writing.site_id, "site", at, writing.recorded_at) or (
        definitions.in_force(writing.connection, writing.site_id, "site", ALL_TIME, writing.recorded_at)
    )
    check(lambda: compile_bodies(name, Site.model_validate_json(own[0].body), body, substance), "")


def newest(store: Store, site: str, kind: str, name: str, at: int | None, as_of: int | None) -> dict[str, Any]:
    """One definition: as in force at an instant, or the one that holds last."""
    with store.reading() as connection:
        site_id = site_number(connection, site)
        known = watermark(connection, site_id, as_of)
        found = definitions.in_force(connection, site_id, kind, ALL_TIME if at is None else at, known, [name])
    if not found:
        raise NotFound(f"There is no {kind} of that id here", code=f"unknown_{kind}")
    return defined(kind, found[0])


def defined(kind: str, one: Definition) -> dict[str, Any]:
    """A stored definition as an answer; its body is the text that was sent."""
    return {
        "id": one.name,
        "effective_from": None if one.effective_from == ALWAYS else one.effective_from,
        "revision": one.revision,
        "recorded_at": one.recorded_at,
        "definition": KINDS[kind].model_validate_json(one.body),
    }


def site_listing(store: Store, after: str | None, limit: int) -> tuple[list[dict[str, Any]], str | None]:
    """A page of sites as they hold last, by id, and the next cursor."""
    page: list[dict[str, Any]] = []
    with store.reading() as connection:
        found = sites.listing(connection, after or "", limit + 1)
        for site_id, name in found[:limit]:
            known = sites.watermark(connection, site_id)
            own = definitions.in_force(connection, site_id, "site", ALL_TIME, known, [name])
            page.extend(defined("site", one) for one in own)
    return page, found[limit - 1][1] if len(found) > limit else None


def listing(
    store: Store, site: str, kind: str, at: int | None, as_of: int | None, after: str | None, limit: int
) -> tuple[list[dict[str, Any]], str | None, int]:
    """A page of definitions in force by id, the next cursor, and what was known."""
    with store.reading() as connection:
        site_id = site_number(connection, site)
        known = watermark(connection, site_id, as_of)
        when = ALL_TIME if at is None else at
        page, following = definitions.listing(connection, site_id, kind, when, known, after=after or "", limit=limit)
    return [defined(kind, one) for one in page], following, known


def revisions(store: Store, site: str, kind: str, name: str, as_of: int | None) -> tuple[list[dict[str, Any]], int]:
    """Everything that was ever said of a name in the order in which it was recorded, and what was known."""
    with store.reading() as connection:
        site_id = site_number(connection, site)
        known = watermark(connection, site_id, as_of)
        found = definitions.revisions(connection, site_id, kind, name, known)
    if not found:
        raise NotFound(f"There is no {kind} of that id here", code=f"unknown_{kind}")
    return [defined(kind, one) for one in found], known
