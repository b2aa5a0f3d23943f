"""What the instruments and the clerks made of the truth: readings, samples, tickets, with their errors.

Errors are drawn from what the definitions declare: one offset for an instrument and as long as it stands
(the same wherever it is used), a fresh error at every reading. Nothing is larger than declared but the
three faults that are planted here.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from demo_data.physics import Floats
from demo_data.schedule import Movement, instant, local_text
from demo_data.terminal import LIQUIDS, METERS
from demo_data.truth import Vessel, Weather, stream

BIASED_TANK, BIAS_M, BIAS_FROM_S = "tk-21", 0.018, instant(10, "02:20")
TWICE_ENTERED = "road-k-0324-2"
DIGITS = {
    "level_m": 4,
    "liquid_temperature_c": 2,
    "pressure_kpa": 2,
    "vapour_temperature_c": 2,
    "free_water_level_m": 3,
}
HAND_DIGITS = {**DIGITS, "level_m": 3, "liquid_temperature_c": 1}
TRUE_NAMES = {
    "level_m": "level_m",
    "liquid_temperature_c": "liquid_c",
    "pressure_kpa": "gauge_kpa",
    "vapour_temperature_c": "vapour_c",
    "free_water_level_m": "water_m",
}
BEGINS_S, ENDS_S = instant(0, "17:00"), instant(32, "06:10")


@dataclass(frozen=True)
class Series:
    """Readings of one source on one vessel: instants and columns, rounded as they are written."""

    vessel: str
    source: str
    at_s: Floats
    columns: Mapping[str, Floats]


@dataclass(frozen=True)
class Sample:
    """One analysis of the laboratory."""

    id: str
    vessel: str
    taken_s: int
    holds_from_s: int
    density: float


@dataclass(frozen=True)
class Book:
    """Everything that was written down in the month."""

    series: tuple[Series, ...]
    samples: tuple[Sample, ...]
    site: Series
    tickets: tuple[dict[str, Any], ...]


def declared(vessel: Vessel, quantity: str, source: str) -> Mapping[str, Any]:
    """Uncertainties of a quantity as the vessel's body declares them for a source."""
    body = vessel.plan.body
    own: dict[str, Any] = next((one.get("instruments", {}) for one in body["sources"] if one["source"] == source), {})
    found: Mapping[str, Any] = own.get(quantity, body["instruments"][quantity])
    return found


def read(vessel: Vessel, source: str, at_s: Floats, quantities: Sequence[str], seed: int) -> Series:
    """Readings of some quantities, each with the offset of its instrument and an error of its own."""
    true, columns = vessel.conditions(at_s), {}
    for quantity in quantities:
        said = declared(vessel, quantity, source)
        name = said.get("instrument", f"{vessel.id} {source} {quantity}")
        offset = said["systematic"] * stream(seed, f"offset {name}").standard_normal()
        fresh = said["random"] * stream(seed, f"{vessel.id} {source} {quantity}").standard_normal(len(at_s))
        shown = getattr(true, TRUE_NAMES[quantity]) + offset + fresh
        if (vessel.id, source, quantity) == (BIASED_TANK, "radar", "level_m"):
            shown = shown + np.where(at_s >= BIAS_FROM_S, BIAS_M, 0.0)
        columns[quantity] = np.round(shown, (HAND_DIGITS if source == "hand" else DIGITS)[quantity])
    return Series(vessel.id, source, at_s, columns)


def dips() -> Floats:
    """When tanks are dipped: before the close and after the day's work."""
    days = range(1, 33)
    return np.asarray(
        sorted([instant(d - 1, "18:10") for d in days] + [instant(d, "05:50") for d in days]), dtype=float
    )


def readings_of(vessel: Vessel, seed: int) -> list[Series]:
    """All series of one vessel."""
    plan, found = vessel.plan, []
    liquid = vessel.liquid is not None
    if plan.every_s:
        at_s = np.arange(BEGINS_S, ENDS_S + 1, plan.every_s, dtype=float)
        wanted = ["level_m", "liquid_temperature_c"] if liquid else []
        wanted += ["pressure_kpa", "vapour_temperature_c"] if plan.gas else []
        found.append(read(vessel, plan.winner, at_s, wanted, seed))
    if not plan.gas:
        dipped = ["level_m"] if plan.every_s else ["level_m", "liquid_temperature_c"]
        found.append(read(vessel, "hand", dips(), dipped, seed))
    if plan.water_m:
        at_s = np.asarray([instant(0, "18:15"), instant(15, "18:15")], dtype=float)
        found.append(read(vessel, "hand", at_s, ["free_water_level_m"], seed))
    return found


def samples_of(vessel: Vessel, seed: int) -> list[Sample]:
    """The laboratory's densities: one before the month, one an hour after each receipt that is known."""
    if vessel.plan.gas:
        return []
    said = vessel.plan.body["instruments"]
    density, bath = said["observed_density_kg_m3"], said["observed_density_temperature_c"]
    offset = density["systematic"] * stream(seed, f"offset {density['instrument']}").standard_normal()
    warmer = bath["systematic"] * stream(seed, f"bath {bath['instrument']}").standard_normal()
    rng = stream(seed, f"{vessel.id} samples")
    instants = [(instant(0, "16:00"), instant(0, "16:00"))]
    instants += [(r.movement.end_s + 3600, r.movement.end_s) for r in vessel.receipts if r.movement.recorded]
    found = []
    for number, (taken, holds_from) in enumerate(instants):
        true = float(vessel.density_15(np.asarray([float(taken)]))[0])
        shown = true * (1.0 - LIQUIDS[vessel.plan.substance][2].beta_per_k * warmer) + offset
        shown += density["random"] * rng.standard_normal()
        found.append(Sample(f"{vessel.id}-s{number:02d}", vessel.id, taken, holds_from, round(shown, 2)))
    return found


def site_readings(weather: Weather, seed: int) -> Series:
    """Air temperature from one screen, and the barometer, every hour."""
    at_s, rng = np.arange(BEGINS_S, ENDS_S + 1, 3600, dtype=float), stream(seed, "site")
    screen = rng.standard_normal()
    ambient = weather.ambient_c(at_s) + screen + 0.2 * rng.standard_normal(len(at_s))
    barometer = weather.barometer_kpa(at_s) + 0.1 * rng.standard_normal(len(at_s))
    columns = {
        "ambient_temperature_c": np.round(ambient, 1),
        "barometric_pressure_kpa_abs": np.round(barometer, 2),
    }
    return Series("", "weather station", at_s, columns)


def ticket(one: Movement, found: Mapping[str, Vessel], seed: int) -> dict[str, Any]:
    """The ticket of a movement, as a client would put it, with its id."""
    rng = stream(seed, f"ticket {one.id}")
    written: dict[str, Any] = {"id": one.id, "from": one.source, "to": one.target, "by": one.by}
    quantity, noise = one.mass_kg, rng.standard_normal()
    if one.meter:
        written["meter"] = one.meter
        _, random, systematic = METERS[one.meter]
        quantity *= 1.0 + 0.01 * (random * noise + systematic * stream(seed, f"offset {one.meter}").standard_normal())
    written |= {"started_at": local_text(one.start_s), "ended_at": local_text(one.end_s)}
    if one.form == "unmetered":
        return written | {"unmetered": True}
    if one.form == "mass":
        if not one.meter:
            quantity += one.mass_uncertainty_kg * noise
            written["mass_uncertainty_kg"] = one.mass_uncertainty_kg
        small = found[one.source if one.source in found else one.target].liquid is None
        return written | {"mass_kg": round(quantity, 2 if small else 0)}
    carrier = found.get(one.source)
    cargo = next((r.density_cargo for v in found.values() for r in v.receipts if r.movement is one), 0.0)
    true = float(carrier.density_15(np.asarray([float(one.start_s)]))[0]) if carrier else cargo
    written |= {
        "standard_volume_m3": round(quantity / true, 3),
        "density_kg_m3": round(true + 0.05 * rng.standard_normal(), 2),
        "density_temperature_c": 15.0,
    }
    if one.progress_s:
        part = float(one.share(float(one.progress_s))) * quantity / true
        written["progress"] = [{"at": local_text(one.progress_s), "standard_volume_m3": round(part, 3)}]
    return written


def book(found: Mapping[str, Vessel], moved: Sequence[Movement], seed: int) -> Book:
    """All that was written down; the unrecorded movement has no ticket, and one ticket came in twice."""
    series, samples = [], []
    for vessel in found.values():
        series += readings_of(vessel, seed)
        samples += samples_of(vessel, seed)
    tickets = []
    for one in moved:
        if not one.recorded:
            continue
        tickets.append(ticket(one, found, seed))
        if one.id == TWICE_ENTERED:
            tickets.append({**tickets[-1], "id": f"{one.id}b"})
    weather = next(iter(found.values())).weather
    return Book(tuple(series), tuple(samples), site_readings(weather, seed), tuple(tickets))
