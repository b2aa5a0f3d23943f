"""What a revision of a closed period changed against the one before, and because of what."""

from __future__ import annotations

import json
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import Any

from sqlalchemy import Connection

from app.services import close
from app.services.because import Cause, Compared, Side, ends, merged, told_at
from app.services.find import site_number
from app.store import books, sites, transfers
from app.store.books import Book
from app.store.engine import Store
from app.store.tables import LONGEST_TRANSFER
from app.store.transfers import Transfer as Ticket

ROUNDING_KG = 1e-3  # kg; masses that differ less were added up in another order
SOURCES = {
    "opening_mass_kg": "opening mass",
    "closing_mass_kg": "closing mass",
    "received_kg": "receipts",
    "delivered_kg": "deliveries",
    "restated_kg": "restated opening",
}
RESULTS = {"imbalance_kg": "imbalance", "flagged": "flagged", "verdict": "verdict"}
MEASURED = "measured_mass_kg"
RECLASSIFIED = "reclassified_kg"
WORDS = {**SOURCES, **RESULTS, MEASURED: "measured mass"}
OF_SUBSTANCES = {**SOURCES, RECLASSIFIED: "reclassified", "imbalance_kg": "imbalance"}
TOLD = 3  # causes of one change that its sentence tells; all are listed

Entry = Mapping[str, Any]


@dataclass(frozen=True)
class Change:
    """One field that differs, before it has a reason."""

    owner: str  # "vessel", "transfer" or "substance"
    name: str
    field: str
    before: Any
    after: Any


def changes(store: Store, site: str, name: str) -> dict[str, Any]:
    """Everything that a revision changed, with its causes, and each change as a sentence."""
    with store.reading() as connection:
        site_id = site_number(connection, site)
        label, book = close.book_of(connection, site_id, site, name, sites.watermark(connection, site_id))
        answer: dict[str, Any] = {"id": f"{label}.{book.revision}", "before": None, "changes": [], "words": []}
        former = books.revision(connection, site_id, book.opening, book.closing, book.revision - 1)
        if former is None:
            return answer
        found = Revised(connection, site_id, site, former, book).changes()
    listed = [
        {one.owner: one.name, "field": one.field, "before": one.before, "after": one.after,
         "because": [cause.answer() for cause in causes]}
        for one, causes in found
    ]  # fmt: skip
    words = [sentence(one, causes) for one, causes in found]
    return answer | {"before": f"{label}.{former.revision}", "changes": listed, "words": words}


class Revised:
    """Two revisions of a period side by side."""

    def __init__(self, connection: Connection, site_id: int, site: str, former: Book, book: Book) -> None:
        self.connection, self.site_id, self.site = connection, site_id, site
        self.former, self.book = former, book
        self.bodies = json.loads(former.body), json.loads(book.body)
        self.sides = _side(former), _side(book)
        self.closing = Compared(connection, site_id, site, book.closing, *self.sides, book.recorded_at)
        self.openings: dict[tuple[Side, Side], Compared] = {}

    def changes(self) -> list[tuple[Change, list[Cause]]]:
        """Every field that differs, of vessels, of transfers and of substances, with what it comes from."""
        vessels = [_by_name(body["vessels"], "vessel") for body in self.bodies]
        entries = {
            name: (vessels[0].get(name, {}), vessels[1].get(name, {})) for name in sorted({*vessels[0], *vessels[1]})
        }
        members = {name: _members(name, pair) for name, pair in entries.items()}
        changed = {name: _differing("vessel", name, pair, WORDS) for name, pair in entries.items()}
        sources = {
            name: [(one, self._source(one.field, name, members[name])) for one in own if one.field in SOURCES]
            for name, own in changed.items()
        }
        found: list[tuple[Change, list[Cause]]] = []
        for name, own in changed.items():
            found += sources[name]
            results = [one for one in own if one.field in RESULTS]
            if results:
                with_it = [pair for one in sorted(members[name]) for pair in sources.get(one, ())]
                causes = merged(cause for _, several in with_it for cause in several)
                found += [(one, causes or self._every(members[name])) for one in results]
        found += [(one, self._ticket(one.name)) for one in self._tickets_changed]
        found += self._of_substances({one.field for one, _ in found}, sorted(entries))
        if any(not causes for _, causes in found):  # a vessel is also judged beside the others
            everything = merged(cause for _, causes in found for cause in causes)
            found = [(one, causes or everything) for one, causes in found]
        return found

    def _of_substances(self, told: set[str], vessels: list[str]) -> list[tuple[Change, list[Cause]]]:
        """What moved from one substance to another: no vessel's own figures tell it."""
        before, after = (_by_name(body.get("totals", ()), "substance") for body in self.bodies)
        changed = [
            one
            for name in sorted({*before, *after})
            for one in _differing("substance", name, (before.get(name, {}), after.get(name, {})), OF_SUBSTANCES)
            if one.field not in told
        ]
        if not changed:
            return []
        causes = merged(cause for name in vessels for cause in self.closing.definitions(name))
        return [(one, causes) for one in changed]

    # --- where a figure comes from -------------------------------------------------------------------

    def _source(self, field: str, vessel: str, members: set[str]) -> list[Cause]:
        if field == "closing_mass_kg":
            return self._closing(vessel)
        if field == "opening_mass_kg":
            return self._opening(vessel)
        if field == "restated_kg":
            return merged(self.closing.definitions(vessel)) or self._opening(vessel)
        return self._moved(members)

    def _closing(self, vessel: str) -> list[Cause]:
        found = self.closing.of(vessel)
        if self.closing.carried(vessel):
            found += self._moved({vessel})
        return merged(found)

    def _opening(self, vessel: str) -> list[Cause]:
        """What changed the close before, or the reading where there is none: its causes are this night's."""
        sides = []
        for (before, held), side in zip(self._nights_before, self.sides, strict=True):
            if before is not None and vessel in held:
                sides.append(Side(before.known_at, self.book.opening - 1, before.method))
            else:
                sides.append(Side(side.known, None, side.method))
        key = sides[0], sides[1]
        if key not in self.openings:
            self.openings[key] = Compared(
                self.connection, self.site_id, self.site, self.book.opening, *key, self.book.recorded_at
            )
        found = self.openings[key].of(vessel)
        if self.openings[key].carried(vessel):
            found += self._tickets_of(vessel, key)
        return merged(found)

    @cached_property
    def _nights_before(self) -> list[tuple[Book | None, set[str]]]:
        """The book that either revision opened with, and its vessels."""
        found: list[tuple[Book | None, set[str]]] = []
        for one in (self.former, self.book):
            before = books.closing_at(self.connection, self.site_id, one.opening, one.known_at)
            held = [] if before is None else books.vessels_of(self.connection, self.site_id, before)
            found.append((before, {night.vessel for night in held}))
        return found

    def _every(self, members: set[str]) -> list[Cause]:
        """Whatever touches a vessel's balance: an uncertainty or a limit may have changed, and no mass."""
        found = self._moved(members)
        for one in sorted(members):
            found += self.closing.of(one) + self._opening(one)
        return merged(found)

    # --- tickets -------------------------------------------------------------------------------------

    @cached_property
    def tickets(self) -> tuple[dict[str, Ticket], dict[str, Ticket]]:
        """The period's tickets as they were known at either revision, struck ones too."""
        before, after = (
            {
                one.name: one
                for one in transfers.overlapping(
                    self.connection, self.site_id, self.book.opening, self.book.closing, side.known, void=True
                )
            }
            for side in self.sides
        )
        return before, after

    @cached_property
    def _tickets_changed(self) -> list[Change]:
        """Tickets of the period whose mass in it is another, and those that came or went."""
        before, after = (_by_name(body.get("transfers", ()), "transfer") for body in self.bodies)
        found = []
        for name in sorted({*before, *after}):
            entries = before.get(name, {}), after.get(name, {})
            change = Change("transfer", name, MEASURED, entries[0].get(MEASURED), entries[1].get(MEASURED))
            if _differ(change.before, change.after) or (name in before) != (name in after):
                found.append(change)
        return found

    def _moved(self, members: set[str]) -> list[Cause]:
        """Why tickets of some vessels are others: those whose mass changed, and those that were recorded in between."""
        changed = {one.name for one in self._tickets_changed}
        found: list[Cause] = []
        for name in sorted({*self.tickets[0], *self.tickets[1]}):
            touched = set().union(*(ends(known[name].body) for known in self.tickets if name in known))
            if touched & members:
                found += self._ticket(name) if name in changed else self._recorded(name, self.sides[0].known)
        return merged(found)

    def _recorded(self, name: str, since: int, until: int | None = None) -> list[Cause]:
        known = self.sides[1].known if until is None else until
        one = transfers.current(self.connection, self.site_id, name, known)
        if one is None or one.recorded_at <= since:
            return []
        was = transfers.current(self.connection, self.site_id, name, since)
        did = "was struck" if one.void else "came" if was is None else "was corrected"
        words = f"ticket {name} {did} on {told_at(one.recorded_at)}"
        return [Cause("late_transfer", name, one.recorded_at, words)]

    def _ticket(self, name: str) -> list[Cause]:
        """Why a ticket's mass is another: its text, its meter, or the density of the vessel that it touches."""
        found = self._recorded(name, self.sides[0].known)
        one = self.tickets[1].get(name) or self.tickets[0].get(name)
        if one is None:
            return found
        said = json.loads(one.body)
        if said.get("meter"):
            found += self.closing.meter(said["meter"])
        if "mass_kg" not in said:
            old, new = (Side(side.known, None, side.method) for side in self.sides)
            then = Compared(self.connection, self.site_id, self.site, one.started_at, old, new, self.book.recorded_at)
            for end in sorted(ends(one.body) & {vessel.name for vessel in self.closing.stocks[1].site.vessels}):
                known = said.get("density_kg_m3")
                found += self.closing.definitions(end) if known else self.closing.density(end) + then.density(end)
        return merged(found)

    def _tickets_of(self, vessel: str, sides: tuple[Side, Side]) -> list[Cause]:
        """Tickets of a vessel recorded between two states of knowledge of the close before."""
        first, last = self.book.opening - LONGEST_TRANSFER, self.book.opening
        near = transfers.overlapping(self.connection, self.site_id, first, last, sides[1].known, void=True)
        return [
            cause
            for one in near
            if vessel in ends(one.body)
            for cause in self._recorded(one.name, sides[0].known, sides[1].known)
        ]


def _side(book: Book) -> Side:
    return Side(book.known_at, book.closing - 1, book.method)


def _members(name: str, entries: Iterable[Entry]) -> set[str]:
    """A vessel and those that it is judged with."""
    return {name}.union(*(one.get("judged_with", ()) for one in entries))


def _by_name(entries: Iterable[Entry], key: str) -> dict[str, Entry]:
    return {one[key]: one for one in entries}


def _differing(owner: str, name: str, entries: tuple[Entry, Entry], fields: Iterable[str]) -> list[Change]:
    found = [Change(owner, name, field, entries[0].get(field), entries[1].get(field)) for field in fields]
    return [one for one in found if _differ(one.before, one.after)]


def _differ(before: Any, after: Any) -> bool:
    if isinstance(before, float) and isinstance(after, float):
        return abs(after - before) > ROUNDING_KG
    return bool(before != after)


def sentence(change: Change, causes: Iterable[Cause]) -> str:
    """One change in words."""
    told = [one.words for one in causes]
    subject = f"ticket {change.name}" if change.owner == "transfer" else change.name
    before, after, unit = change.before, change.after, ""
    if change.field.endswith("_kg"):
        close_by = None not in (before, after) and abs(after - before) < 1.0
        lacking = "unknown" if change.owner == "vessel" else "none"
        before, after = (lacking if one is None else f"{one:,.{3 if close_by else 0}f}" for one in (before, after))
        unit = " kg"
    elif change.field == "flagged":
        before, after = ("yes" if one else "no" for one in (before, after))
    text = f"{subject}: {(WORDS | OF_SUBSTANCES)[change.field]} {before or 'none'} → {after or 'none'}{unit}"
    if not told:
        return text
    more = f"; and {len(told) - TOLD} more" if len(told) > TOLD else ""
    return f"{text} because {'; '.join(told[:TOLD])}{more}"
