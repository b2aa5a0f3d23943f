"""One chain from readings to mass: geometry, liquid and vapour, with analytic sensitivities.

The steps, in order: the capacity curve at the level gives volume and surface; the shell's strain gives
the factor K; the floating roof takes its displacement; β and κ give the density at the state; the
virial equation gives the vapour's; the sum is the mass. Every step works on columns of readings.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace

import numpy as np

from models.arrays import BLOCK_ROWS, BoolArray, FloatArray, IntArray, blocks
from models.columns import Inventory, Mark, Method, State, Vessels
from models.constants import GAS_CONSTANT
from models.geometry.roof import afloat_fraction
from models.liquid.expansivity import expansivity, log_volume_ratio
from models.vapour.series import VapourState

RESULTS = {
    "level_fraction": "1", "gross_observed_volume": "m³", "free_water_volume": "m³", "shell_factor": "1",
    "gross_standard_volume": "m³", "net_standard_volume": "m³", "liquid_density": "kg/m³",
    "standard_density": "kg/m³", "liquid_mass": "kg", "vapour_volume": "m³", "compressibility_factor": "1",
    "vapour_density": "kg/m³", "vapour_mass": "kg", "gas_standard_volume": "m³", "mass": "kg",
    "tank_volume": "m³", "surface_area": "m²", "liquid_shell_temperature": "K", "full_factor": "1",
    "vapour_temperature": "K", "vapour_pressure": "Pa", "second_virial": "m³/mol", "third_virial": "m⁶/mol²",
    "reduced_density": "1", "roof_volume": "m³",
}  # fmt: skip

SENSITIVITIES = {
    "level": "kg/m", "water_level": "kg/m", "liquid_temperature": "kg/K", "ambient_temperature": "kg/K",
    "vapour_temperature": "kg/K", "pressure": "kg/Pa", "density": "kg/(kg/m³)", "density_temperature": "kg/K",
    "sediment_water": "kg", "capacity": "kg", "capacity_local": "kg", "expansion": "kg", "vapour_model": "kg",
    "molar_mass": "kg", "roof": "kg", "vapour_left_out": "kg",
}  # fmt: skip

LEFT_OUT_SHARE = 0.01  # of the liquid; a vapour that cannot be computed is left out up to this bound
SATURATION_COVERAGE = 2.0  # standard uncertainties


@dataclass
class _Step:
    """What the steps of one block hand on to each other."""

    vessels: Vessels
    state: State
    marks: IntArray
    out: dict[str, FloatArray]
    sens: dict[str, FloatArray]
    conditions: tuple[FloatArray, FloatArray, BoolArray, BoolArray] | None = None

    def mark(self, where: BoolArray, flag: Mark) -> None:
        if where.any():  # hardly ever
            self.marks |= np.where(where, int(flag), 0)


def inventory(vessels: Vessels, rows: IntArray | None, state: State) -> Inventory:
    """Mass of each reading, its working values and the sensitivities to its inputs.

    Parameters
    ----------
    vessels : Vessels
        Compiled vessels. [SI]
    rows : IntArray, shape (n,), or None
        Row of each reading's vessel; None where all readings are of the first. [1]
    state : State
        What was read, n rows. [SI]

    Returns
    -------
    Inventory
        Columns of n rows, in the order of the readings. [SI]

    Notes
    -----
    With W the roof's mass once it floats, K and K_T the shell's factors at part fill and full::

        M = ρ K (V(h) − V(h_w)) − W + ρ_v (K_T V_T − K V(h))        (1)

    A row that has no mass carries NaN and the mark that says why; nothing is clamped.

    The sensitivities are the derivatives of M but for these: the slope of K by the level is left out
    (a strain, at most about 5e-4 of the slope that stays); the water's own share of a table's local
    error is left out; ``roof`` is the whole mass that may be afloat in the landing zone; and of a vapour
    taken as saturated, ``vapour_temperature`` is the derivative by a departure from saturation.

    References
    ----------
    .. [1] API MPMS ch. 12.1.1, order of calculation (form from memory); the virial equation for the
       vapour in place of an ideal gas.
    """
    total = state.rows if rows is None else len(rows)
    made = _Made(np.zeros(total, dtype=np.intp), of_one_method=rows is None)
    if rows is None:
        method = Method(int(vessels.method[0]))
        for block in blocks(total, BLOCK_ROWS):
            _compute(method, vessels.take(slice(0, 1)), state.take(block), made, block)  # eq. 1
        return made.inventory()
    methods = vessels.method[rows]
    for number in np.unique(methods):  # a handful of methods, never a loop over vessels
        members = np.flatnonzero(methods == number)
        for block in blocks(len(members), BLOCK_ROWS):
            at = members[block]
            _compute(Method(int(number)), vessels.take(rows[at]), state.take(at), made, at)
    return made.inventory()


@dataclass
class _Made:
    """Columns of all rows, made when a block first brings one: most vessels need few of them."""

    marks: IntArray
    of_one_method: bool
    columns: dict[str, FloatArray] = field(default_factory=dict)
    sensitivities: dict[str, FloatArray] = field(default_factory=dict)

    def put(self, step: _Step, where: IntArray | slice) -> None:
        """One block's columns into their rows."""
        self.marks[where] = step.marks
        for columns, found, absent in ((self.columns, step.out, np.nan), (self.sensitivities, step.sens, 0.0)):
            for name, column in found.items():
                if name not in columns:  # of one method, every block brings the same columns
                    rows = len(self.marks)
                    columns[name] = np.empty(rows) if self.of_one_method else np.full(rows, absent)
                columns[name][where] = column

    def inventory(self) -> Inventory:
        """The columns as they are answered; what no block brought is one value for all rows."""
        rows = (len(self.marks),)
        return Inventory(
            self.marks,
            {name: self.columns.get(name, np.broadcast_to(np.nan, rows)) for name in RESULTS},
            {name: self.sensitivities.get(name, np.broadcast_to(0.0, rows)) for name in SENSITIVITIES},
        )


def _compute(method: Method, vessels: Vessels, state: State, made: _Made, where: IntArray | slice) -> None:
    """One block of one method: its columns go to their rows of the result."""
    step = _Step(vessels, state, np.zeros(len(made.marks[where]), dtype=np.intp), {}, {})
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        if method & Method.VAPOUR:
            step.conditions = _vapour_conditions(step, method)
        if method & Method.LIQUID:
            if method & Method.FULL:
                _filled(step)
            else:
                _geometry(step)
            _liquid(step, method)
        else:
            _whole_vessel(step)
        if method & Method.VAPOUR:
            _vapour(step, method)
        _sum(step, method)
    lost = ~np.isfinite(step.out["mass"]) & ((step.marks & ~_HARMLESS) == 0)
    step.mark(lost, Mark.MISSING)
    made.put(step, where)


_HARMLESS = int(
    Mark.ROOF_LANDING_ZONE | Mark.SATURATION_LOW | Mark.SATURATION_HIGH | Mark.VAPOUR_SATURATED | Mark.GUARD_WIDE
    | Mark.LIQUID_FULL | Mark.VAPOUR_LEFT_OUT | Mark.VAPOUR_AT_PRESSURE | Mark.VAPOUR_AT_LIQUID_TEMPERATURE
)  # fmt: skip


def _strain(step: _Step, wet_temperature: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Sum of the shell's three strains and the vertical one, temperature and pressure together."""
    v, s = step.vessels, step.state
    shell = v.liquid_weight * wet_temperature
    weight = 1.0 - v.liquid_weight
    shell = shell + np.where(weight > 0.0, weight * s.ambient_temperature, 0.0)
    step.out["liquid_shell_temperature"] = shell
    thermal = np.where(v.expansion != 0.0, v.expansion * (shell - v.expansion_temperature), 0.0)
    gauge = np.where(v.strain_sum != 0.0, s.pressure - s.atmosphere - v.strain_pressure, 0.0)
    return 3.0 * thermal + v.strain_sum * gauge, thermal + v.strain_vertical * gauge


def _geometry(step: _Step) -> None:
    """Level to volumes: the curve at the liquid and at the water, and the shell's factor."""
    v, s, out = step.vessels, step.state, step.out
    assert v.curves is not None
    outside = (s.level < v.bottom) | (s.level > v.top)
    level = s.level
    if outside.any():
        step.mark(outside & (v.is_table > 0.0), Mark.OUTSIDE_TABLE)
        step.mark(outside & (v.is_table == 0.0), Mark.OUTSIDE_VESSEL)
        level = np.where(outside, np.nan, level)
    wet = s.water_level > v.bottom
    drowned = wet & (s.water_level > s.level)
    if drowned.any():
        step.mark(drowned, Mark.OUTSIDE_VESSEL)
        level = np.where(drowned, np.nan, level)
    row = v.curve_row if len(v.curve_row) > 1 else int(v.curve_row[0])
    volume, area = v.curves.volume_and_area(level, row)
    if wet.any():
        water_level = np.where(wet & (s.water_level <= v.top), s.water_level, v.bottom)
        water, water_area = v.curves.volume_and_area(water_level, row)
        water, water_area = np.where(wet, water, 0.0), np.where(wet, water_area, 0.0)
    else:
        water = water_area = np.zeros(1)
    total, vertical = _strain(step, s.liquid_temperature)
    reach = np.where(volume > 0.0, (level - v.bottom) * area / volume, 1.0)
    factor = 1.0 + total - vertical * reach
    out.update(
        tank_volume=volume, surface_area=area, free_water_volume=factor * water, shell_factor=factor,
        full_factor=1.0 + total, level_fraction=volume / v.capacity,
    )  # fmt: skip
    step.sens["_water_area"] = np.asarray(factor * water_area)
    step.sens["_reach"] = reach


def _filled(step: _Step) -> None:
    """A line that is kept full: no level, the whole capacity and the strain of a full vessel."""
    total, _ = _strain(step, step.state.liquid_temperature)
    full = step.vessels.capacity + np.zeros(len(step.marks))
    step.out.update(
        tank_volume=full, surface_area=np.zeros(1), free_water_volume=np.zeros(1), shell_factor=1.0 + total,
        full_factor=1.0 + total, level_fraction=np.ones(1),
    )  # fmt: skip
    step.sens["_water_area"] = step.sens["_reach"] = np.zeros(1)


def _liquid(step: _Step, method: Method) -> None:
    """Density of the sample to the state and to the standard state; volumes and liquid mass."""
    v, s, out, sens = step.vessels, step.state, step.out, step.sens
    b, liquid = v.expansivity, {"origin": v.expansivity_origin}
    kappa, t, p = v.compressibility, s.liquid_temperature, s.pressure
    state_to_sample = log_volume_ratio(
        t, p, temperature_ref=s.density_temperature, pressure_ref=s.density_pressure,
        coefficients=b, compressibility=kappa, **liquid,
    )  # fmt: skip
    to_standard = log_volume_ratio(
        s.density_temperature, s.density_pressure, temperature_ref=v.standard_temperature,
        pressure_ref=v.standard_pressure, coefficients=b, compressibility=kappa, **liquid,
    )  # fmt: skip
    density = s.density * np.exp(-state_to_sample)
    standard = s.density * np.exp(to_standard)  # V_std/V_sample = exp(−ln V_sample/V_std)
    water = s.sediment_water
    # The water's share of a wet sample leaves it as sampled: so the mass does not depend on the standard state.
    share = np.where(s.density_is_dry > 0.0, 1.0 - water, 1.0 - water * v.water_density / s.density)
    ratio = density / standard  # C_T C_P
    net = share * density
    factor, volume = out["shell_factor"], out["tank_volume"]
    before_roof = factor * volume - out["free_water_volume"]
    displaced = np.zeros(1)
    slope = np.zeros(1)
    if method & Method.ROOF:
        afloat = afloat_fraction(s.level, v.roof_lands, v.roof_floats)
        landing = (s.level > v.roof_lands) & (s.level < v.roof_floats)
        step.mark(landing, Mark.ROOF_LANDING_ZONE)
        before_roof = before_roof + afloat * v.roof_mass * v.roof_volume_per_mass
        weight = v.roof_mass if s.roof_load is None else v.roof_mass + s.roof_load
        displaced = afloat * weight
        slope = np.where(landing, weight / (v.roof_floats - v.roof_lands), 0.0)
        sens["roof"] = np.where(landing, weight * share, 0.0)
        out["roof_volume"] = displaced * (v.roof_volume_per_mass - 1.0 / density)
    gross = before_roof - displaced / density
    mass = net * before_roof - displaced * share
    out.update(
        gross_observed_volume=gross, gross_standard_volume=gross * ratio,
        net_standard_volume=gross * ratio * (1.0 - water), liquid_density=density,
        standard_density=share * standard / (1.0 - water), liquid_mass=mass,
    )  # fmt: skip
    thermal = state_to_sample + kappa * (p - s.density_pressure)
    _liquid_sensitivities(step, net, before_roof, displaced, share, slope, thermal)


def _liquid_sensitivities(
    step: _Step, net: FloatArray, before_roof: FloatArray, displaced: FloatArray, share: FloatArray,
    slope: FloatArray, thermal: FloatArray,
) -> None:  # fmt: skip
    """Derivatives of the liquid mass; those of the vapour are added by the vapour's own step."""
    v, s, out, sens = step.vessels, step.state, step.out, step.sens
    b, origin = v.expansivity, v.expansivity_origin
    beta = expansivity(s.liquid_temperature, coefficients=b, origin=origin)
    sample_beta = expansivity(s.density_temperature, coefficients=b, origin=origin)
    volume, reach = out["tank_volume"], sens["_reach"]
    stretch_temperature = v.expansion * (3.0 - reach)  # dK/dT_shell
    stretch_pressure = v.strain_sum - v.strain_vertical * reach
    liquid_volume = volume - out["free_water_volume"] / out["shell_factor"]
    shell = net * liquid_volume * stretch_temperature
    full = net * before_roof
    dry = s.density_is_dry > 0.0
    by_log_density = np.where(dry, full, out["liquid_density"] * before_roof - displaced * (1.0 - share))
    sens["level"] = net * out["shell_factor"] * out["surface_area"] + slope * (net * v.roof_volume_per_mass - share)
    sens["water_level"] = -net * sens["_water_area"]
    sens["liquid_temperature"] = -beta * full + v.liquid_weight * shell
    sens["ambient_temperature"] = (1.0 - v.liquid_weight) * shell
    sens["pressure"] = v.compressibility * full + net * liquid_volume * stretch_pressure
    sens["density"] = by_log_density / s.density
    sens["density_temperature"] = full * sample_beta
    sens["expansion"] = -full * thermal
    sens["capacity"] = net * out["shell_factor"] * liquid_volume
    sens["capacity_local"] = net * out["shell_factor"] * volume
    gross = out["gross_observed_volume"]
    leaves = np.where(dry, 1.0, v.water_density / s.density)
    sens["sediment_water"] = -leaves * out["liquid_density"] * gross


def _whole_vessel(step: _Step) -> None:
    """A vessel of gas alone: no level, the whole capacity and the shell at the gas's temperature."""
    total, _ = _strain(step, step.state.vapour_temperature)
    rows = len(step.marks)
    nothing = np.zeros(rows)
    step.out.update(
        tank_volume=nothing, shell_factor=np.ones(rows), full_factor=1.0 + total + nothing,
        free_water_volume=nothing, gross_observed_volume=nothing, liquid_mass=nothing,
    )  # fmt: skip


def _vapour_conditions(step: _Step, method: Method) -> tuple[FloatArray, FloatArray, BoolArray, BoolArray]:
    """Pressure and temperature at which the vapour is taken, and where they are saturated ones.

    In this order: as measured; at the measured pressure, saturated; without a pressure, saturated at the
    liquid's temperature. A vapour above saturation beside its liquid is taken as saturated at its pressure.
    """
    v, s = step.vessels, step.state
    nowhere = np.zeros(step.marks.shape, dtype=bool)
    pressure = np.broadcast_to(s.pressure, nowhere.shape)
    temperature = np.broadcast_to(s.vapour_temperature, nowhere.shape)
    if not method & Method.SATURATION or not method & Method.LIQUID:
        return pressure, temperature, nowhere, nowhere
    assert v.saturation is not None
    row = v.saturation_row if len(v.saturation_row) > 1 else int(v.saturation_row[0])
    at_liquid, liquid_slope = v.saturation.pressure(s.liquid_temperature, row)
    by_liquid = np.isnan(pressure)
    pressure = np.where(by_liquid, at_liquid, pressure)
    temperature = np.where(by_liquid, s.liquid_temperature, temperature)
    at_vapour, slope = v.saturation.pressure(temperature, row)
    above = (pressure > at_vapour) & ~by_liquid
    by_pressure = np.isnan(temperature) | above
    if by_pressure.any():
        boiling = v.saturation.temperature(pressure, row)
        temperature = np.where(by_pressure, boiling, temperature)
    tolerance = SATURATION_COVERAGE * np.hypot(
        s.pressure_uncertainty, np.where(np.isfinite(slope), slope, liquid_slope) * s.temperature_uncertainty
    )
    measured = np.isfinite(s.pressure) & ~by_liquid
    known = np.isfinite(at_vapour)
    lower = np.where(known, np.minimum(at_liquid, at_vapour), at_liquid)
    upper = np.where(known, np.maximum(at_liquid, at_vapour), at_liquid)
    step.mark(measured & (s.pressure < lower - tolerance), Mark.SATURATION_LOW)
    step.mark(measured & (s.pressure > upper + tolerance), Mark.SATURATION_HIGH)
    step.mark(above, Mark.VAPOUR_SATURATED)
    step.mark(by_pressure & ~above, Mark.VAPOUR_AT_PRESSURE)
    step.mark(by_liquid, Mark.VAPOUR_AT_LIQUID_TEMPERATURE)
    # The liquid's pressure is that of the space above it, also where that is the vapour pressure.
    step.state = replace(s, pressure=pressure)
    return pressure, temperature, by_pressure, by_liquid


def _vapour(step: _Step, method: Method) -> None:
    """Vapour volume, its density by the virial equation, its mass and derivatives."""
    v, s, out = step.vessels, step.state, step.out
    assert v.vapour is not None
    assert step.conditions is not None
    pressure, temperature, by_pressure, by_liquid = step.conditions
    rows = v.vapour_row if s.vapour_row is None else s.vapour_row
    row = rows if len(rows) > 1 else int(rows[0])
    gas = v.vapour.state(pressure, temperature, row)
    space = out["full_factor"] * v.capacity - out["shell_factor"] * out["tank_volume"]
    if method & Method.LIQUID:
        step.mark(space <= 0.0, Mark.LIQUID_FULL)
        space = np.where(space > 0.0, space, np.where(np.isnan(space), np.nan, 0.0))
    mass = gas.density * space
    out.update(
        vapour_volume=space, compressibility_factor=gas.compressibility, vapour_density=gas.density,
        vapour_mass=mass, vapour_temperature=temperature, vapour_pressure=pressure,
        reduced_density=gas.reduced_density,
    )  # fmt: skip
    _guard(step, method, gas, pressure, temperature, space, row)
    mass = out["vapour_mass"]  # without what was left out
    by_p = mass * gas.pressure_sensitivity / pressure
    by_t = mass * gas.temperature_sensitivity / temperature
    _vapour_sensitivities(step, method, gas, by_p, by_t, (by_pressure, by_liquid))


def _guard(
    step: _Step, method: Method, gas: VapourState, pressure: FloatArray, temperature: FloatArray,
    space: FloatArray, row: IntArray | int,
) -> None:  # fmt: skip
    """What the virial equation says of itself, and a small vapour that it refuses, left out."""
    v, out = step.vessels, step.out
    assert v.vapour is not None
    step.mark((gas.verdict == 1) | (gas.verdict == 2), Mark.GUARD_WIDE)
    refused = np.asarray(gas.verdict >= 3) & np.isfinite(pressure) & np.isfinite(temperature)
    if method & Method.LIQUID:
        nothing = np.isnan(out["vapour_density"])
        sure = np.where(np.isfinite(temperature), temperature, step.state.liquid_temperature)
        known = np.where(np.isfinite(pressure), pressure, step.state.pressure)
        # Twice the ideal gas bounds the vapour up to Z = 0.5, where the guard has long refused.
        bound = 2.0 * v.vapour.molar_mass[row] * known * space / (GAS_CONSTANT * sure)
        small = nothing & (bound <= LEFT_OUT_SHARE * np.abs(out["liquid_mass"]))
        step.mark(small, Mark.VAPOUR_LEFT_OUT)
        out["vapour_mass"] = np.where(small, 0.0, out["vapour_mass"])
        step.sens["vapour_left_out"] = np.where(small, bound, 0.0)
        refused = refused & ~small
    step.mark(refused & (gas.verdict == 3), Mark.GUARD_REFUSED)
    step.mark(refused & (gas.verdict == 4), Mark.NO_VAPOUR_ROOT)
    step.mark(refused & (gas.verdict == 5), Mark.OUTSIDE_METHOD)


def _vapour_sensitivities(
    step: _Step, method: Method, gas: VapourState, by_p: FloatArray, by_t: FloatArray,
    saturated: tuple[BoolArray, BoolArray],
) -> None:  # fmt: skip
    """Derivatives of the vapour mass, added to those of the liquid."""
    v, out, sens = step.vessels, step.out, step.sens
    mass, density = out["vapour_mass"], np.where(np.isfinite(gas.density), gas.density, 0.0)
    by_p, by_t = np.where(np.isfinite(by_p), by_p, 0.0), np.where(np.isfinite(by_t), by_t, 0.0)
    reach = sens.get("_reach", np.ones(1))
    volume = out["tank_volume"]
    shell = density * v.expansion * (3.0 * v.capacity - (3.0 - reach) * volume)
    pressed = density * (v.strain_sum * v.capacity - (v.strain_sum - v.strain_vertical * reach) * volume)
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
    if not (by_pressure.any() or by_liquid.any()):
        sens["pressure"] = sens["pressure"] + by_p
        return
    assert v.saturation is not None
    row = v.saturation_row if len(v.saturation_row) > 1 else int(v.saturation_row[0])
    _, slope = v.saturation.pressure(out["vapour_temperature"], row)
    along = np.where(by_pressure, by_t / slope, 0.0)
    by_pressure_alone = sens["pressure"] + by_p
    sens["pressure"] = np.where(by_liquid, 0.0, by_pressure_alone + along)
    along_liquid = by_t + by_pressure_alone * slope
    sens["liquid_temperature"] = sens["liquid_temperature"] + np.where(by_liquid, along_liquid, 0.0)


def _sum(step: _Step, method: Method) -> None:
    """Liquid plus vapour, and the gas at its base state."""
    out, sens = step.out, step.sens
    for name in ("_reach", "_water_area"):
        sens.pop(name, None)
    vapour = out.get("vapour_mass", np.zeros(1))
    out["mass"] = np.broadcast_to(out["liquid_mass"] + vapour, step.marks.shape)
    if method & Method.VAPOUR:
        v, analysed = step.vessels, step.state.vapour_row
        assert v.vapour is not None
        heavier = 1.0 if analysed is None else v.vapour.molar_mass[analysed] / v.vapour.molar_mass[v.vapour_row]
        out["gas_standard_volume"] = vapour / (v.gas_standard_density * heavier)


def standard_uncertainty(result: Inventory, sigmas: Mapping[str, tuple[FloatArray, ...]]) -> FloatArray:
    """Standard uncertainty of each mass from independent errors of its inputs.

    Parameters
    ----------
    result : Inventory
        Masses with their sensitivities, n rows. [kg/unit]
    sigmas : mapping of str to tuple of FloatArray, shape (n,) or (1,)
        For each input of :data:`SENSITIVITIES`, the standard deviations of its independent errors
        (random, systematic, …), in SI. [unit]

    Returns
    -------
    FloatArray, shape (n,)
        Standard uncertainty of the mass. [kg]

    Notes
    -----
    Within one mass every error occurs once, so the named parts add in quadrature::

        u² = Σ_i c_i² Σ_k u_ik²        (1)

    References
    ----------
    .. [1] JCGM 100:2008 (GUM), eq. 10.
    """
    found = np.empty(len(result.marks))
    for block in blocks(len(found), BLOCK_ROWS):
        variance = np.zeros(len(found[block]))
        for name, parts in sigmas.items():
            squares = sum(np.square(part[block] if len(part) > 1 else part) for part in parts)
            variance += np.square(result.sensitivities[name][block]) * squares  # eq. 1
        found[block] = np.sqrt(np.where(np.isfinite(result["mass"][block]), variance, np.nan))
    return found
