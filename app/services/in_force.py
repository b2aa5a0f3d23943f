"""The definitions in force at an instant, compiled."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import UTC, datetime, time, timedelta
from zoneinfo import ZoneInfo

from sqlalchemy import Connection

from app.errors import Conflict, NotFound
from app.schemas.meter import Meter
from app.schemas.site import Site
from app.schemas.vessel import Vessel
from app.services.compile import CompiledVessel, InForce, compile_texts
from app.services.instants import EPOCH, Period, day_bounds, micros, parse_label
from app.store import definitions
from app.store.definitions import Definition
from app.store.tables import ALWAYS

JUNCTION = "junction"


@dataclass(frozen=True)
class SiteInForce:
    """A site at an instant: its own definition and its vessels, compiled."""

    name: str
    site_id: int
    known: int
    body: Site
    vessels: tuple[CompiledVessel, ...]
    out: tuple[Definition, ...]
    texts: tuple[str, ...]

    def vessel(self, name: str) -> CompiledVessel | None:
        """One vessel in service, by its id."""
        return next((vessel for vessel in self.vessels if vessel.name == name), None)


def named(kind: str, one: Definition) -> InForce:
    """How a result cites a definition."""
    return InForce(kind, one.name, None if one.effective_from == ALWAYS else one.effective_from, one.revision)


def site_body(connection: Connection, site_id: int, name: str, at: int, known: int) -> tuple[Site, Definition]:
    """The site's own definition in force."""
    found = definitions.in_force(connection, site_id, "site", at, known, [name])
    if not found:
        raise NotFound("The site is not defined at that instant", code="unknown_site")
    return Site.model_validate_json(found[0].body), found[0]


def site_in_force(
    connection: Connection, site_id: int, name: str, at: int, known: int, only: str | None = None
) -> SiteInForce:
    """Everything that a calculation at an instant rests on; ``only`` one vessel where it is named."""
    body, own = site_body(connection, site_id, name, at, known)
    vessels = definitions.in_force(connection, site_id, "vessel", at, known, None if only is None else [only])
    if only is not None and not vessels:
        raise NotFound("There is no vessel of that id at that instant", code="unknown_vessel")
    substances = {one.name: one for one in definitions.in_force(connection, site_id, "substance", at, known)}
    compiled: list[CompiledVessel] = []
    out: list[Definition] = []
    texts = [own.body]
    for one in vessels:
        parsed = Vessel.model_validate_json(one.body)
        texts.append(f"{one.name}\n{one.effective_from}\n{one.body}")
        if parsed.shape.kind == JUNCTION:
            continue
        if parsed.service == "out":
            out.append(one)
            continue
        substance = substances.get(parsed.substance or "")
        if substance is None:
            raise Conflict(
                f"Vessel {one.name} holds a substance that is not defined at that instant", code="unknown_substance"
            )
        texts.append(f"{substance.name}\n{substance.effective_from}\n{substance.body}")
        cited = (named("site", own), named("vessel", one), named("substance", substance))
        compiled.append(compile_texts(one.name, cited, own.body, one.body, substance.body))
    return SiteInForce(name, site_id, known, body, tuple(compiled), tuple(out), tuple(texts))


def meters_in_force(connection: Connection, site_id: int, at: int, known: int) -> dict[str, Meter]:
    """The meters of a site at an instant, by id."""
    found = definitions.in_force(connection, site_id, "meter", at, known)
    return {one.name: Meter.model_validate_json(one.body) for one in found}


def period_of(connection: Connection, site_id: int, name: str, label: str, known: int) -> Period:
    """A period by its id: two instants, or a local day of the site by the zone in force on it."""
    parsed = parse_label(label)
    if isinstance(parsed, Period):
        return parsed
    noon = micros(datetime.combine(parsed, time(12), tzinfo=UTC))
    body, _ = site_body(connection, site_id, name, noon, known)
    return Period(*day_bounds(parsed, body.day_starts_at, body.time_zone), day=label)


def labelled(connection: Connection, site_id: int, name: str, bounds: tuple[int, int], known: int) -> Period:
    """A period by its instants; one that is a day of the site is named as that day."""
    body, _ = site_body(connection, site_id, name, bounds[0], known)
    day = (EPOCH + timedelta(microseconds=bounds[0])).astimezone(ZoneInfo(body.time_zone)).date()
    is_day = day_bounds(day, body.day_starts_at, body.time_zone) == bounds
    return Period(*bounds, day=day.isoformat() if is_day else None)
