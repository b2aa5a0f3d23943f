"""Inventories: every vessel of a site at an instant, one vessel's course, the working behind one mass."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any

import numpy as np
from sqlalchemy import Connection

from app.errors import Unprocessable
from app.services.carry import measure_at
from app.services.explain import answers, mass_estimate
from app.services.find import site_number, watermark
from app.services.in_force import SiteInForce, meters_in_force, named, site_in_force
from app.services.instants import in_order
from app.services.measure import Measured
from app.services.reasons import reason
from app.store import definitions
from app.store.engine import Store
from models.estimate import Estimate, combine

COURSE_POINTS = 10_000
TRIES = 100


@dataclass(frozen=True)
class Stock:
    """A site's inventory at an instant: answers, masses with parts, and what they rest on."""

    site: SiteInForce
    at: int
    answers: list[dict[str, Any]]
    masses: dict[str, Estimate | None]
    measured: Measured | None


def stock_at(
    connection: Connection, site_id: int, site: str, at: int, known: int, *, only: str | None = None,
    working: bool = False, budget: bool = False, statement: bool = False, closing: bool = False,
    definitions_at: int | None = None,
) -> Stock:  # fmt: skip
    """Inventories at an instant by what was known.

    A close uses the definitions in force just before it (``definitions_at``), and takes a vessel that was
    read only afterwards by its first reading there.
    """
    when = at if definitions_at is None else definitions_at
    held = site_in_force(connection, site_id, site, when, known, only)
    found: list[dict[str, Any]] = []
    masses: dict[str, Estimate | None] = {}
    measured = None
    if held.vessels:
        meters = meters_in_force(connection, site_id, when, known)
        asked = np.full(len(held.vessels), at, dtype=np.int64)
        measured = measure_at(connection, site_id, held.vessels, asked, known, meters, closing=closing)
        found = answers(measured, working=working, budget=budget, statement=statement)
        masses = {vessel.name: mass_estimate(measured, row) for row, vessel in enumerate(held.vessels)}
    for one in held.out:
        found.append(out_of_service(one.name, at, [named("vessel", one)._asdict()]))
        masses[one.name] = Estimate(0.0)
    masses |= {name: Estimate(0.0) for name in held.junctions}
    found.sort(key=lambda answer: answer["vessel"])
    return Stock(held, at, found, masses, measured)


def out_of_service(vessel: str, at: int, cited: list[dict[str, Any]]) -> dict[str, Any]:
    """A vessel that is out of service holds 0 ± 0."""
    return {"vessel": vessel, "at": at, "status": "out_of_service", "mass_kg": 0.0, "mass_uncertainty_kg": 0.0,
            "liquid_mass_kg": 0.0, "vapour_mass_kg": 0.0, "available_mass_kg": 0.0, "definitions": cited}  # fmt: skip


def site_inventory(store: Store, site: str, at: int, as_of: int | None) -> dict[str, Any]:
    """Every vessel's inventory at an instant, with totals by substance."""
    with store.reading() as connection:
        site_id = site_number(connection, site)
        known = watermark(connection, site_id, as_of)
        stock = stock_at(connection, site_id, site, at, known)
    return {"at": at, "known_at": known, "vessels": stock.answers, "totals": totals(stock)}


def totals(stock: Stock) -> list[dict[str, Any]]:
    """Mass by substance; errors that vessels share add up as shared."""
    groups: dict[str, list[dict[str, Any]]] = {}
    for answer in stock.answers:
        if answer["status"] != "out_of_service":
            groups.setdefault(answer["substance"], []).append(answer)
    result = []
    for substance, members in sorted(groups.items()):
        measured = [one["vessel"] for one in members if one["status"] != "unmeasured"]
        total = combine((1.0, _mass(stock, name)) for name in measured)
        result.append(
            {
                "substance": substance,
                "mass_kg": total.value if measured else None,
                "mass_uncertainty_kg": total.uncertainty if measured else None,
                "vessels": measured,
                "missing": [one["vessel"] for one in members if one["status"] == "unmeasured"],
                "complete": len(measured) == len(members),
            }
        )
    return result


def _mass(stock: Stock, name: str) -> Estimate:
    mass = stock.masses[name]
    assert mass is not None
    return mass


def vessel_inventory(
    store: Store, site: str, vessel: str, at: int, as_of: int | None, *, working: bool = False, budget: bool = False,
    statement: bool = False,
) -> dict[str, Any]:  # fmt: skip
    """One vessel's inventory at an instant."""
    with store.reading() as connection:
        site_id = site_number(connection, site)
        known = watermark(connection, site_id, as_of)
        blocks = {"working": working, "budget": budget, "statement": statement}
        stock = stock_at(connection, site_id, site, at, known, only=vessel, **blocks)
    if not stock.answers:
        raise Unprocessable("A junction holds nothing: it has no inventory", code="junction")
    return stock.answers[0]


def course(
    store: Store, site: str, vessel: str, first: int, last: int, every: int, as_of: int | None
) -> dict[str, Any]:
    """A vessel's inventories from an instant to before another, one every so many microseconds."""
    in_order((first, last))
    if -((first - last) // every) > COURSE_POINTS:  # before the instants are made: they could fill the memory
        raise Unprocessable(
            f"That course has more than {COURSE_POINTS:,} points: ask for a shorter one, or a larger every",
            code="too_many_points",
        )
    instants = np.arange(first, last, every, dtype=np.int64)
    found: list[dict[str, Any]] = []
    with store.reading() as connection:
        site_id = site_number(connection, site)
        known = watermark(connection, site_id, as_of)
        for part in _segments(connection, site_id, instants, known):
            held = site_in_force(connection, site_id, site, int(part[0]), known, vessel)
            if held.out:
                cited = [named("vessel", held.out[0])._asdict()]
                found.extend(out_of_service(vessel, int(at), cited) for at in part)
            elif held.vessels:
                meters = meters_in_force(connection, site_id, int(part[0]), known)
                found.extend(answers(measure_at(connection, site_id, held.vessels[:1], part, known, meters)))
    return {"items": found, "next": None, "known_at": known}


def _segments(
    connection: Connection, site_id: int, instants: np.ndarray[tuple[int], np.dtype[np.int64]], known: int
) -> Iterable[np.ndarray[tuple[int], np.dtype[np.int64]]]:
    """The instants, cut where a definition changes: each part is computed by one set of definitions."""
    low, high = int(instants[0]), int(instants[-1]) + 1
    cuts = set()
    for kind in ("site", "substance", "vessel"):
        for one in definitions.timeline(connection, site_id, kind, low, high, known):
            if low < one.effective_from < high:
                cuts.add(one.effective_from)
    return [part for part in np.split(instants, np.searchsorted(instants, sorted(cuts))) if len(part)]


def why_unmeasured(stock: Stock, vessel: str) -> str:
    """The reason for which a vessel has no mass, as a sentence."""
    assert stock.measured is not None
    names = [one.name for one in stock.site.vessels]
    return reason(stock.measured, names.index(vessel))["detail"]
