"""The balances of a period as books: each vessel's figures, verdict and limits, each substance's total."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from app.schemas.site import ImbalanceLimit
from app.services import explain
from app.services.move import Moved
from app.services.take_stock import Stock
from models.balance.night import Movement, Row, limits, night
from models.estimate import Estimate, combine

if TYPE_CHECKING:
    from app.services.close import Opening

MONTH_DAYS = 30.44  # days of a mean month


@dataclass(frozen=True)
class Piece:
    """What a ticket moved in a part of the period in which no vessel changed its substance."""

    movement: Movement
    given: str | None  # substance of the end that lost it; None is no vessel's
    gained: str | None


@dataclass(frozen=True)
class Regrade:
    """A vessel that took another substance within the period: its book mass then, None if not known."""

    vessel: str
    given: str
    gained: str
    mass: Estimate | None


def books_of(
    closing: Stock, opening: Opening, moves: Sequence[Moved], pieces: Sequence[Piece], regrades: Sequence[Regrade]
) -> tuple[dict[str, Any], set[str]]:
    """The blocks of a reconciliation that this version computes, and the vessels that are flagged."""
    measured = closing.masses
    known_ends = set(measured)
    movements = [
        Movement(one.name, end_of(one.source, known_ends), end_of(one.target, known_ends), one.mass) for one in moves
    ]
    alarm = min(0.99, closing.site.body.false_alarms_per_month / MONTH_DAYS)
    result = night(opening.masses, measured, movements, alarm)
    named = {answer["vessel"]: answer["status"] for answer in closing.answers}
    named |= dict.fromkeys(closing.site.junctions, "measured")
    moved = {answer["vessel"]: answer.get("moved_kg") for answer in closing.answers}
    rows = {name: row for row in result.rows for name in row.members}
    crossed = _crossed(movements, rows)
    vessels = [
        _vessel(name, status, closing, opening, crossed, rows.get(name), result.critical)
        | {"moved_kg": moved.get(name)}
        for name, status in sorted(named.items())
    ]
    flagged = {one["vessel"] for one in vessels if one["flagged"]}
    in_service = [one for one in vessels if one["status"] != "out_of_service"]
    body = {
        "status": "imbalanced" if flagged else "balanced",
        "complete": all(one["imbalance_kg"] is not None for one in in_service),
        "vessels": vessels,
        "transfers": [
            {
                "transfer": one.name,
                "measured_mass_kg": None if one.mass is None else one.mass.value,
                "observability": result.observability[one.name],
            }
            for one in movements
        ],
        "groups": [
            {"members": list(one.members), "statistic": _number(one.statistic),
             "degrees_of_freedom": one.degrees_of_freedom, "p_value": _number(one.p_value)}
            for one in result.groups
        ],
        "totals": _totals(closing, opening, pieces, regrades),
    }  # fmt: skip
    return body, flagged


def end_of(name: str | None, known: set[str]) -> str | None:
    """An end that has a balance of its own; a boundary's is beyond the books."""
    return name if name in known else None


def _number(value: float) -> float | None:
    return float(value) if math.isfinite(value) else None


def read_at(stock: Stock, vessel: str) -> int | None:
    """When the inventory of a vessel was read."""
    row = stock.site.rows.get(vessel)
    return None if stock.measured is None or row is None else explain.read_at(stock.measured, row)


def _sum(masses: Sequence[Estimate]) -> float:
    return math.fsum(mass.value for mass in masses)


@dataclass(frozen=True)
class _Crossed:
    """What came into each vessel and what went out of it; of merged ones into and out of the whole, by its first."""

    received: Mapping[str | None, Sequence[Estimate]]
    delivered: Mapping[str | None, Sequence[Estimate]]


def _crossed(movements: Sequence[Movement], rows: Mapping[str, Row]) -> _Crossed:
    first = {name: row.members[0] for name, row in rows.items()}
    received: dict[str | None, list[Estimate]] = {}
    delivered: dict[str | None, list[Estimate]] = {}
    for one in movements:
        source, target = first.get(one.source or "", one.source), first.get(one.target or "", one.target)
        if one.mass is not None and source != target:
            received.setdefault(target, []).append(one.mass)
            delivered.setdefault(source, []).append(one.mass)
    return _Crossed(received, delivered)


def _vessel(
    name: str, status: str, closing: Stock, opening: Opening, crossed: _Crossed, row: Row | None, critical: float
) -> dict[str, Any]:
    """One vessel's books; merged vessels carry the book and the imbalance of the whole."""
    members = (name,) if row is None else row.members
    received, delivered = crossed.received.get(members[0], ()), crossed.delivered.get(members[0], ())
    before, after = opening.masses.get(name), closing.masses[name]
    book = None
    if row is not None:
        opened = [opening.masses[one] for one in members]
        book = math.fsum(one.value for one in opened if one is not None) + _sum(received) - _sum(delivered)
    entry: dict[str, Any] = {
        "vessel": name,
        "status": status,
        "flagged": bool(row is not None and row.flagged),
        "opening_mass_kg": None if before is None else before.value - opening.restated.get(name, 0.0),
        "restated_kg": opening.restated.get(name),
        "closing_mass_kg": None if after is None else after.value,
        "received_kg": _sum(received),
        "delivered_kg": _sum(delivered),
        "book_mass_kg": book,
        "imbalance_kg": None if row is None else row.imbalance.value,
        "imbalance_uncertainty_kg": None if row is None else row.imbalance.uncertainty,
        "score": None if row is None else _number(row.score),
        "p_value": None if row is None else row.p_value,
        "detectable_imbalance_kg": None if row is None or _unseen(row) else _number(row.detectable),
        "opening_read_at": opening.read_at.get(name),
        "closing_read_at": read_at(closing, name),
        "judged_with": [one for one in members if one != name],
    }
    return entry | _verdict(name, closing, row, critical, max(_sum(received), _sum(delivered)))


def _unseen(row: Row) -> bool:
    """Whether both ends rest on one reading and no ticket moved anything: nothing was measured in between."""
    return row.imbalance.uncertainty == 0.0


def _verdict(name: str, closing: Stock, row: Row | None, critical: float, throughput: float) -> dict[str, Any]:
    """fail if flagged; inconclusive if a limit is set that the instruments cannot see or that is passed."""
    vessel = closing.site.vessel(name)
    own: ImbalanceLimit | None = None if vessel is None else vessel.body.imbalance_limit
    limit = own or closing.site.body.imbalance_limit
    entry: dict[str, Any] = {}
    if row is not None:
        entry["limited_by"] = [
            {"instrument": one, "detectable_without_it_kg": without}
            for one, without in limits(row, critical, instrument)
        ]
    if row is None:
        return entry | {"verdict": None if vessel is None else "inconclusive"}
    if limit is None:
        return entry | {"verdict": "fail" if row.flagged else "pass"}
    allowed = limit.kg + limit.pct_of_throughput / 100.0 * throughput
    over = abs(row.imbalance.value) > allowed
    unseen = vessel is not None and (_unseen(row) or row.detectable > allowed)
    verdict = "fail" if row.flagged else "inconclusive" if over or unseen else "pass"
    return entry | {"verdict": verdict, "over_limit": over}


def instrument(error: str) -> str:
    """What a reader would go and look at, from an error's name: stamps of single readings are left out."""
    kind, _, rest = error.partition(":")
    if kind in ("r", "stale"):
        return rest.rpartition(":")[0].replace(":", " ") + (", each reading" if kind == "r" else ", carried forward")
    if kind == "t":
        return f"ticket {rest}"
    return f"{kind} {rest}"


def _totals(
    closing: Stock, opening: Opening, pieces: Sequence[Piece], regrades: Sequence[Regrade]
) -> list[dict[str, Any]]:
    """Each substance over the whole site; errors that vessels and tickets share add up as shared."""
    closed: dict[str, list[Estimate | None]] = {}
    for vessel in closing.site.vessels:
        closed.setdefault(str(vessel.body.substance), []).append(closing.masses[vessel.name])
    opened: dict[str, list[Estimate | None]] = {}
    for name, substance in opening.substances.items():
        opened.setdefault(substance, []).append(opening.masses.get(name))
    names = sorted({*closed, *opened, *(one.gained for one in regrades), *(one.given for one in regrades)})
    return [_total(name, opened.get(name, []), closed.get(name, []), pieces, regrades) for name in names]


def _total(
    substance: str, opened: Sequence[Estimate | None], closed: Sequence[Estimate | None], pieces: Sequence[Piece],
    regrades: Sequence[Regrade],
) -> dict[str, Any]:  # fmt: skip
    """One substance: what crossed the site's edge, what came from or went to another substance, the rest."""
    received = [one.movement.mass for one in pieces if one.gained == substance and one.given is None]
    delivered = [one.movement.mass for one in pieces if one.given == substance and one.gained is None]
    turned: list[tuple[float, Estimate | None]] = []
    for one in pieces:
        if one.given != one.gained and None not in (one.given, one.gained):
            turned += [(1.0, one.movement.mass)] if one.gained == substance else []
            turned += [(-1.0, one.movement.mass)] if one.given == substance else []
    for regrade in regrades:
        turned += [(1.0, regrade.mass)] if regrade.gained == substance else []
        turned += [(-1.0, regrade.mass)] if regrade.given == substance else []
    signed: list[tuple[float, Estimate | None]] = [
        *((1.0, mass) for mass in closed), *((-1.0, mass) for mass in opened), *((-1.0, mass) for mass in received),
        *((1.0, mass) for mass in delivered), *((-sign, mass) for sign, mass in turned),
    ]  # fmt: skip
    complete = all(mass is not None for _, mass in signed)
    entry: dict[str, Any] = {
        "substance": substance,
        "opening_mass_kg": _known(opened),
        "closing_mass_kg": _known(closed),
        "received_kg": _known(received),
        "delivered_kg": _known(delivered),
        "complete": complete,
    }
    if turned:
        known = all(mass is not None for _, mass in turned)
        entry["reclassified_kg"] = math.fsum(sign * mass.value for sign, mass in turned if mass) if known else None
    if complete:
        imbalance = combine((sign, mass) for sign, mass in signed if mass is not None)
        entry |= {"imbalance_kg": imbalance.value, "imbalance_uncertainty_kg": imbalance.uncertainty}
    return entry


def _known(masses: Sequence[Estimate | None]) -> float | None:
    """Sum of masses, None where one is not known."""
    return (
        None if any(mass is None for mass in masses) else math.fsum(mass.value for mass in masses if mass is not None)
    )
