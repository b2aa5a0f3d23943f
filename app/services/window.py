"""The window of nights that a close is judged in: what was closed before, and tonight, as the balance takes it."""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence
from dataclasses import replace
from typing import TYPE_CHECKING, Any

from sqlalchemy import Connection

from app.services import move
from app.services.move import Moved
from app.services.parts import at_row
from app.services.take_stock import Stock, stock_at
from app.store import books
from app.store.books import BookMove, BookVessel, WindowNight
from models.balance.window import Check, Ticket, Window
from models.balance.window import Stock as Closed
from models.estimate import Estimate

if TYPE_CHECKING:
    from app.schemas.meter import Meter
    from app.services.close import Opening
    from app.store.transfers import Transfer

DAY_US = 86_400_000_000
MILLIMETRE = 1e-3  # m
SLOPES = {"level": "level", "temperature": "liquid_temperature", "density": "density"}
"""Inputs that a fault may shift, and the chain's name of the mass's derivative by each. [kg for one SI unit]"""
CHECKED = {
    "level_m": ("level", "level", 1.0), "liquid_temperature_c": ("temperature", "temperature", 1.0)
}  # fmt: skip
"""Of a check's quantity: what of the mass it informs, the first word of its errors' names, and the SI of its unit."""


# --- what a close keeps ---------------------------------------------------------------------------


def kept_vessels(closing: Stock, opening: Opening, flagged: set[str]) -> list[BookVessel]:
    """Each vessel's closing inventory with its named parts, and how it follows what was read."""
    rows = []
    for name, mass in sorted(closing.masses.items()):
        parts = "{}" if mass is None else _text(mass.parts)
        value = None if mass is None else mass.value
        notes = notes_of(closing, opening, name)
        rows.append(BookVessel(name, value, parts, name in flagged, json.dumps(notes, sort_keys=True) if notes else ""))
    return rows


def _text(parts: Mapping[str, float]) -> str:
    return json.dumps(dict(sorted(parts.items())))


def notes_of(closing: Stock, opening: Opening, vessel: str) -> dict[str, Any]:
    """What a window needs of a closing inventory beside its mass; nothing of one that stands as it was stated."""
    notes: dict[str, Any] = {}
    restated = opening.masses.get(vessel)
    if vessel in opening.restated and restated is not None:
        notes["opened"] = {"mass_kg": restated.value, "parts": dict(sorted(restated.parts.items()))}
    row = closing.site.rows.get(vessel)
    if closing.measured is None or row is None or closing.masses.get(vessel) is None:
        return notes
    carried = closing.measured.carried.get(row)
    if carried is not None and carried.stated is not None:
        return notes
    slopes = closing.measured.result.sensitivities
    found = {name: float(slopes[column][row]) for name, column in SLOPES.items()}
    notes["slopes"] = {name: slope for name, slope in found.items() if slope != 0.0}
    if carried is not None and any(one["code"] == "level_unchanged" for one in carried.warnings):
        notes["still"] = True
    if checks := _checks(closing, vessel, row, found):
        notes["checks"] = checks
    return notes


def _checks(closing: Stock, name: str, row: int, slopes: Mapping[str, float]) -> list[dict[str, Any]]:
    """Second sources' values of the period: winner less check, in mass, with the errors of both instruments."""
    measured = closing.measured
    assert measured is not None
    vessel, found = measured.vessel(row), []
    for one in measured.checks.get(row, ()):
        if one["quantity"] not in CHECKED or one["difference"] is None:
            continue
        kind, prefix, unit = CHECKED[one["quantity"]]
        slope = slopes[kind] * unit
        winner = vessel.instrument(one["quantity"], measured.source(_input(kind), row), one["at"])
        check = vessel.instrument(one["quantity"], one["source"], one["at"])
        parts = {f"{prefix}:{winner.name}": slope * winner.systematic}
        shared = f"{prefix}:{check.name}"
        parts[shared] = parts.get(shared, 0.0) - slope * check.systematic
        parts[f"check:{name}:{one['source']}:{one['at']}"] = abs(slope) * (winner.random**2 + check.random**2) ** 0.5
        found.append({"kind": kind, "at": one["at"], "difference": -slope * one["difference"], "slope": slope,
                      "parts": {key: part for key, part in sorted(parts.items()) if part}})  # fmt: skip
    return found


def _input(kind: str) -> str:
    return {"level": "level", "temperature": "liquid_temperature"}[kind]


def kept_moves(
    moves: Sequence[Moved], tickets: Sequence[Transfer], meters: Mapping[str, Meter]
) -> list[BookMove]:
    """What each ticket moved in the period, with the meter that measured it and since which proving."""
    bodies = {ticket.name: move.body_of(ticket) for ticket in tickets}
    rows = []
    for one in moves:
        body, mass = bodies[one.name], one.mass
        meter = "" if body.meter is None else f"{body.meter}:{move.proved(meters.get(body.meter), body.started_at)}"
        parts = "{}" if mass is None else _text(mass.parts)
        value = None if mass is None else mass.value
        rows.append(BookMove(one.name, one.source or "", one.target or "", value, parts, meter))
    return rows


# --- what the balance takes -----------------------------------------------------------------------


def window_of(
    connection: Connection, site_id: int, site: str, period: tuple[int, int], known: int, nights: int,
    tonight: tuple[Sequence[BookVessel], Sequence[BookMove]], opening: Opening,
) -> tuple[Window, list[str]]:  # fmt: skip
    """Tonight and the closed nights that lead up to it, and the digests of those."""
    before = books.chain(connection, site_id, period[0], known, nights)
    first, past = _first_close(connection, site_id, site, period, known, before, nights, opening)
    vessels, moves = tonight
    stocks = list(first)
    tickets: list[Ticket] = []
    checks: list[Check] = []
    lengths = [one.book.closing - one.book.opening for one in past] + [period[1] - period[0]]
    held = [([*one.vessels], one.slopes, one.moves) for one in past]
    for number, (own, notes, moved) in enumerate(held, start=1):
        rows = [BookVessel(one.vessel, one.mass_kg, one.parts, one.flagged, notes.get(one.vessel, "")) for one in own]
        _night(number, rows, moved, stocks, tickets, checks)
    _night(len(lengths), vessels, moves, stocks, tickets, checks)
    window = Window(tuple(one / DAY_US for one in lengths), stocks, tickets, checks)
    return window, [one.book.digest for one in before]


def _first_close(
    connection: Connection, site_id: int, site: str, period: tuple[int, int], known: int,
    before: list[WindowNight], nights: int, opening: Opening,
) -> tuple[list[Closed], list[WindowNight]]:  # fmt: skip
    """Stocks at the close that opens the window, and the nights after it.

    Of a window that is full the oldest book only opens it; of the first nights of a site the opening is measured.
    """
    if len(before) >= nights > 1:
        oldest, past = before[0], before[1:]
        return [_closed(0, BookVessel(one.vessel, one.mass_kg, one.parts, one.flagged,
                                      oldest.slopes.get(one.vessel, ""))) for one in oldest.vessels], past  # fmt: skip
    if not before:
        return [Closed(name, 0, mass, {}) for name, mass in sorted(opening.masses.items())], []
    stock = stock_at(connection, site_id, site, before[0].book.opening, known, closing=True)
    found = []
    for name, mass in sorted(stock.masses.items()):
        row = stock.site.rows.get(name)
        slopes: dict[str, float] = {}
        if mass is not None and stock.measured is not None and row is not None:
            chain = stock.measured.result.sensitivities
            slopes = {key: at_row(chain[column], row) for key, column in SLOPES.items()}
        found.append(_stock(name, 0, mass, {"slopes": {key: one for key, one in slopes.items() if one}}))
    return found, before


def _night(
    number: int, vessels: Sequence[BookVessel], moves: Sequence[BookMove], stocks: list[Closed],
    tickets: list[Ticket], checks: list[Check],
) -> None:  # fmt: skip
    """One night's stocks, tickets and checks; an opening that was stated anew belongs to the close before."""
    for one in vessels:
        notes = json.loads(one.slopes) if one.slopes else {}
        if opened := notes.get("opened"):
            _reopen(stocks, one.vessel, number - 1, Estimate(opened["mass_kg"], opened["parts"]))
        stocks.append(_closed(number, one))
        checks += [
            Check(one.vessel, number, Estimate(check["difference"], check["parts"]), check["kind"], check["slope"])
            for check in notes.get("checks", ())
        ]
    tickets += [
        Ticket(
            one.transfer, number, one.source or None, one.target or None,
            None if one.mass_kg is None else Estimate(one.mass_kg, json.loads(one.parts)), one.meter or None,
        )
        for one in moves
    ]  # fmt: skip


def _closed(close: int, one: BookVessel) -> Closed:
    mass = None if one.mass_kg is None else Estimate(one.mass_kg, json.loads(one.parts))
    return _stock(one.vessel, close, mass, json.loads(one.slopes) if one.slopes else {})


def _stock(vessel: str, close: int, mass: Estimate | None, notes: Mapping[str, Any]) -> Closed:
    slopes = notes.get("slopes", {})
    samples = () if mass is None else tuple(name for name in mass.parts if name.startswith(("sample:", "density:")))
    return Closed(
        vessel, close, mass, slopes, samples, None, abs(slopes.get("level", 0.0)) * MILLIMETRE,
        bool(notes.get("still", False)),
    )  # fmt: skip


def _reopen(stocks: list[Closed], vessel: str, close: int, mass: Estimate) -> None:
    for place in range(len(stocks) - 1, -1, -1):
        if stocks[place].vessel == vessel and stocks[place].close == close:
            stocks[place] = replace(stocks[place], reopened=mass)
            return
