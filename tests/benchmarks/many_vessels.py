"""A site of many vessels of mixed shapes: its definitions by the services, a long history straight into the tables."""

from __future__ import annotations

import math
from collections.abc import Iterator
from datetime import UTC, datetime
from itertools import islice
from typing import Any

from app.clock import Clock
from app.schemas.batch import RowError
from app.schemas.meter import Meter
from app.schemas.reading import Reading
from app.schemas.site import Site
from app.schemas.substance import Substance
from app.schemas.transfer import NamedTransfer
from app.schemas.types import canonical
from app.schemas.vessel import Vessel
from app.services import define, ingest, move
from app.store import definitions, readings
from app.store.engine import Store, Writing
from app.store.months import make_months

SECOND = 1_000_000
STEP = 300 * SECOND  # between two readings of a vessel
CLOSING = int(datetime(2026, 6, 15, tzinfo=UTC).timestamp()) * SECOND
DAY = 86_400 * SECOND
VALUES = 4  # of each reading

SITE = {"name": "many", "time_zone": "UTC", "day_starts_at": "00:00", "elevation_m": 12.0}
SHELL = {"expansion_per_k": 1.12e-5}
OIL = {
    "model": "expansivity", "density_kg_m3": 840.0, "density_uncertainty_kg_m3": 3.0, "at_temperature_c": 15.0,
    "expansivity_per_k": 0.00085, "compressibility_per_kpa": 7.7e-7,
}  # fmt: skip
PROPANE = OIL | {"density_kg_m3": 507.5, "at_pressure_kpa_abs": 731.5, "expansivity_per_k": [0.003, 2.8e-5]}
SUBSTANCES: dict[str, dict[str, Any]] = {
    "oil": {"name": "oil", "liquid": OIL},
    "propane": {"name": "propane", "liquid": PROPANE,
                "vapour": {"model": "virial", "components": [{"id": "propane", "mole_fraction": 1.0}]}},
    "nitrogen": {"name": "nitrogen",
                 "vapour": {"model": "virial", "components": [{"id": "nitrogen", "mole_fraction": 1.0}]}},
}  # fmt: skip
ROOF = {"mass_kg": 88000.0, "lands_at_m": 1.6, "floats_at_m": 1.9, "gauge_sees": "liquid"}
TABLE = [[0.05 * row, 22.6195 * row + 1.5 * math.sin(row)] for row in range(241)]
TABLE[0][1] = 0.0
HEAD = {"kind": "ellipsoidal", "depth_m": 0.75}
SHAPES: tuple[dict[str, Any], ...] = (
    {"substance": "oil", "vapour_space": {"kind": "open"},
     "shape": {"kind": "vertical_cylinder", "diameter_m": 30.0, "height_m": 14.0}},
    {"substance": "oil", "shape": {"kind": "vertical_cylinder", "diameter_m": 24.0, "height_m": 14.0},
     "floating_roof": ROOF},
    {"substance": "oil",
     "shape": {"kind": "capacity_table", "of": "vertical_cylinder", "diameter_m": 24.0, "rows": TABLE}},
    {"substance": "propane", "shape": {"kind": "horizontal_cylinder", "diameter_m": 6.0, "length_m": 20.0,
                                       "left_head": HEAD, "right_head": HEAD}},
    {"substance": "propane", "shape": {"kind": "sphere", "diameter_m": 14.0}},
    {"substance": "oil", "shape": {"kind": "box", "length_m": 6.0, "width_m": 3.0, "height_m": 5.0}},
    {"substance": "nitrogen", "shape": {"kind": "fixed_volume", "volume_m3": 50.0}},
)  # fmt: skip


class AfterAll(Clock):
    """A clock that stands, after everything that is read here."""

    def now(self) -> int:
        return CLOSING + 10 * DAY


def name_of(number: int) -> str:
    return f"v{number:05}"


def body(number: int) -> dict[str, Any]:
    """One vessel's definition; each shape in turn, no two of one size."""
    kind = dict(SHAPES[number % len(SHAPES)])
    size = 1.0 + 1e-5 * number
    shape = dict(kind["shape"])
    for length in ("diameter_m", "length_m", "volume_m3"):
        if length in shape:
            shape[length] *= size
    return {"name": name_of(number), "shell": SHELL} | kind | {"shape": shape}


def values(number: int, step: int = 0) -> dict[str, float]:
    """Four values of a reading; they wander with the steps."""
    wander = math.sin(0.1 * step + number)
    if SHAPES[number % len(SHAPES)]["substance"] == "nitrogen":
        return {
            "pressure_kpa": 900.0 + wander,
            "vapour_temperature_c": 18.0 + wander,
            "ambient_temperature_c": 12.0 + wander,
            "liquid_temperature_c": 18.0 + wander,
        }
    propane = SHAPES[number % len(SHAPES)]["substance"] == "propane"
    return {
        "level_m": 3.0 + 0.5 * wander,
        "liquid_temperature_c": 15.0 + wander,
        "ambient_temperature_c": 12.0 + wander,
        "pressure_kpa": 640.0 + 5.0 * wander if propane else 0.2 * wander,
    }


def define_all(writing: Writing, vessels: int) -> None:
    """Everything that has a text, in one transaction."""
    for name, said in SUBSTANCES.items():
        definitions.put(writing, "substance", name, None, canonical(Substance.model_validate(said)))
    for number in range(vessels):
        text = canonical(Vessel.model_validate(body(number)))
        definitions.put(writing, "vessel", name_of(number), None, text)
    for number in range(20):
        meter = Meter.model_validate({"name": f"meter {number}", "random_pct": 0.1, "systematic_pct": 0.1})
        definitions.put(writing, "meter", f"m{number}", None, canonical(meter))


def batch(vessels: int, at: int, step: int = 0) -> list[tuple[int, Reading]]:
    """One reading of each vessel."""
    return [
        (number, Reading.model_validate({"vessel": name_of(number), "taken_at": at_text(at), "source": "gauge"}
                                        | values(number, step)))
        for number in range(vessels)
    ]  # fmt: skip


def at_text(at: int) -> str:
    return datetime.fromtimestamp(at / SECOND, UTC).isoformat()


def post(store: Store, site: str, rows: list[tuple[int, Reading]]) -> None:
    errors: list[RowError] = []
    ingest.ingest(store, AfterAll(), site, rows, errors)
    assert not errors, errors[0]


def make(store: Store, site: str, vessels: int, history: int) -> None:
    """A site whose vessels were read at the close, and ``history`` times before and after it."""
    define.put_site(store, site, Site.model_validate(SITE))
    with store.writing(site) as writing:
        define_all(writing, vessels)
    post(store, site, batch(vessels, CLOSING))
    samples = [
        (number, {"vessel": name_of(number), "taken_at": at_text(CLOSING - 3 * DAY), "source": "lab",
                  "observed_density_kg_m3": 841.0, "observed_density_temperature_c": 15.0, "sample": f"s{number}"})
        for number in range(vessels) if SHAPES[number % len(SHAPES)]["substance"] == "oil"
    ]  # fmt: skip
    post(store, site, [(row, Reading.model_validate(sample)) for row, sample in samples])
    fill(store, site, history)


def fill(store: Store, site: str, history: int) -> None:
    """Each series' values around the one at the close, in the order of the key, past the service."""
    with store.writing(site) as writing:
        series = sorted(
            (one.series_id, int(one.vessel[1:]), one.quantity)
            for one in readings.series_of(writing.connection, writing.site_id)
            if one.source == "gauge"
        )
        steps = [step for step in range(-history // 2, history - history // 2) if step]
        make_months(store, (CLOSING + step * STEP for step in steps[:: 12 * 24]))
        make_months(store, (CLOSING + steps[0] * STEP, CLOSING + steps[-1] * STEP) if steps else ())
        site_id, recorded_at = writing.site_id, writing.recorded_at

        def rows() -> Iterator[tuple[Any, ...]]:
            for number, vessel, quantity in series:
                about = values(vessel)[quantity]
                for step in steps:
                    value = about * (1.0 + 1e-4 * (step & 15))
                    yield site_id, number, CLOSING + step * STEP, 1, recorded_at, value, None, 0

        insert(writing, rows())


COLUMNS = "site_id, series_id, taken_at, revision, recorded_at, value, cited_id, quality"


def insert(writing: Writing, rows: Iterator[tuple[Any, ...]]) -> None:
    """Rows straight into the table of readings, by what each database is fastest with."""
    driver = writing.connection.connection.driver_connection
    assert driver is not None
    if writing.store.dialect == "sqlite":
        driver.executemany(f"INSERT INTO reading ({COLUMNS}) VALUES (?, ?, ?, ?, ?, ?, ?, ?)", rows)
        return
    with driver.cursor() as cursor, cursor.copy(f"COPY reading ({COLUMNS}) FROM STDIN") as copy:
        while some := list(islice(rows, 10_000)):
            copy.write("".join("\t".join(map(repr, row)).replace("None", "\\N") + "\n" for row in some))


def move_all(store: Store, site: str, vessels: int, by: str = "mass_kg") -> int:
    """Three tickets a vessel on the day before the close, to vessels near by; how many.

    Those of a gas are in mass, whatever the others are in.
    """
    tickets = []
    for number in range(3 * vessels):
        source = number % vessels
        target = source + 7 * (1 + number // vessels)
        started = CLOSING - DAY + (number % 20) * 3600 * SECOND
        gas = SHAPES[source % len(SHAPES)]["substance"] == "nitrogen"
        tickets.append(NamedTransfer.model_validate({
            "id": f"t{number}", "from": name_of(source), "to": name_of(target) if target < vessels else "boundary:out",
            "by": "meter", "meter": f"m{number % 20}", "started_at": at_text(started),
            "ended_at": at_text(started + 3600 * SECOND), "mass_kg" if gas else by: 0.5,
        }))  # fmt: skip
    _, errors, _ = move.put_many(store, site, list(enumerate(tickets)), [])
    assert not errors, errors[0]
    return len(tickets)
