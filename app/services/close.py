"""A period is closed: opening from the book before, closing measured, transfers between, every vessel judged."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from sqlalchemy import Connection

from app.clock import Clock
from app.errors import Conflict, NotFound
from app.schemas.meter import Meter
from app.services import judge, window
from app.services.explain import inputs_read
from app.services.find import site_number
from app.services.in_force import labelled, meters_in_force, period_of, site_in_force
from app.services.instants import Period, in_order
from app.services.regrade import Moving, regraded
from app.services.restate import restated
from app.services.take_stock import Stock, stock_at
from app.store import books, due, sites, transfers
from app.store.books import Book, BookMove, BookVessel
from app.store.engine import Store
from models.estimate import Estimate

METHOD = "2"  # of the calculation: a close by another method is another revision


@dataclass(frozen=True)
class Opening:
    """Masses with which a period opens, and what they rest on."""

    masses: Mapping[str, Estimate | None]
    restated: Mapping[str, float]
    substances: Mapping[str, str]
    read_at: Mapping[str, int | None]
    grounds: str


def close(
    store: Store, clock: Clock, site: str, day: str | None = None, bounds: tuple[int, int] | None = None,
    request: str = "", *, detail: bool = False,
) -> tuple[dict[str, Any], bool]:  # fmt: skip
    """Close a day or a period; the reconciliation that stands now, and whether it is a new revision.

    It reads under a watermark, computes without a lock, and writes behind a fence: of many closers of one
    period one writes, and the same inputs make no second revision.
    """
    with store.reading() as connection:
        site_id = site_number(connection, site)
        known = sites.watermark(connection, site_id)
        if bounds is None:
            period = period_of(connection, site_id, site, str(day), known)
        else:
            period = labelled(connection, site_id, site, bounds, known)
        if period.closing > clock.now():
            raise Conflict(
                "That period has not ended: it is closed when its last reading can be there", code="period_open"
            )
        body, vessels, moves, digest = _compute(connection, site_id, site, period, known)
    text = json.dumps(body, sort_keys=True, ensure_ascii=False, allow_nan=False)
    with store.writing(site, deed="close", request=request) as writing:
        book, new = books.write_book(
            writing, period.opening, period.closing, digest, known, METHOD, text, vessels, moves
        )
        due.finish(writing, period.opening, period.closing, known)
        if new and book.revision > 1:
            due.mark_opening_at(writing, period.closing, "the night before was closed anew")
    return answer(site, book, detail=detail), new


def _compute(
    connection: Connection, site_id: int, site: str, period: Period, known: int
) -> tuple[dict[str, Any], list[BookVessel], list[BookMove], str]:
    """The books of a period, each vessel's closing inventory, what moved, and the digest of what they rest on."""
    closing = stock_at(
        connection, site_id, site, period.closing, known, closing=True, definitions_at=period.closing - 1
    )
    meters = meters_in_force(connection, site_id, period.closing - 1, known)
    opening = _opening(connection, site_id, site, period, known, closing, meters)
    tickets = transfers.overlapping(connection, site_id, period.opening, period.closing, known)
    moving = Moving(connection, tickets, closing, meters)
    moves = [one for one in moving.between(period.opening, period.closing) if not one.water]
    pieces, regrades = regraded(moving, opening.masses, opening.substances, closing, period)
    body, flagged = judge.books_of(closing, opening, moves, pieces, regrades)
    body |= {"site": site, "opening": period.opening, "closing": period.closing, "label": period.label,
             "known_at": known, "method": METHOD}  # fmt: skip
    grounds = [METHOD, period.opening, period.closing, opening.grounds, list(closing.site.texts),
               inputs_of(closing), [[one.name, one.body] for one in tickets], _meter_texts(meters),
               moving.grounds]  # fmt: skip
    digest = hashlib.sha256(json.dumps(grounds, sort_keys=True).encode()).hexdigest()
    body["digest"] = digest
    return body, window.kept_vessels(closing, opening, flagged), window.kept_moves(moves, tickets, meters), digest


def _meter_texts(meters: Mapping[str, Meter]) -> list[list[str]]:
    return sorted([name, meter.model_dump_json(exclude_unset=True)] for name, meter in meters.items())


def inputs_of(stock: Stock) -> list[Any]:
    """Every value that counted in a stock-take, by its key, and the tickets that carried it to the instant."""
    if stock.measured is None:
        return []
    read = [[vessel.name, inputs_read(stock.measured, row)] for row, vessel in enumerate(stock.site.vessels)]
    return [read, sorted(stock.measured.tickets)]


def _opening(
    connection: Connection, site_id: int, site: str, period: Period, known: int, closing: Stock,
    meters: Mapping[str, Meter],
) -> Opening:  # fmt: skip
    """The closing of the book before, at its current revision; vessels that it lacks are measured now.

    A vessel whose geometry is another at the close is opened by it, from the same readings.
    """
    before = books.closing_at(connection, site_id, period.opening, known)
    masses: dict[str, Estimate | None] = {}
    read_at: dict[str, int | None] = {}
    grounds: list[Any] = []
    if before is not None:
        former = {one["vessel"]: one.get("closing_read_at") for one in json.loads(before.body)["vessels"]}
        for one in books.vessels_of(connection, site_id, before):
            masses[one.vessel] = None if one.mass_kg is None else Estimate(one.mass_kg, json.loads(one.parts))
            read_at[one.vessel] = former.get(one.vessel)
            # What was handed over, not by which revision: a night that opens as it did stands.
            grounds.append([one.vessel, one.mass_kg, one.parts, read_at[one.vessel]])
    lacking = set(closing.masses) - set(masses)
    held = site_in_force(connection, site_id, site, period.opening - (before is not None), known)
    if lacking:
        stock = stock_at(connection, site_id, site, period.opening, known, closing=True)
        for name in lacking & set(stock.masses):
            masses[name] = stock.masses[name]
            read_at[name] = judge.read_at(stock, name)
        grounds.append([inputs_of(stock), list(stock.site.texts)])
        if before is None:
            held = stock.site
    anew = restated(connection, held, closing.site, period.opening, known, meters, masses)
    grounds.append(sorted([name, one.change] for name, one in anew.items()))
    substances = {vessel.name: str(vessel.body.substance) for vessel in held.vessels if vessel.name in masses}
    grounds.append(sorted(substances.items()))
    return Opening(
        masses | {name: one.mass for name, one in anew.items()},
        {name: one.change for name, one in anew.items()}, substances, read_at, json.dumps(grounds, sort_keys=True),
    )  # fmt: skip


def answer(site: str, book: Book, *, detail: bool = False) -> dict[str, Any]:
    """A stored book as the contract's reconciliation."""
    body: dict[str, Any] = json.loads(book.body)
    label = body.pop("label")
    if not detail:
        for group in body.get("groups", ()):
            group.pop("statistic", None)
    return body | {"id": f"{label}.{book.revision}", "site": site, "revision": book.revision}


def find(store: Store, site: str, name: str, as_of: int | None, *, detail: bool) -> dict[str, Any]:
    """A closed period by its id, at the revision that is named or the newest."""
    with store.reading() as connection:
        site_id = site_number(connection, site)
        known = sites.watermark(connection, site_id) if as_of is None else as_of
        _, book = book_of(connection, site_id, site, name, known)
    return answer(site, book, detail=detail)


def book_of(connection: Connection, site_id: int, site: str, name: str, known: int) -> tuple[str, Book]:
    """A book by its id, at the revision that is named or the newest, and the id without its revision."""
    label, _, number = name.partition(".")
    period = period_of(connection, site_id, site, label, known)
    if number:
        book = books.revision(connection, site_id, period.opening, period.closing, int(number))
    else:
        book = books.newest(connection, site_id, period.opening, period.closing, known)
    if book is None or book.recorded_at > known:
        raise NotFound("That period was not closed, or not at that revision", code="unknown_reconciliation")
    return label, book


def listing(
    store: Store, site: str, period: tuple[int, int], place: tuple[int, str, int] | None, limit: int, as_of: int | None
) -> tuple[list[dict[str, Any]], tuple[int, str] | None, int]:
    """A page of closed periods by their close, each at its newest revision, and the place behind it."""
    in_order(period)
    with store.reading() as connection:
        site_id = site_number(connection, site)
        newest = sites.watermark(connection, site_id)
        known = place[2] if place is not None else (newest if as_of is None else min(as_of, newest))
        cursor = None if place is None else (place[0], int(place[1]))
        page, following = books.listing(connection, site_id, *period, known, cursor=cursor, limit=limit)
    after = None if following is None else (following[0], str(following[1]))
    return [answer(site, book) for book in page], after, known


def imbalances(found: Sequence[Mapping[str, Any]], *, flagged: bool | None) -> list[dict[str, Any]]:
    """The vessels of many books as one flat list."""
    rows = []
    for book in found:
        for vessel in book["vessels"]:
            if flagged is None or vessel["flagged"] == flagged:
                rows.append(
                    {"reconciliation": book["id"], "opening": book["opening"], "closing": book["closing"], **vessel}
                )
    return rows
