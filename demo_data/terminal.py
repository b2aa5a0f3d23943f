"""The invented terminal as it is defined to the service: site, substances, vessels, meters.

Every body is what a client would PUT. What only the simulator knows of a vessel (how much is in it on
the first evening, how warm it is, how often it is read) stands beside the body in its :class:`Plan`.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

from demo_data.physics import Floats, Liquid, lying_volume

SITE_ID = "lontra-quay"
ZONE = "Europe/Lisbon"
Body = dict[str, Any]

SITE: Body = {
    "name": "Lontra Quay storage, an invented terminal",
    "time_zone": ZONE,
    "day_starts_at": "06:00",
    "base_temperature_c": 15.0,
    "elevation_m": 12.0,
    "barometer_uncertainty_kpa": 0.1,
    "false_alarms_per_month": 0.2,
}

# β of petroleum products: derivative of the correction of API MPMS 11.1-2004 at 20 °C for densities of
# 840, 745 and 800 kg/m³ at 15 °C; κ likewise. Toluene: reference equation of state at 20 °C (Lemmon &
# Span, 2006). Ethanol: OIML R 22, ρ at 15 and 25 °C; its κ by reference equation. Ethylene glycol: β by
# the DIPPR correlation of its density, κ from memory.
LIQUIDS: dict[str, tuple[str, float, Liquid]] = {
    "gas-oil": ("gas oil, house grade", 840.0, Liquid(8.5e-4, 7.69e-7)),
    "gasoline": ("gasoline, house grade", 745.0, Liquid(1.225e-3, 1.11e-6)),
    "kerosene": ("kerosene, house grade", 800.0, Liquid(9.36e-4, 8.83e-7)),
    "toluene": ("toluene", 871.5, Liquid(1.072e-3, 8.885e-7)),
    "ethanol": ("ethanol, undenatured", 793.6, Liquid(1.084e-3, 1.126e-6)),
    "glycol": ("ethylene glycol", 1116.9, Liquid(6.3e-4, 3.6e-7)),
}
# Density and vapour pressure at 15 °C, β along an isobar as a polynomial in t − 15 °C (4 to 26 °C, 3e-6)
# and κ: the reference equations that demo_data/physics.py names.
LIQUEFIED: dict[str, tuple[str, float, float, list[float], float]] = {
    "propane": ("propane, odorised", 507.5, 731.51, [2.9916e-3, 2.803e-5, 3.01e-7], 5.13e-6),
    "n-butane": ("n-butane", 584.25, 176.15, [1.93816e-3, 1.0161e-5, 7.3e-8], 2.66e-6),
}
GASES = {"nitrogen": "nitrogen, from a vaporiser", "hydrogen": "hydrogen, from tube trailers"}


def substances() -> dict[str, Body]:
    """Bodies of the substances by id."""
    bodies: dict[str, Body] = {}
    for key, (name, density, liquid) in LIQUIDS.items():
        bodies[key] = {
            "name": name,
            "liquid": {
                "model": "expansivity",
                "density_kg_m3": density,
                "density_uncertainty_kg_m3": 3.0,
                "at_temperature_c": 15.0,
                "at_pressure_kpa_abs": 101.325,
                "expansivity_per_k": liquid.beta_per_k,
                "compressibility_per_kpa": liquid.kappa_per_kpa,
            },
        }
    for key, (name, density, pressure, beta, kappa) in LIQUEFIED.items():
        bodies[key] = {
            "name": name,
            "liquid": {
                "model": "expansivity",
                "density_kg_m3": density,
                "density_uncertainty_kg_m3": 0.5,
                "at_temperature_c": 15.0,
                "at_pressure_kpa_abs": pressure,
                "expansivity_per_k": beta,
                "compressibility_per_kpa": kappa,
            },
            "vapour": virial(key),
        }
    for key, name in GASES.items():
        bodies[key] = {"name": name, "vapour": virial(key)}
    return bodies


def virial(component: str) -> Body:
    """A pure vapour by the virial equation."""
    return {"model": "virial", "components": [{"id": component, "mole_fraction": 1.0}]}


@dataclass(frozen=True)
class Plan:
    """A vessel: its body, and what only the simulator knows.

    ``every_s`` is the interval of its automatic gauge, 0 where it is dipped by hand; ``density_15`` is
    0 for gases; ``mean_c`` and ``swing_c`` are the liquid's mean temperature and its daily amplitude.
    """

    body: Body
    every_s: int
    opening_kg: float
    density_15: float
    mean_c: float
    swing_c: float
    water_m: float = 0.0

    @property
    def substance(self) -> str:
        """Id of what it holds."""
        return str(self.body["substance"])

    @property
    def gas(self) -> str:
        """Fluid of the vapour that counts, or nothing."""
        return self.substance if self.substance in LIQUEFIED or self.substance in GASES else ""

    @property
    def winner(self) -> str:
        """The source that counts first."""
        return str(self.body["sources"][0]["source"])


FLAT: Body = {"kind": "flat"}
STEEL: Body = {"expansion_per_k": 1.12e-5, "at_temperature_c": 15.0, "insulated": False}
THICK: Body = {**STEEL, "elastic_modulus_gpa": 207.0, "poisson_ratio": 0.3}
LAB: Body = {"random": 0.2, "systematic": 0.15, "instrument": "lab densitometer"}
LAB_BATH: Body = {"random": 0.0, "systematic": 0.03, "instrument": "lab densitometer"}
TAPE: Body = {"random": 0.0015, "systematic": 0.001, "instrument": "tape 7"}
THERMOMETER: Body = {"random": 0.1, "systematic": 0.15, "instrument": "thermometer 3"}
RADAR: Body = {"random": 0.001, "systematic": 0.002, "calibrated_at": "2026-01-20T10:00:00+00:00"}


def tank(name: str, substance: str, shape: Body, *, gauge: bool, capacity: tuple[float, float], **more: Any) -> Body:
    """An unpressurised tank: radar with a hand dip as its check, or the dip alone; density from the lab."""
    dipped = {"source": "hand", "instruments": {"level_m": TAPE}} if gauge else {"source": "hand"}
    level = {"level_m": RADAR, "liquid_temperature_c": {"random": 0.05, "systematic": 0.2}}
    if not gauge:
        level = {"level_m": TAPE, "liquid_temperature_c": THERMOMETER}
    roof = "floating_roof" in more
    age: Body = (
        {"level_m": 900, "liquid_temperature_c": 1800} if gauge else {"level_m": 21600, "liquid_temperature_c": 21600}
    )
    return {
        "name": name,
        "substance": substance,
        "service": "in",
        "shape": shape,
        "shell": STEEL,
        "vapour_space": {"kind": "none" if roof else "open"},
        "sources": [*([{"source": "radar"}] if gauge else []), dipped, {"source": "lab"}],
        "instruments": {
            **level,
            "free_water_level_m": {"random": 0.003, "systematic": 0.0},
            "observed_density_kg_m3": LAB,
            "observed_density_temperature_c": LAB_BATH,
            "capacity_pct": {"systematic": capacity[0], "local": capacity[1]},
        },
        "max_age_s": {**age, "free_water_level_m": None, "observed_density_kg_m3": None},
        "assumed": {"pressure_kpa": {"value": 0.0, "standard_uncertainty": 0.2}},
        **more,
    }


def pressure_vessel(name: str, substance: str, shape: Body, shell: Body, *, span_kpa: float) -> Body:
    """A closed vessel with transmitters: level and liquid temperature where there is liquid."""
    liquid = substance in LIQUEFIED
    instruments: Body = {
        "pressure_kpa": {"random": 2e-4 * span_kpa, "systematic": 6e-4 * span_kpa},
        "vapour_temperature_c": {"random": 0.1, "systematic": 0.3},
        "capacity_pct": {"systematic": 0.1, "local": 0.02},
    }
    if liquid:
        instruments["level_m"] = {"random": 0.001, "systematic": 0.002}
        instruments["liquid_temperature_c"] = {"random": 0.05, "systematic": 0.15}
    return {
        "name": name,
        "substance": substance,
        "service": "in",
        "shape": shape,
        "shell": shell,
        "vapour_space": {"kind": "product"},
        "sources": [{"source": "transmitter"}],
        "instruments": instruments,
        "max_age_s": 900 if liquid else 7200,
        "hand_gauging": False,
    }


def upright(diameter: float, height: float, cone: float = 0.0) -> Body:
    """An upright cylinder under a cone roof, on a flat bottom or on a cone that drains to its middle."""
    bottom = {"kind": "cone", "depth_m": cone} if cone else FLAT
    top = {"kind": "cone", "depth_m": round(diameter / 20.0, 2)}
    return {
        "kind": "vertical_cylinder",
        "diameter_m": diameter,
        "height_m": height,
        "bottom": bottom,
        "top": top,
    }


def upright_table(diameter: float, height: float, at_zero: float, step: float) -> Body:
    """Capacity table of an upright shell on an uneven bottom: straight lines, so coarse rows are exact."""
    area, count = math.pi * diameter**2 / 4.0, round(height / step)
    rows = [[round(k * step, 3), round(at_zero + area * k * step, 4)] for k in range(count + 1)]
    return {
        "kind": "capacity_table",
        "of": "vertical_cylinder",
        "diameter_m": diameter,
        "interpolation": "linear",
        "rows": rows,
        "total_volume_m3": rows[-1][1],
    }


def lying_table(diameter: float, length: float, step: float) -> Body:
    """Capacity table of a lying cylinder with flat ends, rows close enough to be read linearly."""
    volume: Any = lying_volume(diameter, length, 0.0, 0.0, length / 2.0)
    levels = [round(k * step, 3) for k in range(round(diameter / step) + 1)]
    found: Floats = volume(levels)
    rows = [[level, max(0.0, round(float(v), 4))] for level, v in zip(levels, found, strict=True)]
    return {
        "kind": "capacity_table",
        "of": "horizontal_cylinder",
        "diameter_m": diameter,
        "interpolation": "linear",
        "rows": rows,
        "total_volume_m3": round(math.pi * diameter**2 / 4.0 * length, 4),
    }


BULLET: Body = {
    "kind": "horizontal_cylinder",
    "diameter_m": 3.2,
    "length_m": 18.0,
    "tilt_deg": 0.6,
    "gauge_at_m": 2.5,
    "left_head": {"kind": "ellipsoidal", "depth_m": 0.8},
    "right_head": {"kind": "ellipsoidal", "depth_m": 0.8},
}
RECEIVER: Body = {
    "kind": "horizontal_cylinder",
    "diameter_m": 2.4,
    "length_m": 17.0,
    "left_head": {"kind": "hemispherical"},
    "right_head": {"kind": "hemispherical"},
}
ROOF: Body = {"mass_kg": 88000.0, "lands_at_m": 1.6, "floats_at_m": 1.9, "gauge_sees": "liquid"}
FINE, COARSE = (0.05, 0.02), (0.1, 0.03)

# opening mass [kg], density at 15 °C [kg/m³, 0 for a gas], mean temperature and daily swing [°C], water [m]
CONTENTS: dict[str, tuple[float, ...]] = {
    "tk-11": (5.1e6, 839.4, 15.2, 0.10, 0.045),
    "tk-12": (3.3e6, 840.6, 14.6, 0.12),
    "tk-21": (2.3e6, 744.8, 14.9, 0.15),
    "tk-22": (2.6e6, 746.1, 14.4, 0.15),
    "tk-31": (1.2e6, 799.2, 15.1, 0.15),
    "tk-41": (2.6e5, 871.3, 16.0, 0.2),
    "tk-51": (3.4e5, 793.7, 14.8, 0.2),
    "b-61": (3.9e4, 507.5, 14.0, 0.5),
    "s-71": (4.2e5, 584.25, 14.5, 0.25),
    "r-81": (1.4e3, 0.0, 14.0, 1.5),
    "r-82": (2.4e2, 0.0, 14.0, 1.5),
    "u-91": (1.9e4, 840.2, 13.0, 0.02),
    "bx-95": (2.9e4, 1116.4, 15.5, 0.4),
}
EVERY_S = {"tk-11": 300, "tk-12": 300, "tk-21": 300, "b-61": 300, "s-71": 300, "r-81": 3600, "r-82": 3600}


def vessels() -> dict[str, Body]:
    """Bodies of the vessels by id, in the order of a walk along the quay."""
    return {**tanks(), **pressure_vessels(), **small_tanks()}


def tanks() -> dict[str, Body]:
    """The tank farm: three gauges, four tapes."""
    table = upright_table(24.0, 14.0, at_zero=9.6, step=0.05)
    flat_top = upright(24.0, 14.0) | {"top": FLAT}
    bodies = {
        "tk-11": tank("gas oil 11", "gas-oil", upright(30.0, 14.0), gauge=True, capacity=FINE),
        "tk-12": tank("gas oil 12", "gas-oil", upright(30.0, 14.0), gauge=True, capacity=FINE),
        "tk-21": tank("gasoline 21", "gasoline", table, gauge=True, capacity=FINE, floating_roof=ROOF),
        "tk-22": tank("gasoline 22", "gasoline", flat_top, gauge=False, capacity=FINE, floating_roof=ROOF),
        "tk-31": tank("kerosene 31", "kerosene", upright(18.0, 12.0), gauge=False, capacity=FINE),
        "tk-41": tank("toluene 41", "toluene", upright(10.0, 9.0, cone=0.4), gauge=False, capacity=FINE),
        "tk-51": tank("ethanol 51", "ethanol", upright(12.0, 10.0), gauge=False, capacity=FINE),
    }
    bodies["tk-51"]["shell"] = {**STEEL, "expansion_per_k": 1.73e-5}  # stainless, type 304, from memory
    return bodies


def pressure_vessels() -> dict[str, Body]:
    """Liquefied gases, and gases in receivers."""
    sphere, stamped = {"kind": "sphere", "diameter_m": 14.0}, {"kind": "fixed_volume", "volume_m3": 50.0}
    wall = {thickness: {**THICK, "thickness_m": thickness} for thickness in (0.018, 0.02, 0.04)}
    return {
        "b-61": pressure_vessel("propane bullet 61", "propane", BULLET, wall[0.018], span_kpa=1600.0),
        "s-71": pressure_vessel("butane sphere 71", "n-butane", sphere, wall[0.02], span_kpa=600.0),
        "r-81": pressure_vessel("nitrogen receiver 81", "nitrogen", stamped, STEEL, span_kpa=4000.0),
        "r-82": pressure_vessel("hydrogen receiver 82", "hydrogen", RECEIVER, wall[0.04], span_kpa=6000.0),
    }


def small_tanks() -> dict[str, Body]:
    """What stands about the yard."""
    buried, box = (
        lying_table(2.4, 8.0, step=0.01),
        {"kind": "box", "length_m": 6.0, "width_m": 3.0, "height_m": 2.5},
    )
    bodies = {
        "u-91": tank("site diesel, under the yard", "gas-oil", buried, gauge=False, capacity=COARSE),
        "bx-95": tank("glycol box 95", "glycol", box, gauge=False, capacity=COARSE),
    }
    bodies["u-91"]["shell"] = {**STEEL, "insulated": True}  # the ground keeps it at its liquid's temperature
    return bodies


def plans() -> dict[str, Plan]:
    """The vessels by id with what only the simulator knows."""
    return {key: Plan(body, EVERY_S.get(key, 0), *CONTENTS[key]) for key, body in vessels().items()}


PROVED = "2026-02-10T09:00:00+00:00"
METERS: dict[str, tuple[str, float, float]] = {
    "m-jetty": ("jetty, gas oil and gasoline", 0.05, 0.08),
    "m-rack-1": ("loading rack, gas oil", 0.1, 0.1),
    "m-rack-2": ("loading rack, gasoline", 0.1, 0.1),
    "m-line": ("tank to tank", 0.1, 0.12),
    "m-plant-1": ("toluene to the plant", 0.1, 0.1),
    "m-plant-2": ("glycol to the plant", 0.2, 0.2),
    "m-gas-1": ("nitrogen", 0.5, 0.4),
    "m-gas-2": ("hydrogen", 0.5, 0.4),
    "m-pump": ("yard pump, site diesel", 0.2, 0.15),
}


def meters() -> dict[str, Body]:
    """Bodies of the meters by id."""
    return {
        key: {
            "name": name,
            "random_pct": random,
            "systematic_pct": systematic,
            "provings": [{"at": PROVED, "systematic_pct": systematic}],
        }
        for key, (name, random, systematic) in METERS.items()
    }
