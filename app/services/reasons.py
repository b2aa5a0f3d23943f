"""Why a mass is doubtful, and why there is none: each reason under its code, with its values and limits."""

from __future__ import annotations

import math

import numpy as np

from app.schemas.types import format_instant
from app.services.choose import NEVER
from app.services.collect import INPUTS
from app.services.compositions import saturation_columns, virial_columns
from app.services.liquids import why_outside
from app.services.measure import Measured
from app.services.parts import at_row, celsius_of
from models import instruments
from models.columns import UNMEASURED, Mark
from models.liquid.definition import MixtureLiquid
from models.space import SaturationInterval, saturation_interval

NEEDED = {
    "level": ("level_m", "a level or an ullage"),
    "liquid_temperature": ("liquid_temperature_c", "the liquid's temperature"),
    "vapour_temperature": ("vapour_temperature_c", "the gas's temperature"),
    "pressure": ("pressure_kpa", "the pressure of the gas, or of the space above the liquid"),
}
WARNINGS: dict[Mark, tuple[str, str]] = {
    Mark.ROOF_LANDING_ZONE: (
        "roof_landing_zone",
        "the level lies between lands_at_m and floats_at_m: what the roof displaces is only estimated there",
    ),
    Mark.SATURATION_LOW: (
        "saturation_low",
        "look for gauge and absolute confused, a warm thermometer, a lighter product withdrawn, another product, or a "
        "blanket that is lost",
    ),
    Mark.SATURATION_HIGH: (
        "saturation_high",
        "look for gauge and absolute confused, gas that does not condense, a cold thermometer, or a lighter product",
    ),
    Mark.VAPOUR_SATURATED: (
        "vapour_saturated",
        "the vapour was above saturation beside its liquid and is taken as saturated at its pressure, or at its "
        "liquid's temperature where no vapour of the substance stands at that pressure",
    ),
    Mark.VAPOUR_LEFT_OUT: (
        "vapour_left_out",
        "the vapour cannot be computed here and is left out; at most 1 % of the liquid, it stands in the budget",
    ),
    Mark.GUARD_WIDE: (
        "guard_wide",
        "the vapour is so dense that the virial equation has a wider uncertainty, which stands in the budget",
    ),
    Mark.VAPOUR_BETWEEN: (
        "guard_refused",
        "the virial equation does not reach this vapour, which is too much to be left out: it is taken halfway between "
        "the ideal gas and the most that it can be, and half of that difference stands in the budget",
    ),
    Mark.GUARD_REFUSED: (
        "guard_refused",
        "the vapour is too dense for the virial equation: beyond half of its critical density or too near to "
        "the limit of a stable vapour",
    ),
    Mark.LIQUID_FULL: ("liquid_full", "the vessel is full of liquid: no vapour space is left"),
    Mark.OUTSIDE_VESSEL: ("outside_vessel", "the level lies outside the vessel"),
    Mark.OUTSIDE_TABLE: (
        "outside_table",
        "the level lies outside the capacity table, which is never extrapolated",
    ),
    Mark.OUTSIDE_METHOD: (
        "outside_method",
        "a temperature lies outside the range of the virial coefficients",
    ),
    Mark.LIQUID_OUTSIDE_METHOD: ("outside_method", "the liquid lies outside its method"),
    Mark.STANDARD_OUTSIDE_METHOD: (
        "outside_method",
        "the standard state lies outside the liquid's method: the mass needs none, standard volumes are unknown",
    ),
    Mark.NO_VAPOUR_ROOT: (
        "guard_refused",
        "the virial equation has no vapour at this pressure and temperature: it would condense",
    ),
}


UNSATURATED = Mark.SATURATION_LOW | Mark.SATURATION_HIGH


def counts(measured: Measured, row: int, name: str) -> bool:
    """Whether an input enters this vessel's mass at all."""
    vessel = measured.vessel(row)
    carried = measured.carried.get(row)
    if name in ("empty", "weighed") or (carried and carried.stated is not None):
        stated = "" if carried is None or carried.stated is None else "empty" if carried.empty else "weighed"
        return name == stated
    if name == "roof_load":
        return vessel.body.floating_roof is not None
    if vessel.is_full and name in ("level", "free_water"):
        return False
    if name in ("level", "liquid_temperature", "free_water", "density", "sediment_water"):
        return vessel.has_liquid
    if name == "vapour_temperature":  # beside a liquid it counts with a pressure only
        return vessel.has_vapour and (not vessel.has_liquid or math.isfinite(at_row(measured.state.pressure, row)))
    if name == "liquid_composition":
        return vessel.boiling is not None or isinstance(vessel.liquid, MixtureLiquid)
    if name == "vapour_composition":
        return vessel.has_vapour and not vessel.is_blanketed
    if name in ("ambient", "site_ambient"):
        insulated = vessel.parameters["liquid_weight"] == 1.0 or vessel.parameters["expansion"] == 0.0
        assumed = measured.assumed.get("ambient_temperature_c")
        own = bool(measured.chosen["ambient"].usable[row]) or (assumed is not None and bool(assumed[row]))
        return not insulated and (name == "ambient") == own
    return True


def warnings(measured: Measured, row: int) -> list[dict[str, str]]:
    """What is doubtful, and why a row has no mass."""
    marks = Mark(int(measured.result.marks[row]))
    found = [
        {"code": code, "detail": _in_full(measured, row, mark, detail)}
        for mark, (code, detail) in (WARNINGS.items() if marks else ())
        if marks & mark and not mark & UNMEASURED
    ]
    for spec in INPUTS:
        chosen = measured.chosen[spec.name]
        if not chosen.usable[row] or not counts(measured, row, spec.name):
            continue
        quantity, source = measured.collected.origins[spec.name].of(row, int(chosen.source[row]))
        if chosen.quality[row] == 1:
            found.append({"code": "input_uncertain", "detail": f"{quantity} was posted as uncertain"})
        if chosen.contenders[row] > 1 and not measured.vessel(row).body.sources:
            found.append(
                {
                    "code": "two_sources",
                    "detail": f"{quantity} comes from several sources and the vessel gives no order of sources; "
                    f"the newest was taken, from source '{source}'",
                }
            )
    found.extend(_assumptions(measured, row))
    carried = measured.carried.get(row)
    return found if carried is None else found + carried.warnings


def _in_full(measured: Measured, row: int, mark: Mark, detail: str) -> str:
    """A mark's sentence with what this row adds to it."""
    if mark & UNSATURATED:
        return _saturation(measured, row, detail)
    if mark & Mark.VAPOUR_LEFT_OUT and row in measured.refused:
        return f"{detail}: {measured.refused[row]}"
    return detail


def _saturation(measured: Measured, row: int, look: str) -> str:
    """The pressure, the interval that it should lie in, what made that and its tolerance: enough to redo it."""
    state, vessel = measured.state, measured.vessel(row)
    pressure, spread = at_row(state.pressure, row), at_row(state.pressure_uncertainty, row)
    kelvin = at_row(state.temperature_uncertainty, row)
    liquid, vapour = at_row(state.liquid_temperature, row), at_row(state.vapour_temperature, row)
    own = interval_of(measured, row)
    ends = {"liquid": (liquid, own.at_liquid), "vapour": (vapour, own.at_vapour)}
    if vessel.is_blanketed and math.isfinite(own.at_vapour):
        del ends["liquid"]  # the gas's own temperature says what part of it is product
    said = " and ".join(
        f"{_kpa(float(one))} kPa at {celsius_of(t):.5g} °C of the {where}"
        for where, (t, one) in ends.items()
        if math.isfinite(one)
    )
    low, high = float(own.lowest), float(own.highest)
    below = pressure < low
    far = _kpa(low - pressure if below else pressure - high)
    detail = (
        f"the pressure is {_kpa(pressure)} kPa absolute, {far} kPa {'below' if below else 'above'} the vapour "
        f"pressure, which is {said}; the tolerance is 2u = {_kpa(float(own.tolerance))} kPa, of u = {_kpa(spread)} kPa "
        f"in the pressure, {kelvin:.4g} K at {_kpa(float(own.slope))} kPa/K in the temperature and "
        f"{_kpa(float(own.departure))} kPa in the vapour pressure: "
    )
    return detail + look + _slip(measured, row, own)


def interval_of(measured: Measured, row: int) -> SaturationInterval:
    """The pressures that agree with the temperatures of a row, as the chain took them."""
    state, boiling = measured.state, measured.boiling(row)
    assert boiling is not None
    vapour = at_row(state.vapour_temperature, row)
    if measured.vessel(row).is_blanketed:  # beside a blanket the gas's temperature alone counts
        vapour = vapour if math.isfinite(vapour) else at_row(state.liquid_temperature, row)
    liquid = vapour if measured.vessel(row).is_blanketed else at_row(state.liquid_temperature, row)
    columns = liquid, vapour, at_row(state.pressure_uncertainty, row), at_row(state.temperature_uncertainty, row)
    return saturation_interval(saturation_columns((boiling,)), 0, *(np.asarray(value) for value in columns))


def _slip(measured: Measured, row: int, own: SaturationInterval) -> str:
    """One sentence more where the same number, taken as the other of gauge and absolute, would fit."""
    if measured.vessel(row).is_blanketed:
        return ""  # every pressure above the product's fits
    pressure, air = at_row(measured.state.pressure, row), at_row(measured.state.atmosphere, row)
    absolute = _read_absolute(measured, row)
    other = pressure + air if absolute else pressure - air
    if not own.lowest - own.tolerance <= other <= own.highest + own.tolerance:
        return ""
    posted, meant = ("pressure_kpa_abs", "pressure_kpa") if absolute else ("pressure_kpa", "pressure_kpa_abs")
    number = _kpa(pressure if absolute else other)
    reads = f"gauge pressure, {number} kPa over {_kpa(air)} kPa" if absolute else f"absolute pressure, {number} kPa"
    return f". It fits if the transmitter reads {reads}: check whether {posted} was meant as {meant}"


def _read_absolute(measured: Measured, row: int) -> bool:
    """Whether what counts for the pressure was posted, or assumed, as an absolute one."""
    chosen = measured.chosen["pressure"]
    if chosen.usable[row]:
        return measured.collected.origins["pressure"].of(row, int(chosen.source[row]))[0] == "pressure_kpa_abs"
    assumed = measured.assumed.get("pressure_kpa_abs")
    return assumed is not None and bool(assumed[row])


def _kpa(pascal: float) -> str:
    return f"{pascal / 1000.0:.5g}"


def _assumptions(measured: Measured, row: int) -> list[dict[str, str]]:
    vessel = measured.vessel(row)
    found = []
    for quantity, where in measured.assumed.items():
        if where[row]:
            found.append({"code": "input_assumed", "detail": f"{quantity} is the value that the vessel assumes"})
    depends = vessel.has_vapour or vessel.parameters["strain_sum"] != 0.0
    if measured.atmosphere_assumed is not None and measured.atmosphere_assumed[row] and depends:
        found.append(
            {
                "code": "atmosphere_assumed",
                "detail": "no barometer is read and the site has neither elevation_m nor "
                "atmospheric_pressure_kpa_abs: 101.325 kPa is taken",
            }
        )
    read = any(measured.chosen[name].usable[row] for name in ("ambient", "site_ambient"))
    if counts(measured, row, "site_ambient") and not read and "ambient_temperature_c" not in measured.assumed:
        found.append(
            {
                "code": "input_assumed",
                "detail": "no ambient temperature is read: the shell is taken at the product's temperature, "
                f"with a standard uncertainty of {instruments.AMBIENT_UNREAD:g} K on the ambient's",
            }
        )
    return found


def reason(measured: Measured, row: int) -> dict[str, str]:
    """Why a row has no mass: the first input that it lacks, or a value outside a limit."""
    if row in measured.refused:
        return {"code": "outside_method", "detail": measured.refused[row]}
    vessel = measured.vessel(row)
    state = measured.state
    lacking = {
        name: not math.isfinite(at_row(getattr(state, name), row))
        for name in ("level", "liquid_temperature", "pressure", "vapour_temperature")
    }
    saturates = vessel.has_vapour and not vessel.is_blanketed
    needed = ["pressure", "vapour_temperature"]
    if vessel.has_liquid:  # a space that can be saturated needs nothing read
        needed = ["level", "liquid_temperature"] + ([] if saturates else ["pressure"])
        needed = needed[1:] if vessel.is_full else needed
    marks = Mark(int(measured.result.marks[row]))
    for mark, (code, detail) in WARNINGS.items():
        if marks & mark & UNMEASURED:
            return {"code": code, "detail": _limit(measured, row, mark, detail)}
    for name in needed:
        if lacking[name]:
            quantity, words = NEEDED[name]
            return {"code": "input_missing", "detail": _missing(measured, row, name, quantity, words)}
    if vessel.has_liquid and math.isnan(at_row(state.water_level, row)):
        said = _missing(measured, row, "free_water", "free_water_level_m", "the free water")
        return {"code": "input_missing", "detail": f"{said}: dip it, or assume a level, or raise its max_age_s"}
    if vessel.has_vapour and not math.isfinite(float(measured.result["vapour_pressure"][row])):
        celsius = at_row(state.liquid_temperature, row) - 273.15
        return {
            "code": "outside_method",
            "detail": f"no pressure is read, and at {celsius:.4g} °C the substance has no vapour pressure that we know",
        }
    return {"code": "outside_method", "detail": "the inputs give no mass: look at their values"}


def _missing(measured: Measured, row: int, name: str, quantity: str, words: str) -> str:
    """Which input is lacking, when it was last read, and how long that would have counted."""
    last = int(measured.collected.candidates[name].before_at[row].max())
    age = measured.vessel(row).max_age_us(quantity)
    if last <= int(NEVER):
        detail = f"{words} ({quantity}) was not read within reach of this instant and is not assumed"
    else:
        detail = f"{words} ({quantity}) was last read at {format_instant(last)}"
    if age is not None:
        detail += f"; a reading counts for {age * 1e-6:g} s (max_age_s)"
    if name == "level" and measured.vessel(row).body.gauging.reference_height_m is None:
        columns = measured.collected.origins[name].columns
        if any(read == "ullage_m" for read, _ in columns[row if len(columns) > 1 else 0]):
            detail += "; an ullage needs the vessel's gauging.reference_height_m, which is not given"
    return detail


def _limit(measured: Measured, row: int, mark: Mark, detail: str) -> str:
    """The value and the limit that it passed."""
    curve = measured.vessel(row).curve
    if mark & (Mark.OUTSIDE_VESSEL | Mark.OUTSIDE_TABLE) and curve is not None:
        level, water = at_row(measured.state.level, row), at_row(measured.state.water_level, row)
        if curve.bottom <= level <= curve.top:
            return f"free water lies above the liquid: free_water_level_m is {water:.4g} m, level_m is {level:.4g} m"
        return f"{detail}: level_m is {level:.4g} m; levels run from {curve.bottom:.4g} to {curve.top:.4g} m"
    if mark & (Mark.LIQUID_OUTSIDE_METHOD | Mark.STANDARD_OUTSIDE_METHOD):
        return _liquid_limit(measured, row, mark, detail)
    result = measured.result
    pressure, temperature = float(result["vapour_pressure"][row]), float(result["vapour_temperature"][row])
    at = f"{pressure / 1000.0:.6g} kPa absolute at {temperature - 273.15:.4g} °C"
    if mark & Mark.GUARD_REFUSED:
        return f"{detail}: {at} is {result['reduced_density'][row]:.3g} of its critical density"
    if mark & Mark.OUTSIDE_METHOD:
        if pressure < 0.0:
            return f"a pressure lies below a vacuum: {at}"
        series = virial_columns((measured.mixture(row),))
        low, high = series.lowest.min() - 273.15, series.highest.max() - 273.15
        return f"{detail}: {at}; they hold from {low:.4g} to {high:.4g} °C"
    return f"{detail}: {at}"


def _liquid_limit(measured: Measured, row: int, mark: Mark, detail: str) -> str:
    """Which limit of its method the liquid passed, in the vessel or at the standard state."""
    state, held = measured.state, measured.vessel(row).parameters
    pressure = at_row(state.pressure, row)
    if not math.isfinite(pressure):
        pressure = float(measured.result["vapour_pressure"][row])
    here = at_row(state.liquid_temperature, row), pressure
    if not mark & Mark.LIQUID_OUTSIDE_METHOD:
        here = held["standard_temperature"], held["standard_pressure"]
    sample = at_row(state.density_temperature, row), at_row(state.density_pressure, row)
    why = why_outside(measured.liquid(row), at_row(state.density, row), sample, here)
    return f"{detail}: {why}" if why else detail
