"""The month as it really was: masses, densities and temperatures at any instant, without any instrument."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from zlib import crc32

import numpy as np

from demo_data.physics import (
    Conditions,
    Floats,
    Hull,
    Liquid,
    hull,
    mass_kg,
    vapour_density,
    vapour_pressure_kpa_abs,
)
from demo_data.schedule import Movement, instant
from demo_data.terminal import LIQUEFIED, LIQUIDS, Plan

DAY_S = 86400.0
START_S = instant(0, "00:00")


def stream(seed: int, name: str) -> np.random.Generator:
    """Random numbers of one name: a change in one vessel leaves all others as they were."""
    return np.random.default_rng([seed, crc32(name.encode())])


@dataclass(frozen=True)
class Weather:
    """Air over the site: temperature and pressure as sums of a few waves."""

    warm: tuple[float, float]
    pressed: tuple[float, float]

    def ambient_c(self, at_s: Floats) -> Floats:
        """A day's wave with its top at three in the afternoon, on a slower one."""
        days = (at_s - START_S) / DAY_S
        slow = 2.0 * np.sin(2.0 * np.pi * days / 9.3 + self.warm[0]) + np.sin(2.0 * np.pi * days / 3.7 + self.warm[1])
        return np.asarray(13.0 + 0.06 * days + slow + 3.5 * np.sin(2.0 * np.pi * (days - 0.375)))

    def barometer_kpa(self, at_s: Floats) -> Floats:
        """Lows that pass every week or so."""
        days = (at_s - START_S) / DAY_S
        waves = 0.7 * np.sin(2.0 * np.pi * days / 7.1 + self.pressed[0]) + 0.4 * np.sin(
            2.0 * np.pi * days / 4.3 + self.pressed[1]
        )
        return np.asarray(101.2 + waves)


@dataclass(frozen=True)
class Receipt:
    """A receipt into one vessel, with what it found there and what it made of it."""

    movement: Movement
    before_kg: float
    density_before: float
    density_cargo: float

    @property
    def density_after(self) -> float:
        """Blend by mass and standard volume."""
        return float(self.density(1.0))

    def density(self, share: object) -> Floats:
        """Density at 15 °C when this share of the receipt is in."""
        came = np.asarray(share, dtype=float) * self.movement.mass_kg
        volume = self.before_kg / self.density_before + came / self.density_cargo
        return np.asarray((self.before_kg + came) / volume)


@dataclass(frozen=True)
class Vessel:
    """One vessel over the month, in truth."""

    id: str
    plan: Plan
    shell: Hull
    liquid: Liquid | None
    factor: float
    local: Callable[[Floats], Floats]
    flows: tuple[Movement, ...]
    receipts: tuple[Receipt, ...]
    phases: tuple[float, float, float]
    weather: Weather

    @property
    def roof_kg(self) -> float:
        """Mass that floats on the liquid."""
        return float(self.plan.body.get("floating_roof", {}).get("mass_kg", 0.0))

    def mass(self, at_s: Floats) -> Floats:
        """What was there."""
        total = np.full(np.shape(at_s), self.plan.opening_kg)
        for one in self.flows:
            sign = 1.0 if one.target == self.id else -1.0
            total = total + sign * one.mass_kg * one.share(at_s)
        return np.asarray(total)

    def density_15(self, at_s: Floats) -> Floats:
        """Standard density of what was there."""
        found = np.full(np.shape(at_s), self.plan.density_15)
        for one in self.receipts:
            found = np.where(at_s > one.movement.start_s, one.density(one.movement.share(at_s)), found)
        return np.asarray(found)

    def liquid_c(self, at_s: Floats) -> Floats:
        """Slow waves of the season, a day's wave, and what receipts brought with them, fading."""
        days = (at_s - START_S) / DAY_S
        one, two, three = self.phases
        found = self.plan.mean_c + 0.5 * np.sin(2.0 * np.pi * days / 15.0 + one) + 0.025 * (days - 15.0)
        found = (
            found
            + self.plan.swing_c * np.sin(2.0 * np.pi * days + two)
            + 0.15 * np.sin(2.0 * np.pi * days / 6.1 + three)
        )
        for receipt in self.receipts:
            cargo = receipt.movement
            share = cargo.mass_kg / (receipt.before_kg + cargo.mass_kg) * cargo.share(at_s)
            fading = np.exp(-np.clip(at_s - cargo.end_s, 0.0, None) / (5.0 * DAY_S))
            found = found + share * (cargo.cargo_c - self.plan.mean_c) * fading
        return np.asarray(found)

    def conditions(self, at_s: Floats) -> Conditions:
        """Everything an instrument could have shown at these instants, without error."""
        ambient, barometer = self.weather.ambient_c(at_s), self.weather.barometer_kpa(at_s)
        liquid_c, mass = self.liquid_c(at_s), self.mass(at_s)
        if self.liquid is None:
            return self._gas(mass, liquid_c, ambient, barometer)
        gauge, vapour_c = np.zeros_like(mass), liquid_c
        if self.plan.gas:
            gauge = vapour_pressure_kpa_abs(self.plan.gas, liquid_c) - barometer
            vapour_c = liquid_c + 1.2 + 0.6 * np.sin(2.0 * np.pi * (at_s - START_S) / DAY_S + self.phases[2])
        known = Conditions(0.0, self.plan.water_m, liquid_c, ambient, gauge, vapour_c, barometer, self.density_15(at_s))

        def excess(level: Floats) -> Floats:
            at = Conditions(**{**known.__dict__, "level_m": level})
            return np.asarray(
                mass_kg(self.shell, self.liquid, self.plan.gas, self.roof_kg, at, self.stretch(level)) - mass
            )

        level = bisect(excess, np.full(mass.shape, 0.02), np.full(mass.shape, self.shell.top_m * 0.999))
        return Conditions(**{**known.__dict__, "level_m": level})

    def _gas(self, mass: Floats, vapour_c: Floats, ambient: Floats, barometer: Floats) -> Conditions:
        def excess(gauge: Floats) -> Floats:
            _, whole = self.shell.stretched(0.0 * gauge, vapour_c, ambient, gauge)
            density = vapour_density(self.plan.gas, gauge + barometer, vapour_c)
            return np.asarray(density * whole * self.stretch(0.0 * gauge) - mass)

        gauge = bisect(excess, np.full(mass.shape, 100.0), np.full(mass.shape, 8000.0))
        return Conditions(0.0, 0.0, vapour_c, ambient, gauge, vapour_c, barometer, 0.0)

    def stretch(self, level: Floats) -> Floats:
        """True volume over that of the table: an error of the whole, and one along the level."""
        return np.asarray((1.0 + self.factor) * (1.0 + self.local(level)))


def bisect(excess: Callable[[Floats], Floats], low: Floats, high: Floats) -> Floats:
    """The root of a rising function, column by column."""
    if np.any(excess(low) > 0.0) or np.any(excess(high) < 0.0):
        raise ValueError("a vessel of the demo runs empty or over: change the schedule")
    for _ in range(46):
        middle = 0.5 * (low + high)
        above = excess(middle) > 0.0
        low, high = np.where(above, low, middle), np.where(above, middle, high)
    return 0.5 * (low + high)


def local_error(rng: np.random.Generator, share: float) -> Callable[[Floats], Floats]:
    """An unknown, smooth function of level with this standard deviation: three cosines."""
    lengths, phases = rng.uniform(2.0, 5.0, 3), rng.uniform(0.0, 2.0 * np.pi, 3)
    weights = rng.standard_normal(3) / np.sqrt(1.5)

    def error(level: Floats) -> Floats:
        waves = np.cos(2.0 * np.pi * np.asarray(level)[..., None] / lengths + phases) * weights
        return np.asarray(share * waves.sum(axis=-1))

    return error


def vessels(plans: dict[str, Plan], moved: Sequence[Movement], seed: int) -> dict[str, Vessel]:
    """The month's truth: what moved, through vessels whose tables and β are slightly wrong."""
    rng = stream(seed, "weather")
    weather = Weather(*(tuple(rng.uniform(0.0, 6.28, 2)) for _ in range(2)))
    betas = {key: 1.0 + 0.02 * stream(seed, key).standard_normal() for key in LIQUIDS}
    offset = {key: stream(seed, key).standard_normal() * 0.5 for key in LIQUEFIED}
    found: dict[str, Vessel] = {}
    for key, plan in plans.items():
        rng, kind = stream(seed, f"shell {key}"), plan.substance
        capacity = plan.body["instruments"]["capacity_pct"]
        liquid = None
        if kind in LIQUIDS:
            ideal = LIQUIDS[kind][2]
            liquid = Liquid(ideal.beta_per_k * betas[kind], ideal.kappa_per_kpa)
        elif kind in LIQUEFIED:
            liquid = Liquid(fluid=kind)
            plan = Plan(**{**plan.__dict__, "density_15": plan.density_15 + offset[kind]})
        flows = tuple(one for one in moved if key in (one.source, one.target))
        found[key] = Vessel(
            key,
            plan,
            hull(plan.body),
            liquid,
            0.01 * capacity["systematic"] * rng.standard_normal(),
            local_error(rng, 0.01 * capacity["local"]),
            flows,
            (),
            tuple(rng.uniform(0.0, 6.28, 3)),
            weather,
        )
    return with_receipts(found, moved)


def with_receipts(found: dict[str, Vessel], moved: Sequence[Movement]) -> dict[str, Vessel]:
    """Densities after each receipt, in the order of the month: a cargo may come from another tank."""
    for one in moved:
        if one.target not in found or found[one.target].liquid is None:
            continue
        target, start = found[one.target], np.asarray([float(one.start_s)])
        here = float(target.density_15(start)[0])
        cargo = float(found[one.source].density_15(start)[0]) if one.source in found else one.cargo_density
        receipt = Receipt(one, float(target.mass(start)[0]), here, cargo or here)
        apart = [other for other in target.flows if other.start_s < one.end_s and other.end_s > one.start_s]
        if receipt.density_cargo != here and apart != [one]:
            raise ValueError(f"{one.id} blends while {one.target} moves: change the schedule")
        found[one.target] = Vessel(**{**target.__dict__, "receipts": (*target.receipts, receipt)})
    return found
