"""The working behind one mass, step by step, and its budget, part by part."""

from __future__ import annotations

import math
from collections.abc import Iterator
from typing import TYPE_CHECKING, Any

from app.services.compositions import virial_columns
from app.services.geometry_working import ORDER, STRAIN, geometry_steps
from app.services.liquid_working import Sampled, Step, density_steps, step
from app.services.liquids import SATURATED
from app.services.measure import Measured
from app.services.parts import at_row, celsius_of
from models.columns import Mark
from models.estimate import Estimate, combine

if TYPE_CHECKING:
    from app.services.carry import Carried


def working_steps(measured: Measured, row: int) -> list[Step]:
    """Each factor with its symbol, value, unit, method and reference, in the order of the chain."""
    carried = measured.carried.get(row)
    if carried is not None and carried.stated is not None:
        mass, how = carried.stated.value, "the vessel was read empty" if carried.empty else "weighed, as it stands"
        return [step("stock-take", "M", mass, "kg", how, "as read"), *_moved(measured, row, carried, mass)]
    vessel = measured.vessel(row)
    steps: list[Step] = []
    if vessel.has_liquid:
        steps.extend(geometry_steps(measured, row))
        steps.extend(_liquid(measured, row))
    if vessel.has_vapour:
        steps.extend(_vapour(measured, row))
    symbols = "M = M_liquid + M_vapour" if vessel.has_vapour else "M = M_liquid"
    steps.append(step("mass", "M", measured.result["mass"][row], "kg", symbols, ORDER))
    if carried is not None:
        steps.extend(_moved(measured, row, carried, float(measured.result["mass"][row])))
    return steps


def _moved(measured: Measured, row: int, carried: Carried, read: float) -> Iterator[Step]:
    """From the reading to the instant that was asked for."""
    if measured.instant(row) == int(measured.collected.at[row]):
        return
    moved = carried.moved.value
    yield step("moved", "ΔM", moved, "kg", "receipts less deliveries between the reading and the instant", "as read")
    yield step("mass at the instant", "M(t)", read + moved, "kg", "M + ΔM", ORDER)


def _liquid(measured: Measured, row: int) -> Iterator[Step]:
    result, state, vessel = measured.result, measured.state, measured.vessel(row)
    chosen = measured.chosen["density"].usable[row]
    glass = 1.0 if measured.glass is None else at_row(measured.glass, row)
    if glass != 1.0:
        yield step("hydrometer's reading", "ρ_h", at_row(state.density, row) / glass, "kg/m³", "of glass", "as read")
        yield step("glass of the hydrometer", "HYC", glass, "1",
                   "1 − 2.3e-5 (T_s − t_c) − 2e-8 (T_s − t_c)², t_c of 15 or 20 °C; in °F from 60 °F "
                   "1 − 1.278e-5 (t − 60) − 6.2e-9 (t − 60)²; ρ_s = ρ_h HYC",
                   "API MPMS ch. 11.1-1980; ASTM D1298")  # fmt: skip
    yield step("sample density", "ρ_s", at_row(state.density, row), "kg/m³",
                "laboratory sample" if chosen else "the substance's own figure: no sample was ever read",
                "as read")  # fmt: skip
    yield step(
        "sample temperature",
        "T_s",
        celsius_of(at_row(state.density_temperature, row)),
        "°C",
        "as read",
        "as read",
    )
    yield step("sample pressure", "P_s", at_row(state.density_pressure, row) / 1000.0, "kPa", "absolute", "as read")
    yield step(
        "liquid temperature",
        "T",
        celsius_of(at_row(state.liquid_temperature, row)),
        "°C",
        "mean of the liquid",
        "as read",
    )
    yield step("liquid pressure", "P", _pressure(measured, row) / 1000.0, "kPa",
                "absolute; of the space above the liquid: the liquid's own head is left out", ORDER)  # fmt: skip
    yield step(
        "standard temperature",
        "T_std",
        celsius_of(vessel.parameters["standard_temperature"]),
        "°C",
        "the site's base temperature",
        "definition",
    )
    equilibrium = (
        "absolute; the site's base pressure: where that of equilibrium is higher, the method takes the saturated liquid"
        if isinstance(measured.liquid(row), SATURATED)
        else "absolute; the site's base pressure or, where higher, the vapour pressure at T_std"
    )
    yield step("standard pressure", "P_std", vessel.parameters["standard_pressure"] / 1000.0, "kPa", equilibrium,
               "definition")  # fmt: skip
    yield from density_steps(content(measured, row))
    yield step(
        "sediment and water",
        "f",
        at_row(state.sediment_water, row),
        "1",
        "volume fraction of the sample",
        "as read",
    )
    yield step("water density", "ρ_w", vessel.parameters["water_density"], "kg/m³",
                "of the water in a wet sample, 15 °C", "M. Tanaka et al., Metrologia 38 (2001) 301-309")  # fmt: skip
    yield step("standard density", "ρ_std", result["standard_density"][row], "kg/m³",
                "ρ_s,std (1 − f ρ_w/ρ_s)/(1 − f) of a wet sample, ρ_s,std of a dry one", ORDER)  # fmt: skip
    yield step("gross standard volume", "GSV", result["gross_standard_volume"][row], "m³", "GOV C_T C_P", ORDER)
    yield step("net standard volume", "NSV", result["net_standard_volume"][row], "m³", "GSV (1 − f)", ORDER)
    known = math.isfinite(result["standard_density"][row])
    method = "NSV ρ_std" if known else "GOV ρ (1 − f ρ_w/ρ_s) of a wet sample, GOV ρ (1 − f) of a dry one"
    yield step("liquid mass", "M_liquid", result["liquid_mass"][row], "kg", method, ORDER)


def content(measured: Measured, row: int) -> Sampled:
    """The liquid of a row: its sample, where it is, and its standard state."""
    state, held = measured.state, measured.vessel(row).parameters
    return Sampled(
        measured.liquid(row), at_row(state.density, row),
        (at_row(state.density_temperature, row), at_row(state.density_pressure, row)),
        (at_row(state.liquid_temperature, row), _pressure(measured, row)),
        (held["standard_temperature"], held["standard_pressure"]), at_row(state.atmosphere, row),
    )  # fmt: skip


def _pressure(measured: Measured, row: int) -> float:
    """Pressure of the space: as read, or the vapour pressure that stood for it."""
    read = at_row(measured.state.pressure, row)
    return read if math.isfinite(read) else float(measured.result["vapour_pressure"][row])


VAPOUR_BASIS = {
    Mark.VAPOUR_AT_PRESSURE: "no vapour temperature is read: saturated at the measured pressure",
    Mark.VAPOUR_SATURATED: "computed above saturation beside its liquid: taken as saturated at its pressure",
    Mark.VAPOUR_AT_LIQUID_TEMPERATURE: "no pressure is read: saturated at the liquid's temperature",
}
NO_SUCH_VAPOUR = "no vapour of the substance stands at the pressure as read: saturated at the liquid's temperature"
NO_BOILING = "that of the liquid: at the pressure as read its own boiling point is not known"
BESIDE_BLANKET = "the product's vapour pressure at T_v, its part of the pressure beside the blanket (Dalton's law)"
NO_BLANKET = "that of the space: the product's vapour pressure has reached it and no blanket is left"


def _vapour(measured: Measured, row: int) -> Iterator[Step]:
    result, vessel = measured.result, measured.vessel(row)
    marks = Mark(int(result.marks[row]))
    basis = next((words for mark, words in VAPOUR_BASIS.items() if marks & mark), "as read")
    unread = not math.isfinite(at_row(measured.state.vapour_temperature, row))
    if marks & Mark.VAPOUR_AT_LIQUID_TEMPERATURE and math.isfinite(at_row(measured.state.pressure, row)):
        basis = NO_SUCH_VAPOUR
    if vessel.is_blanketed:
        basis = BESIDE_BLANKET if result["vapour_pressure"][row] < at_row(measured.state.pressure, row) else NO_BLANKET
    virial = ("virial equation", "definition")
    yield step("capacity", "V_total", vessel.capacity, "m³", "whole vessel, unstrained", "definition")
    yield step("full shell factor", "K_T", result["full_factor"][row], "1", "(1 + Σε/3)³", STRAIN)
    yield step("vapour volume", "V_v", result["vapour_volume"][row], "m³", "K_T V_total − K V(h)", STRAIN)
    if Mark.VAPOUR_LEFT_OUT & marks:
        yield step(
            "vapour mass",
            "M_vapour",
            0.0,
            "kg",
            "left out: it cannot be computed here",
            "bounded in the budget",
        )
        return
    yield step(
        "vapour pressure",
        "P",
        result["vapour_pressure"][row] / 1000.0,
        "kPa",
        f"absolute; {basis}",
        "as read",
    )
    if vessel.is_blanketed:
        yield from _blanket(measured, row)
        basis = "that of the liquid" if unread else "as read"
    elif basis == "as read" and unread:
        basis = NO_BOILING
    yield step("vapour temperature", "T_v", celsius_of(result["vapour_temperature"][row]), "°C", basis, "as read")
    mixture = measured.mixture(row)
    series = virial_columns((mixture,))
    if marks & Mark.VAPOUR_BETWEEN:
        yield from _halfway(measured, row, float(series.molar_mass[0]))
        return
    second, _, third, _ = series.second_and_third(result["vapour_temperature"][row])
    values = {"B": (float(second) * 1e6, "cm³/mol"), "C": (float(third) * 1e12, "cm⁶/mol²")}
    notes = series.describe(0)
    inside = series.lowest[0] <= result["vapour_temperature"][row] <= series.highest[0]
    for note in notes if inside else notes[::-1]:
        if note.symbol in values:
            value, unit = values.pop(note.symbol)
            yield step(note.quantity, note.symbol, value, unit, note.method, note.reference)
        elif note.symbol == "Z":
            virial = (note.method, note.reference)
    yield step(
        "molar mass",
        "m",
        float(series.molar_mass[0]) * 1e3,
        "g/mol",
        "of the vapour's composition",
        "components",
    )
    yield step("compressibility factor", "Z", result["compressibility_factor"][row], "1", *virial)
    yield step("reduced density", "ρ_r", result["reduced_density"][row], "1",
                "molar density times the critical volume: how far from an ideal gas", virial[1])  # fmt: skip
    yield step("vapour density", "ρ_v", result["vapour_density"][row], "kg/m³", "P m/(Z R T_v)", virial[1])
    yield step("vapour mass", "M_vapour", result["vapour_mass"][row], "kg", "V_v ρ_v", ORDER)


def _halfway(measured: Measured, row: int, molar_mass: float) -> Iterator[Step]:
    """A vapour that is not computed, halfway between the ideal gas and the most that it can be."""
    result = measured.result
    yield step("molar mass", "m", molar_mass * 1e3, "g/mol", "of the vapour's composition", "components")
    yield step("compressibility factor", "Z", result["compressibility_factor"][row], "1",
               "not computed: 2/(1 + n), n the most that the vapour can be of the ideal gas: 2, or 4 above 0.96 of its "
               "critical temperature", "bounded in the budget")  # fmt: skip
    yield step("vapour density", "ρ_v", result["vapour_density"][row], "kg/m³", "P m/(Z R T_v)", "definition of Z")
    yield step("vapour mass", "M_vapour", result["vapour_mass"][row], "kg", "V_v ρ_v", ORDER)


def _blanket(measured: Measured, row: int) -> Iterator[Step]:
    """What is not product in a blanketed space: shown, and no part of the mass."""
    kind = measured.vessel(row).body.vapour_space
    name = "blanket" if kind is None or kind.blanket is None else kind.blanket
    rest = max(0.0, at_row(measured.state.pressure, row) - float(measured.result["vapour_pressure"][row]))
    yield step("blanket pressure", "P_b", rest / 1000.0, "kPa",
                f"{name}: the pressure of the space less the vapour's own; it counts in no mass",
                "Dalton's law")  # fmt: skip


def budget_lines(measured: Measured, row: int) -> list[dict[str, Any]]:
    """Every error of this mass: its size, its sensitivity and what it contributes, largest first."""
    carried = measured.carried.get(row)
    lines = [] if carried is None else _carried_lines(carried)
    for part in measured.parts if carried is None or carried.stated is None else ():
        sigma = at_row(part.sigma, row)
        sensitivity = float(measured.result.sensitivities[part.sensitivity][row])
        contribution = sensitivity * sigma
        if contribution == 0.0 or not math.isfinite(contribution):
            continue
        scale = part.scale
        lines.append(
            {
                "input": part.quantity,
                "instrument": part.instrument(row),
                "standard_uncertainty": sigma / scale,
                "sensitivity": sensitivity * scale,
                "contribution_kg": contribution,
                "kind": part.kind,
                "declared": bool(part.declared(row)),
            }
        )
    return sorted(lines, key=lambda line: -abs(line["contribution_kg"]))


MODELS = ("split", "water", "vapour-return", "vapour", "mix")  # errors of a method, by the first word of their name
RANDOM = ("t", "sample", "r", "stale")


def _carried_lines(carried: Carried) -> list[dict[str, Any]]:
    """What a weighing is off by, what tickets between the reading and the instant add, and what a water dip no
    longer says."""
    lines = []
    stated = carried.stated or Estimate(0.0)
    terms = [(1.0, stated), (1.0, carried.moved), (1.0, Estimate(0.0, carried.extras))]
    for name, kilograms in combine(terms).parts.items():
        kind = name.partition(":")[0]
        read = "weighed_mass_kg" if name in stated.parts else "moved_kg"
        lines.append(
            {
                "input": "free_water_level_m" if name in carried.extras else read,
                "instrument": name,
                "standard_uncertainty": abs(kilograms),
                "sensitivity": math.copysign(1.0, kilograms),
                "contribution_kg": kilograms,
                "kind": "model" if kind in MODELS else "random" if kind in RANDOM else "systematic",
                "declared": kind not in MODELS,
            }
        )
    return lines
