"""Samples that a receipt made stale: contents are blended by mass and standard volume, or known less well.

The density of a blend is that of the dry liquid, as a ticket's is that of the net substance; the water's share
is blended beside it, each since its own sample.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

from app.schemas.transfer import Transfer
from app.services import move
from app.services.compile import WATER_DENSITY
from app.services.measure import Measured, standard_density
from app.services.parts import at_row
from app.store.transfers import Transfer as Ticket
from models import instruments
from models.estimate import Estimate
from models.liquid.definition import MixtureLiquid

if TYPE_CHECKING:
    from app.services.carry import Carried, Moves

Own = Sequence[tuple[Ticket, Transfer]]


@dataclass(frozen=True)
class Blend:
    """Density of a content that received something since its sample, None for the sample's, and its error.

    ``water`` is its share of sediment and water, None for the sample's; beside it the density is the dry one.
    """

    density: float | None
    sigma: float
    name: str
    water: float | None = None
    water_sigma: float = 0.0
    water_name: str = ""


@dataclass(frozen=True)
class Corrections:
    """What samples and water dips no longer say, by row."""

    blends: Mapping[int, Blend]
    dry: frozenset[int]


@dataclass(frozen=True)
class _Receipt:
    """What came in since a sample: net mass, standard density of its own if known, water and net volume."""

    ticket: str
    mass: float
    density: float | None
    net: float
    water: float


@dataclass(frozen=True)
class _Since:
    """What came and what left since a sample, in the order of time; of what left the standard volume."""

    events: tuple[_Receipt | float, ...]

    @property
    def received(self) -> list[_Receipt]:
        """What came."""
        return [one for one in self.events if isinstance(one, _Receipt)]

    @property
    def delivered(self) -> float:
        """Standard volume of what left. [m³]"""
        return math.fsum(one for one in self.events if isinstance(one, float))


@dataclass(frozen=True)
class _Content:
    """A content as its samples describe it: standard volume with its water, the water's share, density without."""

    volume: float
    share: float
    density: float
    wet: bool  # whether the water's share was sampled


def stale(measured: Measured, moves: Moves, own: Own, row: int, carried: Carried) -> Blend | None:
    """What a receipt after a sample does to a row; each such sample is said to predate it."""
    read = int(measured.collected.at[row])
    vessel = measured.vessel(row)
    _analyses(measured, own, row, read, carried)
    content = _content(measured, row) if vessel.has_liquid else None
    if content is None:
        return None
    standard = {vessel.name: standard_density(measured, row)}
    found: list[Blend] = []
    names: set[str] = set()
    for name, blended in (("density", _density), ("liquid_composition", _density), ("sediment_water", _water)):
        chosen = measured.chosen[name]
        if chosen.usable[row] and (name != "liquid_composition" or _is_density(measured, row)):
            since = _since(measured, moves, own, row, int(chosen.begins[row]), content, standard)
            if any(one.mass != 0.0 for one in since.received):
                found.append(blended(vessel.name, content, since))
                names.add(name)
    if not found:
        return None
    if names != {"liquid_composition"}:
        carried.warn(
            "sample_predates_receipt", "a receipt came after the sample that stands for the content", uncertain=True
        )
    return _together(found, content)


def _analyses(measured: Measured, own: Own, row: int, read: int, carried: Carried) -> None:
    """A content that received something since its analysis: what came in has a composition that nobody told."""
    vessel = measured.vessel(row)
    by_composition = vessel.has_liquid and isinstance(vessel.liquid, MixtureLiquid)
    for quantity, what, counts in (
        ("vapour_composition", "gas", vessel.has_vapour), ("liquid_composition", "liquid", by_composition),
    ):  # fmt: skip
        chosen = measured.chosen[quantity]
        if not counts or not chosen.usable[row]:
            continue
        begins = int(chosen.begins[row])
        if any(b.of is None and b.to == vessel.name and t.started_at < read and t.ended_at > begins for t, b in own):
            detail = f"a receipt came after the analysis that stands for the {what}"
            carried.warn("sample_predates_receipt", detail, uncertain=True)


def _is_density(measured: Measured, row: int) -> bool:
    """Whether an analysis stands for the content's density: a liquid by composition of which no density was read."""
    usable = {name: bool(measured.chosen[name].usable[row]) for name in ("liquid_composition", "density")}
    by_composition = isinstance(measured.vessel(row).liquid, MixtureLiquid)
    return by_composition and usable["liquid_composition"] and not usable["density"]


def _content(measured: Measured, row: int) -> _Content | None:
    """The content by its samples as they are."""
    volume = float(measured.result["gross_standard_volume"][row])
    held = float(measured.result["standard_density"][row])
    share = at_row(measured.state.sediment_water, row)
    if not (math.isfinite(volume) and volume > 0.0 and math.isfinite(held) and share < 1.0):
        return None
    return _Content(volume, share, held, bool(measured.chosen["sediment_water"].usable[row]))


def _since(
    measured: Measured, moves: Moves, own: Own, row: int, begins: int, content: _Content, standard: dict[str, Estimate]
) -> _Since:
    """What moved between the beginning of a sample and the reading, each ticket at the middle of its time."""
    vessel, read = measured.vessel(row), int(measured.collected.at[row])
    events: list[tuple[int, _Receipt | float]] = []
    since = [one for one in own if one[1].of is None and one[0].started_at < read and one[0].ended_at > begins]
    if all(body.to != vessel.name for _, body in since):
        return _Since(())  # what left, left as it was
    dense = float(measured.result["vapour_density"][row])
    space = {vessel.name: dense} if math.isfinite(dense) else {}
    for ticket, body in since:
        middle = max(ticket.started_at, begins) + min(ticket.ended_at, read)
        part = moves.part(ticket, begins, read, standard, spaces=space)
        mass = math.nan if part.mass is None else part.mass.value
        if part.target == vessel.name:
            density = move.own_density(ticket.name, body, vessel)
            net = mass / (content.density if density is None else density.value)
            water = _water_of(body, mass, net) if content.wet else 0.0
            known = None if density is None else density.value
            events.append((middle, _Receipt(ticket.name, mass, known, net, water)))
        elif part.mass is not None:
            events.append((middle, mass / content.density / (1.0 - content.share)))
    events.sort(key=lambda one: (one[0], isinstance(one[1], float)))
    return _Since(tuple(event for _, event in events))


def _water_of(body: Transfer, mass: float, net: float) -> float:
    """Standard volume of a ticket's water; its share is one of the quantity that the ticket is in."""
    share = body.sediment_water_pct / 100.0
    if share >= 1.0:
        return 0.0
    by_mass = body.quantities()[:1] in (["mass_kg"], ["weight_in_air_kg"])
    return share / (1.0 - share) * (mass / WATER_DENSITY if by_mass else net)


def _density(vessel: str, content: _Content, since: _Since) -> Blend:
    """The content's density by mass and net volume; or the sample's, less well known."""
    received = since.received
    name = f"mix:{vessel}:{received[-1].ticket}"
    if all(one.density is not None and math.isfinite(one.mass) for one in received):
        mass, net, _ = _mixed(content, since)
        return Blend(mass / net, abs(mass / net - content.density) / math.sqrt(3.0), name)
    share = math.fsum(one.net if math.isfinite(one.net) else content.volume for one in received)
    return Blend(None, instruments.BLEND_DENSITY * min(1.0, share / (content.volume + since.delivered)), name)


def _water(vessel: str, content: _Content, since: _Since) -> Blend:
    """The water's share of the content, where the volumes of what came are known."""
    received = since.received
    name = f"wet:{vessel}:{received[-1].ticket}"
    if not all(math.isfinite(one.mass) for one in received):
        return Blend(None, 0.0, name)
    _, net, water = _mixed(content, since)
    share = water / (net + water)
    return Blend(None, 0.0, name, share, abs(share - content.share) / math.sqrt(3.0), name)


def _mixed(content: _Content, since: _Since) -> tuple[float, float, float]:
    """Mass, net volume and water of a heel that was mixed with what came; what left was as the content was then."""
    came = math.fsum(one.net + one.water for one in since.received)
    heel = max(0.0, content.volume + since.delivered - came)
    net, water = heel * (1.0 - content.share), heel * content.share
    mass = net * content.density
    for one in since.events:
        if isinstance(one, _Receipt):
            mass, net, water = mass + one.mass, net + one.net, water + one.water
        elif net + water > one:  # else nothing would be left, which the level denies
            kept = 1.0 - one / (net + water)
            mass, net, water = mass * kept, net * kept, water * kept
    return mass, net, water


def _together(found: Sequence[Blend], content: _Content) -> Blend:
    """The blends of both samples as one; beside another share of water the density is told dry."""
    water = next((one for one in found if one.water is not None), None)
    mixed = next((one for one in found if one.water is None), None)
    if water is None:
        assert mixed is not None
        return mixed
    density = content.density if mixed is None or mixed.density is None else mixed.density
    sigma, name = (0.0, water.name) if mixed is None else (mixed.sigma, mixed.name)
    return Blend(density, sigma, name, water.water, water.water_sigma, water.name)
