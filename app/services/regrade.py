"""Tickets of a period in parts, cut where a vessel takes another substance: what turned from one into another."""

from __future__ import annotations

from collections import ChainMap, Counter
from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np
from sqlalchemy import Connection

from app.schemas.meter import Meter
from app.services import move
from app.services.carry import measure_at, vapours
from app.services.compile import CompiledVessel
from app.services.explain import inputs_read
from app.services.in_force import SiteInForce, site_in_force
from app.services.instants import Period
from app.services.judge import Piece, Regrade, end_of
from app.services.measure import standard_density
from app.services.move import Moved
from app.services.take_stock import Stock
from app.store.transfers import Transfer as Ticket
from models.balance.night import Movement
from models.estimate import Estimate, combine


class Moving:
    """The tickets of a period and what is needed to turn them into mass.

    A ticket by volume that brings no density takes that of the vessel which lost it (received it, from beyond the
    site) as it was when the ticket began: whatever came in or was sampled later, or whatever the vessel was made to
    hold. So it is the same mass in whichever periods it is counted.
    """

    def __init__(
        self, connection: Connection, tickets: Sequence[Ticket], closing: Stock, meters: Mapping[str, Meter]
    ) -> None:
        self.tickets = tickets
        self.meters = meters
        self.vessels = {vessel.name: vessel for vessel in closing.site.vessels}
        self.standard: dict[str, Estimate] = {}
        self.spaces: dict[str, float] = {}
        self.then: dict[str, tuple[CompiledVessel, Estimate]] = {}
        self.grounds: list[Any] = []
        if closing.measured is not None:
            self.spaces = vapours(closing.measured)
            for row, vessel in enumerate(closing.site.vessels):
                self.standard[vessel.name] = standard_density(closing.measured, row)
        found: dict[str, list[Any]] = {}
        for together in _rounds([(one, _density_of(one, closing)) for one in tickets]):
            found |= self._measure(connection, closing.site, together)
        self.grounds = [found[one.name] for one in tickets if one.name in found]

    def _measure(
        self, connection: Connection, site: SiteInForce, tickets: Mapping[str, Ticket]
    ) -> dict[str, list[Any]]:  # fmt: skip
        """Each vessel's density when its ticket began, by the definitions and the sample of then; what it rests on."""
        held = {name: _former(connection, site, name, ticket.started_at) for name, ticket in tickets.items()}
        vessels = tuple(one for one in held.values() if one is not None and one.has_liquid)
        if not vessels:
            return {}
        own = [tickets[vessel.name] for vessel in vessels]
        at = np.array([one.started_at for one in own], dtype=np.int64)
        measured = measure_at(connection, site.site_id, vessels, at, site.known, self.meters)
        found: dict[str, list[Any]] = {}
        for row, (vessel, ticket) in enumerate(zip(vessels, own, strict=True)):
            self.then[ticket.name] = vessel, standard_density(measured, row)
            cited = [list(one) for one in vessel.definitions]
            found[ticket.name] = [ticket.name, cited, inputs_read(measured, row)]
        return found

    def between(self, first: int, last: int) -> list[Moved]:
        """What the tickets that ran between two instants moved then; one of no duration where it stands."""
        return [
            self._moved(one, first, last)
            for one in self.tickets
            if one.started_at < last and (one.ended_at > first or one.started_at >= first)
        ]

    def _moved(self, one: Ticket, first: int, last: int) -> Moved:
        vessels: Mapping[str, CompiledVessel] = self.vessels
        standard: Mapping[str, Estimate] = self.standard
        if one.name in self.then:
            vessel, density = self.then[one.name]
            vessels = ChainMap({vessel.name: vessel}, self.vessels)
            standard = ChainMap({vessel.name: density}, self.standard)
        return move.moved(one, first, last, vessels, self.meters, standard, self.spaces)


def _rounds(wanted: Sequence[tuple[Ticket, str | None]]) -> list[dict[str, Ticket]]:
    """Tickets by the vessel that each asks for, a vessel once in a round: a round is measured together."""
    rounds: list[dict[str, Ticket]] = []
    taken: Counter[str] = Counter()
    for ticket, vessel in wanted:
        if vessel is not None:
            if taken[vessel] == len(rounds):
                rounds.append({})
            rounds[taken[vessel]][vessel] = ticket
            taken[vessel] += 1
    return rounds


def _former(connection: Connection, site: SiteInForce, name: str, at: int) -> CompiledVessel | None:
    """A vessel by the definitions of an instant before the close; those of the close where they held by then."""
    vessel = site.vessel(name)
    if vessel is not None and all(one.effective_from is None or one.effective_from <= at for one in vessel.definitions):
        return vessel
    return site_in_force(connection, site.site_id, site.name, at, site.known).vessel(name)


def _density_of(ticket: Ticket, closing: Stock) -> str | None:
    """The vessel whose density a ticket needs as of its beginning, where that of the close may be another."""
    body = move.body_of(ticket)
    if body.of == "water" or body.unmetered or body.by == "gauging" or body.density_kg_m3 is not None:
        return None
    name = body.to if body.from_.startswith(move.BOUNDARY) else body.from_
    if body.mass_kg is not None or name in closing.site.junctions:
        return None
    row = closing.site.rows.get(name)
    if row is None or closing.measured is None or closing.site.vessels[row].since > ticket.started_at:
        return name  # out of service, or of another substance
    measured = closing.measured
    sample, carried = measured.chosen["density"], measured.carried.get(row)
    stale = carried is not None and any(one["code"] == "sample_predates_receipt" for one in carried.warnings)
    newer = bool(sample.usable[row]) and int(sample.begins[row]) > ticket.started_at
    return name if newer or (stale and name == body.from_) else None


def regraded(
    moving: Moving,
    opening: Mapping[str, Estimate | None],
    substances: Mapping[str, str],
    closing: Stock,
    period: Period,
) -> tuple[list[Piece], list[Regrade]]:
    """The period's tickets by the substances of their ends, and the heels that became another substance."""
    turns = {
        vessel.name: vessel.since
        for vessel in closing.site.vessels
        if period.opening <= vessel.since < period.closing and substances.get(vessel.name, "") != vessel.body.substance
    }
    later = {vessel.name: str(vessel.body.substance) for vessel in closing.site.vessels}
    known = set(closing.masses)
    edges = [period.opening, *sorted(set(turns.values()) - {period.opening}), period.closing]
    pieces: list[Piece] = []
    for first, last in zip(edges, edges[1:], strict=False):
        moves = [one for one in moving.between(first, last) if not one.water and (one.mass is None or one.mass.value)]
        # A vessel that opened out of service holds what it holds later, one that closes so what it held.
        held = dict(substances) | {
            name: substance
            for name, substance in later.items()
            if name not in substances or turns.get(name, period.opening) <= first
        }
        _through(held, closing.site.junctions, moves)
        for one in moves:
            source, target = end_of(one.source, known), end_of(one.target, known)
            pieces.append(
                Piece(Movement(one.name, source, target, one.mass), held.get(source or ""), held.get(target or ""))
            )
    heels = [
        Regrade(name, substances[name], later[name], _heel(moving, opening.get(name), name, period.opening, at))
        for name, at in turns.items()
        if name in substances
    ]
    return pieces, heels


def _through(held: dict[str, str], junctions: Sequence[str], moves: Sequence[Moved]) -> None:
    """A junction passes on what the vessels beside it hold, where that is one substance."""
    for _ in junctions:  # junctions may stand one behind the other
        for name in junctions:
            beside = {
                held[there]
                for one in moves
                for here, there in ((one.source, one.target), (one.target, one.source))
                if here == name and there in held
            }
            if name not in held and len(beside) == 1:
                held[name] = beside.pop()


def _heel(moving: Moving, opening: Estimate | None, vessel: str, first: int, at: int) -> Estimate | None:
    """Book mass of a vessel when it took another substance; None where something was not measured."""
    if opening is None:
        return None
    terms = [(1.0, opening)]
    for one in moving.between(first, at) if at > first else ():
        if one.water or vessel not in (one.source, one.target):
            continue
        if one.mass is None:
            return None
        terms.append((1.0 if one.target == vessel else -1.0, one.mass))
    return combine(terms)
