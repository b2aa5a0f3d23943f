"""A level by other means than a level gauge: an indicated volume, a percentage, the head of the liquid."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from app.services.compile import CompiledVessel
from models import constants, units
from models.columns import Inventory, State, Vessels
from models.geometry.curves import Curve, Curves
from models.mass import densities

FloatColumns = NDArray[np.float64]

HEAD = "differential_pressure_kpa"
GRAVITY_SHARE = 0.0015  # of standard gravity: 9.78 to 9.83 m/s² over the earth, ±0.26 %, over √3
BEYOND = 1.0  # m past the end of a curve: where an impossible volume is put, so that it is refused as outside


def volume_level(vessel: CompiledVessel, quantity: str) -> Callable[[float], float] | None:
    """The level at which the vessel holds an indicated volume, or a share of its capacity; None for others."""
    curve = vessel.curve
    if curve is None or quantity not in ("liquid_volume_m3", "liquid_volume_pct"):
        return None
    scale = 1.0 if quantity == "liquid_volume_m3" else vessel.capacity / 100.0
    stack = Curves.from_curves([curve])
    return lambda value: _level(stack, curve, value * scale)


def _level(stack: Curves, curve: Curve, volume: float) -> float:
    if volume > curve.volume_at_top:
        return curve.top + BEYOND
    if volume < float(curve.volumes[0]):
        return curve.bottom - BEYOND
    return float(stack.level(volume))


def _column(vessels: tuple[CompiledVessel, ...], rows: int, value: Callable[[CompiledVessel], float]) -> FloatColumns:
    column = np.array([value(vessel) for vessel in vessels], dtype=np.float64)
    return column if len(vessels) > 1 else np.full(rows, column[0])


def state_density(vessels: tuple[CompiledVessel, ...], compiled: Vessels, state: State) -> FloatColumns:
    """Density of the liquid in each row's state; at its standard pressure where none was read. [kg/m³]"""
    rows = np.zeros(state.rows, dtype=np.intp) if len(vessels) == 1 else np.arange(state.rows, dtype=np.intp)
    standard = compiled.standard_pressure[rows]
    density = np.full(state.rows, np.nan)
    if compiled.liquids is None:
        return density
    pressed = replace(state, pressure=np.where(np.isfinite(state.pressure), state.pressure, standard))
    kinds = compiled.kind(rows)
    for kind in np.unique(kinds):
        members = np.flatnonzero(kinds == kind)
        density[members] = densities(compiled.take(rows[members]), pressed.take(members)).density
    return density


def by_head(
    vessels: tuple[CompiledVessel, ...], compiled: Vessels, state: State, where: NDArray[np.bool_]
) -> State:
    """Rows whose level is a head of liquid in kPa get the level that it stands for: h = tap + ΔP/(g ρ)."""
    if not where.any():
        return state
    density = state_density(vessels, compiled, state)
    tap = _column(vessels, state.rows, lambda one: one.body.gauging.tap_m)
    level = tap + state.level * units.PASCAL_PER_KPA / (constants.STANDARD_GRAVITY * density)
    return replace(state, level=np.where(where, level, state.level))


def levels_per_unit(
    vessels: tuple[CompiledVessel, ...], compiled: Vessels, state: State, result: Inventory
) -> Mapping[str, FloatColumns]:
    """Change of the level for one unit of each quantity that may stand for it. [m/unit]"""
    with np.errstate(divide="ignore", invalid="ignore"):
        area = np.nan_to_num(1.0 / result["surface_area"], posinf=0.0, neginf=0.0)
        density = state_density(vessels, compiled, state)
        head = units.PASCAL_PER_KPA / (constants.STANDARD_GRAVITY * density)
    capacity = _column(vessels, state.rows, lambda one: one.capacity)
    return {"liquid_volume_m3": area, "liquid_volume_pct": area * capacity / 100.0, HEAD: np.nan_to_num(head)}


def head_sensitivities(
    vessels: tuple[CompiledVessel, ...], state: State, result: Inventory, where: NDArray[np.bool_]
) -> FloatColumns:
    """A head weighs: its level follows the density, so the mass hardly does. What gravity leaves of the level. [m]

    Sensitivities of rows by head are corrected in place for the level's own dependence on the density:
    dh = −(h − tap) dρ/ρ.
    """
    if not where.any():
        return np.zeros(1)
    tap = _column(vessels, state.rows, lambda one: one.body.gauging.tap_m)
    by_log_density = np.where(where, -(state.level - tap) * result.sensitivities["level"], 0.0)
    for name, change in (
        ("density", result["by_sample"] * by_log_density / state.density),
        ("liquid_temperature", -result["expansivity"] * by_log_density),
        ("density_temperature", result["by_sample_temperature"] * by_log_density),
        ("expansion", result["method_error"] * by_log_density),
        ("pressure", result["compressibility"] * by_log_density),
    ):
        result.sensitivities[name][:] += np.nan_to_num(change)
    return np.where(where, GRAVITY_SHARE * np.nan_to_num(state.level - tap), 0.0)
