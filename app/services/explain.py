"""One measured row as an answer: what it is, what it rests on, and what is doubtful about it."""

from __future__ import annotations

import json
import math
from typing import Any

from app.schemas.types import format_instant
from app.services.choose import NEVER
from app.services.collect import INPUTS
from app.services.compositions import virial_columns
from app.services.measure import Measured
from app.services.parts import at_row, estimate, sigmas
from app.services.working import budget_lines, working_steps
from models import constants, instruments
from models.columns import UNMEASURED, Mark
from models.estimate import Estimate, combine
from models.mass import standard_uncertainty

QUALITY = ("good", "uncertain", "bad")
SHOWN_AS_LEVEL = ("ullage_m", "liquid_volume_m3", "liquid_volume_pct")  # what counts of them is the level
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
        "the pressure lies below the vapour pressure at both temperatures by more than twice its uncertainty: "
        "look for gauge and absolute confused, a warm thermometer, a lighter product withdrawn, another product, or a "
        "blanket that is lost",
    ),
    Mark.SATURATION_HIGH: (
        "saturation_high",
        "the pressure lies above the vapour pressure at both temperatures by more than twice its uncertainty: "
        "look for gas that does not condense, a cold thermometer, or a lighter product",
    ),
    Mark.VAPOUR_SATURATED: (
        "vapour_saturated",
        "the vapour was above saturation beside its liquid and is taken as saturated at its pressure",
    ),
    Mark.VAPOUR_LEFT_OUT: (
        "vapour_left_out",
        "the vapour cannot be computed here and is left out; at most 1 % of the liquid, it stands in the budget",
    ),
    Mark.GUARD_WIDE: (
        "guard_wide",
        "the vapour is so dense that the virial equation has a wider uncertainty, which stands in the budget",
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
    Mark.NO_VAPOUR_ROOT: (
        "guard_refused",
        "the virial equation has no vapour at this pressure and temperature: it would condense",
    ),
}


def status(measured: Measured, row: int) -> str:
    """``measured``, ``uncertain`` or ``unmeasured``."""
    if not _has_mass(measured, row):
        return "unmeasured"
    marks = Mark(int(measured.result.marks[row]))
    doubtful = Mark.ROOF_LANDING_ZONE | Mark.GUARD_WIDE
    uncertain = any(
        c.quality[row] == 1 and c.usable[row] and _counts(measured, row, name) for name, c in measured.chosen.items()
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


def answers(measured: Measured, *, working: bool = False, budget: bool = False) -> list[dict[str, Any]]:
    """Every row as the contract's inventory."""
    spread = standard_uncertainty(measured.result, sigmas(measured.parts))
    return [
        _answer(measured, row, float(spread[row]), working=working, budget=budget)
        for row in range(measured.collected.rows)
    ]


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
    air, weights = constants.CONVENTIONAL_AIR_DENSITY, constants.CONVENTIONAL_WEIGHT_DENSITY
    return mass * (1.0 - air / density) / (1.0 - air / weights)


def _counts(measured: Measured, row: int, name: str) -> bool:
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
    if name == "vapour_composition":
        return vessel.has_vapour and not vessel.is_blanketed
    if name in ("ambient", "site_ambient"):
        insulated = vessel.parameters["liquid_weight"] == 1.0 or vessel.parameters["expansion"] == 0.0
        assumed = measured.assumed.get("ambient_temperature_c")
        own = bool(measured.chosen["ambient"].usable[row]) or (assumed is not None and bool(assumed[row]))
        return not insulated and (name == "ambient") == own
    return True


def inputs(measured: Measured, row: int) -> list[dict[str, Any]]:
    """What counted: quantity, value, age, source and quality."""
    listed: list[dict[str, Any]] = []
    for spec in INPUTS:
        chosen = measured.chosen[spec.name]
        if not chosen.usable[row] or not _counts(measured, row, spec.name):
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


def warnings(measured: Measured, row: int) -> list[dict[str, str]]:
    """What is doubtful, and why a row has no mass."""
    marks = Mark(int(measured.result.marks[row]))
    found = [
        {"code": code, "detail": detail}
        for mark, (code, detail) in (WARNINGS.items() if marks else ())
        if marks & mark and not mark & UNMEASURED
    ]
    for spec in INPUTS:
        chosen = measured.chosen[spec.name]
        if not chosen.usable[row] or not _counts(measured, row, spec.name):
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
    if _counts(measured, row, "site_ambient") and not read and "ambient_temperature_c" not in measured.assumed:
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
        detail = f"the substance's vapour model cannot take the analysis: {measured.refused[row]}"
        return {"code": "outside_method", "detail": detail}
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


def inputs_read(measured: Measured, row: int) -> list[list[Any]]:
    """Every stored value that counted in a row, by its key: what a close rests on."""
    found: list[list[Any]] = []
    for spec in INPUTS:
        chosen = measured.chosen[spec.name]
        if not chosen.usable[row] or not _counts(measured, row, spec.name):
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
