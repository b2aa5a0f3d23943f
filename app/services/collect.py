"""What was read becomes candidates: for each input the values of every source around each instant."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray
from sqlalchemy import Connection

from app.services.choose import ALWAYS, NEVER, Candidates
from app.services.compile import CompiledVessel
from app.services.parts import Origin
from app.store import readings
from app.store.readings import Found

SITE = ""  # the vessel of a row that is the site's own

Text = NDArray[np.object_]


@dataclass(frozen=True)
class InputSpec:
    """One input of the chain: the quantities that give it, and how they behave in time."""

    name: str
    quantities: tuple[str, ...]
    interpolates: bool = False
    of_site: bool = False
    companions: tuple[str, ...] = ()


INPUTS: tuple[InputSpec, ...] = (
    InputSpec("level", ("level_m", "ullage_m"), interpolates=True),
    InputSpec("free_water", ("free_water_level_m",)),
    InputSpec("liquid_temperature", ("liquid_temperature_c",), interpolates=True),
    InputSpec("vapour_temperature", ("vapour_temperature_c",), interpolates=True),
    InputSpec("ambient", ("ambient_temperature_c",), interpolates=True),
    InputSpec("site_ambient", ("ambient_temperature_c",), interpolates=True, of_site=True),
    InputSpec("pressure", ("pressure_kpa", "pressure_kpa_abs"), interpolates=True),
    InputSpec("barometer", ("barometric_pressure_kpa_abs",), interpolates=True, of_site=True),
    InputSpec(
        "density",
        ("observed_density_kg_m3",),
        companions=("observed_density_temperature_c", "observed_density_pressure_kpa_abs", "sample"),
    ),
    InputSpec("sediment_water", ("sediment_water_pct",), companions=("density_basis", "sample")),
    InputSpec("vapour_composition", ("vapour_composition",), companions=("sample",)),
)


def names_of(spec: InputSpec) -> tuple[str, ...]:
    """Every quantity that an input looks at, its companions last."""
    return spec.quantities + spec.companions


@dataclass
class Collected:
    """Candidates of every input over n rows; texts and companions stand beside their columns."""

    at: NDArray[np.int64]
    vessels: tuple[CompiledVessel, ...]
    candidates: dict[str, Candidates] = field(default_factory=dict)
    origins: dict[str, Origin] = field(default_factory=dict)
    texts: dict[str, Text] = field(default_factory=dict)
    companions: dict[tuple[str, str], tuple[Candidates, Text]] = field(default_factory=dict)

    @property
    def rows(self) -> int:
        """Number of rows."""
        return len(self.at)


def at_instant(
    connection: Connection, site_id: int, vessels: tuple[CompiledVessel, ...], at: int, known: int
) -> Collected:
    """Candidates of many vessels at one instant: the newest values before it, the next ones after."""
    slots = _slots(connection, site_id, vessels)
    before = readings.newest(
        connection, site_id, [(slot.series, _oldest(slot.max_age, at)) for slot in slots], at, known
    )
    moving = [slot for slot in slots if slot.interpolates]
    after = readings.following(connection, site_id, [(slot.series, at + slot.max_age) for slot in moving], at, known)
    collected = _frame(slots, np.full(len(vessels), at, dtype=np.int64), vessels, per_row=True)
    earlier, later = {found.series_id: found for found in before}, {found.series_id: found for found in after}
    for slot in slots:
        _place(collected, slot, slot.rows, earlier.get(slot.series), later.get(slot.series))
    return collected


def over_course(
    connection: Connection, site_id: int, vessel: CompiledVessel, at: NDArray[np.int64], known: int
) -> Collected:
    """Candidates of one vessel at many instants: each series is read once and searched."""
    slots = _slots(connection, site_id, (vessel,))
    collected = _frame(slots, at, (vessel,), per_row=False)
    low, high = int(at.min()), int(at.max())
    lasting = [slot for slot in slots if slot.max_age >= ALWAYS]
    passing = [slot for slot in slots if slot.max_age < ALWAYS]
    reach = max((slot.max_age for slot in passing), default=0)
    for some, oldest, latest in ((lasting, int(NEVER), high), (passing, low - reach, high + reach)):
        series = sorted({slot.series for slot in some})
        if not series:
            continue
        found = readings.course(connection, site_id, series, oldest, latest, known)
        owner = np.array(found.series_id, dtype=np.int64)
        taken = np.array(found.taken_at, dtype=np.int64)
        value = np.array([np.nan if one is None else one for one in found.value], dtype=np.float64)
        text, quality = np.array(found.cited, dtype=object), np.array(found.quality, dtype=np.int64)
        for slot in some:
            own = np.flatnonzero(owner == slot.series)
            _fill(collected, slot, taken[own], value[own], text[own], quality[own])
    return collected


@dataclass(frozen=True)
class _Slot:
    """One series and the columns that it feeds."""

    series: int
    spec: InputSpec
    quantity: str
    source: str
    column: int
    rows: tuple[int, ...]
    max_age: int
    rank: int
    interpolates: bool
    convert: Callable[[float], float]

    @property
    def companion(self) -> bool:
        return self.quantity not in self.spec.quantities


def _slots(connection: Connection, site_id: int, vessels: tuple[CompiledVessel, ...]) -> list[_Slot]:
    """Every stored series that feeds an input of one of the vessels, with its column."""
    index = {vessel.name: row for row, vessel in enumerate(vessels)}
    known = readings.series_of(connection, site_id, [*index, SITE])
    slots: list[_Slot] = []
    by_owner: dict[tuple[str, str], dict[str, int]] = {}
    for owner, quantity, source, series in sorted(
        (item.vessel, item.quantity, item.source, item.series_id) for item in known
    ):
        by_owner.setdefault((owner, quantity), {})[source] = series
    for spec in INPUTS:
        owners: Iterable[str] = (SITE,) if spec.of_site else index
        for owner in owners:
            slots.extend(_owner_slots(spec, owner, by_owner, index, vessels))
    return slots


def _owner_slots(
    spec: InputSpec, owner: str, by_owner: dict[tuple[str, str], dict[str, int]], index: dict[str, int],
    vessels: tuple[CompiledVessel, ...],
) -> list[_Slot]:  # fmt: skip
    row = index.get(owner)
    rows = tuple(range(len(vessels))) if row is None else (row,)
    vessel = vessels[rows[0]]
    found: list[_Slot] = []
    columns: dict[tuple[str, str], int] = {}
    for quantity in spec.quantities:
        for source in by_owner.get((owner, quantity), {}):
            columns[(quantity, source)] = len(columns)
    for quantity in names_of(spec):
        for source, series in by_owner.get((owner, quantity), {}).items():
            if quantity in spec.quantities:
                column = columns[(quantity, source)]
            elif (spec.quantities[0], source) in columns:
                column = columns[(spec.quantities[0], source)]
            else:
                continue
            age = vessel.max_age_us(quantity if quantity in spec.quantities else spec.quantities[0])
            found.append(
                _Slot(
                    series, spec, quantity, source, column, rows, int(ALWAYS) if age is None else age,
                    vessel.rank(source), spec.interpolates and quantity in spec.quantities,
                    conversion(vessel, quantity, source),
                )
            )  # fmt: skip
    return found


def conversion(vessel: CompiledVessel, quantity: str, source: str) -> Callable[[float], float]:
    """A stored value as the input's: known errors corrected, an ullage made an innage."""
    offset = vessel.instrument(quantity, source).offset
    if quantity == "ullage_m":
        gauging = vessel.body.gauging
        height = gauging.reference_height_m if gauging is not None else None
        if height is None:
            return lambda value: float("nan")
        return lambda value: height - (value + offset)
    return lambda value: value + offset


def _oldest(max_age: int, at: int) -> int:
    return int(NEVER) if max_age >= ALWAYS else at - max_age


def _frame(
    slots: Sequence[_Slot], at: NDArray[np.int64], vessels: tuple[CompiledVessel, ...], *, per_row: bool
) -> Collected:
    """Empty candidates of the right width, with the origin of each column."""
    collected = Collected(at, vessels)
    for spec in INPUTS:
        own = [slot for slot in slots if slot.spec is spec]
        width = max((slot.column + 1 for slot in own), default=0)
        collected.candidates[spec.name] = Candidates.empty(len(at), width)
        collected.texts[spec.name] = np.full((len(at), max(width, 1)), None, dtype=object)
        names: list[list[tuple[str, str]]] = [[("", "")] * width for _ in range(len(at) if per_row else 1)]
        for slot in own:
            if not slot.companion:
                for row in slot.rows if per_row else (0,):
                    names[row][slot.column] = (slot.quantity, slot.source)
        collected.origins[spec.name] = Origin(names)
        for quantity in spec.companions:
            collected.companions[(spec.name, quantity)] = (
                Candidates.empty(len(at), width),
                np.full((len(at), max(width, 1)), None, dtype=object),
            )
    return collected


def _place(collected: Collected, slot: _Slot, rows: tuple[int, ...], before: Found | None, after: Found | None) -> None:
    """One series' neighbours of the instant into the rows that it feeds."""
    target, texts = _target(collected, slot)
    picked = rows[0] if len(rows) == 1 else slice(None)
    target.rank[picked, slot.column] = slot.rank
    target.max_age[picked, slot.column] = slot.max_age
    if before is not None:
        target.before_at[picked, slot.column] = before.taken_at
        target.before_quality[picked, slot.column] = before.quality
        if before.value is not None:
            target.before[picked, slot.column] = slot.convert(before.value)
        texts[picked, slot.column] = before.cited
    if after is not None and after.value is not None:
        target.after_at[picked, slot.column] = after.taken_at
        target.after_quality[picked, slot.column] = after.quality
        target.after[picked, slot.column] = slot.convert(after.value)


def _target(collected: Collected, slot: _Slot) -> tuple[Candidates, Text]:
    if slot.companion:
        return collected.companions[(slot.spec.name, slot.quantity)]
    return collected.candidates[slot.spec.name], collected.texts[slot.spec.name]


def _fill(
    collected: Collected, slot: _Slot, taken: NDArray[np.int64], values: NDArray[np.float64], texts: Text,
    quality: NDArray[np.int64],
) -> None:  # fmt: skip
    """One series searched for its neighbours of every instant."""
    target, target_texts = _target(collected, slot)
    target.rank[:, slot.column] = slot.rank
    target.max_age[:, slot.column] = slot.max_age
    if not len(taken):
        return
    converted = np.asarray(slot.convert(values))  # type: ignore[arg-type]
    position = np.searchsorted(taken, collected.at, side="right") - 1
    has = position >= 0
    here = np.maximum(position, 0)
    target.before_at[:, slot.column] = np.where(has, taken[here], NEVER)
    target.before[:, slot.column] = np.where(has, converted[here], np.nan)
    target.before_quality[:, slot.column] = np.where(has, quality[here], 0)
    target_texts[:, slot.column] = np.where(has, texts[here], None)
    if slot.interpolates:
        beyond = position + 1
        there = np.minimum(beyond, len(taken) - 1)
        follows = beyond < len(taken)
        target.after_at[:, slot.column] = np.where(follows, taken[there], NEVER)
        target.after[:, slot.column] = np.where(follows, converted[there], np.nan)
        target.after_quality[:, slot.column] = np.where(follows, quality[there], 0)
