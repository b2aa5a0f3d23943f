"""A site as it truly is: vessels, what moves between them night after night, and how warm it is."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from zlib import crc32

import numpy as np

from models.arrays import FloatArray

LOWEST, HIGHEST = 0.12, 0.88  # of a vessel's capacity that movements leave filled, and fill
STANDARD = 15.0  # °C
TRIES = 200


def stream(seed: int, name: str) -> np.random.Generator:
    """Random numbers of one name: what is drawn under another leaves them as they are."""
    return np.random.default_rng([seed, crc32(name.encode())])


@dataclass(frozen=True)
class Vessel:
    """An upright cylinder or a sphere, and what stands in it."""

    name: str
    group: int
    radius: float  # m
    height: float  # m; of a sphere twice its radius
    density: float  # kg/m³ at 15 °C
    expansivity: float  # 1/K
    round: bool = False

    def volume(self, level: FloatArray) -> FloatArray:
        if self.round:
            return np.asarray(np.pi * level**2 * (self.radius - level / 3.0))
        return np.asarray(np.pi * self.radius**2 * level)

    def area(self, level: FloatArray) -> FloatArray:
        if self.round:
            return np.asarray(np.pi * level * (2.0 * self.radius - level))
        return np.full(np.shape(level), np.pi * self.radius**2)

    def level(self, volume: FloatArray) -> FloatArray:
        """Newton's method, from half full; the volume rises with the level everywhere."""
        level = np.full(np.shape(volume), 0.5 * self.height)
        for _ in range(60):
            step = (self.volume(level) - volume) / self.area(level)
            level = np.clip(level - step, 1e-3 * self.height, 0.999 * self.height)
        return level

    def density_at(self, temperature: FloatArray, density: FloatArray | float | None = None) -> FloatArray:
        standard = self.density if density is None else density
        return np.asarray(standard * (1.0 - self.expansivity * (temperature - STANDARD)))

    @property
    def capacity(self) -> float:
        """kg at 15 °C."""
        return float(self.volume(np.array(self.height))) * self.density

    @property
    def per_mm(self) -> float:
        """kg of one millimetre of level, half full."""
        return float(self.area(np.array(0.5 * self.height))) * self.density / 1000.0


@dataclass(frozen=True)
class Movement:
    """What moved in one night; None is beyond the site."""

    name: str
    night: int
    source: str | None
    target: str | None
    mass: float  # kg
    meter: str
    share: float = 1.0  # of the whole movement, where it is split at a close
    sign: float = 1.0  # -1 for what follows the close


@dataclass(frozen=True)
class Plan:
    """The truth without any fault."""

    vessels: Sequence[Vessel]
    movements: Sequence[Movement]
    nights: int
    start: FloatArray  # kg, by vessel
    temperature: FloatArray  # °C, by vessel and close
    sample: Sequence[Sequence[str]]  # name of the density sample, by vessel and close

    @property
    def place(self) -> dict[str, int]:
        return {vessel.name: at for at, vessel in enumerate(self.vessels)}

    @property
    def meters(self) -> dict[str, list[Movement]]:
        """Each proving of each meter, with what it measured."""
        found: dict[str, list[Movement]] = {}
        for movement in self.movements:
            found.setdefault(movement.meter, []).append(movement)
        return found


def plan(
    seed: int, *, layout: Sequence[tuple[int, int]] = ((8, 2),), nights: int = 20, tickets: int = 8, sampled: int = 5,
    split: float = 0.0,
) -> Plan:  # fmt: skip
    """A site of groups, each of so many upright tanks and so many spheres, with so many movements a night.

    Every tank has a new density sample each ``sampled`` nights, not all on one; every meter is proved once. With
    the chance ``split`` a movement is under way at the close.
    """
    rng = stream(seed, "plan")
    vessels = [
        vessel for group, (tanks, spheres) in enumerate(layout) for vessel in _vessels(rng, group, tanks, spheres)
    ]
    filled = np.array([rng.uniform(0.35, 0.65) * vessel.capacity for vessel in vessels])
    start = filled.copy()
    proved = {(group, way): int(rng.integers(2, max(3, nights))) for group in range(len(layout)) for way in range(3)}
    movements = [
        movement
        for night in range(1, nights + 1)
        for group in range(len(layout))
        for movement in _night(rng, vessels, filled, night, group, tickets, proved)
    ]
    movements = [part for movement in movements for part in _split(movement, nights, split, seed)]
    steps = rng.normal(0.0, 0.6, (len(vessels), nights + 1))
    temperature = rng.uniform(12.0, 24.0, (len(vessels), 1)) + np.cumsum(steps, axis=1)
    first = rng.integers(0, sampled, len(vessels))
    sample = [
        [f"sample:{vessel.name}:{(close + late) // sampled}" for close in range(nights + 1)]
        for vessel, late in zip(vessels, first, strict=True)
    ]
    return Plan(vessels, movements, nights, start, temperature, sample)


def _split(movement: Movement, nights: int, chance: float, seed: int) -> list[Movement]:
    """A movement, or its parts before and after the close that ends its night."""
    rng = stream(seed, f"split:{movement.name}")
    if movement.night == nights or rng.random() >= chance:
        return [movement]
    share = rng.uniform(0.1, 0.9)
    return [
        replace(movement, mass=movement.mass * share, share=share),
        replace(movement, mass=movement.mass * (1.0 - share), night=movement.night + 1, share=1.0 - share, sign=-1.0),
    ]


def _vessels(rng: np.random.Generator, group: int, tanks: int, spheres: int) -> list[Vessel]:
    found = []
    for number in range(tanks):
        density, expansivity = rng.uniform(740.0, 860.0), rng.uniform(0.8e-3, 1.2e-3)
        radius, height = rng.uniform(9.0, 17.0), rng.uniform(12.0, 18.0)
        found.append(Vessel(f"g{group}-tk-{number}", group, radius, height, density, expansivity))
    for number in range(spheres):
        radius = rng.uniform(7.0, 10.0)
        found.append(Vessel(f"g{group}-sp-{number}", group, radius, 2.0 * radius, 510.0, 2.0e-3, round=True))
    return found


def _night(
    rng: np.random.Generator, vessels: Sequence[Vessel], filled: FloatArray, night: int, group: int, tickets: int,
    proved: dict[tuple[int, int], int],
) -> list[Movement]:  # fmt: skip
    """Movements that every vessel has the room and the content for; what is filled follows them."""
    own = [at for at, vessel in enumerate(vessels) if vessel.group == group]
    found: list[Movement] = []
    for _ in range(TRIES):
        if len(found) == tickets:
            break
        way = int(rng.choice(3, p=[0.35, 0.35, 0.3]))  # in, out, between
        one, other = (int(at) for at in rng.choice(own, 2, replace=len(own) == 1))
        source, target = (None if way == 0 else one), (None if way == 1 else other)
        if source == target:
            continue
        mass = rng.uniform(0.02, 0.12) * min(vessels[at].capacity for at in (source, target) if at is not None)
        if source is not None and filled[source] - mass < LOWEST * vessels[source].capacity:
            continue
        if target is not None and filled[target] + mass > HIGHEST * vessels[target].capacity:
            continue
        ends = tuple(None if at is None else vessels[at].name for at in (source, target))
        for at, sign in ((source, -1.0), (target, 1.0)):
            if at is not None:
                filled[at] += sign * mass
        meter = f"g{group}-m-{way}:{int(night >= proved[group, way])}"
        found.append(Movement(f"g{group}-t-{night}-{len(found)}", night, ends[0], ends[1], mass, meter))
    return found
