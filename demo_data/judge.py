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
from datetime import datetime
from typing import Any

import numpy as np

from demo_data.measure import Book, Sample, Series, declared
from demo_data.physics import ATMOSPHERE_KPA, Conditions, hull, mass_kg
from demo_data.schedule import FIRST_DAY, LAST_DAY, instant
from demo_data.terminal import METERS
from demo_data.truth import Vessel

AMBIENT_C, BAROMETER_KPA, EXPANSION_SHARE, LOCAL_SPAN_M = 2.0, 0.1, 0.02, 1.0
Parts = dict[str, float]
Known = dict[str, float]
Moves = list[tuple[str, str, float]]  # an input, the name of its error, one standard uncertainty
INPUTS = {
    "level_m": "level_m",
    "liquid_temperature_c": "liquid_c",
    "pressure_kpa": "gauge_kpa",
    "vapour_temperature_c": "vapour_c",
}


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
        self.winners = {
            key: self._series(key, one.plan.winner, "level_m" if one.liquid else "pressure_kpa")
            for key, one in found.items()
        }

    def _series(self, vessel: str, source: str, quantity: str) -> Series:
        return next(s for s in self.book.series if (s.vessel, s.source) == (vessel, source) and quantity in s.columns)

    def mass(self, key: str, when_s: int) -> tuple[float, Parts]:
        """Mass of one vessel at a close and the parts of its uncertainty."""
        vessel, liquid = self.found[key], self._liquid(key)
        known, moves = self._read(key, when_s)
        if liquid:
            known["density_15"], more = self._density(key, when_s, liquid)
            moves += more
        here = Conditions(**known)
        shell, roof, gas = self.shells[key], vessel.roof_kg, vessel.plan.gas

        def weigh(conditions: Conditions, content: Any = liquid) -> float:
            return float(mass_kg(shell, content, gas, roof, conditions))

        mass = weigh(here)
        parts: Parts = defaultdict(float)
        for name, error, sigma in moves:
            step = 1e-3 * sigma
            parts[error] += 1e3 * (weigh(replace(here, **{name: getattr(here, name) + step})) - mass)
        if liquid:
            drifted = replace(liquid, scale=1.0 + EXPANSION_SHARE)
            parts[f"expansion:{vessel.plan.substance}"] += weigh(here, drifted) - mass
        self._capacity(key, mass + roof, here.level_m, parts)
        return mass, parts

    def _read(self, key: str, when_s: int) -> tuple[Known, Moves]:
        """What the instruments showed at a close, and how wrong each may be."""
        vessel, winner, site = self.found[key], self.winners[key], self.book.site
        known = {
            "ambient_c": at(site, "ambient_temperature_c", when_s)[0],
            "barometer_kpa": at(site, "barometric_pressure_kpa_abs", when_s)[0],
        }
        moves: Moves = [
            ("ambient_c", "ambient", AMBIENT_C),
            ("barometer_kpa", f"barometer:{when_s}", BAROMETER_KPA),
        ]
        for quantity in winner.columns:
            name, said = INPUTS[quantity], declared(vessel, quantity, winner.source)
            known[name], read_s = at(winner, quantity, when_s)
            moves.append((name, f"{quantity}:{said.get('instrument', key)}", said["systematic"]))
            moves.append((name, f"r:{key}:{quantity}:{read_s}", said["random"]))
        if vessel.plan.water_m:
            dip = self._series(key, "hand", "free_water_level_m")
            known["water_m"], read_s = at(dip, "free_water_level_m", when_s)
            random = declared(vessel, "free_water_level_m", "hand")["random"]
            moves.append(("water_m", f"r:{key}:water:{read_s}", random))
        return known, moves

    def _density(self, key: str, when_s: int, liquid: Declared) -> tuple[float, Moves]:
        """Density at 15 °C: the laboratory's last, or the declared one where no sample is taken."""
        plan = self.found[key].plan
        sample = self._sample(key, when_s)
        if sample is None:
            body = self.substances[plan.substance]["liquid"]
            unknown = ("density_15", f"substance:{plan.substance}", body["density_uncertainty_kg_m3"])
            return body["density_kg_m3"], [unknown]
        said = plan.body["instruments"]
        lab, bath = said["observed_density_kg_m3"], said["observed_density_temperature_c"]
        warmth = bath["systematic"] * sample.density * liquid.beta[0]
        return sample.density, [
            ("density_15", f"density:{lab['instrument']}", lab["systematic"]),
            ("density_15", f"sample:{sample.id}", lab["random"]),
            ("density_15", f"bath:{bath['instrument']}", warmth),
        ]

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
        return Declared(
            tuple(beta) if isinstance(beta, list) else (beta,),
            body["compressibility_per_kpa"],
            body.get("at_pressure_kpa_abs", ATMOSPHERE_KPA),
        )

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
    stamped = [one | {name: sortable(one[name]) for name in ("started_at", "ended_at")} for one in book.tickets]
    masses = {
        (key, day): clerk.mass(key, instant(day, "06:00")) for key in found for day in range(FIRST_DAY, LAST_DAY + 2)
    }
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


def sortable(text: str) -> str:
    """An instant as text whose order is that of time: local texts are not, when the clocks change."""
    return f"{int(datetime.fromisoformat(text).timestamp()):012d}"
