"""A site as its instruments show it: readings with errors that they share, tickets, and any fault that is planted.

The errors of the tables along the level follow another law than the one that the balance assumes, three waves
in place of knots; all else is normal. One seed gives one window, and a fault changes nothing but what it touches.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np

from models.arrays import BoolArray, FloatArray
from models.balance.window import Check, Stock, Ticket, Window
from models.estimate import Estimate
from tests.simulation.plan import Movement, Plan, Vessel, stream

LAB = "density:lab"
WAVES = 3
WAVE_LENGTHS = (3.2, 5.6)  # spans; at four the correlation over one span vanishes, as it does between knots


@dataclass(frozen=True)
class Errors:
    """Declared standard uncertainties, and how much larger the true ones are."""

    level: float = 2e-3  # m, the gauge's offset
    level_random: float = 1e-3  # m
    temperature: float = 0.25  # K
    temperature_random: float = 0.15  # K
    capacity: float = 7e-4  # of the volume
    local: float = 3e-4  # of the volume, along the level
    span: float = 1.0  # m
    sample: float = 0.4  # kg/m³
    laboratory: float = 0.3  # kg/m³
    factor: float = 1e-3  # of a ticket
    repeatability: float = 5e-4  # of a ticket
    split: float = 0.3  # of the smaller part of a ticket that is split at a close
    dip: float = 1.5e-3  # m
    proving: float = 3e-4  # of a meter's factor
    true_over_declared: float = 1.0
    gauge_step: float = 5e-4  # m


@dataclass(frozen=True)
class Fault:
    """One fault: its kind, its subject as a suspect names it, the night with which it begins, its size.

    Sizes are in the units of the kinds: mm, °C, kg/m³, %, kg, kg/day; of duplicated, misrouted and late tickets
    one. ``level_stuck`` holds its reading up to ``until``; ``meter_drift`` grows by its size each night.
    """

    kind: str
    subject: tuple[str, ...]
    onset: int
    size: float = 1.0
    until: int | None = None


@dataclass(frozen=True)
class Site:
    """What was measured, and the truth behind it."""

    window: Window
    plan: Plan
    content: FloatArray  # kg, by vessel and close
    lost: FloatArray  # kg, by vessel and night: book less physical, had everything been measured truly
    moved: dict[str, float]  # kg, of each ticket


def simulate(
    plan: Plan, seed: int, faults: Sequence[Fault] = (), errors: Errors | None = None, *,
    dips: Sequence[tuple[str, int]] = (), provings: Sequence[tuple[str, int]] = (),
    revised: Mapping[str, int] | None = None,
) -> Site:  # fmt: skip
    """The window of a site with faults; the same seed draws the same errors whatever is planted.

    A vessel is dipped at a close, a meter's factor found in a night; a vessel that is revised at a close has another
    gauge and another table from there on, and opens its next night by them.
    """
    errors = Errors() if errors is None else errors
    content, lost = _truth(plan, faults)
    stocks, checks = [], []
    for at, vessel in enumerate(plan.vessels):
        read = _read(plan, at, content[at], seed, faults, errors)
        own = _stocks(plan, at, read, errors)
        if revised and vessel.name in revised:
            again = _read(plan, at, content[at], seed, faults, errors, revision=2)
            own = _reopened(own, _stocks(plan, at, again, errors), revised[vessel.name])
        stocks += own
        checks += [_dip(vessel, own[close], read, close, seed, errors) for name, close in dips if name == vessel.name]
    tickets = [_ticket(movement, seed, faults, errors) for movement in _recorded(plan, faults)]
    checks += [_proving(plan, meter, night, seed, faults, errors) for meter, night in provings]
    moved = {movement.name: movement.mass / movement.share for movement in plan.movements}
    return Site(Window((1.0,) * plan.nights, stocks, tickets, checks), plan, content, lost, moved)


def unshared(window: Window) -> Window:
    """The same window as one would have it who takes every error for a new one at each value."""

    def alone(estimate: Estimate | None, where: str) -> Estimate | None:
        if estimate is None:
            return None
        return Estimate(estimate.value, {f"{name} at {where}": part for name, part in estimate.parts.items()})

    stocks = [
        replace(
            one, mass=alone(one.mass, f"{one.vessel} {one.close}"), reopened=alone(one.reopened, f"{one.vessel} anew")
        )
        for one in window.stocks
    ]
    tickets = [replace(one, mass=alone(one.mass, f"{one.name} {one.night}")) for one in window.tickets]
    return replace(window, stocks=stocks, tickets=tickets)


def _truth(plan: Plan, faults: Sequence[Fault]) -> tuple[FloatArray, FloatArray]:
    """Content of each vessel at each close, and what each lost each night that no true ticket would tell."""
    place = plan.place
    change = np.zeros((len(plan.vessels), plan.nights))
    lost = np.zeros_like(change)
    for movement in plan.movements:
        for end, sign in ((movement.source, -1.0), (movement.target, 1.0)):
            if end is not None:
                change[place[end], movement.night - 1] += sign * movement.mass
    for fault in faults:
        if fault.kind == "vessel_loss":
            lost[place[fault.subject[0]], fault.onset - 1] += fault.size
        elif fault.kind == "slow_loss":
            lost[place[fault.subject[0]], fault.onset - 1 :] += fault.size
        elif fault.kind == "unrecorded_transfer":
            for end, sign in zip(fault.subject, (1.0, -1.0), strict=True):
                if end:
                    lost[place[end], fault.onset - 1] += sign * fault.size
    content = np.cumsum(np.concatenate([plan.start[:, None], change - lost], axis=1), axis=1)
    return content, lost


@dataclass(frozen=True)
class Read:
    """One vessel as it was read at every close."""

    level: FloatArray  # m
    temperature: FloatArray  # °C
    density: FloatArray  # kg/m³ at 15 °C
    mass: FloatArray  # kg
    still: BoolArray
    true_level: FloatArray  # m
    revision: int


def _read(
    plan: Plan, at: int, content: FloatArray, seed: int, faults: Sequence[Fault], errors: Errors, revision: int = 1
) -> Read:  # fmt: skip
    """A level, a temperature and a density with their errors, and the mass that they make."""
    closes = np.arange(plan.nights + 1)
    vessel, truth = plan.vessels[at], plan.temperature[at]
    name = vessel.name

    def drawn(sigma: float, *ids: str) -> FloatArray:
        each = [sigma * errors.true_over_declared * stream(seed, one).standard_normal() for one in ids]
        return np.array(each)

    def faulty(kind: str) -> FloatArray:
        sizes = [np.where(closes >= f.onset, f.size, 0.0) for f in faults if (f.kind, f.subject) == (kind, (name,))]
        return np.sum(sizes, axis=0) if sizes else np.zeros(len(closes))

    true_level = vessel.level(content / vessel.density_at(truth))
    level = true_level + 1e-3 * faulty("level_bias") + drawn(errors.level, _gauge(name, revision))
    level = level + drawn(errors.level_random, *(f"r:{name}:{k}:level" for k in closes))
    still = _stick(level, name, faults, errors.gauge_step)
    temperature = truth + faulty("temperature_bias") + drawn(errors.temperature, f"temperature:{name}")
    temperature = temperature + drawn(errors.temperature_random, *(f"r:{name}:{k}:temperature" for k in closes))
    density = vessel.density + drawn(errors.sample, *plan.sample[at]) + drawn(errors.laboratory, LAB)
    for fault in faults:
        if fault.kind == "density_bias":
            cited = np.array([fault.subject[0] in (LAB, sample) for sample in plan.sample[at]])
            density = density + np.where(cited & (closes >= fault.onset), fault.size, 0.0)
    table = 1.0 + drawn(errors.capacity, f"capacity:{name}:{revision}")
    table = table + _waves(level, seed, f"{name}:{revision}", errors)
    mass = vessel.density_at(temperature, density) * vessel.volume(level) * table
    for fault in faults:
        if (fault.kind, fault.subject) == ("bad_stock_take", (name,)):
            mass = mass + np.where(closes == fault.onset, fault.size, 0.0)
    return Read(level, temperature, density, mass, still, true_level, revision)


def _gauge(name: str, revision: int) -> str:
    return f"level:{name}" if revision == 1 else f"level:{name}:{revision}"


def _stocks(plan: Plan, at: int, read: Read, errors: Errors) -> list[Stock]:
    vessel, sample = plan.vessels[at], plan.sample[at]
    return [_stock(vessel, close, sample[close], read, errors) for close in range(plan.nights + 1)]


def _stock(vessel: Vessel, close: int, sample: str, read: Read, errors: Errors) -> Stock:
    """One close with the parts of its mass, at what was read."""
    name, table = vessel.name, f"capacity:{vessel.name}:{read.revision}"
    columns = (read.level, read.temperature, read.density, read.mass)
    level, temperature, density, mass = (float(column[close]) for column in columns)
    warmed = float(vessel.density_at(np.array(temperature), density))
    per_m = warmed * float(vessel.area(np.array(level)))
    per_k = -vessel.expansivity * mass * density / warmed
    per_density = mass / density
    parts = {
        _gauge(name, read.revision): per_m * errors.level,
        f"r:{name}:{close}:level": per_m * errors.level_random,
        f"temperature:{name}": per_k * errors.temperature,
        f"r:{name}:{close}:temperature": per_k * errors.temperature_random,
        table: mass * errors.capacity,
        sample: per_density * errors.sample,
        LAB: per_density * errors.laboratory,
    }
    knot, share = divmod(level / errors.span, 1.0)
    norm = np.hypot(1.0 - share, share)
    for at, weight in ((int(knot), 1.0 - share), (int(knot) + 1, share)):
        parts[f"{table}:{at}"] = mass * errors.local * float(weight / norm)
    slopes = {"level": per_m, "temperature": per_k, "density": per_density}
    still = bool(read.still[close])
    return Stock(name, close, Estimate(mass, parts), slopes, (sample, LAB), per_mm=per_m / 1000.0, still=still)


def _reopened(before: Sequence[Stock], after: Sequence[Stock], close: int) -> list[Stock]:
    """Stocks of a vessel whose definition changes at a close."""
    return [*before[:close], replace(before[close], reopened=after[close].mass), *after[close + 1 :]]


def _dip(vessel: Vessel, stock: Stock, read: Read, close: int, seed: int, errors: Errors) -> Check:
    """The gauge less a hand dip, of its own error alone."""
    name, own = vessel.name, f"dip:{vessel.name}:{close}"
    slope = stock.slopes["level"]
    dipped = read.true_level[close] + errors.true_over_declared * errors.dip * stream(seed, own).standard_normal()
    shared = {_gauge(name, read.revision): errors.level, f"r:{name}:{close}:level": errors.level_random}
    parts = {error: slope * sigma for error, sigma in {**shared, own: -errors.dip}.items()}
    return Check(name, close, Estimate(slope * float(read.level[close] - dipped), parts), "level", slope)


def _proving(plan: Plan, meter: str, night: int, seed: int, faults: Sequence[Fault], errors: Errors) -> Check:
    """What a prover found that a meter reads too high, for a typical ticket of its."""
    own = f"proving:{meter}:{night}"
    slope = float(np.mean([movement.mass for movement in plan.meters[meter]])) / 100.0
    found = _factor(meter, night, seed, faults, errors) - 1.0
    found -= errors.true_over_declared * errors.proving * stream(seed, own).standard_normal()
    parts = {f"meter:{meter}": 100.0 * slope * errors.factor, own: -100.0 * slope * errors.proving}
    return Check(meter, night, Estimate(100.0 * slope * found, parts), "meter", slope)


def _stick(level: FloatArray, name: str, faults: Sequence[Fault], step: float) -> BoolArray:
    """Hold a stuck gauge's readings where they were; which readings show the level of the close before."""
    for fault in faults:
        if (fault.kind, fault.subject) == ("level_stuck", (name,)):
            last = len(level) - 1 if fault.until is None else fault.until
            level[fault.onset : last + 1] = level[fault.onset - 1]
    return np.abs(np.diff(level, prepend=np.inf)) <= step


def _waves(level: FloatArray, seed: int, name: str, errors: Errors) -> FloatArray:
    """Error of a capacity table along the level: three waves of one variance together."""
    rng = stream(seed, f"waves:{name}")
    length = errors.span * rng.uniform(*WAVE_LENGTHS, WAVES)
    phase = rng.uniform(0.0, 2.0 * np.pi, WAVES)
    waves = np.cos(2.0 * np.pi * level[:, None] / length + phase).sum(axis=1)
    return np.asarray(errors.local * errors.true_over_declared * np.sqrt(2.0 / WAVES) * waves)


def _recorded(plan: Plan, faults: Sequence[Fault]) -> list[Movement]:
    """What the books have of the movements, but for what a meter makes of them."""
    found = list(plan.movements)
    for fault in faults:
        own = next((at for at, one in enumerate(found) if one.name == fault.subject[0]), None)
        if own is None:
            continue
        ticket = found[own]
        if fault.kind == "duplicated_transfer":
            found.append(replace(ticket, name=f"{ticket.name}-again"))
        elif fault.kind == "misrouted_transfer":  # the subject names the ticket, the end in the books, the true one
            found[own] = _misrouted(ticket, *fault.subject[1:])
        elif fault.kind == "late_transfer":  # the night in the books; the ticket belongs to the next or the previous
            found[own] = replace(ticket, night=ticket.night - 1 if fault.subject[1] == "next" else ticket.night + 1)
    return [one for one in found if 1 <= one.night <= plan.nights]


def _misrouted(ticket: Movement, named: str, true: str) -> Movement:
    return replace(ticket, target=named) if ticket.target == true else replace(ticket, source=named)


def _ticket(movement: Movement, seed: int, faults: Sequence[Fault], errors: Errors) -> Ticket:
    """One ticket as its meter gave it, and as it was written down."""
    scale = errors.true_over_declared
    name = movement.name.removesuffix("-again")  # a copy of a ticket is the ticket's figure once more
    factor = _factor(movement.meter, movement.night, seed, faults, errors)
    factor += scale * errors.repeatability * stream(seed, f"t:{name}").standard_normal()
    mass = movement.mass * factor
    wrong = sum(one.size for one in faults if (one.kind, one.subject) == ("wrong_transfer", (movement.name,)))
    mass += movement.share * wrong
    parts = {f"meter:{movement.meter}": mass * errors.factor, f"t:{movement.name}": mass * errors.repeatability}
    if movement.share < 1.0:
        own = f"split:{movement.name}"
        parts[own] = movement.sign * errors.split * mass / movement.share * min(movement.share, 1.0 - movement.share)
        mass += scale * parts[own] * stream(seed, own).standard_normal()
    return Ticket(
        movement.name, movement.night, movement.source, movement.target, Estimate(mass, parts), movement.meter
    )


def _factor(meter: str, night: int, seed: int, faults: Sequence[Fault], errors: Errors) -> float:
    """What a meter shows of one kilogram."""
    factor = 1.0 + errors.true_over_declared * errors.factor * stream(seed, f"meter:{meter}").standard_normal()
    for fault in faults:
        if fault.subject == (meter,) and night >= fault.onset:
            nights = night - fault.onset + 1 if fault.kind == "meter_drift" else 1
            factor += fault.size / 100.0 * nights
    return float(factor)
