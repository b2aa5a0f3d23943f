"""A mass is taken where it was read and carried to the instant by what moved in between.

What was read before a receipt or a water draw no longer says all about the content: such samples are
blended or widened, such water dips are not carried.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from functools import cached_property

import numpy as np
from numpy.typing import NDArray
from sqlalchemy import Connection

from app.schemas.meter import Meter
from app.schemas.transfer import Transfer
from app.services import move
from app.services.blend import Blend, Corrections, stale
from app.services.check import check
from app.services.choose import ALWAYS, Chosen
from app.services.collect import Collected, collect
from app.services.compile import CompiledVessel
from app.services.measure import Measured, choices, measure, standard_density
from app.services.parts import at_row, stamp
from app.store import transfers
from app.store.transfers import Transfer as Ticket
from models import instruments
from models.estimate import Estimate, combine

DAY_US = 86_400_000_000
OUTDATED = {"sample_predates_receipt", "water_predates_receipt"}
LOOK_BACK_US = 400 * DAY_US  # µs; a sample older than this is not asked which receipts came after it
STILL_M = 0.002  # m; a level that moves no more than this stands still: the step of a gauge, common practice
CERTAIN = 6.0  # standard uncertainties of what tickets moved, before a level that stands still is doubted

Instants = NDArray[np.int64]


@dataclass
class Carried:
    """What happened to one row between its reading and the instant that was asked for."""

    moved: Estimate = field(default_factory=lambda: Estimate(0.0))
    empty: bool = False
    weighed: Estimate | None = None
    extras: dict[str, float] = field(default_factory=dict)  # kg of each further named error
    warnings: list[dict[str, str]] = field(default_factory=list)
    uncertain: bool = False

    @property
    def stated(self) -> Estimate | None:
        """The mass of a stock-take that counts as it stands: found empty, or weighed."""
        return Estimate(0.0) if self.empty else self.weighed

    @property
    def changed(self) -> bool:
        """Whether the mass, or what is known of it, is another than that of its reading."""
        return bool(self.stated is not None or self.extras or self.moved.value or self.moved.parts)

    def warn(self, code: str, detail: str, *, uncertain: bool = False) -> None:
        """Say what is doubtful."""
        self.warnings.append({"code": code, "detail": detail})
        self.uncertain |= uncertain


@dataclass(frozen=True)
class Moves:
    """The tickets that matter to a set of vessels, read once."""

    tickets: Sequence[tuple[Ticket, Transfer]]
    vessels: Mapping[str, CompiledVessel]
    meters: Mapping[str, Meter]
    spaces: Mapping[str, float]

    def of(self, vessel: str) -> Sequence[tuple[Ticket, Transfer]]:
        """Those with an end at a vessel."""
        return self._by_end.get(vessel, ())

    @cached_property
    def _by_end(self) -> dict[str, list[tuple[Ticket, Transfer]]]:
        found: dict[str, list[tuple[Ticket, Transfer]]] = {}
        for ticket, body in self.tickets:
            for end in {body.from_, body.to}:
                found.setdefault(end, []).append((ticket, body))
        return found

    def part(
        self, ticket: Ticket, first: int, last: int, standard: Mapping[str, Estimate], asked: int | None = None,
        spaces: Mapping[str, float] | None = None,
    ) -> move.Moved:  # fmt: skip
        """What a ticket moved between two instants, of which ``asked`` stands fast.

        The vessel whose standard density is given is asked and the ticket's other end is not, so that an answer
        is the same alone and among others; ``spaces`` is the density of its vapour in one row of a course.
        """
        own = {name: self.vessels[name] for name in standard}
        spaces = self.spaces if spaces is None else spaces
        return move.moved(ticket, first, last, own, self.meters, standard, spaces, asked)


def measure_at(
    connection: Connection, site_id: int, vessels: tuple[CompiledVessel, ...], asked: Instants, known: int,
    meters: Mapping[str, Meter], *, closing: bool = False,
) -> Measured:  # fmt: skip
    """Masses of many vessels at one instant, or of one vessel at many, each read where it was read.

    A row whose level (or pressure) was read at another instant is measured there, temperature and all, and
    carried to the instant that was asked for by what moved in between.
    """
    rows = len(asked)
    first = collect(connection, site_id, vessels, asked, known)
    ahead = np.full(rows, ALWAYS) if closing else None
    instants, empties, scales = _read_at(first, choices(first, ahead), asked)
    collected = first
    if (instants != asked).any():
        collected = collect(connection, site_id, vessels, instants, known, first.slots)
    _spend(collected, asked - instants)
    within = np.full(rows, ALWAYS) if closing else np.maximum(asked - instants, 0)
    measured = measure(collected, ahead=within, asked=asked)
    carried = {row: Carried(empty=row in empties) for row in range(rows)}
    for row in scales:
        carried[row].weighed = _weighed(measured, row)
    moves = _moves(connection, site_id, measured, known, meters)
    corrections = _corrections(measured, moves, carried)
    if corrections is not None:
        measured = measure(collected, ahead=within, asked=asked, corrections=corrections)
    for row in range(rows):
        _move(measured, moves, row, carried[row])
    measured.carried = carried
    measured.tickets = _counted(measured, moves)
    _standing_still(connection, site_id, measured, moves, known)
    check(connection, site_id, first, measured, moves, known)
    return measured


def _counted(measured: Measured, moves: Moves) -> list[tuple[str, str]]:
    """Tickets that may have had a part in a mass or in a doubt about it.

    Those of the last day and those between a reading and the instant; those since a sample or a water dip only
    where they outdated it.
    """
    found: dict[str, str] = {}
    for row, carried in measured.carried.items():
        outdated = not OUTDATED.isdisjoint(one["code"] for one in carried.warnings)
        since = min(int(measured.collected.at[row]), measured.instant(row)) - DAY_US
        for ticket, _ in moves.of(measured.vessel(row).name):
            if outdated or ticket.ended_at > since:
                found[ticket.name] = ticket.body
    return sorted(found.items())


def _read_at(
    collected: Collected, chosen: Mapping[str, Chosen], asked: Instants
) -> tuple[Instants, set[int], set[int]]:
    """The instant at which each row is measured, and the rows that were found empty, or weighed, then."""
    instants = asked.copy()
    found: dict[str, set[int]] = {"empty": set(), "weighed": set()}
    for row in range(len(asked)):
        key = chosen[collected.vessel(row).key_input]
        newest = None
        if key.usable[row]:
            newest = int(key.taken_at[row])
            if key.share[row] == 0.0:
                instants[row] = newest
        for name in ("weighed", "empty"):
            stated = chosen[name]
            if stated.usable[row] and (newest is None or newest < stated.taken_at[row]):
                newest = int(stated.taken_at[row])
                instants[row] = newest if stated.share[row] == 0.0 else asked[row]
                for rows in found.values():
                    rows.discard(row)
                found[name].add(row)
    return instants, found["empty"], found["weighed"]


def _weighed(measured: Measured, row: int) -> Estimate | None:
    """A mass by load cells as it stands, with the errors of the cells. [kg]"""
    chosen, vessel = measured.chosen["weighed"], measured.vessel(row)
    if not chosen.usable[row]:
        return None
    value, source = float(chosen.value[row]), measured.source("weighed", row)
    own = vessel.instrument("weighed_mass_kg", source, int(chosen.taken_at[row]))
    systematic = own.systematic if own.declared else instruments.WEIGHED_SHARE * abs(value)
    reading = f"{vessel.name}/{source}" if source else vessel.name
    scatter = f"r:{reading}:weighed_mass_kg:{stamp(chosen.taken_at[row])}"
    parts = {f"weighed:{own.name}": systematic, scatter: own.random}
    return Estimate(value, {name: part for name, part in parts.items() if part})


def _spend(collected: Collected, elapsed: Instants) -> None:
    """What is too far from the instant that was asked for does not win at the reading of another source."""
    for row in range(collected.rows):
        age = collected.candidates[collected.vessel(row).key_input].max_age[row]
        age[age < ALWAYS] -= abs(int(elapsed[row]))


def _moves(connection: Connection, site_id: int, measured: Measured, known: int, meters: Mapping[str, Meter]) -> Moves:
    """Tickets since the oldest of what counts in each vessel: its reading, its sample, its water dip."""
    since: dict[str, int] = {}
    instants = measured.collected.at
    latest = int(instants.max())
    for row in range(measured.collected.rows):
        at = measured.instant(row)
        latest = max(latest, at)
        oldest = min(int(instants[row]), at - DAY_US)
        for name in ("density", "sediment_water", "liquid_composition", "vapour_composition", "free_water"):
            chosen = measured.chosen[name]
            if chosen.usable[row]:
                oldest = min(oldest, int(chosen.begins[row]))
        vessel = measured.vessel(row).name
        since[vessel] = min(since.get(vessel, at), max(oldest, at - LOOK_BACK_US))
    found = transfers.touching(connection, site_id, since, latest, known)
    held = {vessel.name: vessel for vessel in measured.collected.vessels}
    return Moves([(one, move.body_of(one)) for one in found], held, meters, vapours(measured))


def vapours(measured: Measured, rows: Iterable[int] | None = None) -> dict[str, float]:
    """Density of the vapour in each vessel that has one, in all rows or some. [kg/m³]"""
    densities = measured.result["vapour_density"]
    return {
        measured.vessel(row).name: float(densities[row])
        for row in (range(measured.collected.rows) if rows is None else rows)
        if math.isfinite(densities[row])
    }


def _move(measured: Measured, moves: Moves, row: int, carried: Carried) -> None:
    """Receipts less deliveries between the reading and the instant, backwards where it was read after it."""
    read, at = int(measured.collected.at[row]), measured.instant(row)
    if read == at:
        return
    vessel = measured.vessel(row).name
    standard, spaces = {vessel: standard_density(measured, row)}, vapours(measured, [row])
    sign = 1.0 if read < at else -1.0
    first, last = min(read, at), max(read, at)
    terms: list[tuple[float, Estimate]] = []
    for ticket, body in moves.of(vessel):
        if body.of == "water" or ticket.started_at >= last or ticket.ended_at <= first:
            continue
        part = moves.part(ticket, first, last, standard, at, spaces)
        if part.mass is None:
            said = "an unmetered transfer ran between the reading and the instant: its part is not known"
            carried.warn("input_uncertain", said, uncertain=True)
        else:
            terms.append((sign if part.target == vessel else -sign, part.mass))
    if terms:
        carried.moved = combine(terms)


def _corrections(measured: Measured, moves: Moves, carried: Mapping[int, Carried]) -> Corrections | None:
    """What samples and water dips no longer say, row by row."""
    blends: dict[int, Blend] = {}
    dry: set[int] = set()
    for row in range(measured.collected.rows):
        vessel = measured.vessel(row)
        own = moves.of(vessel.name)
        if not own or carried[row].stated is not None:
            continue
        blend = stale(measured, moves, own, row, carried[row])
        if blend is not None:
            blends[row] = blend
        read = int(measured.collected.at[row])
        if vessel.has_liquid and _water(measured, own, row, read, carried[row]):
            dry.add(row)
    return Corrections(blends, frozenset(dry)) if blends or dry else None


def _water(measured: Measured, own: Sequence[tuple[Ticket, Transfer]], row: int, read: int, carried: Carried) -> bool:
    """Whether a water dip is no longer true: free water was moved after it."""
    chosen = measured.chosen["free_water"]
    if not chosen.usable[row]:
        return False
    dipped = int(chosen.begins[row])
    later = [(ticket, body) for ticket, body in own if ticket.started_at < read and ticket.ended_at > dipped]
    drawn = [ticket for ticket, body in later if body.of == "water"]
    vessel = measured.vessel(row)
    if not drawn:
        if any(body.to == vessel.name for _, body in later):
            carried.warn("water_predates_receipt", "a receipt came after the free water was last dipped")
        return False
    carried.warn(
        "water_predates_receipt",
        "free water was moved after it was last dipped: it is taken as none, with what was dipped as a bound",
        uncertain=True,
    )
    kilograms = float(measured.result["liquid_density"][row]) * float(measured.result["free_water_volume"][row])
    if math.isfinite(kilograms) and kilograms > 0.0:
        carried.extras[f"water:{vessel.name}:{drawn[-1].name}"] = kilograms / math.sqrt(3.0)
    return True


def _standing_still(connection: Connection, site_id: int, measured: Measured, moves: Moves, known: int) -> None:
    """A level that did not move while tickets did is doubted, before any night is closed."""
    suspects: dict[int, int] = {}
    for row in range(measured.collected.rows):
        vessel, read = measured.vessel(row), int(measured.collected.at[row])
        if vessel.key_input != "level" or not measured.chosen["level"].usable[row] or measured.carried[row].stated:
            continue
        began = _began(moves, vessel.name, read)
        if began is not None and _certain(measured, moves, row, began, read):
            suspects[row] = began
    if not suspects:
        return
    rows = sorted(suspects)
    vessels = measured.collected.vessels
    several = tuple(vessels[row] for row in rows) if len(vessels) > 1 else vessels
    then = collect(connection, site_id, several, np.array([suspects[row] for row in rows], dtype=np.int64), known)
    former = choices(then, np.full(len(rows), ALWAYS))["level"]
    for place, row in enumerate(rows):
        since, read = int(former.taken_at[place]), int(measured.collected.at[row])
        if since >= read or (since > suspects[row] and not _certain(measured, moves, row, since, read)):
            continue  # no level was read before the tickets began: what moved since one was may be less
        change = at_row(measured.state.level, row) - float(former.value[place])
        if abs(change) <= STILL_M:
            said = f"the level moved {change * 1000.0:.1f} mm while tickets moved more than the gauge could miss"
            measured.carried[row].warn("level_unchanged", f"{said}: it may stand still", uncertain=True)


def _began(moves: Moves, vessel: str, read: int) -> int | None:
    """When the earliest ticket of the last day began that moved something before a reading."""
    begun = [
        ticket.started_at
        for ticket, body in moves.of(vessel)
        if ticket.started_at < read and ticket.ended_at > read - DAY_US and body.of is None
    ]
    return max(min(begun), read - DAY_US) if begun else None


def _certain(measured: Measured, moves: Moves, row: int, first: int, last: int) -> bool:
    """Whether what tickets moved between two instants is beyond doubt for this vessel's gauge."""
    vessel = measured.vessel(row)
    standard, spaces = {vessel.name: standard_density(measured, row)}, vapours(measured, [row])
    terms = []
    for ticket, body in moves.of(vessel.name):
        if body.of is None and ticket.started_at < last and ticket.ended_at > first:
            part = moves.part(ticket, first, last, standard, spaces=spaces)
            if part.mass is not None:
                terms.append((1.0 if part.target == vessel.name else -1.0, part.mass))
    net = combine(terms)
    own = vessel.instrument("level_m", measured.source("level", row))
    per_metre = abs(float(measured.result.sensitivities["level"][row]))
    return abs(net.value) > CERTAIN * math.hypot(math.sqrt(2.0) * own.random * per_metre, net.uncertainty)
