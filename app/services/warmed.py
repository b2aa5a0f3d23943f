"""What temperature did to a level as it was read: a warm tape's marks, a reference point on a warm shell."""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import TYPE_CHECKING, NamedTuple

import numpy as np
from numpy.typing import NDArray

from app.services.compile import CompiledVessel
from models import units
from models.columns import State
from models.geometry.gauging import reference_height_growth, tape_correction

if TYPE_CHECKING:
    from app.services.measure import States

FloatColumns = NDArray[np.float64]
TAPE_C = 20.0  # °C, at which a tape's marks are true where nothing else is said: common practice


class Warmed(NamedTuple):
    """What was added to each row's level. [m]"""

    tape: FloatColumns
    reference: FloatColumns


class Temperatures(NamedTuple):
    """Of the liquid, the space above it and the air, in one row. [K]"""

    liquid: float
    space: float
    ambient: float


def warmed(builder: States, state: State) -> Warmed | None:
    """Corrections of every row's level; None where no instrument of these vessels asks for any."""
    if not any(_asks(vessel) for vessel in builder.vessels):
        return None
    chosen, origin = builder.chosen["level"], builder.collected.origins["level"]
    found = np.zeros((2, builder.collected.rows))
    for row in np.flatnonzero(chosen.usable).tolist():
        quantity, source = origin.of(row, int(chosen.source[row]))
        vessel = builder.vessels[row if len(builder.vessels) > 1 else 0]
        at = int(chosen.taken_at[row]) if vessel.history else None
        found[:, row] = correction(vessel, quantity, source, float(state.level[row]), temperatures(state, row), at)
    return Warmed(*found)


def temperatures(state: State, row: int) -> Temperatures:
    """A row's temperatures; the space has the air's, and the air the liquid's, where they were not read."""
    columns = (state.liquid_temperature, state.vapour_temperature, state.ambient_temperature)
    liquid, space, ambient = (float(column[row if len(column) > 1 else 0]) for column in columns)
    ambient = ambient if math.isfinite(ambient) else liquid
    return Temperatures(liquid, space if math.isfinite(space) else ambient, ambient)


def correction(
    vessel: CompiledVessel, quantity: str, source: str, level: float, at: Temperatures, taken_at: int | None = None
) -> tuple[float, float]:
    """What a level from a source gains by the tape's temperature, and by that of what carries its reference. [m]"""
    if quantity not in ("level_m", "ullage_m") or not math.isfinite(level):
        return 0.0, 0.0
    tape = vessel.declared(quantity, source, taken_at)
    expansion = 0.0 if tape is None or tape.expansion_per_k is None else tape.expansion_per_k
    given = None if tape is None else tape.at_temperature_c
    own = float(units.kelvin(TAPE_C if given is None else given))
    if quantity == "level_m":
        return float(tape_correction(level, at.liquid, own, expansion)) if expansion else 0.0, 0.0
    gauging = vessel.body.gauging
    height = gauging.reference_height_m or 0.0
    hanging = float(tape_correction(height - level, at.space, own, expansion)) if expansion else 0.0
    carrier = CARRIERS[gauging.reference_on](vessel, at)
    reference = float(units.kelvin(gauging.reference_height_at_temperature_c))
    growth = reference_height_growth(height, carrier, reference, vessel.body.shell.expansion_per_k)
    return -hanging, float(growth) if math.isfinite(carrier) else 0.0


def as_shown(vessel: CompiledVessel, quantity: str, source: str, level: float, at: Temperatures) -> float:
    """The dip or the ullage that an instrument shows for a level of the chain: the correction undone. [m]"""
    height = vessel.body.gauging.reference_height_m or 0.0
    if not _asks(vessel):
        return level if quantity == "level_m" else height - level
    nothing, far = (correction(vessel, quantity, source, one, at) for one in (height, height + 1.0))
    by_metre = sum(far) - sum(nothing)  # both corrections are straight lines of the level
    read = (level - sum(nothing) + by_metre * height) / (1.0 + by_metre)
    return read if quantity == "level_m" else height - read


def _shell(vessel: CompiledVessel, at: Temperatures) -> float:
    weight = vessel.parameters["liquid_weight"]
    return weight * at.liquid + (1.0 - weight) * at.ambient


CARRIERS: dict[str, Callable[[CompiledVessel, Temperatures], float]] = {
    "shell": _shell,
    "still_pipe": lambda vessel, at: at.liquid,
    "ground": lambda vessel, at: math.nan,
}
"""Temperature of what carries the reference point; of the ground, nothing grows. [K]"""


def _asks(vessel: CompiledVessel) -> bool:
    """Whether any text of a vessel corrects its level for a temperature."""
    for body in [vessel.body, *(text for _, text in vessel.history)]:
        own = [body.instruments, *(item.instruments for item in body.sources)]
        tapes = [one.get(quantity) for one in own for quantity in ("level_m", "ullage_m")]
        if body.gauging.reference_on != "ground" or any(tape and tape.expansion_per_k for tape in tapes):
            return True
    return False
