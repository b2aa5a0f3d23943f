"""A running service, a clock that the test sets, and a site of its own for every test.

SQLite always; PostgreSQL too where ``BRIMBOOK_API_POSTGRESQL`` is set. Masses are checked by hand: a box
of 10 m by 5 m whose wall does not expand, holding a liquid of 1000 kg/m³ that does not either, holds
50 000 kg for every metre of level.
"""

from __future__ import annotations

import os
from collections.abc import Iterator
from datetime import datetime, timedelta
from typing import Any

import httpx2
import pytest
from fastapi.testclient import TestClient

from app.clock import Clock
from app.main import create_app
from app.settings import Settings

DATABASES = ["sqlite", *(["postgresql"] if os.environ.get("BRIMBOOK_API_POSTGRESQL") else [])]
NOON = "2026-06-01T12:00:00Z"
LIQUID = {
    "model": "expansivity", "density_kg_m3": 1000.0, "density_uncertainty_kg_m3": 1.0, "at_temperature_c": 15.0,
    "expansivity_per_k": 0.0,
}  # fmt: skip
BOX = {"kind": "box", "length_m": 10.0, "width_m": 5.0, "height_m": 4.0}
EXACT = {
    "level_m": {"random": 0.003, "systematic": 0.004},
    "capacity_pct": {"systematic": 0.0, "local": 0.0},
    "liquid_temperature_c": {"random": 0.0, "systematic": 0.0},
    "ambient_temperature_c": {"random": 0.0, "systematic": 0.0},
}
VESSEL = {
    "name": "a box", "substance": "liquid", "shape": BOX, "shell": {"expansion_per_k": 0.0}, "instruments": EXACT,
}  # fmt: skip


class SetClock(Clock):
    """A clock that shows what a test sets."""

    def __init__(self) -> None:
        self.set(NOON)

    def set(self, text: str) -> None:
        """Show this instant."""
        self._now = (datetime.fromisoformat(text) - datetime.fromisoformat("1970-01-01T00:00:00Z")) // timedelta(
            microseconds=1
        )

    def now(self) -> int:
        return self._now


class Site:
    """One site of the service: its paths below ``/v1/sites/{site}``, and the bodies that most tests start from."""

    def __init__(self, client: TestClient, clock: SetClock, name: str) -> None:
        self.client, self.clock, self.name = client, clock, name
        self.path = f"/v1/sites/{name}"

    def ask(self, method: str, path: str = "", *, status: int | None = None, **rest: Any) -> httpx2.Response:
        """A request, and its answer; its status where one is expected."""
        answer = self.client.request(method, f"{self.path}{path}", **rest)
        if status is not None:
            assert answer.status_code == status, answer.text
        return answer

    def put(self, path: str, body: Any, *, status: int | None = None) -> dict[str, Any]:
        """The answer to a PUT, whose status is 200 or 201 unless another is expected."""
        answer = self.ask("PUT", path, json=body)
        assert answer.status_code in ((200, 201) if status is None else (status,)), answer.text
        found: dict[str, Any] = answer.json()
        return found

    def get(self, path: str, *, status: int = 200, **query: Any) -> Any:
        """The answer to a GET; a trailing underscore frees a name that Python keeps for itself."""
        params = {name.removesuffix("_"): value for name, value in query.items() if value is not None}
        return self.ask("GET", path, params=params, status=status).json()

    def post(self, path: str, body: Any, *, status: int = 200) -> Any:
        """The answer to a POST."""
        return self.ask("POST", path, json=body, status=status).json()

    def define(self, **changes: Any) -> None:
        """Define the site; UTC, days from midnight, at sea level."""
        self.put("", {"name": "a place", "time_zone": "UTC", "day_starts_at": "00:00", "elevation_m": 0.0} | changes)

    def substance(self, name: str = "liquid", /, **changes: Any) -> None:
        """Define the liquid of 1000 kg/m³."""
        self.put(f"/substances/{name}", {"name": name, "liquid": LIQUID} | changes)

    def vessel(self, name: str = "tk-1", /, **changes: Any) -> dict[str, Any]:
        """Define a box that holds 50 000 kg for every metre of level."""
        return self.put(f"/vessels/{name}", VESSEL | changes)

    def read(self, taken_at: str, level_m: float, *, vessel: str = "tk-1", **more: Any) -> dict[str, Any]:
        """Post a level and a temperature of 15 °C."""
        row = {"vessel": vessel, "taken_at": taken_at, "level_m": level_m, "liquid_temperature_c": 15.0} | more
        answer: dict[str, Any] = self.post("/readings", {"readings": [row]})
        assert answer["rejected"] == 0, answer
        return answer

    def move(self, name: str, source: str, target: str, /, **more: Any) -> dict[str, Any]:
        """Put a ticket; by statement, with a standard uncertainty of 10 kg unless said otherwise."""
        body: dict[str, Any] = {"from": source, "to": target, "by": "statement"} | more
        if body["by"] == "statement" and not body.get("unmetered"):
            body.setdefault("mass_uncertainty_kg", 10.0)
        return self.put(f"/transfers/{name}", body)

    def close(self, day: str, *, status: int = 201, **query: Any) -> Any:
        """Close a day."""
        return self.ask("POST", "/reconciliations", json={"day": day}, params=query, status=status).json()


@pytest.fixture(scope="session", params=DATABASES)
def service(request: pytest.FixtureRequest) -> Iterator[tuple[TestClient, SetClock]]:
    """The service, running on each database in turn, and its clock."""
    url = request.getfixturevalue(f"{request.param}_url")
    clock = SetClock()
    with TestClient(create_app(Settings(database_url=url), clock), base_url="http://localhost") as client:
        yield client, clock


@pytest.fixture
def client(service: tuple[TestClient, SetClock]) -> TestClient:
    """A client of the running service."""
    return service[0]


@pytest.fixture
def clock(service: tuple[TestClient, SetClock]) -> SetClock:
    """The service's clock, at noon of the first of June 2026 until the test sets it."""
    service[1].set(NOON)
    return service[1]


@pytest.fixture
def place(client: TestClient, clock: SetClock, site_id: str) -> Site:
    """A site that is not defined yet."""
    return Site(client, clock, site_id)


@pytest.fixture
def site(place: Site) -> Site:
    """A site with one box, ``tk-1``, of a liquid of 1000 kg/m³; nothing was read."""
    place.define()
    place.substance()
    place.vessel()
    return place
