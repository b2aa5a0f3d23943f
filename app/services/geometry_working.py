"""The working of a vessel's geometry: from the level that was read to the volume of its liquid."""

from __future__ import annotations

from collections.abc import Iterator
from typing import TYPE_CHECKING

from app.services.liquid_working import Step, step
from app.services.parts import at_row, celsius_of
from models.columns import Method

if TYPE_CHECKING:
    from app.services.measure import Measured

ORDER = "API MPMS ch. 12.1.1, order of calculation (from memory)"
STRAIN = (
    "V(h; ε) = (1+ε)³ V(h/(1+ε)): homogeneous strain at a fixed level; (1+ε)² for upright cylinders, "
    "the C_TSh of API MPMS 12.1.1"
)
HEAD = "thin-wall elasticity; ISO 7507-1:2003 and API MPMS ch. 2.2A (places from memory)"
TAPE = "linear expansion; API MPMS ch. 3.1A (from memory)"


def geometry_steps(measured: Measured, row: int) -> Iterator[Step]:
    """Level, volume, shell, head, free water and roof, to the gross observed volume."""
    vessel, result = measured.vessel(row), measured.result
    if vessel.is_full:
        yield step("volume", "V", result["tank_volume"][row], "m³", "kept full: the whole capacity", "definition")
        yield from _strain(measured, row)
        yield step("shell factor", "K", result["shell_factor"][row], "1", "(1 + Σε/3)³: of a full vessel", STRAIN)
        yield step("gross observed volume", "GOV", result["gross_observed_volume"][row], "m³", "K V", ORDER)
        return
    yield from _level(measured, row)
    yield from _strain(measured, row)
    factor = result["shell_factor"][row]
    yield step("shell factor", "K", factor, "1", "(1 + Σε/3)³/(1 + ε_z (h − h_0) A/V)", STRAIN)
    head = vessel.method & Method.HEAD
    if head:
        yield step("density of the head in the table", "ρ_t", vessel.parameters["head_included"], "kg/m³",
                   "head_included_at_kg_m3; 0 where the table does not hold it", "definition")  # fmt: skip
        yield step("widening by the head", "ΔV_head", result["head_volume"][row], "m³",
                   "K {ρ S(h|h_w) − ρ_t [S(h) − S(h_w)]}, S = (π g D³/8E) Σ_courses [(h−z_k)₊² − (h−z_k+1)₊²]/t_k, "
                   "S(h|h_w) of the wall above h_w",
                   HEAD)  # fmt: skip
    elif vessel.parameters["head_included"] > 0.0:
        yield step("density of the head in the table", "ρ_t", vessel.parameters["head_included"], "kg/m³",
                   "the table stands as it was made: no courses are given to correct it by", "definition")  # fmt: skip
    water = result["free_water_volume"][row]
    widened = ", and the head's widening beside it" if head else ""
    yield step("free water", "K V(h_w)", water, "m³", f"the same curve at the water's level, times K{widened}", ORDER)
    roof = bool(vessel.method & Method.ROOF)
    if roof:
        yield from _roof(measured, row)
    form = "K V(h) − K V(h_w)" + (" + ΔV_head" if head else "") + (" + ΔV_roof" if roof else "")
    yield step("gross observed volume", "GOV", result["gross_observed_volume"][row], "m³", form, ORDER)


def _level(measured: Measured, row: int) -> Iterator[Step]:
    vessel, result, warm = measured.vessel(row), measured.result, measured.warmed
    assert vessel.curve is not None
    level = at_row(measured.state.level, row)
    if warm is not None:
        tape, reference = at_row(warm.tape, row), at_row(warm.reference, row)
        yield step("level as read", "h_read", level - tape - reference, "m", "before any warmth", "as read")
        yield step("warm tape", "Δ_tape", tape, "m", "L α (T − T_tape) of what hangs; below 0 for an ullage", TAPE)
        yield step("warm reference point", "Δ_H", reference, "m", "H α (T − T_H) of what carries it", TAPE)
    yield step("innage", "h", level, "m",
               "level on the curve's datum; an ullage is taken from the reference height", ORDER)  # fmt: skip
    yield step("lowest level", "h_0", vessel.curve.bottom, "m", "where the curve begins", "definition")
    yield step("volume", "V(h)", result["tank_volume"][row], "m³", vessel.curve.kind, vessel.curve.source)
    yield step("surface", "A(h)", result["surface_area"][row], "m²", "slope of the same curve", vessel.curve.source)


def _strain(measured: Measured, row: int) -> Iterator[Step]:
    """What the wall's temperature and the pressure do, until the strains that make K."""
    p, state = measured.vessel(row).parameters, measured.state
    wall = measured.result["liquid_shell_temperature"][row]
    yield step("shell temperature", "T_shell", celsius_of(wall), "°C",
               "that of the liquid (insulated)" if p["liquid_weight"] == 1.0 else "(7 T_liquid + T_ambient)/8",
               "API MPMS ch. 12.1.1")  # fmt: skip
    yield step("shell's own temperature", "T_0", celsius_of(p["expansion_temperature"]), "°C",
               "of the dimensions or the table", "definition")  # fmt: skip
    yield step("expansion of the shell", "α", p["expansion"], "1/K", "linear", "definition")
    thermal = p["expansion"] * (wall - p["expansion_temperature"])
    total, vertical = 3.0 * thermal, thermal
    if p["strain_sum"] != 0.0:
        over = at_row(state.pressure, row) - at_row(state.atmosphere, row) - p["strain_pressure"]
        if over != over:  # no pressure was read: that of the vapour counts
            over = float(measured.result["vapour_pressure"][row]) - at_row(state.atmosphere, row) - p["strain_pressure"]
        yield step("pressure on the shell", "ΔP", over / 1e3, "kPa", "gauge, above that of the table", "as read")
        for name, symbol, strain in (
            ("strains by pressure, sum", "Σε_P", p["strain_sum"]),
            ("strain by pressure, vertical", "ε_P,z", p["strain_vertical"]),
        ):
            yield step(name, symbol, strain * 1e3, "1/kPa",
                       "thin closed shell: hoop D(1 − ν/2)/2tE, axial D(1 − 2ν)/4tE, sphere D(1 − ν)/4tE each way",
                       "Roark's Formulas for Stress and Strain, 7th ed., table 13.1 (place from memory)")  # fmt: skip
        total, vertical = total + p["strain_sum"] * over, vertical + p["strain_vertical"] * over
    yield step("strains, sum", "Σε", total, "1", "3 α (T_shell − T_0) + Σε_P ΔP", STRAIN)
    yield step("strain, vertical", "ε_z", vertical, "1", "α (T_shell − T_0) + ε_P,z ΔP", STRAIN)


def _roof(measured: Measured, row: int) -> Iterator[Step]:
    p, load = measured.vessel(row).parameters, measured.state.roof_load
    weight = p["roof_mass"] + (0.0 if load is None else at_row(load, row))
    yield step("roof and what lies on it", "W", weight, "kg", "roof with its rain and snow", "as read")
    yield step("roof in the table", "1/ρ_table", p["roof_volume_per_mass"], "m³/kg",
               "of roof_deducted_at_kg_m3; 0 where the table does not deduct it", "definition")  # fmt: skip
    yield step("floating roof", "ΔV_roof", measured.result["roof_volume"][row], "m³",
               "−W/ρ once afloat; W_roof/ρ_table − W/ρ where the table deducts the roof; linear between landing and "
               "floating",
               "API MPMS ch. 12.1.1 (from memory)")  # fmt: skip
