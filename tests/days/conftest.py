"""A site of its own for each day, spoken to over HTTP only, in sentences that read like a log book.

A day takes ``site`` (it then runs on SQLite and on PostgreSQL) or, where it needs several, ``new_site``.
Instants are texts such as ``"2026-03-14 05:40"`` in UTC, or complete RFC 3339 texts. What a method posts
beyond what a day tells it stands in its docstring: everything else is left out, so that a day's arithmetic
can be followed on paper. A plain tank is a box with upright sides, its liquid at 15 °C, its shell stiff:
``mass = area × level × density``, and 1 mm of level is the only error that anything has.
"""

from __future__ import annotations

import uuid
from collections.abc import Callable, Iterator, Mapping
from typing import Any

import pytest
from fastapi.testclient import TestClient

from app.main import create_app
from app.settings import Settings

Body = Mapping[str, Any]
NewSite = Callable[..., "Site"]
WIDTH_M = 10.0  # of a plain tank; its length is its area over this


def instant(text: str) -> str:
    """``2026-03-14 05:40`` as an RFC 3339 text in UTC; a complete one as it is."""
    return text if "T" in text else f"{text.replace(' ', 'T')}:00Z"


class Told(dict[str, Any]):
    """An answer that can be asked about one vessel, one substance, one ticket."""

    def of(self, vessel: str) -> dict[str, Any]:
        """The entry of a vessel."""
        return one_of(self["vessels"], "vessel", vessel)

    def total(self, substance: str) -> dict[str, Any]:
        """The entry of a substance in the totals."""
        return one_of(self["totals"], "substance", substance)

    def ticket(self, name: str) -> dict[str, Any]:
        """The entry of a transfer in a reconciliation."""
        return one_of(self["transfers"], "transfer", name)

    @property
    def flagged(self) -> set[str]:
        """The vessels of a reconciliation that are flagged."""
        return {one["vessel"] for one in self["vessels"] if one["flagged"]}

    def warnings(self, vessel: str) -> set[str]:
        """The codes of an inventory's warnings."""
        return {one["code"] for one in self.of(vessel)["warnings"]}

    def input(self, vessel: str, quantity: str) -> dict[str, Any]:
        """The value of a quantity that an inventory was computed from."""
        return one_of(self.of(vessel)["inputs"], "quantity", quantity)


def one_of(entries: list[dict[str, Any]], key: str, name: str) -> dict[str, Any]:
    """The one entry of that name; a day that asks for another has read the answer wrongly."""
    found = [one for one in entries if one[key] == name]
    assert len(found) == 1, f"{len(found)} entries with {key} {name!r} in {[one[key] for one in entries]}"
    return found[0]


class Site:
    """One site of the service, by its paths."""

    def __init__(self, client: TestClient, name: str) -> None:
        self.client, self.name, self.path = client, name, f"/v1/sites/{name}"

    # --- bare requests ---------------------------------------------------------------------------

    def put(self, path: str, body: Body) -> str:
        """PUT a body under the site: ``created``, ``revised`` or ``unchanged``."""
        answer = self.client.put(f"{self.path}{path}", json=dict(body))
        assert answer.status_code in (200, 201), answer.text
        return str(answer.json()["outcome"])

    def post(self, path: str, body: Body) -> Told:
        """POST a body under the site."""
        answer = self.client.post(f"{self.path}{path}", json=dict(body))
        assert answer.status_code in (200, 201), answer.text
        return Told(answer.json())

    def get(self, path: str, **query: object) -> Told:
        """GET a path under the site; ``from_`` is the query's ``from``, instants may be short."""
        answer = self.client.get(f"{self.path}{path}", params=_query(query))
        assert answer.status_code == 200, answer.text
        return Told(answer.json())

    # --- definitions -----------------------------------------------------------------------------

    def define(self, **body: Any) -> str:
        """The site itself: UTC, days from 06:00, 101.325 kPa, unless the day says otherwise."""
        usual: dict[str, Any] = {"name": "a site", "time_zone": "UTC", "day_starts_at": "06:00"}
        if not {"elevation_m", "atmospheric_pressure_kpa_abs"} & set(body):
            usual["atmospheric_pressure_kpa_abs"] = 101.325
        return self.put("", {**usual, **body})

    def liquid(
        self, name: str, density_kg_m3: float, *, beta_per_k: float = 0.0, kappa_per_kpa: float = 0.0,
        density_uncertainty_kg_m3: float = 0.0, **body: Any,
    ) -> str:  # fmt: skip
        """A substance that is liquid only; without β and κ its density is the same everywhere, and exact."""
        liquid = {
            "model": "expansivity", "density_kg_m3": density_kg_m3, "expansivity_per_k": beta_per_k,
            "compressibility_per_kpa": kappa_per_kpa, "density_uncertainty_kg_m3": density_uncertainty_kg_m3,
        }  # fmt: skip
        return self.substance(name, liquid=liquid, **body)

    def substance(self, name: str, **body: Any) -> str:
        """A substance as it stands in the body."""
        return self.put(f"/substances/{name}", {"name": name, **body})

    def tank(
        self, name: str, holds: str, *, area_m2: float = 100.0, height_m: float = 20.0, random_m: float = 0.001,
        systematic_m: float = 0.0, instruments: Body | None = None, assumed: Body | None = None, **body: Any,
    ) -> str:  # fmt: skip
        """A plain tank: a box of that area, exact but for its gauge, its liquid taken to be at 15 °C.

        The thermometer is an assumed 15 °C ± 0, the shell does not expand, the capacity is exact.
        ``effective_from`` may be a short instant.
        """
        shape = {"kind": "box", "length_m": area_m2 / WIDTH_M, "width_m": WIDTH_M, "height_m": height_m}
        errors = {
            "level_m": {"random": random_m, "systematic": systematic_m},
            "capacity_pct": {"systematic": 0.0, "local": 0.0},
            "observed_density_kg_m3": {"random": 0.0, "systematic": 0.0},
            "observed_density_temperature_c": {"systematic": 0.0},
        }
        assumptions = {"liquid_temperature_c": {"value": 15.0, "standard_uncertainty": 0.0}}
        usual = {
            "shape": shape, "shell": {"expansion_per_k": 0.0}, "instruments": {**errors, **(instruments or {})},
            "assumed": assumptions if assumed is None else assumed,
        }  # fmt: skip
        return self.vessel(name, holds, **{**usual, **body})

    def vessel(self, name: str, holds: str | None, **body: Any) -> str:
        """A vessel as it stands in the body; ``effective_from`` may be a short instant."""
        if "effective_from" in body:
            body["effective_from"] = instant(body["effective_from"])
        held = {} if holds is None else {"substance": holds}
        return self.put(f"/vessels/{name}", {"name": name, **held, **body})

    def meter(self, name: str, *, random_pct: float = 0.0, systematic_pct: float = 0.0, **body: Any) -> str:
        """A meter; exact unless the day says otherwise. The instants of its provings may be short."""
        provings = [{**one, "at": instant(one["at"])} for one in body.pop("provings", ())]
        errors = {"random_pct": random_pct, "systematic_pct": systematic_pct}
        return self.put(f"/meters/{name}", {"name": name, **errors, "provings": provings, **body})

    # --- what happened ---------------------------------------------------------------------------

    def reads(self, vessel: str | None, at: str, **values: Any) -> Told:
        """One reading of a vessel; of the site where the vessel is None. Nothing may be rejected."""
        reading = {"taken_at": instant(at), **values}
        if vessel is not None:
            reading["vessel"] = vessel
        if "sample_holds_from" in reading:
            reading["sample_holds_from"] = instant(reading["sample_holds_from"])
        answer = self.post("/readings", {"readings": [reading]})
        assert answer["rejected"] == 0, answer["errors"]
        return answer

    def moves(self, ticket: str, from_: str, to: str, started: str, ended: str | None, **body: Any) -> str:
        """A ticket from one end to another; ``ended`` None is still running. By statement ± 0 if left out.

        The instants of ``progress`` may be short.
        """
        times = {"started_at": instant(started)} | ({} if ended is None else {"ended_at": instant(ended)})
        if "progress" in body:
            body["progress"] = [{**one, "at": instant(one["at"])} for one in body["progress"]]
        by: dict[str, Any] = {"by": "meter"} if "meter" in body else {"by": "statement"}
        if by["by"] == "statement" and body.get("by", "statement") == "statement" and not body.get("unmetered"):
            by["mass_uncertainty_kg"] = 0.0
        return self.put(f"/transfers/{ticket}", {"from": from_, "to": to, **times, **by, **body})

    def receives(
        self, vessel: str, ticket: str, started: str, ended: str | None, *, of: str = "jetty", **body: Any
    ) -> str:
        """A receipt from beyond the site, by default from the jetty."""
        return self.moves(ticket, f"boundary:{of}", vessel, started, ended, **_water(body))

    def delivers(
        self, vessel: str, ticket: str, started: str, ended: str | None, *, by_way_of: str = "rack", **body: Any
    ) -> str:
        """A delivery to beyond the site, by default over the rack."""
        return self.moves(ticket, vessel, f"boundary:{by_way_of}", started, ended, **_water(body))

    def voids(self, ticket: str) -> str:
        """Strike a ticket: the same again, void."""
        return self.put(f"/transfers/{ticket}", {**self.get(f"/transfers/{ticket}")["transfer"], "void": True})

    # --- what the books say ----------------------------------------------------------------------

    def closes(self, day: str | None = None, opening: str | None = None, closing: str | None = None) -> Told:
        """Close a day, or a period between two instants."""
        if day is not None:
            return self.post("/reconciliations", {"day": day})
        assert opening is not None and closing is not None
        return self.post("/reconciliations", {"opening": instant(opening), "closing": instant(closing)})

    def book(self, name: str, **query: object) -> Told:
        """A closed period by its id: ``2026-03-14`` (the newest revision), ``2026-03-14.1``."""
        return self.get(f"/reconciliations/{name}", **query)

    def changes(self, name: str) -> list[dict[str, Any]]:
        """What a revision changed against the one before, and because of what."""
        return list(self.get(f"/reconciliations/{name}/changes")["changes"])

    def because(self, name: str) -> set[tuple[str, str]]:
        """Kind and subject of everything that a revision's changes come from."""
        return {(cause["kind"], cause["subject"]) for one in self.changes(name) for cause in one["because"]}

    def words(self, name: str) -> list[str]:
        """A revision's changes as sentences."""
        return list(self.get(f"/reconciliations/{name}/changes")["words"])

    def inventory(self, at: str, **query: object) -> Told:
        """Every vessel's inventory at an instant; ``as_of`` by what was known then."""
        return self.get("/inventory", at=at, **query)

    def working(self, vessel: str, at: str, **query: object) -> Told:
        """One vessel's inventory with its steps and its budget."""
        return self.get(f"/vessels/{vessel}/working", at=at, **query)

    def change(self, vessel: str, from_: str, to: str, **query: object) -> Told:
        """Why a vessel's mass differs between two instants, by input."""
        return self.get(f"/vessels/{vessel}/change", from_=from_, to=to, **query)


def _query(query: Mapping[str, object]) -> dict[str, Any]:
    """Query parameters as they are spelt: no underscore behind ``from``, instants in full, lower-case truth."""
    spelt: dict[str, Any] = {}
    for name, value in query.items():
        if isinstance(value, bool):
            value = str(value).lower()
        elif isinstance(value, str) and name in ("at", "from_", "to", "as_of"):
            value = instant(value)
        spelt[name.rstrip("_")] = value
    return spelt


def _water(body: dict[str, Any]) -> dict[str, Any]:
    """``water=True`` in a sentence is ``"of": "water"`` on the ticket."""
    return {**body, "of": "water"} if body.pop("water", False) else body


@pytest.fixture(scope="session", params=["sqlite", "postgresql"])
def days_client(request: pytest.FixtureRequest) -> Iterator[TestClient]:
    """A client of a service on each database in turn, made by its migrations."""
    url = str(request.getfixturevalue(f"{request.param}_url"))
    with TestClient(create_app(Settings(database_url=url)), base_url="http://localhost") as client:
        yield client


@pytest.fixture
def new_site(days_client: TestClient) -> NewSite:
    """Makes a site that nobody knows yet; what is said goes into its definition."""

    def make(**body: Any) -> Site:
        site = Site(days_client, f"site-{uuid.uuid4().hex[:16]}")
        assert site.define(**body) == "created"
        return site

    return make


@pytest.fixture
def site(new_site: NewSite) -> Site:
    """A site in UTC whose days start at 06:00."""
    return new_site()
