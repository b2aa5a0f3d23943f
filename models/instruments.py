"""Standard uncertainties that count where a site declares none, each with the source it rests on.

A stated limit ±a without a law is a/√3, a 95 % figure is halved; both are written out here, so that a
reader sees the published figure. Every use of one of these is marked undeclared in the budget.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

_RECTANGULAR = 1.0 / math.sqrt(3.0)  # limits without a law: JCGM 100:2008, 4.3.7
_REPRODUCIBILITY = 1.0 / 2.77  # 95 % of differences of two results: ISO 5725-6:1994, 4.1.4


@dataclass(frozen=True)
class DefaultUncertainty:
    """One quantity's standard uncertainties, in the unit of its name on the wire.

    Parameters
    ----------
    random : float
        Fresh at every reading. [unit of the quantity]
    systematic : float
        One unknown offset for as long as the calibration stands. [unit of the quantity]
    source : str
        Where the figures come from. [text]
    """

    random: float
    systematic: float
    source: str


DEFAULTS: dict[str, DefaultUncertainty] = {
    "level_m": DefaultUncertainty(
        0.001, math.hypot(0.003, 0.003) * _RECTANGULAR,
        "API MPMS 3.1B-2001, 4.3: ±3 mm from the factory and ±3 mm installed; random 1 mm, common practice",
    ),
    "liquid_volume_pct": DefaultUncertainty(
        0.2, 2.0 * _RECTANGULAR, "the dial of a float gauge, ±2 % of the capacity, common practice"
    ),
    "differential_pressure_kpa": DefaultUncertainty(
        0.02, 0.1 * _RECTANGULAR, "0.1 % of a span of 100 kPa, common practice (from memory)"
    ),
    "free_water_level_m": DefaultUncertainty(
        0.005 * _RECTANGULAR, 0.0, "water cut by paste ±3 to 6 mm, common practice (from memory)"
    ),
    "liquid_temperature_c": DefaultUncertainty(
        0.1, 0.5 * _RECTANGULAR, "Directive 2014/32/EU annex VII: ±0.5 °C, class 0.5 to 1.0; random common practice"
    ),
    "ambient_temperature_c": DefaultUncertainty(
        0.0, 2.0, "one screen for a whole site, common practice"
    ),
    "vapour_temperature_c": DefaultUncertainty(
        0.2, 1.0, "gradients of a vapour space, common practice"
    ),
    "pressure_kpa": DefaultUncertainty(
        0.2, 1.6 * _RECTANGULAR, "0.1 % of a span of 1,600 kPa, common practice (from memory)"
    ),
    "observed_density_kg_m3": DefaultUncertainty(
        0.5 * _REPRODUCIBILITY, math.sqrt(1.2**2 - 0.5**2) * _REPRODUCIBILITY,
        "ISO 3675 / ASTM D1298: r = 0.5, R = 1.2 kg/m³ (from memory)",
    ),
    "observed_density_temperature_c": DefaultUncertainty(
        0.0, 0.25 * _RECTANGULAR, "laboratory thermometer ±0.25 °C, common practice"
    ),
    "sediment_water_pct": DefaultUncertainty(
        0.08 * _REPRODUCIBILITY, math.sqrt(0.11**2 - 0.08**2) * _REPRODUCIBILITY,
        "ASTM D4006: r = 0.08, R = 0.11 % (from memory)",
    ),
    "vapour_composition": DefaultUncertainty(
        0.0, 0.5, "percent of the mean molar mass, a field analysis, common practice"
    ),
}  # fmt: skip

# Capacity, whole table: percent limits by kind of vessel, OIML R 71 (2008), from memory but for the first.
CAPACITY_PCT: dict[str, float] = {
    "vertical_cylinder": 0.2 * _RECTANGULAR,
    "horizontal_cylinder": 0.3 * _RECTANGULAR,
    "sphere": 0.5 * _RECTANGULAR,
    "box": 0.5 * _RECTANGULAR,
    "fixed_volume": 0.5 * _RECTANGULAR,
    "capacity_table": 0.5 * _RECTANGULAR,
}
CAPACITY_LOCAL_PCT = 0.02  # percent, varying along the level; common practice
LOCAL_SPAN = 1.0  # m, distance between the knots of the local error; a setting of the vessel

BAROMETER_KPA = 1.0  # kPa, weather about the mean pressure of the place; common practice, ISO 2533 for the mean
DENSITY_SHARE = 0.01  # of a density that no sample ever confirmed
METHOD_DENSITY_SHARE: dict[str, float] = {
    "water": 1e-4,  # impurities of a service water, common practice; the equation itself is good to 1e-5
    "density_table": DENSITY_SHARE,
}  # of the density that a method gives of its own, where none was ever read
EXPANSION_SHARE = 0.02  # of β, constant: drift of β over 30 K, against reference equations of state
SATURATED_VAPOUR_TEMPERATURE = 3.0  # K, of a vapour whose temperature is taken from its saturation
AMBIENT_UNREAD = 10.0  # K, of an ambient temperature taken as the liquid's
OPEN_SPACE_KPA = 0.2  # kPa, pressure and vacuum valves of a vented tank; common practice

STALE_TEMPERATURE = 0.05 / 3600.0  # K/s carried forward, 0.05 K an hour; common practice
STALE_PRESSURE_KPA = 2.0 / 3600.0  # kPa/s carried forward, 2 kPa an hour; common practice

# A meter of which nothing is declared: Directive 2014/32/EU, annex VII, class 0.5, ±0.3 % for the meter alone.
METER_RANDOM_PCT = 0.05  # percent, repeatability; common practice
METER_SYSTEMATIC_PCT = 0.3 * _RECTANGULAR  # percent

BLEND_DENSITY = 3.0  # kg/m3, of a content that received an unknown density since its sample; common practice

WEIGHED_SHARE = 0.001  # of a mass by load cells, with pipes attached; common practice
