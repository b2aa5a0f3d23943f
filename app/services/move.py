"""Transfers: tickets are kept, and each becomes a mass with named errors, whole or for a part of its time."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import lru_cache

from app.errors import FieldError, NotFound, Unprocessable
from app.schemas.batch import RowError
from app.schemas.meter import Meter
from app.schemas.transfer import MovedQuantity, NamedTransfer, Transfer
from app.schemas.types import canonical
from app.services import mark
from app.services.compile import CompiledVessel, mean_atmosphere, vapour_density
from app.services.compositions import boiling_pressure
from app.services.find import ALL_TIME, site_number
from app.services.liquids import density_between
from app.store import definitions, transfers
from app.store.engine import Store, Writing
from app.store.transfers import Outcome
from app.store.transfers import Transfer as Ticket
from models import constants, instruments, units
from models.estimate import Estimate, combine

BOUNDARY = "boundary:"
SAME_VOLUME_SHARE = 0.2  # of a vapour return that nobody measured
SPLIT_SHARE = 0.05  # of the whole, of a ticket divided by time; at most half of its smaller part


@dataclass(frozen=True)
class Moved:
    """One ticket in one period: what it moved between its ends, None where nothing was measured."""

    name: str
    source: str | None  # None is a boundary
    target: str | None
    mass: Estimate | None
    water: bool


def put(store: Store, site: str, name: str, body: Transfer, request: str = "") -> tuple[Outcome, int]:
    """Keep a ticket; its ends and its meter must be defined. The outcome and the ``recorded_at``."""
    with store.reading() as connection:
        site_number(connection, site)
    with store.writing(site, deed="transfer", request=request) as writing:
        refused = _refusals(writing, body)
        if refused:
            raise Unprocessable(refused[0].detail, code=refused[0].code, errors=refused)
        text = canonical(body)
        return _keep(writing, name, body, text), writing.recorded_at


def put_many(
    store: Store, site: str, rows: Sequence[tuple[int, NamedTransfer]], errors: list[RowError], request: str = ""
) -> tuple[dict[str, int], list[RowError], int]:
    """Keep the good tickets of a batch; counts of outcomes, what was refused, and the ``recorded_at``."""
    counts = {"created": 0, "revised": 0, "unchanged": 0}
    with store.reading() as connection:
        site_number(connection, site)
    with store.writing(site, deed="transfers", request=request) as writing:
        for index, body in rows:
            problems = _refusals(writing, body)
            errors.extend(
                RowError(index=index, field=one.pointer.strip("/"), code=one.code, detail=one.detail)
                for one in problems
            )
            if not problems:
                text = canonical(body, without={"id"})
                counts[_keep(writing, body.id, body, text)] += 1
        return counts, sorted(errors, key=lambda error: error.index), writing.recorded_at


def _keep(writing: Writing, name: str, body: Transfer, text: str) -> Outcome:
    """Keep one ticket; the closed nights that it or its former text touches become due."""
    former = transfers.current(writing.connection, writing.site_id, name, writing.recorded_at)
    ends = tuple("" if end.startswith(BOUNDARY) else end for end in (body.from_, body.to))
    outcome = transfers.put(
        writing, name, body.started_at, body.ended_at, text, ends=(ends[0], ends[1]), void=body.void
    )
    if outcome != "unchanged":
        last = writing.recorded_at if body.ended_at is None else body.ended_at
        mark.period(writing, body.started_at, last, "late or corrected transfer")
        if former is not None:
            mark.period(writing, former.started_at, former.ended_at, "late or corrected transfer")
    return outcome


def _refusals(writing: Writing, body: Transfer) -> list[FieldError]:
    """Ends and meters that nobody defined, and ways of measuring that this version does not compute."""
    found: list[FieldError] = []
    for pointer, end in (("/from", body.from_), ("/to", body.to)):
        if not end.startswith(BOUNDARY) and not _known(writing, "vessel", end):
            detail = "It is neither a vessel of this site nor a boundary, such as boundary:jetty-1"
            found.append(FieldError(pointer, "unknown_vessel", detail))
    if body.meter is not None and not _known(writing, "meter", body.meter):
        found.append(FieldError("/meter", "unknown_meter", "This site has no meter of that id"))
    return found


def _known(writing: Writing, kind: str, name: str) -> bool:
    return bool(definitions.in_force(writing.connection, writing.site_id, kind, ALL_TIME, writing.recorded_at, [name]))


def body_of(ticket: Ticket) -> Transfer:
    """A stored ticket as its body again."""
    return _transfer_of(ticket.body)


@lru_cache(maxsize=20_000)
def _transfer_of(text: str) -> Transfer:
    """A stored text as a transfer; the same text is read once, though a ticket is asked for its parts many times."""
    return Transfer.model_validate_json(text)


def current(store: Store, site: str, name: str, as_of: int | None) -> tuple[Ticket, Transfer]:
    """One ticket as it is known."""
    with store.reading() as connection:
        site_id = site_number(connection, site)
        found = transfers.current(connection, site_id, name, ALL_TIME if as_of is None else as_of)
    if found is None:
        raise NotFound("There is no transfer of that id here", code="unknown_transfer")
    return found, body_of(found)


def moved(
    ticket: Ticket, opening: int, closing: int, vessels: Mapping[str, CompiledVessel], meters: Mapping[str, Meter],
    standard: Mapping[str, Estimate], spaces: Mapping[str, float] | None = None, asked: int | None = None,
) -> Moved:  # fmt: skip
    """What a ticket moved within a period, with its errors named.

    ``standard`` is the standard density of each vessel at the period's close with its parts, for tickets
    in volume that bring no density of their own; ``spaces`` the density of its vapour, for what came back;
    ``asked`` the edge that stands fast where a mass is carried to it from its reading.
    """
    body = body_of(ticket)
    source = None if body.from_.startswith(BOUNDARY) else body.from_
    target = None if body.to.startswith(BOUNDARY) else body.to
    unmeasured = body.unmetered or body.by == "gauging"
    if unmeasured or body.of == "water":
        return Moved(ticket.name, source, target, None, body.of == "water")
    vessel = vessels.get(source or "") or vessels.get(target or "")
    kind = body.quantities()[0]
    factor = _kilograms_per_unit(
        ticket.name, body, kind, vessel, standard.get(source or "") or standard.get(target or "")
    )
    whole = float(getattr(body, kind))
    share, split = _part(ticket.name, body, kind, whole, ticket.ended_at, opening, closing, asked)
    if factor is None:
        return Moved(ticket.name, source, target, None, water=False)
    net = 1.0 - body.sediment_water_pct / 100.0
    part = share / whole if whole else 0.0
    if body.meter is not None:
        net /= 1.0 + _factor(meters.get(body.meter), body.started_at)[0] / 100.0
    mass = Estimate(share * factor.value * net, {name: share * net * one for name, one in factor.parts.items()})
    errors = _ticket_errors(ticket.name, body, meters, mass.value, part)
    errors.update({name: one * factor.value * net for name, one in split.items()})
    returned = _returned(ticket.name, body, vessel, whole * factor.value * net, standard, spaces or {})
    return Moved(
        ticket.name,
        source,
        target,
        combine([(1.0, mass), (1.0, Estimate(0.0, errors)), (-part, returned)]),
        water=False,
    )


def _returned(
    name: str, body: Transfer, vessel: CompiledVessel | None, mass: float, standard: Mapping[str, Estimate],
    spaces: Mapping[str, float],
) -> Estimate:  # fmt: skip
    """Vapour that came back with the whole of a transfer: weighed, by its volume, or the liquid's volume of it."""
    given = body.vapour_return
    if given is None:
        return Estimate(0.0)
    if not isinstance(given, str) and given.mass_kg is not None:
        return Estimate(given.mass_kg)
    if vessel is None or vessel.mixture is None:
        return Estimate(0.0)
    if isinstance(given, str):
        dense = standard.get(vessel.name)
        liquid = dense.value if dense is not None else vessel.density[0]
        density = spaces.get(vessel.name, math.nan)
        if not math.isfinite(density):  # never measured: saturated at the site's base temperature
            base = vessel.parameters["standard_temperature"]
            density, _ = vapour_density(vessel, boiling_pressure(vessel.boiling, base), base)
        returned = mass / liquid * density
        return Estimate(returned, {f"vapour-return:{name}": SAME_VOLUME_SHARE * returned})
    assert given.volume_m3 is not None and given.temperature_c is not None and given.pressure_kpa is not None
    atmosphere, _ = mean_atmosphere(vessel.site)
    pressure = given.pressure_kpa * units.PASCAL_PER_KPA + atmosphere
    density, spread = vapour_density(vessel, pressure, float(units.kelvin(given.temperature_c)))
    returned = given.volume_m3 * density
    return Estimate(returned, {f"vapour:{vessel.body.substance}": spread * returned})


def _kilograms_per_unit(
    name: str, body: Transfer, kind: str, vessel: CompiledVessel | None, standard: Estimate | None
) -> Estimate | None:
    """Mass of one unit of the ticket's quantity, with the errors of the density that it rests on."""
    if kind == "mass_kg":
        return Estimate(1.0)
    own = own_density(name, body, vessel)
    density = own or standard
    if density is None or vessel is None or vessel.liquid is None:
        return None
    if kind == "standard_volume_m3":
        return density
    if kind == "observed_volume_m3":
        assert body.temperature_c is not None
        base = vessel.parameters["standard_temperature"], vessel.parameters["standard_pressure"]
        pressure = base[1] if body.pressure_kpa is None else body.pressure_kpa * units.PASCAL_PER_KPA + base[1]
        temperature = float(units.kelvin(body.temperature_c))
        ratio = density_between(vessel.liquid, density.value, base, (temperature, pressure), base[1]) / density.value
        return Estimate(density.value * ratio, {name: part * ratio for name, part in density.parts.items()})
    air, weights = constants.CONVENTIONAL_AIR_DENSITY, constants.CONVENTIONAL_WEIGHT_DENSITY
    return Estimate((1.0 - air / weights) / (1.0 - air / density.value))  # weight in air to mass, OIML D 28


def own_density(name: str, body: Transfer, vessel: CompiledVessel | None) -> Estimate | None:
    """The ticket's own density, taken to the vessel's standard state."""
    if body.density_kg_m3 is None or vessel is None or vessel.liquid is None:
        return None
    assert body.density_temperature_c is not None
    base = vessel.parameters["standard_temperature"], vessel.parameters["standard_pressure"]
    there = float(units.kelvin(body.density_temperature_c))
    ratio = density_between(vessel.liquid, body.density_kg_m3, (there, base[1]), base, base[1]) / body.density_kg_m3
    instrument = vessel.instrument("observed_density_kg_m3", "lab")
    return Estimate(
        body.density_kg_m3 * ratio,
        {
            f"density:{instrument.name}": instrument.systematic * ratio,
            f"sample:ticket:{name}": instrument.random * ratio,
        },
    )


def _ticket_errors(
    name: str, body: Transfer, meters: Mapping[str, Meter], mass: float, share: float
) -> dict[str, float]:
    """Repeatability and factor of what measured the ticket."""
    if body.meter is None:
        spread = body.mass_uncertainty_kg or 0.0
        return {f"t:{name}": spread * share} if spread else {}
    meter = meters.get(body.meter)
    random = instruments.METER_RANDOM_PCT if meter is None or meter.random_pct is None else meter.random_pct
    _, systematic, proved = _factor(meter, body.started_at)
    return {f"t:{name}": mass * random / 100.0, f"meter:{body.meter}:{proved}": mass * systematic / 100.0}


def proved(meter: Meter | None, started_at: int) -> str:
    """Which interval between two provings a transfer falls in."""
    return _factor(meter, started_at)[2]


def _factor(meter: Meter | None, started_at: int) -> tuple[float, float, str]:
    """What a meter reads high between two provings, its standard uncertainty (both in %), and which interval.

    The proving at the interval's end measures its error: weighed with the declared one, whose mean is none.
    """
    own = instruments.METER_SYSTEMATIC_PCT
    if meter is not None and meter.systematic_pct is not None:
        own = meter.systematic_pct
    systematic, proved = own, ""
    for proving in meter.provings if meter is not None else ():
        if proving.at <= started_at:
            proved = str(proving.at)
            systematic = own if proving.systematic_pct is None else proving.systematic_pct
        elif proving.as_found_pct is not None and proving.as_found_uncertainty_pct is not None:
            total = systematic**2 + proving.as_found_uncertainty_pct**2
            weight = systematic**2 / total if total > 0.0 else 1.0
            known = math.sqrt(weight) * proving.as_found_uncertainty_pct
            return weight * proving.as_found_pct, known, proved
        else:
            break
    return 0.0, systematic, proved


def _part(
    name: str, body: Transfer, kind: str, whole: float, ended_at: int, opening: int, closing: int, asked: int | None
) -> tuple[float, dict[str, float]]:
    """How much of the quantity falls into the period, and the errors of dividing it, in its own unit.

    The parts of all periods always add up to the ticket; an error of the division is + before, − after.
    Two divisions of one piece of a ticket err alike the nearer they are: at ``asked``, which a book also
    divides it at, the error is its own; at the other edge it follows that one as a bridge over the piece does.
    """
    points = _running(body, kind, whole, ended_at)
    first, last = _at(points, opening), _at(points, closing)
    errors: dict[str, float] = {}
    for sign, edge, other in ((-1.0, first, last), (1.0, last, first)):
        if not edge.spread:
            continue
        tied = _tied(edge, other) if asked is not None and edge.at != asked and other.at == asked else 0.0
        for at, size in ((edge.at, math.sqrt(1.0 - tied * tied)), (other.at, tied)):
            if size:
                errors[f"split:{name}:{at}"] = errors.get(f"split:{name}:{at}", 0.0) + sign * size * edge.spread
    return last.quantity - first.quantity, errors


@dataclass(frozen=True)
class _Edge:
    """Running quantity at an instant and its standard uncertainty; the piece of the ticket and the share of it."""

    at: int
    quantity: float
    spread: float
    piece: int
    share: float


def _tied(one: _Edge, other: _Edge) -> float:
    """Correlation of the running quantity at two instants of one piece, both of whose ends are known."""
    if one.piece != other.piece or not other.spread:
        return 0.0
    low, high = sorted((one.share, other.share))
    return math.sqrt(low * (1.0 - high) / (high * (1.0 - low)))


def _running(body: Transfer, kind: str, whole: float, ended_at: int) -> list[tuple[int, float]]:
    """Instants and running quantities from the start to the end, or to the last progress of one that runs."""
    points = [(body.started_at, 0.0)]
    points.extend((one.at, _quantity(one, kind)) for one in body.progress)
    if body.ended_at is not None:
        points.append((ended_at, whole))
    elif not body.progress:
        points.append((body.started_at, whole))
    return points


def _quantity(one: MovedQuantity, kind: str) -> float:
    return float(getattr(one, kind))


def _at(points: list[tuple[int, float]], instant: int) -> _Edge:
    """Running quantity at an instant, by the points or by time between them."""
    if instant <= points[0][0]:
        return _Edge(instant, 0.0, 0.0, -1, 0.0)
    for piece, ((start, low), (end, high)) in enumerate(zip(points, points[1:], strict=False)):
        if instant == end:
            return _Edge(instant, high, 0.0, piece, 1.0)
        if start < instant < end:
            whole, share = high - low, (instant - start) / (end - start)
            spread = min(SPLIT_SHARE * whole, 0.5 * whole * min(share, 1.0 - share))
            return _Edge(instant, low + whole * share, spread, piece, share)
    return _Edge(instant, points[-1][1], 0.0, len(points), 1.0)
