"""The chain from readings to mass against bare formulas, one call a vessel, and a script of scalar libraries."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
import pytest
from chemicals.virial import BVirial_Tsonopoulos, CVirial_Orbey_Vera
from fluids import geometry as fluids

from models.arrays import BLOCK_ROWS, FloatArray, blocks
from models.columns import State, Vessels
from models.constants import GAS_CONSTANT
from models.geometry.heads import Head
from models.geometry.lying import horizontal_cylinder
from models.liquid.definition import ExpansivityLiquid
from models.mass import inventory, standard_uncertainty
from models.vapour.guard import Trust, expanded_uncertainty
from models.vapour.root import vapour_root
from tests.benchmarks.conftest import Ratio
from tests.models.mass_cases import BULLET_CASE, CASES, NITROGEN, OIL, PROPANE, SPHERE_CASE, Case, state, vessels

MILLION = 1_000_000
SIGMAS = {
    "level": (np.array([0.003]), np.array([0.001])), "liquid_temperature": (np.array([0.3]), np.array([0.1])),
    "vapour_temperature": (np.array([1.0]),), "pressure": (np.array([1e3]),), "density": (np.array([0.5]),),
    "capacity": (np.array([1e-3]),), "expansion": (np.array([0.02]),), "vapour_model": (np.array([1.0]),),
}  # fmt: skip
ROOF = next(case for case in CASES if case.name == "floating roof")
COLUMNS = ("level", "liquid_temperature", "ambient_temperature", "vapour_temperature", "pressure")


def spread(case: Case, rows: int) -> State:
    """Readings around the case's own, each column moving."""
    draw = np.random.default_rng(1)
    one = state([case])
    moved: dict[str, Any] = {
        "level": one.level * draw.uniform(0.6, 1.2, rows),
        "liquid_temperature": one.liquid_temperature + draw.uniform(-2.0, 2.0, rows),
        "ambient_temperature": one.ambient_temperature + draw.uniform(-8.0, 8.0, rows),
        "vapour_temperature": one.vapour_temperature + draw.uniform(0.0, 4.0, rows),
        "pressure": one.pressure * draw.uniform(0.96, 1.0, rows),
    }
    return replace(one, **moved)


def uncertain(own: Vessels, read: State) -> tuple[FloatArray, FloatArray]:
    result = inventory(own, None, read)
    return result["mass"], standard_uncertainty(result, SIGMAS)


# --- the yardstick: the same formulas and sensitivities, in the same blocks, nothing checked ----------------


@dataclass(frozen=True)
class Bare:
    """One vessel's numbers, and the arithmetic of one block of its readings."""

    own: Vessels
    case: Case
    read: State

    def __call__(self) -> tuple[FloatArray, FloatArray]:
        rows = self.read.rows
        one = bare_gas if self.case.curve is None else bare_liquid
        made: dict[str, FloatArray] = {}
        error = np.empty(rows)
        for block in blocks(rows, BLOCK_ROWS):
            found = one(self, **{name: getattr(self.read, name)[block] for name in COLUMNS})
            variance = np.zeros(len(error[block]))
            for name, parts in SIGMAS.items():
                if "by " + name in found:
                    variance += found["by " + name] ** 2 * sum(float(part[0]) ** 2 for part in parts)
            error[block] = np.sqrt(variance)
            for name, column in found.items():
                if name not in made:
                    made[name] = np.empty(rows)
                made[name][block] = column
        return made["mass"], error


def bare_gas(
    bare: Bare, pressure: FloatArray, vapour_temperature: FloatArray, **read: FloatArray
) -> dict[str, FloatArray]:
    v, p, t = bare.own, pressure, vapour_temperature
    shell = 7.0 / 8.0 * t + read["ambient_temperature"] / 8.0
    spread = 1.0 + v.expansion * (shell - v.expansion_temperature) + v.strain_sum * (p - bare.read.atmosphere) / 3.0
    by_sum = spread**2 * v.capacity
    return bare_vapour(bare, p, t, spread**3 * v.capacity, 3.0 * v.expansion * by_sum, v.strain_sum * by_sum)


def bare_vapour(
    bare: Bare, p: FloatArray, t: FloatArray, space: FloatArray, warm: FloatArray, pressed: FloatArray
) -> dict[str, FloatArray]:
    """Vapour mass of a space and its slopes; ``warm`` and ``pressed`` are the space's own."""
    vapour = bare.own.vapour
    assert vapour is not None
    second, second_slope, third, third_slope = vapour.second_and_third(t, 0)
    molar = vapour_root(second, third, p / (GAS_CONSTANT * t))[0]
    b, c = second * molar, third * molar * molar
    z = 1.0 + b + c
    psi = z + b + 2.0 * c
    density = molar * vapour.molar_mass[0]
    mass = density * space
    by_t = -(z + t * molar * (second_slope + molar * third_slope)) / psi
    reduced, reduced_temperature = molar * vapour.critical_volume[0], t / vapour.critical_temperature[0]
    trust = Trust(*(np.asarray(column)[0] for column in vapour.trust))
    trusted = expanded_uncertainty(trust, reduced, reduced_temperature, second * molar, psi)
    return {
        "mass": mass, "vapour_mass": mass, "vapour_density": density, "z": z, "reduced": reduced, "space": space,
        "pressure_of_vapour": p, "temperature_of_vapour": t, "standard": mass / bare.own.gas_standard_density,
        "by pressure": mass * z / psi / p + density * pressed, "by ambient": density * warm / 8.0,
        "by vapour_temperature": mass * by_t / t + 7.0 / 8.0 * density * warm, "by capacity": mass,
        "by vapour_model": mass * 0.5 * trusted, "by molar_mass": mass,
    }  # fmt: skip


def bare_liquid(
    bare: Bare, level: FloatArray, liquid_temperature: FloatArray, ambient_temperature: FloatArray,
    vapour_temperature: FloatArray, pressure: FloatArray,
) -> dict[str, FloatArray]:  # fmt: skip
    v, s, t, p = bare.own, bare.read, liquid_temperature, pressure
    liquid_of = bare.case.liquid
    assert v.curves is not None and isinstance(liquid_of, ExpansivityLiquid)
    series, kappa = liquid_of.coefficients, liquid_of.compressibility
    volume, area = v.curves.volume_and_area(level, 0)
    water = v.curves.volume(s.water_level, 0) if np.isfinite(s.water_level[0]) else np.zeros(1)
    shell = 7.0 / 8.0 * t + ambient_temperature / 8.0
    thermal, gauge = v.expansion * (shell - v.expansion_temperature), p - s.atmosphere
    reach = (level - v.bottom) * area / volume
    spread, rise = 1.0 + thermal + v.strain_sum * gauge / 3.0, 1.0 + (thermal + v.strain_vertical * gauge) * reach
    factor = spread**3 / rise
    by_sum, by_vertical = factor / spread, factor * reach / rise
    warmer, origin = t - s.density_temperature, liquid_of.origin
    drift = sum(
        b * ((t - origin) ** (j + 1) - (s.density_temperature - origin) ** (j + 1)) / (j + 1)
        for j, b in enumerate(series)
    ) if len(series) > 1 else series[0] * warmer  # fmt: skip
    beta = sum(b * (t - origin) ** j for j, b in enumerate(series)) if len(series) > 1 else series[0]
    density = s.density * np.exp(-drift + kappa * (p - s.density_pressure))
    dry = 1.0 - s.sediment_water * v.water_density / s.density
    standard = s.density * np.exp(-series[0] * (v.standard_temperature - s.density_temperature))
    net, ratio = density * dry, density / standard
    bulk = factor * (volume - water)
    liquid = net * bulk
    gross = bulk - v.roof_mass / density
    hot = v.expansion * (3.0 * by_sum - by_vertical)
    stretch = v.strain_sum * by_sum - v.strain_vertical * by_vertical
    below = net * (volume - water)
    found = {
        "mass": liquid - v.roof_mass * dry, "volume": volume, "area": area, "water": factor * water, "factor": factor,
        "gross": gross, "gross_standard": gross * ratio, "net_standard": gross * ratio * (1.0 - s.sediment_water),
        "density": density, "standard": dry * standard, "fraction": volume / v.capacity, "shell": shell,
        "by level": net * factor * area, "by water": -net * factor,
        "by density": (density * bulk - v.roof_mass * (1.0 - dry)) / s.density,
        "by liquid_temperature": -beta * liquid + 7.0 / 8.0 * below * hot, "by ambient": below * hot / 8.0,
        "by density_temperature": liquid * series[0], "by sediment_water": -density * gross,
        "by pressure": kappa * liquid + below * stretch, "by capacity": liquid,
        "by capacity_local": net * factor * volume, "by expansion": -liquid * drift,
    }  # fmt: skip
    if bare.case.mixture is None:
        return found
    assert v.saturation is not None
    v.saturation.pressure(t, 0)  # at both temperatures: a part of the method
    v.saturation.pressure(vapour_temperature, 0)
    space = spread**3 * v.capacity - factor * volume
    hotter = v.expansion * 3.0 * spread**2 * v.capacity - hot * volume
    pressed = v.strain_sum * spread**2 * v.capacity - stretch * volume
    gas = bare_vapour(bare, p, vapour_temperature, space, np.zeros(1), pressed)
    lost = gas["vapour_density"] * factor
    for name in ("mass", "by pressure", "by capacity"):
        gas[name] = gas[name] + found[name]
    gas["by level"] = found["by level"] - lost * area
    gas["by capacity_local"] = found["by capacity_local"] - lost * volume
    gas["by liquid_temperature"] = found["by liquid_temperature"] + 7.0 / 8.0 * gas["vapour_density"] * hotter
    gas["by ambient"] = found["by ambient"] + gas["vapour_density"] * hotter / 8.0
    return found | gas


ONE_VESSEL = [OIL, ROOF, BULLET_CASE, SPHERE_CASE, NITROGEN]


@pytest.mark.parametrize("case", ONE_VESSEL, ids=lambda case: case.name)
def test_a_million_readings_of_one_vessel(case: Case, ratio: Ratio) -> None:
    own, read = vessels([case]), spread(case, MILLION)
    bare = Bare(own, case, read)
    (mass, error), (plain, plain_error) = uncertain(own, read), bare()
    np.testing.assert_allclose(mass, plain, rtol=1e-12)
    np.testing.assert_allclose(error, plain_error, rtol=1e-9)
    ratio(f"1e6 readings, {case.name}, over bare formulas", lambda: uncertain(own, read), bare, target="<= 2",
          units=MILLION, rounds=3)  # fmt: skip


def test_a_thousand_vessels_in_one_call(ratio: Ratio) -> None:
    cases = [CASES[i % len(CASES)].reads(ambient_temperature=270.0 + 0.02 * i) for i in range(1000)]
    every, read, rows = vessels(cases), state(cases), np.arange(1000)
    single = [(vessels([case]), state([case])) for case in cases]

    def together() -> FloatArray:
        return inventory(every, rows, read)["mass"]

    def apart() -> list[float]:
        return [float(inventory(one, None, reading)["mass"][0]) for one, reading in single]

    np.testing.assert_allclose(together(), apart(), rtol=1e-13)
    ratio("1,000 vessels in one call, over a call a vessel", together, apart, target="<= 0.02", units=1000, rounds=3)


# --- a script of general-purpose libraries, one reading at a time -------------------------------------------

SCALAR = 200


def scalar_mass(tank: fluids.TANK, case: Case, level: float, t: float, ambient: float, t_v: float, p: float) -> float:
    """A bullet's mass, written as one would with fluids, chemicals and numpy."""
    v, s = case.vessel, case.reading
    volume = tank.V_from_h(level)
    area = (tank.V_from_h(level + 1e-5) - tank.V_from_h(level - 1e-5)) / 2e-5
    shell = 7.0 / 8.0 * t + ambient / 8.0
    thermal, gauge = 1.12e-5 * (shell - 288.15), p - 101_325.0
    factor = 1.0 + 3.0 * thermal + v["strain_sum"] * gauge
    factor -= (thermal + v["strain_vertical"] * gauge) * level * area / volume
    full = 1.0 + 3.0 * thermal + v["strain_sum"] * gauge
    here, there = t - 288.15, s["density_temperature"] - 288.15
    b0, b1 = PROPANE.coefficients
    drift = b0 * (here - there) + b1 * (here**2 - there**2) / 2.0
    density = s["density"] * math.exp(-drift + PROPANE.compressibility * (p - s["density_pressure"]))
    critical: dict[str, Any] = {"Tc": 369.89, "Pc": 4_251_200.0, "omega": 0.1521}
    second = BVirial_Tsonopoulos(t_v, **critical)
    third = CVirial_Orbey_Vera(t_v, **critical)[0]  # type: ignore[no-untyped-call]
    ideal = p / (GAS_CONSTANT * t_v)
    roots = np.roots([third, second, 1.0, -ideal])
    molar = min(root.real for root in roots if abs(root.imag) < 1e-9 * abs(root) and root.real > 0.0)
    return float(factor * volume * density + molar * 0.0440956 * (full * tank.V_total - factor * volume))


def scalar(tank: fluids.TANK, case: Case, read: State) -> list[tuple[float, float]]:
    """Masses with uncertainties by central differences of the whole script."""
    steps = (1e-4, 1e-2, 1e-1, 1e-2, 1e2)
    sigmas = (math.hypot(0.003, 0.001), math.hypot(0.3, 0.1), 0.0, 1.0, 1e3)
    found = []
    for row in range(read.rows):
        at = [float(getattr(read, name)[row]) for name in COLUMNS]
        variance = 0.0
        for k, (step, sigma) in enumerate(zip(steps, sigmas, strict=True)):
            above, below = list(at), list(at)
            above[k], below[k] = at[k] + step, at[k] - step
            slope = (scalar_mass(tank, case, *above) - scalar_mass(tank, case, *below)) / (2.0 * step)
            variance += (slope * sigma) ** 2
        found.append((scalar_mass(tank, case, *at), math.sqrt(variance)))
    return found


def test_a_script_of_scalar_libraries(ratio: Ratio) -> None:
    head = Head("ellipsoidal", 0.75)
    case = replace(BULLET_CASE, curve=horizontal_cylinder(diameter=3.0, length=14.0, left_head=head, right_head=head))
    tank = fluids.TANK(
        D=3.0, L=14.0, horizontal=True, sideA="ellipsoidal", sideB="ellipsoidal", sideA_a=0.75, sideB_a=0.75
    )
    own, few, many = vessels([case]), spread(case, SCALAR), spread(case, 100 * SCALAR)
    masses, errors = zip(*scalar(tank, case, few), strict=True)
    ours = inventory(own, None, few)
    # fitted and correlated coefficients differ by 0.4 % of the vapour, a few percent of the whole
    np.testing.assert_allclose(ours["mass"], masses, rtol=3e-4)
    shared = {name: SIGMAS[name] for name in ("level", "liquid_temperature", "vapour_temperature", "pressure")}
    np.testing.assert_allclose(standard_uncertainty(ours, shared), errors, rtol=0.01)
    found = ratio(
        "20,000 readings of a bullet, over a scalar script's 200", lambda: uncertain(own, many),
        lambda: scalar(tank, case, few), target="<= 0.2", units=100 * SCALAR, rounds=2,
    )  # fmt: skip
    print(f"a reading by the scalar script takes {100.0 / found:.0f} times as long")
