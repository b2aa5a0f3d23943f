"""An opening is stated anew where the close is measured by another table, shell or roof: never a loss."""

from __future__ import annotations

from collections.abc import Mapping
from contextlib import suppress
from dataclasses import dataclass, replace

import numpy as np
from sqlalchemy import Connection

from app.schemas.instruments import Instrument
from app.schemas.meter import Meter
from app.schemas.vessel import Vessel
from app.services.carry import measure_at
from app.services.compile import CompiledVessel, compile_bodies
from app.services.explain import mass_estimate
from app.services.in_force import SiteInForce
from models.errors import DefinitionError
from models.estimate import Estimate

GEOMETRY = ("shape", "shell", "floating_roof", "deadwood")


@dataclass(frozen=True)
class Restated:
    """What the same readings give by the geometry at the close, and how much that differs."""

    mass: Estimate
    change: float


def restated(
    connection: Connection, before: SiteInForce, after: SiteInForce, opening: int, known: int,
    meters: Mapping[str, Meter], closed: Mapping[str, Estimate | None],
) -> dict[str, Restated]:  # fmt: skip
    """Openings by the geometry in force at the close, from the same readings of the same substance.

    Mass is mass: another substance changes no opening, another table does. ``closed`` are the openings as
    they were closed; the difference of the two tables is added to them.
    """
    former = {vessel.name: vessel for vessel in before.vessels}
    pairs: list[tuple[CompiledVessel, CompiledVessel]] = []
    for vessel in after.vessels:
        old = former.get(vessel.name)
        if old is not None and closed.get(vessel.name) is not None and _differs(old.body, vessel.body):
            with suppress(DefinitionError):  # what it held before cannot be in the later geometry: no figure to restate
                pairs.append((old, _with_geometry(old, vessel)))
    found: dict[str, Restated] = {}
    for old, new in pairs:
        two = []
        for one in (old, new):
            measured = measure_at(connection, before.site_id, (one,), np.array([opening]), known, meters, closing=True)
            two.append(mass_estimate(measured, 0))
        was, now = two
        stands = closed[old.name]
        if was is not None and now is not None and stands is not None:
            change = now.value - was.value
            found[old.name] = Restated(Estimate(stands.value + change, now.parts), change)
    return found


def _differs(old: Vessel, new: Vessel) -> bool:
    return any(getattr(old, name) != getattr(new, name) for name in GEOMETRY) or (
        old.gauging.datum_m != new.gauging.datum_m
    )


def _with_geometry(old: CompiledVessel, new: CompiledVessel) -> CompiledVessel:
    """The former vessel with its readings, ages and substance, in the geometry of the later one."""
    instruments: dict[str, Instrument] = dict(old.body.instruments.items())
    instruments.pop("capacity_pct", None)
    if "capacity_pct" in new.body.instruments:
        instruments["capacity_pct"] = new.body.instruments["capacity_pct"]
    update = {name: getattr(new.body, name) for name in GEOMETRY} | {"instruments": instruments}
    update["gauging"] = old.body.gauging.model_copy(update={"datum_m": new.body.gauging.datum_m})
    body = old.body.model_copy(update=update)
    compiled = compile_bodies(old.name, old.site, body, old.substance, definitions=old.definitions)
    return replace(compiled, since=old.since, until=old.until, history=old.history)
