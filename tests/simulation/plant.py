"""Faults of every kind, drawn for a site: subjects that were in use, and sizes from what can barely be seen upwards."""

from __future__ import annotations

import numpy as np

from tests.simulation.plan import Movement, Plan, Vessel
from tests.simulation.site import LAB, Fault

# Smallest and largest size, in mm of the vessel's level where the kind is one of masses.
SIZES = {
    "level_bias": (8.0, 25.0),  # mm
    "temperature_bias": (1.5, 4.0),  # °C
    "density_bias": (3.0, 8.0),  # kg/m³
    "meter_bias": (0.5, 1.5),  # %
    "meter_drift": (0.1, 0.3),  # % more each night
    "vessel_loss": (12.0, 40.0),
    "slow_loss": (1.5, 4.0),
    "bad_stock_take": (12.0, 40.0),
    "unrecorded_transfer": (12.0, 40.0),
    "wrong_transfer": (12.0, 40.0),
}
KINDS = (*SIZES, "late_transfer", "duplicated_transfer", "misrouted_transfer", "level_stuck")
STUCK_NIGHTS = 3
SEEN = 12.0  # mm of level that a ticket must move for its fault to be one


def draw_fault(plan: Plan, rng: np.random.Generator, kind: str, night: int) -> Fault | None:
    """A fault that begins in a night; None where nothing there could have it."""
    if kind in ("late_transfer", "duplicated_transfer", "misrouted_transfer", "wrong_transfer"):
        return _of_a_ticket(plan, rng, kind, night)
    if kind in ("meter_bias", "meter_drift"):
        later = sorted({one.meter for one in plan.movements if one.night == night})
        return Fault(kind, (str(rng.choice(later)),), night, _signed(rng, kind)) if later else None
    at = int(rng.integers(len(plan.vessels)))
    vessel = plan.vessels[at]
    if kind in ("level_bias", "temperature_bias"):
        return Fault(kind, (vessel.name,), night, _signed(rng, kind))
    if kind == "density_bias":
        subject = LAB if rng.random() < 0.25 else plan.sample[at][night]
        first = 0 if subject == LAB else plan.sample[at].index(subject)
        return Fault(kind, (subject,), night if subject == LAB else first, _signed(rng, kind))
    if kind == "level_stuck":
        return _stuck(plan, rng, night)
    size = float(rng.uniform(*SIZES[kind])) * vessel.per_mm
    if kind == "unrecorded_transfer":
        others = sorted(one.name for one in plan.vessels if one.group == vessel.group and one.name != vessel.name)
        ends = sorted((vessel.name, str(rng.choice(others)))) if others and rng.random() < 0.5 else [vessel.name, ""]
        return Fault(kind, tuple(ends), night, size * float(rng.choice([-1.0, 1.0])))
    if kind == "bad_stock_take":
        size *= float(rng.choice([-1.0, 1.0]))
    return Fault(kind, (vessel.name,), night, size)


def _signed(rng: np.random.Generator, kind: str) -> float:
    return float(rng.uniform(*SIZES[kind]) * rng.choice([-1.0, 1.0]))


def _ends(plan: Plan, movement: Movement) -> list[Vessel]:
    return [plan.vessels[plan.place[end]] for end in (movement.source, movement.target) if end is not None]


def _stuck(plan: Plan, rng: np.random.Generator, night: int) -> Fault | None:
    """A gauge that stands still while much moves."""
    net: dict[str, float] = {}
    for movement in plan.movements:
        if movement.night == night:
            for end, sign in ((movement.source, -1.0), (movement.target, 1.0)):
                if end is not None:
                    net[end] = net.get(end, 0.0) + sign * movement.mass
    moved = sorted(name for name, mass in net.items() if abs(mass) > 5.0 * SEEN * plan.vessels[plan.place[name]].per_mm)
    if not moved:
        return None
    until = min(plan.nights, night + STUCK_NIGHTS - 1)
    return Fault("level_stuck", (str(rng.choice(moved)),), night, 0.0, until)


def _of_a_ticket(plan: Plan, rng: np.random.Generator, kind: str, night: int) -> Fault | None:
    """A fault of one ticket of that night that moves its vessels by what can be seen."""
    whole = [one for one in plan.movements if (one.night, one.share) == (night, 1.0)]
    large = [one for one in whole if all(one.mass > SEEN * vessel.per_mm for vessel in _ends(plan, one))]
    if not large:
        return None
    ticket = large[int(rng.integers(len(large)))]
    ends = _ends(plan, ticket)
    if kind == "wrong_transfer":
        size = _signed(rng, kind) * float(np.mean([vessel.per_mm for vessel in ends]))
        return Fault(kind, (ticket.name,), night, max(size, -0.8 * ticket.mass))
    if kind == "duplicated_transfer":
        return Fault(kind, (ticket.name,), night)
    if kind == "late_transfer":
        towards = "next" if night > 1 and rng.random() < 0.5 else "previous"
        return Fault(kind, (ticket.name, towards), night - 1 if towards == "next" else night)
    others = [one.name for one in plan.vessels if one.group == ends[0].group and one not in ends]
    if not others:
        return None
    true = str(rng.choice([vessel.name for vessel in ends]))
    return Fault(kind, (ticket.name, str(rng.choice(others)), true), night)
