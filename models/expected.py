"""The chain read backwards: which level, pressure or temperature belongs to a mass.

Nothing is computed here but the search: every trial is a whole inventory, so that what is found, put back
into the chain, gives the mass again.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np

from models.arrays import FloatArray, IntArray
from models.columns import Method, State, Vessels
from models.constants import GAS_CONSTANT
from models.mass import inventory
from models.saturation import SaturationColumns

GRID_POINTS = 33
SEARCH_STEPS = 120  # bisection alone would end a cell of the grid at its last bit
MASS_TOLERANCE = 1e-15  # relative: a mass is hit
STEP_TOLERANCE = 2e-16  # relative: a step that no longer moves
MISS_TOLERANCE = 1e-10  # relative: a mass that is missed by more, beside a trial without a mass, is not reached
END_ROUNDING = 1e-12  # relative: a full vessel stays full
FACTOR_NODES = np.geomspace(0.1, 10.0, GRID_POINTS)  # where the search starts: beyond every Z of the virial equation

Trial = Callable[[FloatArray, IntArray], tuple[FloatArray, FloatArray]]
"""Masses at trial values, and their slopes; the second argument is the row of each trial."""


@dataclass(frozen=True)
class Expected:
    """What belongs to each mass, one row a mass.

    Parameters
    ----------
    value : FloatArray, shape (n,)
        What was looked for; NaN where nothing in reach has this mass. [unit of what was looked for]
    nearest : FloatArray, shape (n,)
        Where there is no value: the trial at which the search ended, whose marks say why. [same unit]
    least, most : FloatArray, shape (n,)
        Least and greatest mass in reach; NaN where no trial has a mass. [kg]
    """

    value: FloatArray
    nearest: FloatArray
    least: FloatArray
    most: FloatArray


def level_of_mass(vessels: Vessels, rows: IntArray | None, state: State, mass: FloatArray) -> Expected:
    """Level of the liquid at which a vessel holds a mass, liquid and vapour together.

    Parameters
    ----------
    vessels : Vessels
        Compiled vessels that have a level. [SI]
    rows : IntArray, shape (n,), or None
        Row of each mass's vessel; None where all are of the first. [1]
    state : State
        Everything but the level, n rows or one; its own level is not looked at. [SI]
    mass : FloatArray, shape (n,)
        The masses. [kg]

    Returns
    -------
    Expected
        Levels on the datum of the capacity curve; where a roof that comes off its legs lets several levels
        have one mass, the highest. [m]

    Notes
    -----
    The root h of M(h) = m, by Newton's method with the chain's own slope, inside a bracket::

        h' = h − (M(h) − m) / (∂M/∂h)        (1)

    References
    ----------
    .. [1] W. H. Press et al., "Numerical Recipes", 3rd ed., 2007, section 9.4 (Newton inside a bracket).
    """
    own = _rows(rows, mass)
    bottom, top = vessels.bottom[own], vessels.top[own]
    water = np.broadcast_to(state.water_level, mass.shape)
    lowest = np.where(water > bottom, np.minimum(water, top), bottom)
    ladder = lowest[:, None] + (top - lowest)[:, None] * np.linspace(0.0, 1.0, GRID_POINTS)
    legs = np.stack([vessels.roof_lands[own], vessels.roof_floats[own]], axis=1)
    grid = np.concatenate([ladder, legs], axis=1)
    grid = np.sort(np.clip(grid, lowest[:, None], top[:, None]), axis=1)

    def trial(level: FloatArray, which: IntArray) -> tuple[FloatArray, FloatArray]:
        found = inventory(vessels, own[which], replace(state.take(which), level=level))
        return found["mass"], found.sensitivities["level"]

    return _search(trial, grid, mass, lacking_is_much=False)


def pressure_of_mass(vessels: Vessels, rows: IntArray | None, state: State, mass: FloatArray) -> Expected:
    """Pressure at which a vessel of gas alone holds a mass.

    Parameters
    ----------
    vessels : Vessels
        Compiled vessels of gas. [SI]
    rows : IntArray, shape (n,), or None
        Row of each mass's vessel; None where all are of the first. [1]
    state : State
        Everything but the pressure, n rows or one. [SI]
    mass : FloatArray, shape (n,)
        The masses, above 0. [kg]

    Returns
    -------
    Expected
        Absolute pressures. [Pa]

    Notes
    -----
    The search begins around the pressure of an ideal gas::

        P_0 = M R T / (m V)        (1)

    References
    ----------
    .. [1] J. M. Smith, H. C. Van Ness, M. M. Abbott, "Introduction to Chemical Engineering
       Thermodynamics", 7th ed., 2005, ch. 3.
    """
    own = _rows(rows, mass)
    assert vessels.vapour is not None
    series = vessels.vapour_row[own] if state.vapour_row is None else state.vapour_row
    molar_mass = vessels.vapour.molar_mass[series]
    ideal = mass * GAS_CONSTANT * state.vapour_temperature / (molar_mass * vessels.capacity[own])  # eq. 1
    grid = ideal[:, None] * FACTOR_NODES

    def trial(pressure: FloatArray, which: IntArray) -> tuple[FloatArray, FloatArray]:
        found = inventory(vessels, own[which], replace(state.take(which), pressure=pressure))
        return found["mass"], found.sensitivities["pressure"]

    return _search(trial, grid, mass, lacking_is_much=True)


def temperature_of_mass(vessels: Vessels, rows: IntArray | None, state: State, mass: FloatArray) -> Expected:
    """Temperature at which a vessel of gas alone holds a mass at its pressure.

    Parameters
    ----------
    vessels : Vessels
        Compiled vessels of gas. [SI]
    rows : IntArray, shape (n,), or None
        Row of each mass's vessel; None where all are of the first. [1]
    state : State
        Everything but the gas's temperature, n rows or one; an ambient temperature that is NaN is taken
        to be the gas's. [SI]
    mass : FloatArray, shape (n,)
        The masses, above 0. [kg]

    Returns
    -------
    Expected
        Temperatures. [K]

    Notes
    -----
    The whole range of the coefficients is searched, as falling temperatures, at which the mass rises.
    """
    own = _rows(rows, mass)
    lowest, highest = _vapour_range(vessels, own, state)
    grid = -np.geomspace(highest, lowest, GRID_POINTS, axis=1)

    def trial(cooling: FloatArray, which: IntArray) -> tuple[FloatArray, FloatArray]:
        here, warmth = state.take(which), -cooling
        ambient = np.where(np.isnan(here.ambient_temperature), warmth, here.ambient_temperature)
        here = replace(here, vapour_temperature=warmth, ambient_temperature=ambient)
        found = inventory(vessels, own[which], here)
        return found["mass"], -found.sensitivities["vapour_temperature"]

    return _warmth(_search(trial, grid, mass, lacking_is_much=True))


def full_temperature(
    vessels: Vessels, rows: IntArray | None, state: State, mass: FloatArray, saturation: SaturationColumns,
    saturation_row: IntArray,
) -> Expected:  # fmt: skip
    """Temperature at which a mass, all of it liquid, fills the whole of its closed vessel.

    Parameters
    ----------
    vessels : Vessels
        Compiled vessels whose substance has a liquid. [SI]
    rows : IntArray, shape (n,), or None
        Row of each mass's vessel; None where all are of the first. [1]
    state : State
        The sample and the free water, n rows or one; its temperatures and pressure are not looked at. [SI]
    mass : FloatArray, shape (n,)
        The masses. [kg]
    saturation : SaturationColumns
        Vapour pressures. [1]
    saturation_row : IntArray, shape (n,)
        Row of each mass's vapour pressure. [1]

    Returns
    -------
    Expected
        Temperatures; NaN where the methods do not reach. [K]

    Notes
    -----
    With the vapour gone and the shell as warm as the liquid, V_w the volume of free water::

        K_T(T) (V_T − V_w) ρ(T, p_sat(T)) = m        (1)

    References
    ----------
    .. [1] Conservation of mass; the density by the liquid's own method.
    """
    own = _rows(rows, mass)
    full = vessels.take(own)
    free = full.capacity - _free_water(full, state)  # the volume of eq. 1
    full = replace(full, method=np.full(len(own), int(Method.LIQUID | Method.FULL)), capacity=free)
    step = np.linspace(1.0, 0.0, GRID_POINTS)
    low, high = saturation.lowest[saturation_row], saturation.highest[saturation_row]
    grid = -np.clip(low[:, None] + (high - low)[:, None] * step, low[:, None], high[:, None])

    def trial(cooling: FloatArray, which: IntArray) -> tuple[FloatArray, FloatArray]:
        warmth = -cooling
        pressure, slope = saturation.pressure(warmth, saturation_row[which])
        here = replace(
            state.take(which), liquid_temperature=warmth, ambient_temperature=warmth, pressure=pressure
        )
        found = inventory(full, which, here)
        by = found.sensitivities
        by_warmth = by["liquid_temperature"] + by["ambient_temperature"] + by["pressure"] * slope
        return found["mass"], -by_warmth

    return _warmth(_search(trial, grid, mass, lacking_is_much=False))


def _rows(rows: IntArray | None, mass: FloatArray) -> IntArray:
    return np.zeros(len(mass), dtype=np.intp) if rows is None else rows


def _vapour_range(vessels: Vessels, own: IntArray, state: State) -> tuple[FloatArray, FloatArray]:
    """Lowest and highest temperature at which each row's gas can be computed. [K]"""
    assert vessels.vapour is not None
    gas = vessels.vapour
    series = vessels.vapour_row[own] if state.vapour_row is None else state.vapour_row
    spare = np.where(gas.spare[series] < 0, series, gas.spare[series])
    lowest = np.minimum(gas.lowest[series], gas.lowest[spare])
    return lowest, np.maximum(gas.highest[series], gas.highest[spare])


def _free_water(full: Vessels, state: State) -> FloatArray:
    """Volume below the free water's level, as tabulated; none in a vessel without a level. [m³]"""
    water = np.broadcast_to(state.water_level, full.capacity.shape)
    if full.curves is None:
        return np.zeros(len(full.capacity))
    wet = (water > full.bottom) & (water <= full.top)
    volume = full.curves.volume(np.where(wet, water, full.curves.bottom[full.curve_row]), full.curve_row)
    return np.where(wet, volume, 0.0)


def _warmth(cooling: Expected) -> Expected:
    """A search over falling temperatures, as temperatures."""
    return replace(cooling, value=-cooling.value, nearest=-cooling.nearest)


def _search(trial: Trial, grid: FloatArray, mass: FloatArray, *, lacking_is_much: bool) -> Expected:
    """The last place on an increasing grid where the mass comes up to what is wanted, refined to its last bits.

    ``lacking_is_much`` says on which side a trial lies that has no mass: a gas too dense holds too much.
    """
    found, _ = trial(grid.reshape(-1), np.repeat(np.arange(len(mass)), grid.shape[1]))
    found = found.reshape(grid.shape)
    enough = np.where(np.isnan(found), lacking_is_much, found >= mass[:, None])
    rises = ~enough[:, :-1] & enough[:, 1:]
    cell = grid.shape[1] - 2 - np.argmax(rises[:, ::-1], axis=1)
    every, crossed = np.arange(len(mass)), rises.any(axis=1)
    value, nearest = _refined(trial, mass, (grid[every, cell], grid[every, cell + 1]), lacking_is_much)
    for end in (0, -1):  # exactly empty, exactly full
        hit = ~crossed & (np.abs(found[:, end] - mass) <= END_ROUNDING * mass)
        value, crossed = np.where(hit, grid[:, end], value), crossed | hit
    value = np.where(crossed, value, np.nan)
    nearest = np.where(crossed, nearest, np.where(enough[:, 0], grid[:, 0], grid[:, -1]))
    none = np.isnan(found).all(axis=1)
    least = np.where(none, np.nan, np.min(np.where(np.isnan(found), np.inf, found), axis=1))
    most = np.where(none, np.nan, np.max(np.where(np.isnan(found), -np.inf, found), axis=1))
    return Expected(value, nearest, least, most)


def _refined(
    trial: Trial, mass: FloatArray, bracket: tuple[FloatArray, FloatArray], lacking_is_much: bool
) -> tuple[FloatArray, FloatArray]:
    """Newton's method inside a bracket, bisection where it does not halve the miss; and where the search ended."""
    low, high = bracket
    x = 0.5 * (low + high)
    former = np.full(mass.shape, np.inf)
    every, done = np.arange(len(mass)), np.zeros(mass.shape, dtype=bool)
    for _ in range(SEARCH_STEPS):
        found, slope = trial(x, every)
        miss = found - mass
        much = np.where(np.isnan(found), lacking_is_much, miss >= 0.0)
        low, high = np.where(much, low, x), np.where(much, x, high)
        with np.errstate(invalid="ignore", divide="ignore"):
            newton = x - miss / slope  # eq. 1 of level_of_mass
            quick = (newton > low) & (newton < high) & (np.abs(miss) < 0.5 * former)
        following = np.where(quick, newton, 0.5 * (low + high))
        done |= (np.abs(miss) <= MASS_TOLERANCE * mass) | (np.abs(newton - x) <= STEP_TOLERANCE * np.abs(x))
        done |= following == x
        if done.all():
            break
        former = np.where(quick | np.isnan(miss), np.abs(miss), np.inf)
        x = np.where(done, x, following)
    reached = np.abs(miss) <= MISS_TOLERANCE * mass
    return np.where(reached, x, np.nan), high if lacking_is_much else low
