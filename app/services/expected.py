"""The chain read backwards: what the instruments of a vessel should show for a mass that is known."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from numpy.typing import NDArray

from app.errors import FieldError, Unprocessable
from app.schemas.calculation import CalculationReading
from app.schemas.expected import ExpectedReadingCalculation
from app.services import define
from app.services.calculate import collected
from app.services.compile import CompiledVessel, compile_bodies, stack
from app.services.compositions import saturation_columns, what_boils
from app.services.measure import Measured, States, choices, measure
from app.services.parts import at_row, celsius_of, estimate
from app.services.reasons import reason, warnings
from app.services.warmed import as_shown, correction, temperatures
from models import constants, units
from models.columns import State, Vessels
from models.expected import Expected, full_temperature, level_of_mass, pressure_of_mass, temperature_of_mass

CAUTION = (
    "liquid_full_temperature_c is no filling limit: how far a vessel may be filled is set by the codes that apply at "
    "the site and by licensed practice. It is as good as the liquid's method so far from its sample: an expansivity "
    "that holds near the sample alone tells it too high"
)
GIVEN = tuple(name for name in ExpectedReadingCalculation.model_fields if name in CalculationReading.model_fields)
KPA = units.PASCAL_PER_KPA


def expect(request: ExpectedReadingCalculation) -> dict[str, Any]:
    """What the instruments should show, as ``ExpectedReading`` takes it."""
    define.check_components(request.substance, "/substance")
    vessel = define.check(
        lambda: compile_bodies("vessel", request.site, request.vessel, request.substance), "/vessel", "/substance"
    )
    _holds_something(vessel)
    known = CalculationReading.model_validate({name: getattr(request, name) for name in GIVEN})
    sought = _sought(vessel, known)
    read = collected(vessel, (known,))
    state, extra = States(read, choices(read)).build()
    compiled = stack(read.vessels, extra)
    _needs_pressure(vessel, state)
    boiling = _boiling(vessel, compiled, state, known)
    if boiling is not None:
        known = known.model_copy(update={"pressure_kpa_abs": boiling})
        state, _ = States(read := collected(vessel, (known,)), choices(read)).build()
    full = _full(vessel, compiled, state, request)
    found, why = _find(vessel, compiled, state, known, sought, request.mass_kg)
    if why is not None:
        return {"reason": why, "warnings": [], **full}
    return {**_shown(vessel, known, found), "warnings": warnings(found, 0), **full}


# --- what is asked for ----------------------------------------------------------------------------


def _holds_something(vessel: CompiledVessel) -> None:
    """Refuse vessels whose mass no instrument tells: a junction, and a line that is kept full."""
    if vessel.has_vapour or (vessel.has_liquid and not vessel.is_full):
        return
    detail = "A line kept full of liquid, or a junction, has no level and no gas: no instrument tells its mass"
    raise _refused("/vessel/shape/kind", "no_level", detail)


def _sought(vessel: CompiledVessel, known: CalculationReading) -> str:
    """Which reading is to be found; refused where too little is known for it, or too much."""
    if vessel.has_liquid:
        if known.liquid_temperature_c is None and vessel.assumed("liquid_temperature_c") is None:
            detail = "A mass of liquid says nothing of its level without liquid_temperature_c"
            raise _refused("/liquid_temperature_c", "missing", detail)
        return "level_m"
    pressure = "pressure_kpa" if known.pressure_kpa is not None else "pressure_kpa_abs"
    if known.vapour_temperature_c is not None and getattr(known, pressure) is not None:
        detail = "A mass of gas and its temperature give the pressure, or its pressure the temperature: leave one out"
        raise _refused(f"/{pressure}", "conflicting", detail)
    if getattr(known, pressure) is not None:
        return "vapour_temperature_c"
    if known.vapour_temperature_c is None and vessel.assumed("vapour_temperature_c") is None:
        detail = "A mass of gas needs vapour_temperature_c, and its pressure is answered; or its pressure"
        raise _refused("/vapour_temperature_c", "missing", detail)
    return "pressure_kpa"


def _needs_pressure(vessel: CompiledVessel, state: State) -> None:
    """Refuse a liquid whose pressure nothing tells: only beside its own vapour is that its vapour pressure."""
    boils = vessel.has_vapour and not vessel.is_blanketed
    if vessel.has_liquid and not boils and not math.isfinite(at_row(state.pressure, 0)):
        detail = "The pressure of this vapour space follows from nothing else: give pressure_kpa or pressure_kpa_abs"
        raise _refused("/pressure_kpa", "missing", detail)


def _boiling(vessel: CompiledVessel, compiled: Vessels, state: State, known: CalculationReading) -> float | None:
    """What the gauge shows of a product space whose own temperature is known and its pressure not. [kPa absolute]

    Without a pressure the chain knows a vapour only at its liquid's temperature.
    """
    alone = known.vapour_temperature_c is not None and not math.isfinite(at_row(state.pressure, 0))
    if not alone or not vessel.has_liquid or compiled.saturation is None:
        return None
    row = compiled.saturation_row if state.saturation_row is None else state.saturation_row
    pressure, _ = compiled.saturation.pressure(state.liquid_temperature[:1], row[:1])
    if not math.isfinite(pressure[0]):
        return None
    return _unread(vessel, known.source, "pressure_kpa_abs", float(pressure[0]) / KPA)


def _refused(pointer: str, code: str, detail: str) -> Unprocessable:
    return Unprocessable(detail, code=code, errors=[FieldError(pointer, code, detail)])


# --- what is found --------------------------------------------------------------------------------


def _find(
    vessel: CompiledVessel, compiled: Vessels, state: State, known: CalculationReading, sought: str, kilograms: float
) -> tuple[Measured, dict[str, str] | None]:  # fmt: skip
    """The inventory that has this mass; or the one nearest to it, and why there is none."""
    mass = np.array([kilograms])
    if sought == "level_m":
        found = level_of_mass(compiled, None, state, mass)
    elif sought == "pressure_kpa":
        found = pressure_of_mass(compiled, None, state, mass)
    else:
        found = temperature_of_mass(compiled, None, state, mass)
    none = math.isnan(found.value[0])
    value = float((found.nearest if none else found.value)[0])
    if not math.isfinite(value):
        value = 0.0
    reading = known.model_copy(update={sought: _reading(vessel, known.source, sought, value, state)})
    measured = measure(collected(vessel, (reading,)))
    why = _why_none(vessel, measured, found, sought, kilograms) if none else None
    if why is None and not math.isfinite(measured.result["mass"][0]):
        why = _on_its_legs(value)
    return measured, why


def _reading(vessel: CompiledVessel, source: str, quantity: str, value: float, state: State) -> float:
    """What an instrument shows for a value of the chain, in SI there; the last bit keeps a level inside."""
    if quantity == "vapour_temperature_c":
        return _unread(vessel, source, quantity, celsius_of(value))
    if quantity == "pressure_kpa":
        return _unread(vessel, source, quantity, (value - at_row(state.atmosphere, 0)) / KPA)
    at = temperatures(state, 0)
    shown = _unread(vessel, source, quantity, as_shown(vessel, quantity, source, value, at))
    assert vessel.curve is not None
    offset = vessel.instrument(quantity, source).offset

    def read(level: float) -> float:
        own = level + offset
        return own + sum(correction(vessel, quantity, source, own, at))

    while read(shown) > vessel.curve.top >= value:
        shown = math.nextafter(shown, -math.inf)
    while read(shown) < vessel.curve.bottom <= value:
        shown = math.nextafter(shown, math.inf)
    return shown


def _unread(vessel: CompiledVessel, source: str, quantity: str, value: float) -> float:
    """A value less the known error's correction that the chain will add."""
    return value - vessel.instrument(quantity, source).offset


def _why_none(
    vessel: CompiledVessel, measured: Measured, found: Expected, sought: str, kilograms: float
) -> dict[str, str]:
    """Why nothing has this mass: more or less than the vessel can hold, or a limit of a method."""
    least, most = float(found.least[0]), float(found.most[0])
    if math.isnan(least) or not math.isfinite(measured.result["mass"][0]):
        return reason(measured, 0)
    if sought != "level_m":
        if kilograms > least:
            return {"code": "outside_method", "detail": f"no {sought} has exactly {kilograms:.9g} kg by its method"}
        hottest = celsius_of(at_row(measured.state.vapour_temperature, 0))
        detail = (
            f"at {hottest:.5g} °C, the highest temperature of the virial coefficients, the vessel holds "
            f"{least:.9g} kg; for {kilograms:.9g} kg the gas would be hotter"
        )
        return {"code": "outside_method", "detail": detail}
    assert vessel.curve is not None
    code, at = "outside_table" if vessel.table else "outside_vessel", measured.state.liquid_temperature
    here = f"at {celsius_of(at_row(at, 0)):.5g} °C"
    if kilograms > most:
        detail = (
            f"more than full: {here} the vessel holds at most {most:.9g} kg, to its highest level of "
            f"{vessel.curve.top:.6g} m; {kilograms:.9g} kg are {kilograms - most:.6g} kg more"
        )
    else:
        detail = (
            f"below the bottom: {here} the vessel holds {least:.9g} kg with no liquid that a gauge could see, at "
            f"{float(measured.state.level[0]):.6g} m; {kilograms:.9g} kg are {least - kilograms:.6g} kg less"
        )
    return {"code": code, "detail": detail}


def _on_its_legs(level: float) -> dict[str, str]:
    """Why a gauge that rides on the roof shows nothing, though there is a level."""
    detail = (
        f"the liquid would stand at {level:.6g} m, below floats_at_m: the roof is on its legs, and the gauge that "
        "rides on it says nothing of the liquid"
    )
    return {"code": "roof_landing_zone", "detail": detail}


# --- what is shown --------------------------------------------------------------------------------


def _shown(vessel: CompiledVessel, known: CalculationReading, found: Measured) -> dict[str, Any]:
    """The readings that go with a mass, each as its instrument shows it."""
    result, state, source = found.result, found.state, known.source

    def column(name: str) -> float:
        return float(result[name][0])

    pressure = at_row(state.pressure, 0)
    pressure = pressure if math.isfinite(pressure) else column("vapour_pressure")
    shown: dict[str, Any] = {
        "pressure_kpa": _unread(vessel, source, "pressure_kpa", (pressure - at_row(state.atmosphere, 0)) / KPA),
        "pressure_kpa_abs": _unread(vessel, source, "pressure_kpa_abs", pressure / KPA),
        "vapour_temperature_c": known.vapour_temperature_c,
    }
    if known.vapour_temperature_c is None and vessel.has_vapour:
        warmth = column("vapour_temperature")
        if math.isfinite(warmth):
            warmth = celsius_of(warmth)
        shown["vapour_temperature_c"] = _unread(vessel, source, "vapour_temperature_c", warmth)
    for name, of in (("liquid_mass_kg", "liquid_mass"), ("vapour_mass_kg", "vapour_mass"), ("mass_kg", "mass")):
        shown[name] = column(of)
    if vessel.has_liquid:
        shown |= _of_the_liquid(vessel, found, source)
    return shown


def _of_the_liquid(vessel: CompiledVessel, found: Measured, source: str) -> dict[str, Any]:
    """What the means of a level show, and how well the level is known for the mass."""
    result, state = found.result, found.state
    level, water = at_row(state.level, 0), at_row(state.water_level, 0)
    density, tap = float(result["liquid_density"][0]), vessel.body.gauging.tap_m
    height, quantity = vessel.body.gauging.reference_height_m, "differential_pressure_kpa"
    head = constants.STANDARD_GRAVITY * density * (level - tap) / KPA
    ullage = as_shown(vessel, "ullage_m", source, level, temperatures(state, 0))
    assert vessel.curve is not None
    in_liquid = tap <= level and not water > max(tap, vessel.curve.bottom)
    slope = float(result.sensitivities["level"][0])
    errors = [part for part in found.parts if part.sensitivity != "level"]
    return {
        "level_m": _reading(vessel, source, "level_m", level, state),
        "ullage_m": None if height is None else _unread(vessel, source, "ullage_m", ullage),
        "liquid_volume_m3": _unread(vessel, source, "liquid_volume_m3", float(result["tank_volume"][0])),
        "fill_pct": 100.0 * float(result["level_fraction"][0]),
        "differential_pressure_kpa": _unread(vessel, source, quantity, head) if in_liquid else None,
        "liquid_density_kg_m3": density,
        "level_standard_uncertainty_m": (
            estimate(result, errors, 0).uncertainty / slope if slope > 0.0 else None
        ),
    }


# --- the temperature of a full vessel -------------------------------------------------------------


def _full(
    vessel: CompiledVessel, compiled: Vessels, state: State, request: ExpectedReadingCalculation
) -> dict[str, Any]:
    """At which temperature the mass as liquid fills its closed vessel, with what that must not be used for."""
    boils = what_boils(request.substance)
    if vessel.space != "product" or vessel.liquid is None or boils is None:
        return {}
    row: NDArray[np.intp] = np.zeros(1, dtype=np.intp)
    columns = saturation_columns((boils,))
    found = full_temperature(compiled, None, state, np.array([request.mass_kg]), columns, row)
    kelvin = float(found.value[0])
    celsius = celsius_of(kelvin) if math.isfinite(kelvin) else None
    return {"liquid_full_temperature_c": celsius, "liquid_full_caution": CAUTION}
