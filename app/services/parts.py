"""Every error of a mass under its own name: which instrument, how large, shared with whom."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace
from functools import partial
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from app.services.choose import Chosen
from app.services.compile import CompiledVessel, Instrument
from models import instruments, units
from models.columns import Inventory
from models.estimate import Estimate
from models.liquid.definition import ExpansivityLiquid

FloatColumns = NDArray[np.float64]
Kind = Literal["random", "systematic", "model"]
OTHER_MEANS = ("liquid_volume_m3", "liquid_volume_pct", "differential_pressure_kpa")  # of a level


@dataclass(frozen=True)
class Part:
    """One error over all rows: its size and its name; the sensitivity is the chain's.

    ``quantity`` is the input's name on the wire, ``scale`` the SI of one unit of it, ``sigma`` the standard
    uncertainty in SI; ``name`` gives the error id of a row, ``instrument`` what a reader would go and check.
    """

    quantity: str
    sensitivity: str
    sigma: FloatColumns
    kind: Kind
    name: Callable[[int], str]
    instrument: Callable[[int], str]
    declared: Callable[[int], bool]
    scale: float = 1.0


@dataclass(frozen=True)
class Origin:
    """Where the candidates of one quantity come from: quantity and source of each column, for each row."""

    columns: Sequence[Sequence[tuple[str, str]]]

    def of(self, row: int, column: int) -> tuple[str, str]:
        """Quantity and source of a column in a row."""
        names = self.columns[row if len(self.columns) > 1 else 0]
        return names[column] if 0 <= column < len(names) else ("", "")


def at_row(values: FloatColumns, row: int) -> float:
    """The value of a row in a column that may hold one value for all."""
    return float(values[row if len(values) > 1 else 0])


def celsius_of(kelvin: float) -> float:
    """A temperature as it was posted: what the way through kelvin and back adds lies below 1e-10 °C. [°C]"""
    return round(kelvin - 273.15, 10)


def stamp(instant: int) -> str:
    """An instant in error ids: basic UTC to the microsecond."""
    return str(np.datetime64(int(instant), "us")).replace("-", "").replace(":", "") + "Z"


class Errors:
    """Builds the parts of a set of rows, one call an input."""

    def __init__(self, vessels: Sequence[CompiledVessel], rows: int) -> None:
        self.vessels = vessels
        self.rows = rows
        self.parts: list[Part] = []

    def vessel(self, row: int) -> CompiledVessel:
        """The vessel of a row."""
        return self.vessels[row if len(self.vessels) > 1 else 0]

    def add(
        self, quantity: str, sensitivity: str, sigma: FloatColumns | float, kind: Kind, name: Callable[[int], str],
        *, declared: Callable[[int], bool] = lambda row: True, instrument: Callable[[int], str] | None = None,
        scale: float = 1.0,
    ) -> None:  # fmt: skip
        """One part; ``sigma`` is in the quantity's unit and ``scale`` takes it to SI."""
        column = np.atleast_1d(np.asarray(sigma, dtype=np.float64)) * scale
        if np.any(column != 0.0):
            self.parts.append(Part(quantity, sensitivity, column, kind, name, instrument or name, declared, scale))

    def measured(
        self, quantity: str, prefix: str, sensitivity: str, chosen: Chosen, origin: Origin,
        *, scale: float = 1.0, stale: float = 0.0, per_unit: Mapping[str, FloatColumns] | None = None,
    ) -> None:  # fmt: skip
        """Systematic, random and stale parts of what an instrument of the vessel reads.

        ``per_unit`` takes other quantities that stand for this one to its unit, row by row.
        """
        rows = range(self.distinct(chosen, origin))
        known = [self._instrument(quantity, chosen, origin, row, per_unit) for row in rows]

        def of(row: int) -> Instrument:
            return known[row if len(known) > 1 else 0]

        def reading(instants: NDArray[np.int64], row: int) -> str:
            return f"r:{self._reading(chosen, origin, row)}:{quantity}:{stamp(instants[row])}"

        usable = chosen.usable
        shape = len(usable) if len(known) > 1 else 1
        systematic = np.array([i.systematic for i in known]) * (usable if shape > 1 else 1.0)
        random = np.array([i.random for i in known])
        self.add(
            quantity, sensitivity, np.where(usable, systematic, 0.0), "systematic",
            lambda row: f"{prefix}:{of(row).name}", declared=lambda row: of(row).declared,
            instrument=lambda row: of(row).name, scale=scale,
        )  # fmt: skip
        for share, instants in ((1.0 - chosen.share, chosen.taken_at), (chosen.share, chosen.after_at)):
            self.add(
                quantity, sensitivity, np.where(usable, random * share, 0.0), "random",
                partial(reading, instants),
                declared=lambda row: of(row).declared, instrument=lambda row: of(row).name, scale=scale,
            )  # fmt: skip
        if stale:
            self.add(
                quantity, sensitivity, np.where(usable, chosen.age_us * 1e-6 * stale, 0.0), "random",
                lambda row: f"stale:{self.vessel(row).name}:{quantity}:{stamp(chosen.taken_at[row])}",
                declared=lambda row: False, instrument=lambda row: of(row).name, scale=scale,
            )  # fmt: skip

    def distinct(self, chosen: Chosen, origin: Origin) -> int:
        """One instrument for all rows where one source won everywhere, else one a row."""
        one = len(self.vessels) == 1 and len(origin.columns) == 1 and len(np.unique(chosen.source)) == 1
        plain = one and not self.vessels[0].history and origin.of(0, int(chosen.source[0]))[0] not in OTHER_MEANS
        return 1 if plain else self.rows

    def _reading(self, chosen: Chosen, origin: Origin, row: int) -> str:
        """Whose reading it is: vessels that share an instrument share its offset, not its scatter."""
        source = origin.of(row, int(chosen.source[row]))[1]
        return f"{self.vessel(row).name}/{source}" if source else self.vessel(row).name

    def _instrument(
        self, quantity: str, chosen: Chosen, origin: Origin, row: int, per_unit: Mapping[str, FloatColumns] | None
    ) -> Instrument:
        """The errors of what was read in a row, by the text in force when it was, in this quantity's unit."""
        named, source = origin.of(row, int(chosen.source[row]))
        vessel = self.vessel(row)
        at = int(chosen.taken_at[row]) if vessel.history else None
        own = vessel.instrument(named or quantity, source, at)
        if not own.declared and named and named != quantity and named not in instruments.DEFAULTS:
            return vessel.instrument(quantity, source, at)
        if per_unit is not None and named in per_unit:
            unit = at_row(per_unit[named], row)
            return replace(own, random=own.random * unit, systematic=own.systematic * unit)
        return own

    def assumed(self, quantity: str, sensitivity: str, where: NDArray[np.bool_], *, scale: float = 1.0) -> None:
        """The part of a value that the vessel's definition assumes."""
        spread = np.array([_assumed_uncertainty(self.vessel(row), quantity) for row in range(self.rows)])
        self.add(
            quantity, sensitivity, np.where(where, spread, 0.0), "systematic",
            lambda row: f"assumed:{self.vessel(row).name}:{quantity}", scale=scale,
        )  # fmt: skip


def _assumed_uncertainty(vessel: CompiledVessel, quantity: str) -> float:
    assumed = vessel.assumed(quantity)
    return 0.0 if assumed is None else float(assumed.standard_uncertainty)


def capacity_parts(errors: Errors, level: FloatColumns) -> None:
    """Whole-table error of each vessel, and the local one on knots along the level."""
    declared = [_capacity(errors.vessel(row)) for row in range(len(errors.vessels))]

    def of(row: int) -> tuple[float, float, float, bool]:
        return declared[row if len(declared) > 1 else 0]

    whole = np.array([entry[0] for entry in declared])
    local = np.array([entry[1] for entry in declared])
    span = np.array([entry[2] for entry in declared])

    def table(row: int) -> str:
        return f"capacity:{errors.vessel(row).name}:{errors.vessel(row).table_id}"

    def at_knot(knot: FloatColumns, row: int) -> str:
        return f"{table(row)}:{int(at_row(knot, row))}"

    errors.add(
        "capacity_pct", "capacity", whole / 100.0, "systematic", table, declared=lambda row: of(row)[3]
    )  # fmt: skip
    position = np.where(np.isfinite(level), level / span, 0.0)
    lower = np.floor(position)
    weight = position - lower
    norm = np.hypot(weight, 1.0 - weight)
    for knot, share in ((lower, (1.0 - weight) / norm), (lower + 1.0, weight / norm)):
        errors.add(
            "capacity_pct", "capacity_local", local / 100.0 * share, "systematic",
            partial(at_knot, knot), declared=lambda row: of(row)[3],
        )  # fmt: skip


def _capacity(vessel: CompiledVessel) -> tuple[float, float, float, bool]:
    """Whole and local percent, the span of the local error, and whether the site declared them."""
    kind = vessel.body.shape.kind
    varies = vessel.has_liquid and vessel.curve is not None  # a stamped volume has no level to vary along
    if kind == "capacity_table":
        kind = getattr(vessel.body.shape, "of", None) or kind
    whole, local, span = (
        instruments.CAPACITY_PCT.get(kind, 0.0),
        instruments.CAPACITY_LOCAL_PCT,
        instruments.LOCAL_SPAN,
    )
    given = vessel.body.instruments.get("capacity_pct")
    if given is None:
        return whole, local if varies else 0.0, span, False
    return (
        whole if given.systematic is None else given.systematic,
        (local if given.local is None else given.local) if varies else 0.0,
        given.local_span_m or span,
        given.systematic is not None,
    )


def model_parts(errors: Errors) -> None:
    """Errors of the methods themselves, shared by every mass that uses them: they cancel where they must."""
    # A method's error is one standard uncertainty of its own; that of a given β is all of β, of which a share counts.
    shares = [instruments.EXPANSION_SHARE if isinstance(v.liquid, ExpansivityLiquid) else 1.0 for v in errors.vessels]
    errors.add(
        "expansivity", "expansion", np.array(shares), "model",
        lambda row: f"expansion:{errors.vessel(row).body.substance}", declared=lambda row: False,
    )  # fmt: skip
    errors.add(
        "vapour_model", "vapour_model", 1.0, "model",
        lambda row: f"vapour:{errors.vessel(row).body.substance}", declared=lambda row: False,
    )  # fmt: skip
    errors.add(
        "vapour_left_out", "vapour_left_out", 1.0 / np.sqrt(3.0), "model",
        lambda row: f"vapour:{errors.vessel(row).body.substance}", declared=lambda row: False,
    )  # fmt: skip


def estimate(result: Inventory, parts: Sequence[Part], row: int) -> Estimate:
    """One row's mass with its named parts. [kg]"""
    named: dict[str, float] = {}
    for part in parts:
        kilograms = float(result.sensitivities[part.sensitivity][row]) * at_row(part.sigma, row)
        if kilograms != 0.0 and np.isfinite(kilograms):
            name = part.name(row)
            named[name] = named.get(name, 0.0) + kilograms
    return Estimate(float(result["mass"][row]), named)


def sigmas(parts: Sequence[Part]) -> dict[str, tuple[FloatColumns, ...]]:
    """Standard deviations by sensitivity, for the uncertainties of whole columns."""
    grouped: dict[str, list[FloatColumns]] = {}
    for part in parts:
        grouped.setdefault(part.sensitivity, []).append(part.sigma)
    return {name: tuple(columns) for name, columns in grouped.items()}


KELVIN, PASCAL = 1.0, units.PASCAL_PER_KPA  # SI of one °C of difference, and of one kPa
