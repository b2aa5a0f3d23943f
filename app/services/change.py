"""Why the mass differs between two instants: one input replaced after another, and what tickets moved."""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Any

import numpy as np
from sqlalchemy import Connection

from app.errors import Conflict, Unprocessable
from app.services import move
from app.services.carry import vapours
from app.services.compile import Analysed, CompiledVessel, all_of, stack
from app.services.compositions import Boiling, virial_columns
from app.services.explain import mass_estimate
from app.services.find import site_number, watermark
from app.services.in_force import meters_in_force
from app.services.measure import Measured, standard_density
from app.services.parts import at_row
from app.services.take_stock import Stock, stock_at
from app.store import transfers
from app.store.engine import Store
from models.columns import State
from models.liquid.definition import Liquid, MixtureLiquid
from models.mass import inventory

KELVIN, KPA = 273.15, 1000.0
# The chain's order: what each step replaces, and how its value is shown.
STEPS: tuple[tuple[str, tuple[str, ...], str, float, float], ...] = (
    ("level_m", ("level",), "m", 1.0, 0.0),
    ("free_water_level_m", ("water_level",), "m", 1.0, 0.0),
    ("liquid_temperature_c", ("liquid_temperature",), "°C", 1.0, -KELVIN),
    (
        "observed_density_kg_m3",
        ("density", "density_temperature", "density_pressure", "density_is_dry"),
        "kg/m³",
        1.0,
        0.0,
    ),
    ("sediment_water_pct", ("sediment_water",), "%", 100.0, 0.0),
    ("pressure_kpa_abs", ("pressure",), "kPa", 1.0 / KPA, 0.0),
    ("vapour_temperature_c", ("vapour_temperature",), "°C", 1.0, -KELVIN),
    ("ambient_temperature_c", ("ambient_temperature",), "°C", 1.0, -KELVIN),
    ("barometric_pressure_kpa_abs", ("atmosphere",), "kPa", 1.0 / KPA, 0.0),
    ("roof_load_kg", ("roof_load",), "kg", 1.0, 0.0),
)


def change(store: Store, site: str, vessel: str, first: int, last: int, as_of: int | None) -> dict[str, Any]:
    """The difference of two masses by input, beside what tickets moved in between."""
    if last <= first:
        raise Unprocessable("to is after from", code="impossible")
    with store.reading() as connection:
        site_id = site_number(connection, site)
        known = watermark(connection, site_id, as_of)
        stocks = [stock_at(connection, site_id, site, at, known, only=vessel) for at in (first, last)]
        before, after = (_measured(stock, vessel) for stock in stocks)
        moved = _moved(connection, site_id, stocks[1], after, vessel, (first, last), known)
    was, now = _mass(before), _mass(after)
    steps = _steps(before, after)
    difference = now - was
    carried = _carried(after) - _carried(before)
    if carried:
        steps.append(
            {
                "input": "moved_kg",
                "unit": "kg",
                "before": _carried(before),
                "after": _carried(after),
                "contribution_kg": carried,
            }
        )
    ticketed = math.fsum(one["mass_kg"] for one in moved if one["mass_kg"] is not None)
    return {
        "vessel": vessel, "from": first, "to": last, "known_at": known, "mass_before_kg": was, "mass_after_kg": now,
        "difference_kg": difference, "steps": steps, "transfers": moved, "unexplained_kg": difference - ticketed,
    }  # fmt: skip


def _measured(stock: Stock, vessel: str) -> Measured:
    if stock.measured is None:
        raise Conflict("The vessel is out of service, or a junction, at one of the two instants", code="unmeasured")
    if mass_estimate(stock.measured, 0) is None:
        raise Conflict("The vessel has no measured mass at one of the two instants", code="unmeasured")
    return stock.measured


def _mass(measured: Measured) -> float:
    mass = mass_estimate(measured, 0)
    assert mass is not None
    return mass.value


def _read(measured: Measured) -> float:
    """The mass at the reading, before anything was carried."""
    stated = measured.carried[0].stated
    return float(measured.result["mass"][0]) if stated is None else stated.value


def _carried(measured: Measured) -> float:
    return measured.carried[0].moved.value


def _steps(before: Measured, after: Measured) -> list[dict[str, Any]]:
    """Masses of the chain with one input after another taken from the later instant.

    Of a vessel that was found empty or was weighed nothing but that is known. Where one input without the next
    makes a state that cannot be (an old level of water above a new one of the liquid), both are told together.
    """
    if before.carried[0].stated is not None or after.carried[0].stated is not None:
        return [_step("mass_kg", "kg", _read(before), _read(after), _read(after) - _read(before))]
    old = before.vessel(0)
    state = before.state
    mass = _read(before)
    steps: list[dict[str, Any]] = []
    for name, fields, unit, scale, shift in STEPS:
        taken = replace(
            state, **{one: getattr(after.state, one) for one in fields if getattr(after.state, one) is not None}
        )
        now = _compute(old, before, taken)
        seen = (_shown(state, fields[0], scale, shift), _shown(taken, fields[0], scale, shift))
        state = taken
        if not math.isfinite(now):
            steps.append(_step(name, unit, *seen, None))
        elif now != mass or seen[0] != seen[1]:
            steps.append(_step(name, unit, *seen, now - mass))
            mass = now
    if _liquids(before) != _liquids(after):
        now = _compute(old, after, state, vapour_of=before)
        contribution = now - mass if math.isfinite(now) else None
        steps.append(_step("liquid_composition", "", None, None, contribution))
        mass = now if math.isfinite(now) else mass
    if _has_vapour(before) and _has_vapour(after) and before.mixture(0) != after.mixture(0):
        now = _compute(old, after, state)
        contribution = now - mass if math.isfinite(now) else None
        steps.append(_step("vapour_composition", "g/mol", _molar_mass(before), _molar_mass(after), contribution))
        mass = now if math.isfinite(now) else mass
    final = _read(after)
    if final != mass:
        steps.append(_step("definition", "", None, None, final - mass))
    return steps


def _liquids(measured: Measured) -> tuple[Liquid | None, Boiling | None]:
    """The liquid's composition, once as a density and once as a vapour pressure."""
    liquid = measured.vessel(0).liquid
    return measured.liquid(0) if isinstance(liquid, MixtureLiquid) else None, measured.boiling(0)


def _has_vapour(measured: Measured) -> bool:
    return measured.vessel(0).mixture is not None


def _step(
    name: str, unit: str, before: float | None, after: float | None, contribution: float | None
) -> dict[str, Any]:
    return {"input": name, "unit": unit, "before": before, "after": after, "contribution_kg": contribution}


def _molar_mass(measured: Measured) -> float:
    return float(virial_columns((measured.mixture(0),)).molar_mass[0]) * 1e3


def _compute(
    vessel: CompiledVessel, measured: Measured, state: State, vapour_of: Measured | None = None
) -> float:
    """The chain's mass of one vessel in a state, with the compositions of a measured row."""
    boiling = measured.boiling(0) if vessel.boiling is not None else None
    extra = Analysed(
        ((vapour_of or measured).mixture(0),) if vessel.mixture is not None else (),
        (measured.liquid(0),) if isinstance(vessel.liquid, MixtureLiquid) else (),
        () if boiling is None else (boiling,),
    )
    held = all_of((vessel,), extra)
    rows: dict[str, Any] = {
        name: np.array([columns.index(one[0])], dtype=np.intp) if one else None
        for name, one, columns in (
            ("vapour_row", extra.mixtures, held.mixtures), ("liquid_row", extra.liquids, held.liquids),
            ("saturation_row", extra.boiling, held.boiling),
        )
    }  # fmt: skip
    columns = stack((vessel,), extra)
    return float(inventory(columns, None, replace(state, **rows))["mass"][0])


def _shown(state: State, name: str, scale: float, shift: float) -> float | None:
    column = getattr(state, name)
    value = at_row(column, 0) if column is not None else 0.0
    return round(value * scale + shift, 10) if math.isfinite(value) else None


def _moved(
    connection: Connection,
    site_id: int,
    stock: Stock,
    after: Measured,
    vessel: str,
    period: tuple[int, int],
    known: int,
) -> list[dict[str, Any]]:
    """What each ticket moved into or out of the vessel between the instants; null where nobody measured."""
    meters = meters_in_force(connection, site_id, period[1], known)
    held = {one.name: one for one in stock.site.vessels}
    standard = {vessel: standard_density(after, 0)}
    rows = []
    for ticket in transfers.touching(connection, site_id, {vessel: period[0]}, period[1], known):
        one = move.moved(ticket, *period, held, meters, standard, vapours(after))
        if not one.water:
            sign = 1.0 if one.target == vessel else -1.0
            rows.append({"transfer": one.name, "mass_kg": None if one.mass is None else sign * one.mass.value})
    return rows
