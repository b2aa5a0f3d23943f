"""Every error of a state attributed to what caused it: an instrument, a sample, the weather, a substance."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from app.services.compile import DAY_US, Instrument
from app.services.gauged import HEAD
from app.services.parts import PASCAL, Errors, Kind, Part, capacity_parts, model_parts
from models import instruments
from models.columns import Method, State

if TYPE_CHECKING:
    from app.services.measure import States

FloatColumns = NDArray[np.float64]


def parts_of(
    builder: States, state: State, per_unit: Mapping[str, FloatColumns] | None, gravity: FloatColumns
) -> list[Part]:
    """Every error of every input, named."""
    errors = Errors(builder.vessels, builder.collected.rows)
    chosen, origins = builder.chosen, builder.collected.origins
    errors.measured("level_m", "level", "level", chosen["level"], origins["level"], per_unit=per_unit)
    if builder.by_head.any():
        errors.add(HEAD, "level", gravity, "model", lambda row: "gravity:site", declared=lambda row: False)
    errors.measured("free_water_level_m", "water", "water_level", chosen["free_water"], origins["free_water"])
    errors.measured(
        "liquid_temperature_c", "temperature", "liquid_temperature", chosen["liquid_temperature"],
        origins["liquid_temperature"], stale=instruments.STALE_TEMPERATURE,
    )  # fmt: skip
    errors.measured(
        "vapour_temperature_c", "vapour-temperature", "vapour_temperature", chosen["vapour_temperature"],
        origins["vapour_temperature"], stale=instruments.STALE_TEMPERATURE,
    )  # fmt: skip
    errors.measured(
        "pressure_kpa", "pressure", "pressure", chosen["pressure"], origins["pressure"], scale=PASCAL,
        stale=instruments.STALE_PRESSURE_KPA,
    )  # fmt: skip
    capacity_parts(errors, state.level)
    _surroundings(builder, errors)
    _sample(builder, errors)
    _vapour(builder, errors, state.pressure)
    _blends(builder, errors)
    for quantity, name in ASSUMABLE.items():
        if quantity in builder.assumed:
            errors.assumed(quantity, name, builder.assumed[quantity], scale=SCALES.get(quantity, 1.0))
    errors.add(
        "floating_roof", "roof", 1.0 / np.sqrt(12.0), "random",
        lambda row: f"roof:{errors.vessel(row).name}:{builder.collected.at[row]}", declared=lambda row: False,
    )  # fmt: skip
    model_parts(errors)
    return errors.parts


ASSUMABLE = {
    "level_m": "level", "liquid_temperature_c": "liquid_temperature", "pressure_kpa": "pressure",
    "vapour_temperature_c": "vapour_temperature", "ambient_temperature_c": "ambient_temperature",
    "free_water_level_m": "water_level", "observed_density_kg_m3": "density",
    "sediment_water_pct": "sediment_water", "pressure_kpa_abs": "pressure",
}  # fmt: skip
SCALES = {"pressure_kpa": PASCAL, "pressure_kpa_abs": PASCAL, "sediment_water_pct": 0.01}


def _surroundings(builder: States, errors: Errors) -> None:
    """Ambient temperature and atmosphere: the site's, shared by all of its vessels."""
    chosen = builder.chosen
    instead = builder.assumed.get("ambient_temperature_c", np.zeros(1, dtype=bool))
    own, site = chosen["ambient"].usable | instead, chosen["site_ambient"].usable
    errors.measured("ambient_temperature_c", "ambient", "ambient_temperature", chosen["ambient"],
                    builder.collected.origins["ambient"])  # fmt: skip
    default = instruments.DEFAULTS["ambient_temperature_c"].systematic
    errors.add(
        "ambient_temperature_c", "ambient_temperature", np.where(~own & site, default, 0.0), "systematic",
        lambda row: "ambient:site", declared=lambda row: False,
    )  # fmt: skip
    unread = builder.ambient_unread & ~instead
    errors.add(
        "ambient_temperature_c", "ambient_temperature", np.where(unread, instruments.AMBIENT_UNREAD, 0.0),
        "systematic", lambda row: f"ambient-unread:{errors.vessel(row).name}", declared=lambda row: False,
    )  # fmt: skip
    errors.add(
        "pressure_kpa", "pressure", np.where(builder.at_rest, instruments.OPEN_SPACE_KPA, 0.0), "systematic",
        lambda row: f"pressure-open:{errors.vessel(row).name}", declared=lambda row: False, scale=PASCAL,
    )  # fmt: skip
    read, at = chosen["barometer"], builder.collected.at
    # Shared by the vessels of the site, not by two days: where nobody reads it, the weather is another by then.
    errors.add(
        "barometric_pressure_kpa_abs", "pressure", builder.weather() / PASCAL, "systematic",
        lambda row: f"barometer:site:{at[row] // DAY_US if read.source[row] < 0 else read.taken_at[row]}",
        scale=PASCAL,
    )  # fmt: skip


def _sample(builder: States, errors: Errors) -> None:
    """Density: the instrument's error, the sample's own, its thermometer's; or the substance's figure."""
    chosen, origins = builder.chosen["density"], builder.collected.origins["density"]
    texts = builder.companion_text

    def sample(row: int) -> str:
        cited = texts("density", "sample", row)
        own = f"{errors.vessel(row).name}:{chosen.taken_at[row]}"
        return f"sample:{cited or own}"

    rows = range(errors.distinct(chosen, origins))
    sources = [origins.of(row, int(chosen.source[row]))[1] for row in rows]
    known = [errors.vessel(row).instrument("observed_density_kg_m3", sources[row]) for row in rows]
    thermometers = [errors.vessel(row).instrument("observed_density_temperature_c", sources[row]) for row in rows]

    def of(row: int) -> Instrument:
        return known[row if len(known) > 1 else 0]

    sampled = builder.density_is_sample
    errors_of_one: tuple[tuple[list[float], Kind, Callable[[int], str]], ...] = (
        ([k.systematic for k in known], "systematic", lambda row: f"density:{of(row).name}"),
        ([k.random for k in known], "random", sample),
    )
    for sigma, kind, name in errors_of_one:
        errors.add(
            "observed_density_kg_m3", "density", np.where(sampled, np.array(sigma), 0.0), kind, name,
            declared=lambda row: of(row).declared, instrument=lambda row: of(row).name,
        )  # fmt: skip
    errors.add(
        "observed_density_temperature_c", "density_temperature",
        np.where(sampled, np.array([t.systematic for t in thermometers]), 0.0), "systematic",
        lambda row: f"density-temperature:{of(row).name}",
        declared=lambda row: thermometers[row if len(thermometers) > 1 else 0].declared,
    )  # fmt: skip
    own_figure = ~sampled & ~builder.assumed.get("observed_density_kg_m3", np.zeros(1, dtype=bool))
    spread = builder.of_vessels([v.density_uncertainty for v in builder.vessels])
    errors.add(
        "density_kg_m3", "density", np.where(own_figure & np.isfinite(spread), spread, 0.0), "systematic",
        lambda row: f"density:substance:{errors.vessel(row).body.substance}",
        declared=lambda row: errors.vessel(row).density_declared,
    )  # fmt: skip
    errors.measured("sediment_water_pct", "sediment-water", "sediment_water", builder.chosen["sediment_water"],
                    builder.collected.origins["sediment_water"], scale=0.01)  # fmt: skip


def _blends(builder: States, errors: Errors) -> None:
    """Contents that received something since their sample: what their density may be off by."""
    blends = builder.blends
    if not blends:
        return
    sigma = np.array([blends[row].sigma if row in blends else 0.0 for row in range(builder.collected.rows)])
    errors.add(
        "observed_density_kg_m3", "density", sigma, "model", lambda row: blends[row].name, declared=lambda row: False
    )
    wet = np.array([blends[row].water_sigma if row in blends else 0.0 for row in range(builder.collected.rows)])
    errors.add(
        "sediment_water_pct", "sediment_water", wet * 100.0, "model", lambda row: blends[row].water_name,
        declared=lambda row: False, scale=0.01,
    )  # fmt: skip


def _vapour(builder: States, errors: Errors, pressure: FloatColumns) -> None:
    """A vapour's temperature taken from its saturation, and an analysis's share of the molar mass."""
    two_phase = builder.of_vessels([float(bool(v.method & Method.SATURATION)) for v in builder.vessels]) > 0
    read = builder.chosen["vapour_temperature"].usable | builder.assumed.get(
        "vapour_temperature_c", np.zeros(1, dtype=bool)
    )
    read = read & np.isfinite(pressure)  # without a pressure the vapour is taken at the liquid's temperature
    errors.add(
        "vapour_temperature_c", "vapour_temperature",
        np.where(two_phase & ~read, instruments.SATURATED_VAPOUR_TEMPERATURE, 0.0), "systematic",
        lambda row: f"vapour-temperature-assumed:{errors.vessel(row).name}", declared=lambda row: False,
    )  # fmt: skip
    chosen, origins = builder.chosen["vapour_composition"], builder.collected.origins["vapour_composition"]
    known = [
        errors.vessel(row).instrument("vapour_composition", origins.of(row, int(chosen.source[row]))[1])
        for row in range(errors.distinct(chosen, origins))
    ]
    share = np.array([one.systematic / 100.0 for one in known])
    errors.add(
        "vapour_composition", "molar_mass", np.where(builder.mixed, share, 0.0), "systematic",
        lambda row: f"composition:{errors.vessel(row).body.substance}", declared=lambda row: False,
    )  # fmt: skip
