"""A site of each test's own, written by the services' own verbs, and small enough for arithmetic by hand.

Its tanks are boxes of 10 m × 10 m × 10 m with a wall and a liquid that neither warm nor yield: at 800 kg/m³
a metre of level is 80,000 kg.
"""

from __future__ import annotations

from datetime import datetime
from typing import Any

from app.clock import Clock
from app.schemas.batch import RowError
from app.schemas.meter import Meter
from app.schemas.reading import Reading
from app.schemas.site import Site
from app.schemas.substance import Substance
from app.schemas.transfer import Transfer
from app.schemas.vessel import Vessel
from app.services import close, define, ingest, move, take_stock
from app.store import due
from app.store.engine import Store
from app.store.sites import number, watermark

MODELS = {"substance": Substance, "vessel": Vessel, "meter": Meter}
SITE: dict[str, Any] = {"name": "Invented", "time_zone": "UTC", "atmospheric_pressure_kpa_abs": 101.325}
OIL: dict[str, Any] = {
    "name": "oil",
    "liquid": {"model": "expansivity", "density_kg_m3": 800.0, "density_uncertainty_kg_m3": 2.0,
               "at_pressure_kpa_abs": 101.325, "expansivity_per_k": 0.0},
}  # fmt: skip
BOX: dict[str, Any] = {
    "name": "box", "substance": "oil",
    "shape": {"kind": "box", "length_m": 10.0, "width_m": 10.0, "height_m": 10.0},
    "shell": {"expansion_per_k": 0.0, "insulated": True},
    "instruments": {"level_m": {"random": 0.001, "systematic": 0.003},
                    "liquid_temperature_c": {"random": 0.0, "systematic": 0.0},
                    "capacity_pct": {"systematic": 0.1, "local": 0.0}},
    "assumed": {"liquid_temperature_c": {"value": 15.0, "standard_uncertainty": 0.0}},
}  # fmt: skip
KG_PER_M = 80_000.0


def instant(text: str) -> int:
    """Microseconds of ``2026-03-14T06:00`` in UTC, or of a text with an offset."""
    moment = datetime.fromisoformat(text if "+" in text or text.endswith("Z") else text + "+00:00")
    return round(moment.timestamp()) * 1_000_000


def text_of(at: int | str) -> str:
    return at if isinstance(at, str) and ("+" in at or at.endswith("Z")) else f"{at}:00Z"


class Still(Clock):
    """A clock that stands, after every night of these tests."""

    def now(self) -> int:
        return instant("2026-12-31T00:00")


class Plant:
    """One invented site in one store."""

    def __init__(self, store: Store, site: str) -> None:
        self.store, self.site, self.clock = store, site, Still()
        self.put_site()
        self.put("substance", "oil", OIL)

    def put_site(self, **changed: Any) -> define.Put:
        return define.put_site(self.store, self.site, Site.model_validate(SITE | changed))

    def put(self, kind: str, name: str, body: dict[str, Any]) -> define.Put:
        return define.put(self.store, self.site, kind, name, MODELS[kind].model_validate(body))

    def tank(self, name: str, /, **changed: Any) -> define.Put:
        return self.put("vessel", name, BOX | changed)

    def read(self, vessel: str | None, at: str, source: str = "", **values: Any) -> ingest.Outcome:
        """One reading of a vessel, of the site where ``vessel`` is None."""
        errors: list[RowError] = []
        body = {"taken_at": text_of(at), "source": source, **values} | ({} if vessel is None else {"vessel": vessel})
        outcome = ingest.ingest(self.store, self.clock, self.site, [(0, Reading.model_validate(body))], errors)
        assert not errors, errors
        return outcome

    def ticket(self, name: str, source: str, target: str, started: str, ended: str | None, **said: Any) -> str:
        outcome, _ = move.put(self.store, self.site, name, ticket(source, target, started, ended, **said))
        return outcome

    def close(self, day: str, **asked: Any) -> dict[str, Any]:
        """The night that stands after a close of a day."""
        return close.close(self.store, self.clock, self.site, day, **asked)[0]

    def inventory(self, at: str, as_of: int | None = None) -> dict[str, Any]:
        return take_stock.site_inventory(self.store, self.site, instant(at), as_of)

    def vessel(self, name: str, at: str, **asked: Any) -> dict[str, Any]:
        return take_stock.vessel_inventory(self.store, self.site, name, instant(at), None, **asked)

    def due(self) -> list[tuple[int, int]]:
        with self.store.reading() as connection:
            found = due.listing(connection, number(connection, self.site))
        return [(one.opening, one.closing) for one in found]

    def known(self) -> int:
        with self.store.reading() as connection:
            return watermark(connection, number(connection, self.site))


def ticket(source: str, target: str, started: str, ended: str | None, **said: Any) -> Transfer:
    """A ticket by a weighbridge that errs by 10 kg, unless something else is said of it."""
    body = {"from": source, "to": target, "started_at": text_of(started)} | said
    if ended is not None:
        body["ended_at"] = text_of(ended)
    if "by" not in body:
        body |= {"by": "weighbridge"} | ({} if "mass_uncertainty_kg" in body else {"mass_uncertainty_kg": 10.0})
    return Transfer.model_validate(body)


def row(night: dict[str, Any], vessel: str) -> dict[str, Any]:
    """One vessel's books of a night."""
    return next(one for one in night["vessels"] if one["vessel"] == vessel)
