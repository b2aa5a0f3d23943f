"""One chain from readings to mass: geometry, liquid and vapour, with analytic sensitivities.

The steps, in order: the capacity curve at the level gives volume and surface; the shell's strain gives
the factor K; the floating roof takes its displacement; β and κ give the density at the state; the
virial equation gives the vapour's; the sum is the mass. Every step works on columns of readings.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, fields

import numpy as np

from models.arrays import BLOCK_ROWS, FloatArray, IntArray, blocks
from models.columns import Inventory, Mark, Method, State, Step, Vessels
from models.geometry.head_stress import Widening
from models.geometry.roof import afloat_fraction
from models.liquid.state import Conditions, LiquidState
from models.space import vapour, vapour_conditions

RESULTS = {
    "level_fraction": "1", "gross_observed_volume": "m³", "free_water_volume": "m³", "shell_factor": "1",
    "gross_standard_volume": "m³", "net_standard_volume": "m³", "liquid_density": "kg/m³",
    "standard_density": "kg/m³", "liquid_mass": "kg", "vapour_volume": "m³", "compressibility_factor": "1",
    "vapour_density": "kg/m³", "vapour_mass": "kg", "gas_standard_volume": "m³", "mass": "kg",
    "tank_volume": "m³", "surface_area": "m²", "liquid_shell_temperature": "K", "full_factor": "1",
    "vapour_temperature": "K", "vapour_pressure": "Pa", "second_virial": "m³/mol", "third_virial": "m⁶/mol²",
    "reduced_density": "1", "roof_volume": "m³", "head_volume": "m³", "expansivity": "1/K", "compressibility": "1/Pa",
    "by_sample": "1", "by_sample_temperature": "1/K", "standard_by_sample": "1",
    "standard_by_sample_temperature": "1/K", "method_error": "1",
}  # fmt: skip

SENSITIVITIES = {
    "level": "kg/m", "water_level": "kg/m", "liquid_temperature": "kg/K", "ambient_temperature": "kg/K",
    "vapour_temperature": "kg/K", "pressure": "kg/Pa", "density": "kg/(kg/m³)", "density_temperature": "kg/K",
    "sediment_water": "kg", "capacity": "kg", "capacity_local": "kg", "expansion": "kg", "vapour_model": "kg",
    "molar_mass": "kg", "roof": "kg", "vapour_left_out": "kg",
}  # fmt: skip


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
    groups = vessels.method[rows] + KINDS_FROM * vessels.kind(rows)
    for number in np.unique(groups):  # a handful of methods, never a loop over vessels
        members = np.flatnonzero(groups == number)
        for block in blocks(len(members), BLOCK_ROWS):
            at = members[block]
            _compute(Method(int(number) % KINDS_FROM), vessels.take(rows[at]), state.take(at), made, at)
    return made.inventory()


@dataclass
class _Made:
    """Columns of all rows, made when a block first brings one: most vessels need few of them."""

    marks: IntArray
    of_one_method: bool
    columns: dict[str, FloatArray] = field(default_factory=dict)
    sensitivities: dict[str, FloatArray] = field(default_factory=dict)

    def put(self, step: Step, where: IntArray | slice) -> None:
        """One block's columns into their rows."""
        self.marks[where] = step.marks
        for columns, found, absent in ((self.columns, step.out, np.nan), (self.sensitivities, step.sens, 0.0)):
            for name, column in found.items():
                held = columns.get(name)
                if held is None and self.of_one_method and len(column) == 1 < len(self.marks):
                    columns[name] = np.broadcast_to(column, self.marks.shape)  # one value for all, never written
                    continue
                if held is not None and held.strides == (0,):
                    if len(column) == 1 and np.array_equal(column, held[:1], equal_nan=True):
                        continue
                    columns[name] = held.copy()  # until a block brings another
                if held is None:  # of one method, every block brings the same columns
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
    step = Step(vessels, state, np.zeros(len(made.marks[where]), dtype=np.intp), {}, {})
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        if method & Method.VAPOUR:
            step.conditions = vapour_conditions(step, method)
        if method & Method.LIQUID:
            if method & Method.FULL:
                _filled(step)
            else:
                _geometry(step)
            _liquid(step, method)
        else:
            _whole_vessel(step)
        if method & Method.VAPOUR:
            vapour(step, method)
        _sum(step, method)
    lost = ~np.isfinite(step.out["mass"]) & ((step.marks & ~_HARMLESS) == 0)
    step.mark(lost, Mark.MISSING)
    made.put(step, where)


KINDS_FROM = 1024  # above every flag of Method: which kind of liquid, so that a block has one
_HARMLESS = int(
    Mark.ROOF_LANDING_ZONE | Mark.SATURATION_LOW | Mark.SATURATION_HIGH | Mark.VAPOUR_SATURATED | Mark.GUARD_WIDE
    | Mark.LIQUID_FULL | Mark.VAPOUR_LEFT_OUT | Mark.VAPOUR_AT_PRESSURE | Mark.VAPOUR_AT_LIQUID_TEMPERATURE
    | Mark.STANDARD_OUTSIDE_METHOD | Mark.VAPOUR_BETWEEN
)  # fmt: skip


def _strain(step: Step, wet_temperature: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Sum of the shell's three strains and the vertical one, temperature and pressure together."""
    v, s = step.vessels, step.state
    shell = v.liquid_weight * wet_temperature
    weight = 1.0 - v.liquid_weight
    shell = shell + np.where(weight > 0.0, weight * s.ambient_temperature, 0.0)
    step.out["liquid_shell_temperature"] = shell
    thermal = np.where(v.expansion != 0.0, v.expansion * (shell - v.expansion_temperature), 0.0)
    gauge = np.where(v.strain_sum != 0.0, s.pressure - s.atmosphere - v.strain_pressure, 0.0)
    return 3.0 * thermal + v.strain_sum * gauge, thermal + v.strain_vertical * gauge


def _geometry(step: Step) -> None:
    """Level to volumes: the curve at the liquid and at the water, and the shell's factor."""
    v, s, out = step.vessels, step.state, step.out
    assert v.curves is not None
    outside = (s.level < v.bottom) | (s.level > v.top)
    level = s.level
    if outside.any():
        step.mark(outside & (v.is_table > 0.0), Mark.OUTSIDE_TABLE)
        step.mark(outside & (v.is_table == 0.0), Mark.OUTSIDE_VESSEL)
        level = np.where(outside, np.nan, level)
    unknown = np.isnan(s.water_level)
    if unknown.any():
        level = np.where(unknown, np.nan, level)
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
    spread, rise = 1.0 + total / 3.0, 1.0 + vertical * reach
    factor = spread**3 / rise
    out.update(
        tank_volume=volume, surface_area=area, free_water_volume=factor * water, shell_factor=factor,
        full_factor=spread**3, level_fraction=volume / v.capacity,
    )  # fmt: skip
    step.sens["_water_area"] = np.asarray(factor * water_area)
    step.sens.update(
        _by_sum=factor / spread, _by_vertical=np.asarray(factor * reach / rise), _full_by_sum=spread**2
    )


def _filled(step: Step) -> None:
    """A line that is kept full: no level, the whole capacity and the strain of a full vessel."""
    total, _ = _strain(step, step.state.liquid_temperature)
    spread = 1.0 + total / 3.0
    full = step.vessels.capacity + np.zeros(len(step.marks))
    step.out.update(
        tank_volume=full, surface_area=np.zeros(1), free_water_volume=np.zeros(1), shell_factor=spread**3,
        full_factor=spread**3, level_fraction=np.ones(1),
    )  # fmt: skip
    step.sens["_water_area"] = step.sens["_by_vertical"] = np.zeros(1)
    step.sens["_by_sum"] = step.sens["_full_by_sum"] = spread**2


def densities(vessels: Vessels, state: State) -> LiquidState:
    """Density of each content in its vessel and at its standard state, by the method of its liquid.

    Parameters
    ----------
    vessels : Vessels
        A row a reading, or one for all; all of one kind of liquid. [SI]
    state : State
        What was read. [SI]

    Returns
    -------
    LiquidState
        Columns of n rows; NaN where the method does not reach. [SI]
    """
    assert vessels.liquids is not None
    v, s = vessels, state
    return vessels.liquids.state(
        s.density,
        Conditions(s.density_temperature, s.density_pressure, v.standard_pressure),
        Conditions(s.liquid_temperature, s.pressure, s.atmosphere),
        Conditions(v.standard_temperature, v.standard_pressure, v.standard_pressure),
        v.liquid_row if s.liquid_row is None else s.liquid_row,
    )


def _density(step: Step) -> LiquidState:
    """The content's densities, and what they owe to their inputs, for the working and the sensitivities."""
    s, found = step.state, densities(step.vessels, step.state)
    known = np.isfinite(s.density + s.density_temperature + s.density_pressure + s.liquid_temperature + s.pressure)
    lost = np.isnan(found.density)
    step.mark(known & lost, Mark.LIQUID_OUTSIDE_METHOD)
    step.mark(known & ~lost & np.isnan(found.density_standard), Mark.STANDARD_OUTSIDE_METHOD)
    step.out.update(
        expansivity=found.expansivity, compressibility=found.compressibility, by_sample=found.by_sample,
        by_sample_temperature=found.by_sample_temperature, standard_by_sample=found.standard_by_sample,
        standard_by_sample_temperature=found.standard_by_sample_temperature, method_error=found.method_error,
    )  # fmt: skip
    return found


_NONE = np.zeros(1)
NOT_WIDENED = Widening(_NONE, _NONE, _NONE, _NONE, _NONE)


def _widening(step: Step, density: FloatArray) -> Widening:
    """What the head of the liquid adds to the volumes of the shell as tabulated."""
    v, s, out = step.vessels, step.state, step.out
    assert v.head_stress is not None
    row = v.head_row if len(v.head_row) > 1 else int(v.head_row[0])
    found = v.head_stress.widening(s.level, s.water_level, density, v.head_included, row)
    factor = out["shell_factor"]  # a table that holds the widening is multiplied by it, too
    scaled = Widening(*(np.asarray(factor * getattr(found, item.name)) for item in fields(found)))
    out["head_volume"] = scaled.volume
    return scaled


def _liquid(step: Step, method: Method) -> None:
    """Density of the sample to the state and to the standard state; volumes and liquid mass."""
    v, s, out, sens = step.vessels, step.state, step.out, step.sens
    liquid = _density(step)
    density, standard = liquid.density, liquid.density_standard
    water = s.sediment_water
    # The water's share of a wet sample leaves it as sampled: so the mass does not depend on the standard state.
    share = np.where(s.density_is_dry > 0.0, 1.0 - water, 1.0 - water * v.water_density / s.density)
    ratio = density / standard  # C_T C_P
    net = share * density
    factor, volume = out["shell_factor"], out["tank_volume"]
    widening = _widening(step, density) if method & Method.HEAD else NOT_WIDENED
    before_roof = factor * volume - out["free_water_volume"] + widening.volume
    displaced = np.zeros(1)
    slope = np.zeros(1)
    if method & Method.ROOF:
        afloat = afloat_fraction(s.level, v.roof_lands, v.roof_floats)
        landing = (s.level > v.roof_lands) & (s.level < v.roof_floats)
        step.mark(landing, Mark.ROOF_LANDING_ZONE)
        deducted = afloat * v.roof_mass * v.roof_volume_per_mass
        before_roof = before_roof + deducted
        weight = v.roof_mass if s.roof_load is None else v.roof_mass + s.roof_load
        displaced = afloat * weight
        slope = np.where(landing, weight / (v.roof_floats - v.roof_lands), 0.0)
        sens["roof"] = np.where(landing, weight * share, 0.0)
        out["roof_volume"] = deducted - displaced / density
    gross = before_roof - displaced / density
    mass = net * before_roof - displaced * share
    out.update(
        gross_observed_volume=gross, gross_standard_volume=gross * ratio,
        net_standard_volume=gross * ratio * (1.0 - water), liquid_density=density,
        standard_density=share * standard / (1.0 - water), liquid_mass=mass,
    )  # fmt: skip
    _liquid_sensitivities(step, net, before_roof, displaced, share, slope, widening)
    out["free_water_volume"] = out["free_water_volume"] + widening.water_volume


def _liquid_sensitivities(
    step: Step, net: FloatArray, before_roof: FloatArray, displaced: FloatArray, share: FloatArray,
    slope: FloatArray, widening: Widening,
) -> None:  # fmt: skip
    """Derivatives of the liquid mass; those of the vapour are added by the vapour's own step."""
    v, s, out, sens = step.vessels, step.state, step.out, step.sens
    volume = out["tank_volume"]
    by_sum, by_vertical = sens["_by_sum"], sens["_by_vertical"]  # dK by the strains
    stretch_temperature = v.expansion * (3.0 * by_sum - by_vertical)
    stretch_pressure = v.strain_sum * by_sum - v.strain_vertical * by_vertical
    liquid_volume = volume - out["free_water_volume"] / out["shell_factor"]
    stretched = liquid_volume + widening.volume / out["shell_factor"]
    shell = net * stretched * stretch_temperature
    full = net * (before_roof + out["liquid_density"] * widening.by_density)  # a denser liquid widens its tank
    dry = s.density_is_dry > 0.0
    # A wet sample that is denser holds less water by mass: 1 − share = f ρ_w/ρ_s.
    leaves_less = np.where(dry, 0.0, (out["liquid_density"] * before_roof - displaced) * (1.0 - share))
    by_log_density = full * out["by_sample"] + leaves_less
    surface = out["shell_factor"] * out["surface_area"] + widening.by_level
    sens["level"] = net * surface + slope * (net * v.roof_volume_per_mass - share)
    sens["water_level"] = net * (widening.by_water_level - sens["_water_area"])
    sens["liquid_temperature"] = -out["expansivity"] * full + v.liquid_weight * shell
    sens["ambient_temperature"] = (1.0 - v.liquid_weight) * shell
    sens["pressure"] = out["compressibility"] * full + net * stretched * stretch_pressure
    sens["density"] = by_log_density / s.density
    sens["density_temperature"] = full * out["by_sample_temperature"]
    sens["expansion"] = full * out["method_error"]
    sens["capacity"] = net * out["shell_factor"] * liquid_volume
    sens["capacity_local"] = net * out["shell_factor"] * volume
    gross = out["gross_observed_volume"]
    leaves = np.where(dry, 1.0, v.water_density / s.density)
    sens["sediment_water"] = -leaves * out["liquid_density"] * gross


def _whole_vessel(step: Step) -> None:
    """A vessel of gas alone: no level, the whole capacity and the shell at the gas's temperature."""
    total, _ = _strain(step, step.state.vapour_temperature)
    rows = len(step.marks)
    nothing = np.zeros(rows)
    spread = 1.0 + total / 3.0
    step.sens["_by_sum"] = step.sens["_by_vertical"] = nothing
    step.sens["_full_by_sum"] = spread**2
    step.out.update(
        tank_volume=nothing, shell_factor=np.ones(rows), full_factor=spread**3 + nothing,
        free_water_volume=nothing, gross_observed_volume=nothing, liquid_mass=nothing,
    )  # fmt: skip


def _sum(step: Step, method: Method) -> None:
    """Liquid plus vapour, and the gas at its base state."""
    out, sens = step.out, step.sens
    for name in ("_water_area", "_by_sum", "_by_vertical", "_full_by_sum"):
        sens.pop(name, None)
    gas = out.get("vapour_mass", np.zeros(1))
    out["mass"] = np.broadcast_to(out["liquid_mass"] + gas, step.marks.shape)
    if method & Method.VAPOUR:
        v, analysed = step.vessels, step.state.vapour_row
        assert v.vapour is not None
        heavier = 1.0 if analysed is None else v.vapour.molar_mass[analysed] / v.vapour.molar_mass[v.vapour_row]
        out["gas_standard_volume"] = gas / (v.gas_standard_density * heavier)


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
