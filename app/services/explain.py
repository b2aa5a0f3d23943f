"""One measured row as an answer: what it is, what it rests on, and what is doubtful about it."""

from __future__ import annotations

import json
import math
from typing import Any

from app.services.collect import INPUTS
from app.services.measure import Measured
from app.services.parts import at_row, estimate, sigmas
from app.services.reasons import counts, reason, warnings
from app.services.statement import in_air, tank_statements
from app.services.working import budget_lines, working_steps
from models.columns import Mark
from models.estimate import Estimate, combine
from models.mass import standard_uncertainty

QUALITY = ("good", "uncertain", "bad")
SHOWN_AS_LEVEL = ("ullage_m", "liquid_volume_m3", "liquid_volume_pct")  # what counts of them is the level


def status(measured: Measured, row: int) -> str:
    """``measured``, ``uncertain`` or ``unmeasured``."""
    if not _has_mass(measured, row):
        return "unmeasured"
    marks = Mark(int(measured.result.marks[row]))
    doubtful = Mark.ROOF_LANDING_ZONE | Mark.GUARD_WIDE | Mark.VAPOUR_BETWEEN
    uncertain = any(
        c.quality[row] == 1 and c.usable[row] and counts(measured, row, name) for name, c in measured.chosen.items()
    )
    carried = measured.carried.get(row)
    if carried and carried.stated is not None:
        marks = Mark.NONE  # of a level that no longer counts
    return "uncertain" if marks & doubtful or uncertain or (carried and carried.uncertain) else "measured"


def _has_mass(measured: Measured, row: int) -> bool:
    carried = measured.carried.get(row)
    return bool(carried and carried.stated is not None) or math.isfinite(measured.result["mass"][row])


def mass_estimate(measured: Measured, row: int) -> Estimate | None:
    """The row's mass at its instant with its named parts, None where it has none. [kg]"""
    if not _has_mass(measured, row):
        return None
    carried = measured.carried.get(row)
    if carried is None:
        return estimate(measured.result, measured.parts, row)
    read = carried.stated or estimate(measured.result, measured.parts, row)
    return combine([(1.0, read), (1.0, carried.moved), (1.0, Estimate(0.0, carried.extras))])


def answers(
    measured: Measured, *, working: bool = False, budget: bool = False, statement: bool = False
) -> list[dict[str, Any]]:
    """Every row as the contract's inventory."""
    spread = standard_uncertainty(measured.result, sigmas(measured.parts))
    found = [
        _answer(measured, row, float(spread[row]), working=working, budget=budget)
        for row in range(measured.collected.rows)
    ]
    if statement:
        for row, block in tank_statements(measured).items():
            found[row]["statement"] = block
    return found


def _number(value: float) -> float | None:
    return float(value) if math.isfinite(value) else None


FIELDS = (
    ("gross_observed_volume_m3", "gross_observed_volume"), ("free_water_volume_m3", "free_water_volume"),
    ("gross_standard_volume_m3", "gross_standard_volume"), ("net_standard_volume_m3", "net_standard_volume"),
    ("liquid_density_kg_m3", "liquid_density"), ("standard_density_kg_m3", "standard_density"),
    ("liquid_mass_kg", "liquid_mass"), ("vapour_volume_m3", "vapour_volume"),
    ("compressibility_factor", "compressibility_factor"), ("vapour_mass_kg", "vapour_mass"),
    ("gas_standard_volume_m3", "gas_standard_volume"), ("mass_kg", "mass"),
)  # fmt: skip


DENSITIES = ("liquid_density_kg_m3", "standard_density_kg_m3", "compressibility_factor")


def _answer(measured: Measured, row: int, spread: float, *, working: bool, budget: bool) -> dict[str, Any]:
    vessel, result = measured.vessel(row), measured.result
    state = status(measured, row)
    unmeasured = state == "unmeasured"
    filled = float(result["level_fraction"][row])
    answer: dict[str, Any] = {
        "vessel": vessel.name,
        "at": measured.instant(row),
        "status": state,
        "substance": vessel.body.substance,
        "fill_pct": _number(filled * 100.0) if vessel.has_liquid else None,
    }
    for name, column in FIELDS:
        answer[name] = None if unmeasured else _number(result[column][row])
    answer["mass_uncertainty_kg"] = None if unmeasured else _number(spread)
    if not unmeasured and measured.carried.get(row) is not None:
        _carry(measured, row, answer)
    answer["available_mass_kg"] = None if unmeasured else _available(measured, row, answer["mass_kg"])
    answer["weight_in_air_kg"] = None if unmeasured else _weight_in_air(measured, row, answer["liquid_mass_kg"])
    if unmeasured:
        answer["reason"] = reason(measured, row)
    answer["inputs"] = inputs(measured, row)
    answer["checks"] = measured.checks.get(row, [])
    answer["warnings"] = warnings(measured, row)
    answer["definitions"] = [one._asdict() for one in vessel.definitions]
    if working and not unmeasured:
        answer["working"] = working_steps(measured, row)
    if budget and not unmeasured:
        answer["budget"] = budget_lines(measured, row)
    return answer


def _carry(measured: Measured, row: int, answer: dict[str, Any]) -> None:
    """What moved between the reading and the instant, in mass and in the liquid's volumes."""
    carried = measured.carried[row]
    if carried.empty:
        # A density that nobody read makes no volume of what came since.
        nothing = 0.0 if carried.moved.value == 0.0 else None
        answer |= {name: nothing for name, _ in FIELDS if answer[name] is not None} | dict.fromkeys(DENSITIES)
        answer |= {"liquid_mass_kg": 0.0, "vapour_mass_kg": 0.0, "fill_pct": nothing}
    elif carried.weighed is not None:
        answer |= {name: None for name, _ in FIELDS} | {"fill_pct": None}
    if carried.changed:
        whole = mass_estimate(measured, row)
        assert whole is not None
        answer |= {"mass_kg": whole.value, "mass_uncertainty_kg": whole.uncertainty}
    if measured.instant(row) == int(measured.collected.at[row]) and not carried.empty:
        return
    moved = carried.moved.value
    answer["moved_kg"] = moved
    if carried.weighed is not None:
        return
    vessel = measured.vessel(row)
    if not vessel.has_liquid:
        answer["vapour_mass_kg"] = answer["mass_kg"]
        read = float(measured.result["mass"][row])
        if answer["gas_standard_volume_m3"] is not None and read > 0.0:
            answer["gas_standard_volume_m3"] *= answer["mass_kg"] / read
        return
    answer["liquid_mass_kg"] += moved
    if not carried.empty:
        _swell(measured, row, answer, moved)


def _swell(measured: Measured, row: int, answer: dict[str, Any], moved: float) -> None:
    """The liquid's volumes with what moved: of the content's density, and as wet as it."""
    result = measured.result
    standard, wet = float(result["standard_density"][row]), at_row(measured.state.sediment_water, row)
    gross, here = float(result["gross_standard_volume"][row]), float(result["gross_observed_volume"][row])
    if not math.isfinite(standard) or not gross > 0.0:
        return
    net = moved / standard
    observed = net / (1.0 - wet) * here / gross
    answer["net_standard_volume_m3"] += net
    answer["gross_standard_volume_m3"] += net / (1.0 - wet)
    answer["gross_observed_volume_m3"] += observed
    answer["fill_pct"] += 100.0 * observed / measured.vessel(row).capacity


def _available(measured: Measured, row: int, mass: float) -> float | None:
    """Mass above the dead stock: that volume at the liquid's density is what cannot be drawn."""
    dead = measured.vessel(row).body.dead_stock_m3
    density = float(measured.result["liquid_density"][row])
    if not dead or not math.isfinite(density):
        return mass
    return max(0.0, mass - dead * density)


def _weight_in_air(measured: Measured, row: int, mass: float | None) -> float | None:
    """The liquid's weight in air by the conventional densities of OIML D 28."""
    density = float(measured.result["liquid_density"][row])
    if mass is None or not math.isfinite(density) or density <= 0.0:
        return None
    return mass * in_air(density)


def inputs(measured: Measured, row: int) -> list[dict[str, Any]]:
    """What counted: quantity, value, age, source and quality."""
    listed: list[dict[str, Any]] = []
    for spec in INPUTS:
        chosen = measured.chosen[spec.name]
        if not chosen.usable[row] or not counts(measured, row, spec.name):
            continue
        column = int(chosen.source[row])
        quantity, source = measured.collected.origins[spec.name].of(row, column)
        entry: dict[str, Any] = {
            "quantity": "level_m" if quantity in SHOWN_AS_LEVEL else quantity,
            "value": _number(float(chosen.value[row])),
            "age_s": (int(chosen.age_us[row]) + measured.instant(row) - int(measured.collected.at[row])) * 1e-6,
            "source": source,
            "quality": QUALITY[int(chosen.quality[row])],
        }
        text = measured.collected.texts[spec.name][row, column]
        if text is not None:
            entry["composition"] = json.loads(text)
        listed.append(entry)
    for quantity, where in measured.assumed.items():
        given = measured.vessel(row).assumed(quantity)
        if where[row] and given is not None:
            listed.append(_assumed(quantity, float(given.value)))
    if _water_unread(measured, row):
        listed.append(_assumed("free_water_level_m", 0.0))
    return listed


def _water_unread(measured: Measured, row: int) -> bool:
    """Free water that was never read counts as none, and is said to."""
    assumed = measured.assumed.get("free_water_level_m")
    known = measured.chosen["free_water"].usable[row] or (assumed is not None and assumed[row])
    vessel = measured.vessel(row)
    outlived = math.isnan(at_row(measured.state.water_level, row))
    return vessel.has_liquid and not vessel.is_full and not known and not outlived


def _assumed(quantity: str, value: float) -> dict[str, Any]:
    return {"quantity": quantity, "value": value, "quality": "assumed"}


def inputs_read(measured: Measured, row: int) -> list[list[Any]]:
    """Every stored value that counted in a row, by its key: what a close rests on."""
    found: list[list[Any]] = []
    for spec in INPUTS:
        chosen = measured.chosen[spec.name]
        if not chosen.usable[row] or not counts(measured, row, spec.name):
            continue
        column = int(chosen.source[row])
        quantity, source = measured.collected.origins[spec.name].of(row, column)
        text = measured.collected.texts[spec.name][row, column]
        companions = [[name, _companion(measured, row, spec.name, name, column)] for name in spec.companions]
        value = float(chosen.value[row]) if text is None else text
        found.append(
            [quantity, source, int(chosen.taken_at[row]), int(chosen.after_at[row]), value, int(chosen.quality[row]),
             companions]
        )  # fmt: skip
    return found


def _companion(measured: Measured, row: int, name: str, quantity: str, column: int) -> Any:
    candidates, texts = measured.collected.companions[(name, quantity)]
    if candidates.before_at[row, column] != measured.chosen[name].begins[row]:
        return None
    text = texts[row, column]
    return _number(float(candidates.before[row, column])) if text is None else text


def read_at(measured: Measured, row: int) -> int | None:
    """When the level of a row was read, or the pressure of a vessel that has none."""
    carried = measured.carried.get(row)
    if carried is not None and carried.stated is not None:
        return int(measured.collected.at[row])
    chosen = measured.chosen[measured.vessel(row).key_input]
    return int(chosen.taken_at[row]) if chosen.usable[row] else None
