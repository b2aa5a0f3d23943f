"""What stands above a liquid, or fills a vessel of gas: its conditions, its mass, its sensitivities."""

from __future__ import annotations

from dataclasses import replace
from typing import NamedTuple

import numpy as np

from models.arrays import BoolArray, FloatArray, IntArray
from models.columns import Mark, Method, Step
from models.constants import GAS_CONSTANT
from models.saturation import SaturationColumns
from models.vapour.guard import Verdict
from models.vapour.series import VapourState

NO_SERIES = -1  # for a row's virial series: none of the substance can take the composition that was analysed
LEFT_OUT_SHARE = 0.01  # of the liquid; a vapour that cannot be computed is left out up to this bound
SATURATION_COVERAGE = 2.0  # standard uncertainties
# A vapour that is not computed is at most so many times the ideal gas at its pressure and temperature: saturated
# vapours have Z above 0.50 up to 0.96 of their critical temperature and above 0.25 up to 0.999 of it, by the
# reference equations of 20 fluids (CoolProp 8.0.0; helium and associating vapours are left aside).
DENSER_THAN_IDEAL, DENSEST_NEAR_CRITICAL, NEAR_CRITICAL = 2.0, 4.0, 0.96
# Of a vapour beside a blanket, for each pascal of the blanket: what the two gases do to each other is left out.
# Enhancement factors at 1 to 2 bar are 1.005 to 1.04: J. M. Prausnitz et al., 3rd ed., 1999, ch. 5 (from memory).
BLANKET_SHARE = 0.02 / 1e5  # 1/Pa


class SaturationInterval(NamedTuple):
    """Where the pressure above a liquid can lie: from its vapour pressure at the colder to that at the warmer end.

    Parameters
    ----------
    at_liquid, at_vapour : FloatArray, shape (...)
        Vapour pressure at the temperature of the liquid, and of the vapour; NaN where there is none. [Pa]
    slope : FloatArray, shape (...)
        Of the vapour pressure by temperature, at the vapour's where it is known, else at the liquid's. [Pa/K]
    departure : FloatArray, shape (...)
        Standard uncertainty of the vapour pressure itself. [Pa]
    lowest, highest : FloatArray, shape (...)
        Ends of the interval; one point where only the liquid's temperature is known. [Pa]
    tolerance : FloatArray, shape (...)
        By which a pressure may lie outside and still agree. [Pa]
    """

    at_liquid: FloatArray
    at_vapour: FloatArray
    slope: FloatArray
    departure: FloatArray
    lowest: FloatArray
    highest: FloatArray
    tolerance: FloatArray


def saturation_interval(
    saturation: SaturationColumns, row: IntArray | int, liquid_temperature: FloatArray,
    vapour_temperature: FloatArray, pressure_uncertainty: FloatArray, temperature_uncertainty: FloatArray,
) -> SaturationInterval:  # fmt: skip
    """Pressures that agree with the temperatures of a liquid and of the vapour above it.

    Parameters
    ----------
    saturation : SaturationColumns
        Vapour pressures. [1]
    row : IntArray or int, shape (...)
        Which substance. [1]
    liquid_temperature, vapour_temperature : FloatArray, shape (...)
        As measured; NaN where the vapour's is not. [K]
    pressure_uncertainty, temperature_uncertainty : FloatArray, shape (...)
        Standard uncertainties. [Pa, K]

    Returns
    -------
    SaturationInterval
        The interval and its tolerance. [Pa]

    Notes
    -----
    With p the vapour pressure and u_p the departure of its equation, and of Raoult's law for a mixture::

        lowest  = min(p(T_l), p(T_v)),  highest = max(p(T_l), p(T_v))        (1)
        tolerance = 2 √(u(P)² + (dp/dT u(T))² + u_p²)                       (2)

    References
    ----------
    .. [1] JCGM 100:2008 (GUM), eq. 10 and 6.2 (coverage factor 2).
    """
    at_liquid, liquid_slope = saturation.pressure(liquid_temperature, row)
    at_vapour, vapour_slope = saturation.pressure(vapour_temperature, row)
    known = np.isfinite(at_vapour)
    slope = np.where(known, vapour_slope, liquid_slope)
    departure = saturation.departure[row] * np.where(known, at_vapour, at_liquid)
    return SaturationInterval(
        at_liquid, at_vapour, slope, departure,
        np.where(known, np.minimum(at_liquid, at_vapour), at_liquid),  # eq. 1
        np.where(known, np.maximum(at_liquid, at_vapour), at_liquid),
        SATURATION_COVERAGE * np.sqrt(
            pressure_uncertainty**2 + (slope * temperature_uncertainty) ** 2 + departure**2  # eq. 2
        ),
    )  # fmt: skip


def vapour_conditions(step: Step, method: Method) -> tuple[FloatArray, FloatArray, BoolArray, BoolArray]:
    """Pressure and temperature at which the vapour is taken, and where they are saturated ones.

    In this order: as measured; at the measured pressure, saturated; without a pressure, saturated at the
    liquid's temperature. A vapour above saturation beside its liquid is taken as saturated at its pressure.
    A pressure at which the liquid nowhere boils is taken with the liquid's temperature, and where it lies
    above the liquid's vapour pressure as that.

    Parameters
    ----------
    step : Step
        The block; marked where the pressure and the temperatures do not agree. [SI]
    method : Method
        Of its vessels. [1]

    Returns
    -------
    tuple of FloatArray and BoolArray
        Pressure, temperature, and where the vapour is saturated at its pressure, and at its liquid. Of a
        blanketed space: partial pressure, temperature, where the product's vapour is saturated beside its
        blanket, and where its temperature is the liquid's. [Pa, K, 1, 1]
    """
    v, s = step.vessels, step.state
    nowhere = np.zeros(step.marks.shape, dtype=bool)
    pressure = np.broadcast_to(s.pressure, nowhere.shape)
    temperature = np.broadcast_to(s.vapour_temperature, nowhere.shape)
    if method & Method.BLANKET:
        return _beside_blanket(step)
    if not method & Method.SATURATION or not method & Method.LIQUID:
        return pressure, temperature, nowhere, nowhere
    assert v.saturation is not None
    row = step.saturation_row
    unread = np.isnan(pressure)
    own = saturation_interval(
        v.saturation, row, s.liquid_temperature, np.where(unread, np.nan, temperature), s.pressure_uncertainty,
        s.temperature_uncertainty,
    )  # fmt: skip
    step.mark(s.pressure < own.lowest - own.tolerance, Mark.SATURATION_LOW)
    step.mark(s.pressure > own.highest + own.tolerance, Mark.SATURATION_HIGH)
    above = pressure > own.at_vapour
    by_pressure = ~unread & (np.isnan(temperature) | above)
    by_liquid = unread
    # The liquid's pressure is that of the space above it, also where that is the vapour pressure.
    step.state = replace(s, pressure=np.where(unread, own.at_liquid, pressure))
    pressure = step.state.pressure
    temperature = np.where(unread, s.liquid_temperature, temperature)
    if by_pressure.any():
        boiling = v.saturation.temperature(pressure, row)
        temperature = np.where(by_pressure, boiling, temperature)
        nowhere_boiling = by_pressure & np.isnan(boiling)
        if nowhere_boiling.any():
            beyond = nowhere_boiling & (pressure > own.at_liquid)
            by_pressure, by_liquid = by_pressure & ~nowhere_boiling, by_liquid | beyond
            temperature = np.where(nowhere_boiling, s.liquid_temperature, temperature)
            pressure = np.where(beyond, own.at_liquid, pressure)
    step.mark(above, Mark.VAPOUR_SATURATED)
    step.mark(by_pressure & ~above, Mark.VAPOUR_AT_PRESSURE)
    step.mark(by_liquid, Mark.VAPOUR_AT_LIQUID_TEMPERATURE)
    return pressure, temperature, by_pressure, by_liquid


def _beside_blanket(step: Step) -> tuple[FloatArray, FloatArray, BoolArray, BoolArray]:
    """The product's own pressure in a space that it shares with a blanket: its vapour pressure, by Dalton.

    A vapour pressure that reaches the pressure of the space has driven the blanket out: all is product.
    """
    v, s = step.vessels, step.state
    assert v.saturation is not None
    row = step.saturation_row
    unread = np.broadcast_to(np.isnan(s.vapour_temperature), step.marks.shape)
    temperature = np.where(unread, s.liquid_temperature, s.vapour_temperature)
    own = saturation_interval(
        v.saturation, row, temperature, temperature, s.pressure_uncertainty, s.temperature_uncertainty
    )
    boiling = own.lowest
    alone = np.broadcast_to(boiling >= s.pressure, step.marks.shape)
    step.mark(alone & (s.pressure < boiling - own.tolerance), Mark.SATURATION_LOW)
    return np.where(alone, s.pressure, boiling), temperature, ~alone, unread


def vapour(step: Step, method: Method) -> None:
    """Vapour volume, its density by the virial equation, its mass and derivatives.

    Parameters
    ----------
    step : Step
        The block, with the conditions of its vapour; results and sensitivities are added to it. [SI]
    method : Method
        Of its vessels. [1]

    Notes
    -----
    With p the vapour's own pressure, which beside a blanket is its vapour pressure at T_v::

        M_v = (K_T V_T − K V(h)) p m / (Z(p, T_v) R T_v)        (1)

    A blanket is taken to neither thin nor enrich the vapour (Dalton's law); what that leaves out stands in
    the model's uncertainty.

    References
    ----------
    .. [1] J. M. Smith, H. C. Van Ness, M. M. Abbott, "Introduction to Chemical Engineering
       Thermodynamics", 7th ed., 2005, ch. 3 (virial equation) and ch. 10 (Dalton and Raoult).
    """
    v, s, out = step.vessels, step.state, step.out
    assert v.vapour is not None
    assert step.conditions is not None
    pressure, temperature, by_pressure, by_liquid = step.conditions
    rows = v.vapour_row if s.vapour_row is None else s.vapour_row
    unknown = rows == NO_SERIES
    if unknown.any():
        rows = np.where(unknown, v.vapour_row, rows)
    row = rows if len(rows) > 1 else int(rows[0])
    gas = v.vapour.state(pressure, temperature, row)
    if method & Method.SATURATION and not method & Method.BLANKET and (gas.verdict >= Verdict.REFUSED).any():
        gas, pressure, temperature, by_pressure, by_liquid = _at_its_liquid(step, gas, row)
    if unknown.any():  # what its own composition gives bounds it, and is no vapour of this row
        density = np.where(unknown, np.nan, gas.density)
        gas = replace(gas, density=density, verdict=np.where(unknown, Verdict.OUTSIDE_RANGE, gas.verdict))
    space = out["full_factor"] * v.capacity - out["shell_factor"] * out["tank_volume"]
    if method & Method.LIQUID:
        step.mark(space <= 0.0, Mark.LIQUID_FULL)
        space = np.where(space > 0.0, space, np.where(np.isnan(space), np.nan, 0.0))
    between = half = None
    if method & Method.LIQUID and np.isnan(gas.density).any():
        gas, between, half = _between(step, method, gas, (pressure, temperature), space, row, ~unknown)
    mass = gas.density * space  # eq. 1
    out.update(
        vapour_volume=space, compressibility_factor=gas.compressibility, vapour_density=gas.density,
        vapour_mass=mass, vapour_temperature=temperature, vapour_pressure=pressure,
        reduced_density=gas.reduced_density,
    )  # fmt: skip
    _guard(step, method, gas, pressure, temperature, space, row)
    if between is not None and half is not None:
        step.sens["vapour_left_out"] = np.where(between, half * space, step.sens["vapour_left_out"])
    mass = out["vapour_mass"]  # without what was left out
    by_p = mass * gas.pressure_sensitivity / pressure
    by_t = mass * gas.temperature_sensitivity / temperature
    _vapour_sensitivities(step, method, gas, by_p, by_t, (by_pressure, by_liquid))


def _at_its_liquid(
    step: Step, gas: VapourState, row: IntArray | int
) -> tuple[VapourState, FloatArray, FloatArray, BoolArray, BoolArray]:
    """A vapour too dense at the pressure that was read, taken as saturated at its liquid's temperature instead.

    So much more than the liquid's vapour pressure is another gas, or a mistaken pressure: neither is its vapour.
    """
    v, s = step.vessels, step.state
    assert v.vapour is not None and v.saturation is not None and step.conditions is not None
    pressure, temperature, by_pressure, by_liquid = step.conditions
    which = step.saturation_row
    at_liquid, _ = v.saturation.pressure(s.liquid_temperature, which)
    instead = (gas.verdict >= Verdict.REFUSED) & by_pressure & (pressure > at_liquid)
    if not instead.any():
        return gas, pressure, temperature, by_pressure, by_liquid
    pressure, temperature = np.where(instead, at_liquid, pressure), np.where(instead, s.liquid_temperature, temperature)
    step.mark(instead, Mark.VAPOUR_AT_LIQUID_TEMPERATURE)
    again = v.vapour.state(pressure, temperature, row)
    return again, pressure, temperature, by_pressure & ~instead, by_liquid | instead


def _guard(
    step: Step, method: Method, gas: VapourState, pressure: FloatArray, temperature: FloatArray,
    space: FloatArray, row: IntArray | int,
) -> None:  # fmt: skip
    """What the virial equation says of itself, and a small vapour that it refuses, left out."""
    v, out = step.vessels, step.out
    assert v.vapour is not None
    step.mark((gas.verdict == Verdict.WIDE) | (gas.verdict == Verdict.UNCERTAIN), Mark.GUARD_WIDE)
    refused = np.asarray(gas.verdict >= Verdict.REFUSED) & np.isfinite(pressure) & np.isfinite(temperature)
    if method & Method.LIQUID:
        nothing = np.isnan(out["vapour_density"])
        sure = np.where(np.isfinite(temperature), temperature, step.state.liquid_temperature)
        ideal, denser = _ideal(step, method, pressure, sure, row)
        bound = denser * ideal * space
        small = nothing & (bound <= LEFT_OUT_SHARE * np.abs(out["liquid_mass"]))
        step.mark(small, Mark.VAPOUR_LEFT_OUT)
        out["vapour_mass"] = np.where(small, 0.0, out["vapour_mass"])
        step.sens["vapour_left_out"] = np.where(small, bound, 0.0)
        refused = refused & ~small
    step.mark(refused & (gas.verdict == Verdict.REFUSED), Mark.GUARD_REFUSED)
    step.mark(refused & (gas.verdict == Verdict.NO_VAPOUR_ROOT), Mark.NO_VAPOUR_ROOT)
    step.mark(refused & (gas.verdict == Verdict.OUTSIDE_RANGE), Mark.OUTSIDE_METHOD)


def _ideal(
    step: Step, method: Method, pressure: FloatArray, temperature: FloatArray, row: IntArray | int
) -> tuple[FloatArray, FloatArray]:
    """Density of the vapour as an ideal gas, and how many times that a vapour may have that is not computed."""
    vapours = step.vessels.vapour
    assert vapours is not None
    known = np.where(np.isfinite(pressure), pressure, _most(step, method, temperature))
    near = temperature > NEAR_CRITICAL * vapours.critical_temperature[row]
    denser = np.where(near, DENSEST_NEAR_CRITICAL, DENSER_THAN_IDEAL)
    return np.asarray(vapours.molar_mass[row] * known / (GAS_CONSTANT * temperature)), denser


def _between(
    step: Step, method: Method, gas: VapourState, at: tuple[FloatArray, FloatArray], space: FloatArray,
    row: IntArray | int, known: BoolArray,
) -> tuple[VapourState, BoolArray, FloatArray]:  # fmt: skip
    """A vapour beside its liquid that cannot be computed and is too much to be left out: halfway to its bound.

    It has the density of the ideal gas at least, as its molecules attract each other, and the bound at most; half
    of the difference is its uncertainty's limit. Beside a blanket a vapour of unknown pressure may also be none. So
    a vessel is never refused for its vapour.
    """
    pressure, temperature = at
    sure = np.where(np.isfinite(temperature), temperature, step.state.liquid_temperature)
    ideal, denser = _ideal(step, method, pressure, sure, row)
    much = denser * ideal * space > LEFT_OUT_SHARE * np.abs(step.out["liquid_mass"])
    taken = np.isnan(gas.density) & known & much
    step.mark(taken, Mark.VAPOUR_BETWEEN)
    least = np.where(np.isfinite(pressure) | (not method & Method.BLANKET), 1.0, 0.0)
    factor = 0.5 * (least + denser)
    return (
        replace(
            gas,
            density=np.where(taken, factor * ideal, gas.density),
            compressibility=np.where(taken, 1.0 / factor, gas.compressibility),
            pressure_sensitivity=np.where(taken, 1.0, gas.pressure_sensitivity),
            temperature_sensitivity=np.where(taken, -1.0, gas.temperature_sensitivity),
            model_uncertainty=np.where(taken, 0.0, gas.model_uncertainty),
            verdict=np.where(taken, Verdict.OK, gas.verdict),
        ),
        taken,
        np.asarray(0.5 * (denser - least) * ideal),
    )


def _most(step: Step, method: Method, temperature: FloatArray) -> FloatArray:
    """Pressure that a vapour of unknown pressure does not exceed: that of the space, and in the cold still less."""
    v, whole = step.vessels, step.state.pressure
    if not method & Method.BLANKET:
        return whole
    assert v.saturation is not None
    row = v.saturation_row if len(v.saturation_row) > 1 else int(v.saturation_row[0])
    lowest = np.asarray(v.saturation.lowest[row])
    boiling, _ = v.saturation.pressure(lowest, row)
    return np.where(temperature < lowest, np.minimum(boiling, whole), whole)


def _vapour_sensitivities(
    step: Step, method: Method, gas: VapourState, by_p: FloatArray, by_t: FloatArray,
    saturated: tuple[BoolArray, BoolArray],
) -> None:  # fmt: skip
    """Derivatives of the vapour mass, added to those of the liquid."""
    v, out, sens = step.vessels, step.out, step.sens
    mass, density = out["vapour_mass"], np.where(np.isfinite(gas.density), gas.density, 0.0)
    by_p, by_t = np.where(np.isfinite(by_p), by_p, 0.0), np.where(np.isfinite(by_t), by_t, 0.0)
    volume = out["tank_volume"]
    by_sum = sens["_full_by_sum"] * v.capacity - sens["_by_sum"] * volume  # the space by the strains
    by_vertical = sens["_by_vertical"] * volume
    shell = density * v.expansion * (3.0 * by_sum + by_vertical)
    pressed = density * (v.strain_sum * by_sum + v.strain_vertical * by_vertical)
    sens["ambient_temperature"] = sens.get("ambient_temperature", 0.0) + (1.0 - v.liquid_weight) * shell
    sens["vapour_model"] = mass * np.where(np.isfinite(gas.model_uncertainty), gas.model_uncertainty, 0.0)
    sens["molar_mass"] = mass
    sens["capacity"] = sens.get("capacity", 0.0) + mass
    sens["pressure"] = sens.get("pressure", 0.0) + pressed
    if not method & Method.LIQUID:
        sens["pressure"] = sens["pressure"] + by_p
        sens["vapour_temperature"] = by_t + v.liquid_weight * shell
        return
    sens["level"] = sens["level"] - density * out["shell_factor"] * out["surface_area"]
    sens["capacity_local"] = sens["capacity_local"] - density * out["shell_factor"] * volume
    sens["liquid_temperature"] = sens["liquid_temperature"] + v.liquid_weight * shell
    sens["vapour_temperature"] = by_t
    by_pressure, by_liquid = saturated
    if method & Method.BLANKET:
        _blanket_sensitivities(step, by_p, by_t, by_pressure, by_liquid)
        return
    if not (by_pressure.any() or by_liquid.any()):
        sens["pressure"] = sens["pressure"] + by_p
        return
    assert v.saturation is not None
    row = step.saturation_row
    _, slope = v.saturation.pressure(out["vapour_temperature"], row)
    along = np.where(by_pressure, by_t / slope, 0.0)
    liquid_alone = sens["pressure"]
    sens["pressure"] = liquid_alone + by_p + along
    if not by_liquid.any():
        return
    # At its liquid's temperature a vapour follows that; so does the liquid's pressure where none was read.
    read = out["vapour_pressure"] != step.state.pressure
    along_liquid = by_t + np.where(read, by_p, liquid_alone + by_p) * slope
    sens["pressure"] = np.where(by_liquid, np.where(read, liquid_alone, 0.0), sens["pressure"])
    sens["liquid_temperature"] = sens["liquid_temperature"] + np.where(by_liquid, along_liquid, 0.0)


def _blanket_sensitivities(
    step: Step, by_p: FloatArray, by_t: FloatArray, beside: BoolArray, unread: BoolArray
) -> None:
    """Beside its blanket a vapour follows its temperature alone, once as a gas and once as its vapour pressure."""
    v, s, out, sens = step.vessels, step.state, step.out, step.sens
    assert v.saturation is not None
    row = step.saturation_row
    _, slope = v.saturation.pressure(out["vapour_temperature"], row)
    whole = np.where(beside, by_t + by_p * np.where(np.isfinite(slope), slope, 0.0), by_t)
    sens["pressure"] = sens["pressure"] + np.where(beside, 0.0, by_p)
    sens["vapour_temperature"] = whole
    sens["liquid_temperature"] = sens["liquid_temperature"] + np.where(unread, whole, 0.0)
    blanket = np.where(beside & np.isfinite(s.pressure), s.pressure - out["vapour_pressure"], 0.0)
    sens["vapour_model"] = np.hypot(sens["vapour_model"], out["vapour_mass"] * BLANKET_SHARE * blanket)
