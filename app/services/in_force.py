"""The definitions in force at an instant, compiled."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import UTC, datetime, time, timedelta
from functools import cached_property
from zoneinfo import ZoneInfo

from sqlalchemy import Connection

from app.errors import Conflict, NotFound
from app.schemas.meter import Meter
from app.schemas.site import Site
from app.services.compile import CompiledVessel, InForce, compile_texts, vessel_of
from app.services.find import ALL_TIME
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
    junctions: tuple[str, ...]
    texts: tuple[str, ...]

    def vessel(self, name: str) -> CompiledVessel | None:
        """One vessel in service, by its id."""
        row = self.rows.get(name)
        return None if row is None else self.vessels[row]

    @cached_property
    def rows(self) -> dict[str, int]:
        """Place of each vessel in service among them, by its id."""
        return {vessel.name: row for row, vessel in enumerate(self.vessels)}


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
    histories = _histories(connection, site_id, known, only)
    substances = {one.name: one for one in definitions.in_force(connection, site_id, "substance", at, known)}
    compiled: list[CompiledVessel] = []
    out: list[Definition] = []
    junctions: list[str] = []
    texts = [own.body]
    for vessel, history in histories.items():
        place = max((i for i, one in enumerate(history) if one.effective_from <= at), default=None)
        if place is None:
            continue
        one = history[place]
        parsed = vessel_of(one.body)
        texts.append(f"{vessel}\n{one.effective_from}\n{one.body}")
        if parsed.shape.kind == JUNCTION:
            junctions.append(vessel)
        elif parsed.service == "out":
            out.append(one)
        else:
            substance = substances.get(parsed.substance or "")
            if substance is None:
                raise Conflict(
                    f"Vessel {vessel} holds a substance that is not defined at that instant", code="unknown_substance"
                )
            texts.append(f"{substance.name}\n{substance.effective_from}\n{substance.body}")
            cited = (named("site", own), named("vessel", one), named("substance", substance))
            several = tuple((text.effective_from, text.body) for text in history) if len(history) > 1 else ()
            compiled.append(
                compile_texts(vessel, cited, own.body, one.body, substance.body, _run(history, place), several)
            )
    if only is not None and not (compiled or out or junctions):
        raise NotFound("There is no vessel of that id at that instant", code="unknown_vessel")
    return SiteInForce(name, site_id, known, body, tuple(compiled), tuple(out), tuple(junctions), tuple(texts))


def _histories(connection: Connection, site_id: int, known: int, only: str | None) -> dict[str, list[Definition]]:
    """Every text of each vessel that stands, in the order of time."""
    names = None if only is None else [only]
    found: dict[str, list[Definition]] = {}
    for one in definitions.timeline(connection, site_id, "vessel", -ALL_TIME, ALL_TIME, known, names):
        found.setdefault(one.name, []).append(one)
    return found


def _run(history: Sequence[Definition], place: int) -> tuple[int, int]:
    """From when to when the vessel holds the substance that it holds, in service without a break."""
    here = vessel_of(history[place].body)

    def same(one: Definition) -> bool:
        body = vessel_of(one.body)
        return body.substance == here.substance and body.service == "in"

    first = place
    while first > 0 and same(history[first - 1]):
        first -= 1
    last = place
    while last + 1 < len(history) and same(history[last + 1]):
        last += 1
    since = -ALL_TIME if first == 0 else history[first].effective_from
    return since, ALL_TIME if last + 1 == len(history) else history[last + 1].effective_from


def meters_in_force(connection: Connection, site_id: int, at: int, known: int) -> dict[str, Meter]:
    """The meters of a site at an instant, by id; provings are dated themselves, so the last text's count."""
    found = definitions.in_force(connection, site_id, "meter", at, known)
    last = {one.name: one.body for one in definitions.in_force(connection, site_id, "meter", ALL_TIME, known)}
    meters = {}
    for one in found:
        meter = Meter.model_validate_json(one.body)
        if last[one.name] != one.body:
            meter = meter.model_copy(update={"provings": Meter.model_validate_json(last[one.name]).provings})
        meters[one.name] = meter
    return meters


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
