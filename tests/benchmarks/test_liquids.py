"""The chain of every liquid method against its own formulas, and mixed vessels in one call against one by one.

The yardstick is the method's own ``key`` and ``point`` (of a sample once, of the liquid for each reading),
the curve, the strain and the sensitivities in the same blocks, nothing checked and nothing marked.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

import numpy as np
import pytest

from models.arrays import BLOCK_ROWS, FloatArray, IntArray, blocks
from models.columns import Method, State, Vessels
from models.components import component
from models.liquid.definition import (
    EthanolWaterLiquid,
    ExpansivityLiquid,
    LightHydrocarbonLiquid,
    Liquid,
    MixtureLiquid,
    PetroleumLiquid,
    TableLiquid,
    WaterLiquid,
)
from models.liquid.state import Conditions
from models.mass import inventory
from tests.benchmarks.conftest import Ratio
from tests.benchmarks.test_chain import MILLION, SIGMAS, uncertain
from tests.models.mass_cases import (
    BULLET,
    CASES,
    HEADED,
    OIL,
    SPHERE,
    UPRIGHT,
    Case,
    state,
    strained,
    vessels,
)

A_DAY = 1440  # readings, one a minute
PARTS = ((component("propane"), 0.9), (component("isobutane"), 0.07), (component("ethane"), 0.03))
TABLE = tuple((273.15 + t, 860.0 - 0.72 * t - 1e-4 * t * t) for t in range(-20, 101, 10))


def upright(name: str, liquid: Liquid, density: float, **reading: float) -> Case:
    return replace(OIL, name=name, liquid=liquid).reads(density=density, water_level=-np.inf, sediment_water=0.0,
                                                       **reading)  # fmt: skip


def pressed(name: str, liquid: Liquid, density: float) -> Case:
    return Case(
        name, Method.LIQUID, BULLET, strained("horizontal_cylinder", 3.0, 0.018),
        {"level": 1.4, "liquid_temperature": 291.3, "pressure": 1.1e6, "density": density,
         "density_temperature": 289.4, "density_pressure": 9.5e5},
        liquid=liquid,
    )  # fmt: skip


LIQUIDS = [
    upright("expansivity", ExpansivityLiquid((8.3e-4,), 288.15, 7.5e-10), 846.0),
    upright("crude", PetroleumLiquid("crude"), 846.0),
    upright("refined", PetroleumLiquid("refined"), 741.0),
    pressed("light by density", LightHydrocarbonLiquid(), 507.4),
    pressed("mixture of three", MixtureLiquid(PARTS), 505.0),
    upright("water", WaterLiquid(), 997.9),
    upright("density table", TableLiquid(TABLE, 6e-10), 846.0),
    upright("ethanol-water", EthanolWaterLiquid(), 842.0),
    replace(HEADED, name="head of the liquid by courses").reads(water_level=-np.inf, sediment_water=0.0),
]


def spread(case: Case, rows: int, every: int) -> tuple[State, IntArray]:
    """Readings around the case's own, a fresh sample with ``every`` so many, and where each begins."""
    draw = np.random.default_rng(2)
    one, heads = state([case]), np.arange(0, rows, every)
    day = np.arange(rows) // every

    def sampled(value: FloatArray, width: float) -> FloatArray:
        return np.asarray((value + draw.uniform(-width, width, len(heads)))[day])

    moved: dict[str, Any] = {
        "level": one.level * draw.uniform(0.6, 1.2, rows),
        "liquid_temperature": one.liquid_temperature + draw.uniform(-2.0, 2.0, rows),
        "ambient_temperature": one.ambient_temperature + draw.uniform(-8.0, 8.0, rows),
        "pressure": one.pressure * draw.uniform(1.0, 1.04, rows),
        "density": sampled(one.density, 1.0),
        "density_temperature": sampled(one.density_temperature, 1.0),
    }
    return replace(one, **moved), heads


# --- the yardstick --------------------------------------------------------------------------------------------


@dataclass(frozen=True)
class Bare:
    """One vessel's numbers, its readings, and the first reading of each sample."""

    own: Vessels
    case: Case
    read: State
    heads: IntArray

    def __call__(self) -> tuple[FloatArray, FloatArray]:
        s, rows = self.read, self.read.rows
        made: dict[str, FloatArray] = {}
        error = np.empty(rows)
        fresh = len(self.heads) == rows
        samples = None if fresh else self.sampled(s.density[self.heads], s.density_temperature[self.heads])
        lengths = np.diff(np.append(self.heads, rows))
        known = None if samples is None else [np.repeat(column, lengths) for column in samples]
        for block in blocks(rows, BLOCK_ROWS):
            if known is None:
                now = self.sampled(s.density[block], s.density_temperature[block])
            else:
                now = [column[block] for column in known]
            with np.errstate(invalid="ignore"):
                found = self.block(block, now)
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

    def sampled(self, density: FloatArray, temperature: FloatArray) -> list[FloatArray]:
        """Key, standard density and slopes at the sample and at the standard state."""
        method: Any = self.own.liquids.methods[0] if self.own.liquids is not None else None
        if isinstance(self.case.liquid, ExpansivityLiquid):
            beta = np.broadcast_to(self.case.liquid.coefficients[0], density.shape)
            base = density * np.exp(beta * (temperature - self.own.standard_temperature))
            return [density, base, beta, np.ones_like(density), beta, np.ones_like(density)]
        v, s = self.own, self.read
        there = Conditions(temperature, s.density_pressure, v.standard_pressure)
        key = method.key(density, there, 0)
        at = method.point(key, there, 0)
        base = method.point(key, Conditions(v.standard_temperature, v.standard_pressure, v.standard_pressure), 0)
        columns = (key, base.density, at.expansivity, at.by_key, base.expansivity, base.by_key)
        return [np.broadcast_to(column, key.shape) for column in columns]

    def here(self, key: FloatArray, block: slice) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
        """Density, β, κ and the slope by the key."""
        s, liquid = self.read, self.case.liquid
        t, p = s.liquid_temperature[block], s.pressure[block]
        if isinstance(liquid, ExpansivityLiquid):
            warmer, kappa = t - s.density_temperature[block], liquid.compressibility
            density = key * np.exp(-liquid.coefficients[0] * warmer + kappa * (p - s.density_pressure))
            one = np.ones(1)
            return density, liquid.coefficients[0] * one, kappa * one, one
        method: Any = self.own.liquids.methods[0] if self.own.liquids is not None else None
        point = method.point(key, Conditions(t, p, s.atmosphere), 0)
        return point.density, point.expansivity, point.compressibility, point.by_key

    def block(self, block: slice, sampled: list[FloatArray]) -> dict[str, FloatArray]:
        v, s = self.own, self.read
        level, ambient = s.level[block], s.ambient_temperature[block]
        t, p, sample = s.liquid_temperature[block], s.pressure[block], s.density[block]
        assert v.curves is not None
        volume, area = v.curves.volume_and_area(level, 0)
        shell = 7.0 / 8.0 * t + ambient / 8.0
        thermal, gauge = v.expansion * (shell - v.expansion_temperature), p - s.atmosphere
        reach = (level - v.bottom) * area / volume
        spread = 1.0 + thermal + v.strain_sum * gauge / 3.0
        rise = 1.0 + (thermal + v.strain_vertical * gauge) * reach
        factor = spread**3 / rise
        key, standard, sample_beta, sample_by_key, base_beta, base_by_key = sampled
        density, beta, kappa, by_key = self.here(key, block)
        by_sample, base_by_sample = by_key / sample_by_key, base_by_key / sample_by_key
        widened = np.zeros(1)
        if v.head_stress is not None and self.case.courses is not None:
            wide = v.head_stress.widening(level, s.water_level, density, v.head_included, 0)
            widened, by_level, by_density = factor * wide.volume, factor * wide.by_level, factor * wide.by_density
        else:
            by_level = by_density = np.zeros(1)
        gross, ratio = factor * volume + widened, density / standard
        liquid = density * gross
        full = liquid + density * density * by_density
        hot = v.expansion * (3.0 * factor / spread - factor * reach / rise)
        stretch = v.strain_sum * factor / spread - v.strain_vertical * factor * reach / rise
        below = density * (volume + widened / factor)
        return {
            "mass": liquid, "volume": volume, "area": area, "factor": factor, "gross": gross, "head": widened,
            "gross_standard": gross * ratio, "net_standard": gross * ratio, "density": density, "standard": standard,
            "fraction": volume / v.capacity, "shell": shell, "beta": beta, "kappa": kappa, "by_sample": by_sample,
            "by_sample_t": by_sample * sample_beta, "base_by_sample": base_by_sample,
            "base_by_sample_t": base_by_sample * sample_beta, "full factor": spread**3,
            "by level": density * (factor * area + by_level), "by water": -density * factor,
            "by liquid_temperature": -beta * full + 7.0 / 8.0 * below * hot, "by ambient": below * hot / 8.0,
            "by pressure": kappa * full + below * stretch, "by density": full * by_sample / sample,
            "by density_temperature": full * by_sample * sample_beta, "by sediment_water": -density * gross,
            "by capacity": density * factor * volume, "by capacity_local": density * factor * volume,
            "by expansion": full * np.log(density / sample),
        }  # fmt: skip


@pytest.mark.parametrize("every", [A_DAY, 1], ids=["a sample a day", "a sample a reading"])
@pytest.mark.parametrize("case", LIQUIDS, ids=lambda case: case.name)
def test_a_million_readings_of_every_liquid(case: Case, every: int, ratio: Ratio) -> None:
    own = vessels([case])
    read, heads = spread(case, MILLION, every)
    bare = Bare(own, case, read, heads)
    (mass, error), (plain, plain_error) = uncertain(own, read), bare()
    np.testing.assert_allclose(mass, plain, rtol=1e-12)
    assert np.isfinite(error).all()
    assert 0.5 < np.median(error / plain_error) < 1.5  # of the method's own error the yardstick has only the form
    what = "1e6 readings" if every == 1 else "1e6 readings, a sample a day"
    target = "" if every == 1 else "<= 2"
    ratio(f"{what}, {case.name}", lambda: uncertain(own, read), bare, target=target, units=MILLION, rounds=2)


MIXED = [
    *(case for case in LIQUIDS if case.curve is UPRIGHT),
    *(replace(case, curve=SPHERE, vessel=strained("sphere", 18.0, 0.028)).reads(level=11.3) for case in LIQUIDS[3:5]),
    *LIQUIDS[3:5],
    *CASES,
]


def test_a_thousand_vessels_of_mixed_shapes_and_liquids(ratio: Ratio) -> None:
    cases = [MIXED[i % len(MIXED)].reads(ambient_temperature=270.0 + 0.02 * i) for i in range(1000)]
    every, read, rows = vessels(cases), state(cases), np.arange(1000)
    single = [(vessels([case]), state([case])) for case in cases]

    def together() -> FloatArray:
        return inventory(every, rows, read)["mass"]

    def apart() -> list[float]:
        return [float(inventory(one, None, reading)["mass"][0]) for one, reading in single]

    np.testing.assert_allclose(together(), apart(), rtol=1e-12)
    assert np.isfinite(together()).all()
    kinds = len({type(case.liquid) for case in cases})
    ratio(f"1,000 vessels of {kinds} kinds of liquid, over a call a vessel", together, apart, target="<= 0.02",
          units=1000, rounds=3)  # fmt: skip
