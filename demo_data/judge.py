"""The nights as a careful clerk would close them, by arithmetic of our own: how plain is each fault?

The masses come from the written readings and the declared tables and liquids; errors are carried by name
(what opening and closing share cancels), by finite differences. It serves to say in the key how many
standard uncertainties each fault is worth, and to see that the clean nights look ordinary.
"""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from demo_data.measure import Book, Sample, Series, declared
from demo_data.physics import ATMOSPHERE_KPA, Conditions, hull, mass_kg
from demo_data.schedule import FIRST_DAY, LAST_DAY, instant
from demo_data.terminal import METERS
from demo_data.truth import Vessel

AMBIENT_C, EXPANSION_SHARE, LOCAL_SPAN_M, PRESSURE_OPEN_KPA = 2.0, 0.02, 1.0, 0.2
Parts = dict[str, float]


@dataclass(frozen=True)
class Declared:
    """A liquid by its declared β (a polynomial in t − 15 °C) and κ; ``scale`` multiplies β."""

    beta: tuple[float, ...]
    kappa_per_kpa: float
    at_kpa_abs: float
    scale: float = 1.0

    def density(self, density_15: Any, temperature_c: Any, pressure_kpa_abs: Any) -> Any:
        """Density in the vessel."""
        x = temperature_c - 15.0
        thermal = sum(b * x ** (power + 1) / (power + 1) for power, b in enumerate(self.beta))
        return density_15 * np.exp(-self.scale * thermal + self.kappa_per_kpa * (pressure_kpa_abs - self.at_kpa_abs))


@dataclass(frozen=True)
class Night:
    """One vessel (or vessels merged by an unmetered transfer) over one day."""

    day: int
    vessels: tuple[str, ...]
    imbalance_kg: float
    uncertainty_kg: float

    @property
    def score(self) -> float:
        """Imbalance in its standard uncertainties."""
        return self.imbalance_kg / self.uncertainty_kg


def at(series: Series, quantity: str, when_s: int) -> tuple[float, int]:
    """The last value at or before an instant, and when it was read."""
    index = int(np.searchsorted(series.at_s, when_s, side="right")) - 1
    return float(series.columns[quantity][index]), int(series.at_s[index])


class Clerk:
    """Masses and named parts from what was written down, and from nothing else."""

    def __init__(self, book: Book, found: Mapping[str, Vessel], substances: Mapping[str, dict[str, Any]]) -> None:
        self.book, self.found, self.substances = book, found, substances
        self.shells = {key: hull(one.plan.body, as_tabulated=True) for key, one in found.items()}
        self.winners = {key: self._series(key, one.plan.winner, "level_m" if one.liquid else "pressure_kpa")
                        for key, one in found.items()}  # fmt: skip

    def _series(self, vessel: str, source: str, quantity: str) -> Series:
        return next(s for s in self.book.series if (s.vessel, s.source) == (vessel, source) and quantity in s.columns)

    def mass(self, key: str, when_s: int) -> tuple[float, Parts]:
        """Mass of one vessel at a close and the parts of its uncertainty."""
        vessel, winner = self.found[key], self.winners[key]
        plan, parts = vessel.plan, defaultdict(float)
        site = self.book.site
        liquid, sample = self._liquid(key), self._sample(key, when_s)
        known = {"ambient_c": at(site, "ambient_temperature_c", when_s)[0],
                 "barometer_kpa": at(site, "barometric_pressure_kpa_abs", when_s)[0]}  # fmt: skip
        moves: list[tuple[str, str, float]] = [("ambient_c", "ambient", AMBIENT_C), ("barometer_kpa", f"barometer:{when_s}", 0.1)]
        for quantity, name in (("level_m", "level_m"), ("liquid_temperature_c", "liquid_c"),
                               ("pressure_kpa", "gauge_kpa"), ("vapour_temperature_c", "vapour_c")):  # fmt: skip
            if quantity in winner.columns:
                known[name], read_s = at(winner, quantity, when_s)
                said = declared(vessel, quantity, plan.winner)
                owner = said.get("instrument", key)
                moves += [(name, f"{quantity}:{owner}", said["systematic"]), (name, f"r:{key}:{quantity}:{read_s}", said["random"])]
        if plan.water_m:
            known["water_m"], read_s = at(self._series(key, "hand", "free_water_level_m"), "free_water_level_m", when_s)
            moves.append(("water_m", f"r:{key}:water:{read_s}", 0.003))
        if liquid and sample:
            said = plan.body["instruments"]["observed_density_kg_m3"]
            known["density_15"] = sample.density
            warmth = 0.03 * sample.density * liquid.beta[0]
            moves += [("density_15", f"density:{said['instrument']}", said["systematic"]), ("density_15", f"sample:{sample.id}", said["random"]),
                      ("density_15", f"bath:{said['instrument']}", warmth)]  # fmt: skip
        elif liquid:
            body = self.substances[plan.substance]["liquid"]
            known["density_15"] = body["density_kg_m3"]
            moves.append(("density_15", f"substance:{plan.substance}", body["density_uncertainty_kg_m3"]))
        here = Conditions(**known)
        shell, roof = self.shells[key], vessel.roof_kg

        def weigh(conditions: Conditions, content: Any = liquid) -> float:
            return float(mass_kg(shell, content, plan.gas, roof, conditions))

        mass = weigh(here)
        for name, error, sigma in moves:
            step = 1e-3 * sigma
            parts[error] += 1e3 * (weigh(replace(here, **{name: getattr(here, name) + step})) - mass)
        if liquid:
            parts[f"expansion:{plan.substance}"] += weigh(here, replace(liquid, scale=1.0 + EXPANSION_SHARE)) - mass
        self._capacity(key, mass + roof, here.level_m, parts)
        return mass, parts

    def _capacity(self, key: str, mass: float, level: float, parts: Parts) -> None:
        """The table's error as a whole, and along the level by hats of 1 m with a variance of one."""
        said = self.found[key].plan.body["instruments"]["capacity_pct"]
        parts[f"capacity:{key}"] += 0.01 * said["systematic"] * mass
        if self.found[key].liquid is None:
            return
        knot = math.floor(level / LOCAL_SPAN_M)
        upper = level / LOCAL_SPAN_M - knot
        for j, weight in ((knot, 1.0 - upper), (knot + 1, upper)):
            parts[f"capacity:{key}:{j}"] += 0.01 * said["local"] * mass * weight / math.hypot(upper, 1.0 - upper)

    def _liquid(self, key: str) -> Declared | None:
        body = self.substances[self.found[key].plan.substance].get("liquid")
        if body is None:
            return None
        beta = body["expansivity_per_k"]
        return Declared(tuple(beta) if isinstance(beta, list) else (beta,), body["compressibility_per_kpa"],
                        body.get("at_pressure_kpa_abs", ATMOSPHERE_KPA))  # fmt: skip

    def _sample(self, key: str, when_s: int) -> Sample | None:
        mine = [one for one in self.book.samples if one.vessel == key and one.taken_s <= when_s]
        return max(mine, key=lambda one: one.taken_s, default=None)


def ticket_mass(one: Mapping[str, Any]) -> tuple[float, Parts]:
    """Mass of a ticket and its parts; an unmetered one has none."""
    mass = one["mass_kg"] if "mass_kg" in one else one["standard_volume_m3"] * one["density_kg_m3"]
    if "meter" not in one:
        return mass, {f"t:{one['id']}": one["mass_uncertainty_kg"]}
    _, random, systematic = METERS[one["meter"]]
    return mass, {f"t:{one['id']}": 0.01 * random * mass, f"meter:{one['meter']}": 0.01 * systematic * mass}


def share_of_day(one: Mapping[str, Any], opening: str, closing: str) -> float:
    """Part of a ticket that belongs to a day; a ticket across its close is split by its progress."""
    if one["ended_at"] <= opening or one["started_at"] >= closing:
        return 0.0
    if one["started_at"] >= opening and one["ended_at"] <= closing:
        return 1.0
    before = one["progress"][0]["standard_volume_m3"] / one["standard_volume_m3"]
    return float(before if one["ended_at"] > closing else 1.0 - before)


def nights(book: Book, found: Mapping[str, Vessel], substances: Mapping[str, dict[str, Any]]) -> Iterator[Night]:
    """Every vessel's imbalance on every day of the month, physical less book: a loss is negative."""
    clerk = Clerk(book, found, substances)
    stamped = [one | {name: _seconds(one[name]) for name in ("started_at", "ended_at")} for one in book.tickets]
    masses = {(key, day): clerk.mass(key, instant(day, "06:00")) for key in found for day in range(FIRST_DAY, LAST_DAY + 2)}
    for day in range(FIRST_DAY, LAST_DAY + 1):
        opening, closing = f"{instant(day, '06:00'):012d}", f"{instant(day + 1, '06:00'):012d}"
        tonight = [(one, share_of_day(one, opening, closing)) for one in stamped]
        tonight = [(one, share) for one, share in tonight if share > 0.0]
        joined = [{one["from"], one["to"]} for one, _ in tonight if "unmetered" in one]
        single = [{key} for key in found if not any(key in pair for pair in joined)]
        for members in [*joined, *single]:
            parts: Parts = defaultdict(float)
            total = 0.0
            for key in members:
                total += masses[key, day + 1][0] - masses[key, day][0]
                for error, kg in masses[key, day + 1][1].items():
                    parts[error] += kg
                for error, kg in masses[key, day][1].items():
                    parts[error] -= kg
            for one, share in tonight:
                sign = (one["from"] in members) - (one["to"] in members)
                if sign and "unmetered" not in one:
                    mass, errors = ticket_mass(one)
                    total += sign * share * mass
                    for error, kg in errors.items():
                        parts[error] += sign * share * kg
            yield Night(day, tuple(sorted(members)), total, math.sqrt(sum(kg * kg for kg in parts.values())))


def _seconds(text: str) -> str:
    from datetime import datetime

    return f"{int(datetime.fromisoformat(text).timestamp()):012d}"
