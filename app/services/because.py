"""Why a close says something else than before: what was recorded between two states of knowledge."""

from __future__ import annotations

import json
from collections.abc import Iterable, Iterator, Set
from dataclasses import dataclass
from functools import cached_property
from typing import Any, Literal, NamedTuple

from sqlalchemy import Connection

from app.schemas.types import format_instant
from app.services.choose import NEVER
from app.services.collect import INPUTS, SITE, names_of
from app.services.explain import inputs_read
from app.services.find import ALL_TIME
from app.services.samples import HOLDS
from app.services.take_stock import Stock, stock_at
from app.store import definitions, readings
from app.store.readings import Found, Series

Kind = Literal["late_reading", "revised_reading", "late_transfer", "definition", "method"]
BY_TICKETS = {"sample_predates_receipt", "water_predates_receipt"}  # tickets had a part in what was measured
QUANTITY_WORDS = {
    "level_m": "level",
    "ullage_m": "ullage",
    "liquid_volume_m3": "liquid volume",
    "liquid_volume_pct": "liquid volume",
    "differential_pressure_kpa": "differential pressure",
    "weighed_mass_kg": "weighed mass",
    "free_water_level_m": "free water",
    "liquid_temperature_c": "liquid temperature",
    "ambient_temperature_c": "ambient temperature",
    "vapour_temperature_c": "vapour temperature",
    "pressure_kpa": "pressure",
    "pressure_kpa_abs": "pressure",
    "observed_density_kg_m3": "density",
    "observed_density_temperature_c": "temperature of the density",
    "observed_density_pressure_kpa_abs": "pressure of the density",
    "sediment_water_pct": "sediment and water",
    "density_basis": "basis of the density",
    "observed_density_by": "instrument of the density",
    "liquid_composition": "liquid composition",
    "vapour_composition": "vapour composition",
    "roof_load_kg": "roof load",
    "empty": "being empty",
    "sample": "sample",
    "sample_holds_from": "instant from which the sample stands",
    "barometric_pressure_kpa_abs": "barometer",
}


class Cause(NamedTuple):
    """One thing that was recorded in between, as the answer names it and as a sentence tells it."""

    kind: Kind
    subject: str
    recorded_at: int
    words: str

    def answer(self) -> dict[str, Any]:
        """As the contract lists it."""
        return {"kind": self.kind, "subject": self.subject, "recorded_at": self.recorded_at}


@dataclass(frozen=True)
class Side:
    """One state of knowledge of a close: what was known, the definitions' instant, and the method."""

    known: int
    definitions_at: int | None
    method: str


def method(before: Side, after: Side, recorded_at: int) -> list[Cause]:
    """That the calculation itself is another."""
    if before.method == after.method:
        return []
    words = f"the method of calculation is {after.method} and was {before.method}"
    return [Cause("method", f"{before.method} to {after.method}", recorded_at, words)]


def merged(causes: Iterable[Cause]) -> list[Cause]:
    """Each cause once, in the order in which they were recorded."""
    return sorted(set(causes), key=lambda one: (one.recorded_at, one.kind, one.subject))


def told_at(instant: int) -> str:
    """An instant in a sentence, to the second."""
    return format_instant(instant - instant % 1_000_000)


class Compared:
    """The stock of one instant as it was known at two times, and why it differs."""

    def __init__(
        self, connection: Connection, site_id: int, site: str, at: int, before: Side, after: Side, recorded_at: int
    ) -> None:
        self.connection, self.site_id, self.site, self.at = connection, site_id, site, at
        self.before, self.after, self.recorded_at = before, after, recorded_at

    @cached_property
    def stocks(self) -> tuple[Stock, Stock]:
        """Both stocks, computed anew when they are first asked for."""
        return self._stock(self.before), self._stock(self.after)

    def _stock(self, side: Side) -> Stock:
        return stock_at(
            self.connection, self.site_id, self.site, self.at, side.known, closing=True,
            definitions_at=side.definitions_at,
        )  # fmt: skip

    def of(self, vessel: str) -> list[Cause]:
        """Why the mass of a vessel differs."""
        found = method(self.before, self.after, self.recorded_at)
        return [*found, *self.readings(vessel), *self.definitions(vessel)]

    # --- readings ------------------------------------------------------------------------------------

    def _inputs(self, stock: Stock, vessel: str) -> list[list[Any]]:
        names = [one.name for one in stock.site.vessels]
        if stock.measured is None or vessel not in names:
            return []
        return inputs_read(stock.measured, names.index(vessel))

    def density(self, vessel: str) -> list[Cause]:
        """Why the density of what a vessel holds differs."""
        return [*self.readings(vessel, {"observed_density_kg_m3"}), *self.definitions(vessel)]

    def readings(self, vessel: str, only: Set[str] = frozenset()) -> list[Cause]:
        """Values that counted on one side only and were recorded, or withdrawn, in between."""
        before, after = (
            [one for one in self._inputs(stock, vessel) if not only or one[0] in only] for stock in self.stocks
        )
        differing = [one for one in before if one not in after] + [one for one in after if one not in before]
        if not differing:
            return []
        series = {
            (one.quantity, one.source, one.vessel): one
            for one in readings.series_of(self.connection, self.site_id, [vessel, SITE])
        }
        wanted: dict[tuple[int, int], Series] = {}
        for quantity, source, instant in _looked_at(differing):
            for owner in (vessel, SITE):
                one = series.get((quantity, source, owner))
                if one is not None:
                    wanted[one.series_id, instant] = one
        kept = readings.recorded(self.connection, self.site_id, list(wanted), self.before.known, self.after.known)
        return [_reading(wanted[one.series_id, one.taken_at], one, late=late) for one, late in kept]

    def carried(self, vessel: str) -> bool:
        """Whether tickets had a part in what was measured, and another one on the two sides."""
        moved, doubtful = [], False
        for stock in self.stocks:
            own: dict[str, Any] = next((one for one in stock.answers if one["vessel"] == vessel), {})
            moved.append(own.get("moved_kg"))
            doubtful |= not BY_TICKETS.isdisjoint(one["code"] for one in own.get("warnings", ()))
        return doubtful or moved[0] != moved[1]

    # --- definitions ---------------------------------------------------------------------------------

    def definitions(self, vessel: str) -> list[Cause]:
        """Texts of the site, the vessel and its substance that hold then and were not known before."""
        close = self.at if self.after.definitions_at is None else self.after.definitions_at
        instants = {close}
        substances = set()
        for stock in self.stocks:
            held = stock.site.vessel(vessel)
            if held is not None:
                substances.add(str(held.body.substance))
            instants |= {one[2] for one in self._inputs(stock, vessel)}  # a gauge's offset is of its reading's instant
        found = self.texts("site", self.site, [close]) + self.texts("vessel", vessel, sorted(instants))
        return found + [one for name in sorted(substances) for one in self.texts("substance", name, [close])]

    def texts(self, kind: str, name: str, instants: Iterable[int]) -> list[Cause]:
        """A definition's texts in force at some instants that are others than were known before."""
        found = []
        for at in instants:
            now, then = (
                definitions.in_force(self.connection, self.site_id, kind, at, known, [name])
                for known in (self.after.known, self.before.known)
            )
            for one in now:
                if one.recorded_at > self.before.known and [one.body] != [former.body for former in then]:
                    words = f"the definition of {kind} {name} was changed on {told_at(one.recorded_at)}"
                    found.append(Cause("definition", f"{kind} {name}", one.recorded_at, words))
        return merged(found)

    def meter(self, name: str) -> list[Cause]:
        """Texts of a meter; its provings are those of its last text."""
        close = self.at if self.after.definitions_at is None else self.after.definitions_at
        return self.texts("meter", name, [close, ALL_TIME])


def _looked_at(inputs: Iterable[list[Any]]) -> Iterator[tuple[str, str, int]]:
    """Quantity, source and instant of every stored value that such inputs come from."""
    for quantity, source, taken_at, after_at, *_ in inputs:
        spec = next(one for one in INPUTS if quantity in one.quantities)
        names = (quantity, *spec.companions, HOLDS) if spec.sample else (quantity,)
        for instant in (taken_at, after_at):
            if instant > int(NEVER):
                yield from ((name, source, instant) for name in dict.fromkeys((*names, *names_of(spec))))


def _reading(series: Series, found: Found, *, late: bool) -> Cause:
    """A value that came, or that was revised or withdrawn."""
    when = format_instant(found.taken_at)
    by = f" from {series.source}" if series.source else ""
    owner = series.vessel or "site"
    kind: Kind = "late_reading" if late else "revised_reading"
    did = "came" if late else "was revised"
    quantity = QUANTITY_WORDS.get(series.quantity, series.quantity)
    words = f"the {quantity} of {owner} of {when}{by} {did} on {told_at(found.recorded_at)}"
    return Cause(kind, f"{owner} {series.quantity} {when}{by}", found.recorded_at, words)


def ends(body: str) -> set[str]:
    """Both ends of a stored ticket."""
    said = json.loads(body)
    return {said["from"], said["to"]}
