"""What was read becomes candidates: for each input the values of every source around each instant."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray
from sqlalchemy import Connection

from app.services.choose import ALWAYS, NEVER, Candidates
from app.services.compile import CompiledVessel
from app.services.gauged import volume_level
from app.services.parts import Origin
from app.services.samples import Sample, samples_at, samples_of
from app.store import readings
from app.store.readings import Found, Series

SITE = ""  # the vessel of a row that is the site's own

Text = NDArray[np.object_]
Instants = NDArray[np.int64]
Convert = Callable[[float, int], float]


@dataclass(frozen=True)
class InputSpec:
    """One input of the chain: the quantities that give it, and how they behave in time.

    A ``sample`` stands from when it says that it does, until the next one; its companions are what was read
    of the same sample.
    """

    name: str
    quantities: tuple[str, ...]
    interpolates: bool = False
    of_site: bool = False
    sample: bool = False
    companions: tuple[str, ...] = ()


INPUTS: tuple[InputSpec, ...] = (
    InputSpec(
        "level",
        ("level_m", "ullage_m", "liquid_volume_m3", "liquid_volume_pct", "differential_pressure_kpa"),
        interpolates=True,
    ),
    InputSpec("weighed", ("weighed_mass_kg",), interpolates=True),
    InputSpec("empty", ("empty",)),
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
        sample=True,
        companions=(
            "observed_density_temperature_c", "observed_density_pressure_kpa_abs", "observed_density_by", "sample",
        ),
    ),
    InputSpec("sediment_water", ("sediment_water_pct",), sample=True, companions=("density_basis", "sample")),
    InputSpec("liquid_composition", ("liquid_composition",), sample=True, companions=("sample",)),
    InputSpec("vapour_composition", ("vapour_composition",), sample=True, companions=("sample",)),
    InputSpec("roof_load", ("roof_load_kg",)),
)
REMEMBERED = ("free_water_level_m",)  # too old is not the same as never read, which is none
ALWAYS_KEPT = ("ambient_temperature_c",)  # not about the liquid: carried over a change of substance


def names_of(spec: InputSpec) -> tuple[str, ...]:
    """Every quantity that an input looks at, its companions last."""
    return spec.quantities + spec.companions


@dataclass
class Collected:
    """Candidates of every input over n rows; texts and companions stand beside their columns.

    ``at`` is the instant of each row; one vessel stands for all rows, or each row has its own.
    """

    at: Instants
    vessels: tuple[CompiledVessel, ...]
    candidates: dict[str, Candidates] = field(default_factory=dict)
    origins: dict[str, Origin] = field(default_factory=dict)
    texts: dict[str, Text] = field(default_factory=dict)
    companions: dict[tuple[str, str], tuple[Candidates, Text]] = field(default_factory=dict)
    slots: Sequence[Slot] = ()

    @property
    def rows(self) -> int:
        """Number of rows."""
        return len(self.at)

    def vessel(self, row: int) -> CompiledVessel:
        """The vessel of a row."""
        return self.vessels[row if len(self.vessels) > 1 else 0]


@dataclass(frozen=True)
class Slot:
    """One stored series and the column of an input that it feeds."""

    series: int
    spec: InputSpec
    owner: str
    quantity: str
    source: str
    column: int
    rows: tuple[int, ...]
    max_age: int
    rank: int
    convert: Convert

    @property
    def companion(self) -> bool:
        """Whether it is read beside the input's own quantity."""
        return self.quantity not in self.spec.quantities


def collect(
    connection: Connection, site_id: int, vessels: tuple[CompiledVessel, ...], at: Instants, known: int,
    slots: Sequence[Slot] | None = None,
) -> Collected:  # fmt: skip
    """Candidates of many vessels, each at its own instant, or of one vessel at many.

    ``slots`` are those of an earlier collection of the same vessels, at other instants.
    """
    slots = _slots(connection, site_id, vessels) if slots is None else slots
    collected = _frame(slots, at, vessels)
    passing = [slot for slot in slots if not slot.spec.sample]
    if len(vessels) == 1 and len(at) > 1:
        _courses(connection, site_id, collected, passing, known)
        samples = samples_of(connection, site_id, _sampled(slots), int(at.max()), known)
    else:
        moved = len(np.unique(at)) > 1
        shared = [slot for slot in passing if slot.spec.of_site] if moved else []
        _neighbours(connection, site_id, collected, [slot for slot in passing if slot not in shared], known)
        _courses(connection, site_id, collected, shared, known)
        instants = {vessel.name: int(at[row]) for row, vessel in enumerate(vessels)}
        samples = samples_at(connection, site_id, _sampled(slots), instants, known)
    for slot in slots:
        if slot.spec.sample:
            _fill_samples(collected, slot, samples.get((slot.owner, slot.source, slot.spec.quantities[0]), []))
    return collected


def _sampled(slots: Sequence[Slot]) -> list[tuple[str, str, str, dict[str, int]]]:
    """Owner, source and main quantity of each kind of sample, with the series of all that it may hold."""
    found: dict[tuple[str, str, str], dict[str, int]] = {}
    for slot in slots:
        if slot.spec.sample:
            found.setdefault((slot.owner, slot.source, slot.spec.quantities[0]), {})[slot.quantity] = slot.series
    holds = {(slot.owner, slot.source): slot.series for slot in slots if slot.quantity == "sample_holds_from"}
    for (owner, source, _), series in found.items():
        if (owner, source) in holds:
            series["sample_holds_from"] = holds[(owner, source)]
    return [(*key, series) for key, series in found.items()]


def _slots(connection: Connection, site_id: int, vessels: tuple[CompiledVessel, ...]) -> list[Slot]:
    """Every stored series that feeds an input of one of the vessels, with its column."""
    index = {vessel.name: row for row, vessel in enumerate(vessels)}
    by_owner: dict[str, list[Series]] = {}
    for item in readings.series_of(connection, site_id, [*index, SITE]):
        by_owner.setdefault(item.vessel, []).append(item)
    slots: list[Slot] = []
    every = tuple(range(len(vessels)))
    for owner, items in by_owner.items():
        items.sort(key=lambda item: (item.quantity, item.source))
        rows = every if owner == SITE else (index[owner],)
        read = {item.quantity for item in items}
        for spec in INPUTS:
            if spec.of_site == (owner == SITE) and not read.isdisjoint(spec.quantities):
                slots.extend(_owner_slots(spec, owner, items, rows, vessels[rows[0]]))
    return slots


def _owner_slots(
    spec: InputSpec, owner: str, items: Sequence[Series], rows: tuple[int, ...], vessel: CompiledVessel
) -> Iterable[Slot]:
    columns: dict[tuple[str, str], int] = {}
    for quantity in spec.quantities:
        for item in items:
            if item.quantity == quantity:
                columns[(quantity, item.source)] = len(columns)
    looked_at = names_of(spec) + (("sample_holds_from",) if spec.sample else ())
    for item in items:
        if item.quantity not in looked_at:
            continue
        main = item.quantity if item.quantity in spec.quantities else spec.quantities[0]
        column = columns.get((main, item.source))
        if column is None:
            continue
        age = vessel.max_age_us("level_m" if main == "empty" else main)
        yield Slot(
            item.series_id, spec, owner, item.quantity, item.source, column, rows,
            int(ALWAYS) if age is None else age, vessel.rank(item.source),
            conversion(vessel, item.quantity, item.source),
        )  # fmt: skip


def conversion(vessel: CompiledVessel, quantity: str, source: str) -> Convert:
    """A stored value as the input's: the known error of then corrected, an ullage made an innage."""
    history = vessel.history

    def offset(at: int) -> float:
        return vessel.instrument(quantity, source, at if history else None).offset

    def innage(level: float) -> float:
        return float("nan") if on_roof and level < lowest else level

    roof = vessel.body.floating_roof
    # The automatic gauge, which comes first, may ride on the roof; a roof on its legs says nothing of the liquid.
    on_roof = roof is not None and roof.gauge_sees == "roof" and vessel.rank(source) == 0
    lowest = roof.floats_at_m if roof is not None else 0.0
    by_volume = volume_level(vessel, quantity)
    if by_volume is not None:
        return lambda value, at: by_volume(value + offset(at))
    if quantity == "level_m" and on_roof:
        return lambda value, at: innage(value + offset(at))
    if quantity == "ullage_m":
        height = vessel.body.gauging.reference_height_m
        if height is None:
            return lambda value, at: float("nan")
        return lambda value, at: innage(height - (value + offset(at)))
    return lambda value, at: value + offset(at)


def _frame(slots: Sequence[Slot], at: Instants, vessels: tuple[CompiledVessel, ...]) -> Collected:
    """Empty candidates of the right width, with the origin of each column."""
    collected = Collected(at, vessels, slots=slots)
    per_row = len(vessels) > 1
    for spec in INPUTS:
        own = [slot for slot in slots if slot.spec is spec]
        width = max((slot.column + 1 for slot in own), default=0)
        names: list[list[tuple[str, str]]] = [[("", "")] * width for _ in range(len(at) if per_row else 1)]
        for slot in own:
            if not slot.companion:
                for row in slot.rows if per_row else (0,):
                    names[row][slot.column] = (slot.quantity, slot.source)
        collected.origins[spec.name] = Origin(names)
        collected.candidates[spec.name], collected.texts[spec.name] = blank(len(at), width)
        for quantity in spec.companions:
            collected.companions[(spec.name, quantity)] = blank(len(at), width)
    return collected


def blank(rows: int, width: int) -> tuple[Candidates, Text]:
    """Columns in which nothing was read."""
    return Candidates.empty(rows, width), np.full((rows, max(width, 1)), None, dtype=object)


def _remembered(slot: Slot) -> bool:
    """Whether a value of any age tells something: it still counts, or its age is the reason why nothing does."""
    return bool(slot.max_age >= ALWAYS) or slot.quantity in REMEMBERED


def _bounds(slot: Slot, vessel: CompiledVessel, at: int) -> tuple[int, int]:
    """Between which instants a value of a series may count at an instant, both included."""
    oldest = int(NEVER) if _remembered(slot) else at - slot.max_age
    latest = at + min(slot.max_age, int(ALWAYS)) if slot.max_age < ALWAYS else at
    if slot.spec.of_site or slot.quantity in ALWAYS_KEPT:
        return oldest, latest
    return max(oldest, vessel.since), min(latest, vessel.until - 1)


def _neighbours(connection: Connection, site_id: int, collected: Collected, slots: Sequence[Slot], known: int) -> None:
    """The newest value of each series at its row's instant, and the next one after it."""
    before, after = [], []
    for slot in slots:
        row = slot.rows[0]
        at = int(collected.at[row])
        oldest, latest = _bounds(slot, collected.vessels[min(row, len(collected.vessels) - 1)], at)
        if oldest <= at:
            before.append((slot.series, oldest, at))
        if at < latest:
            after.append((slot.series, at + 1, latest))
    earlier = {found.series_id: found for found in readings.newest_each(connection, site_id, before, known)}
    later = {found.series_id: found for found in readings.following_each(connection, site_id, after, known)}
    for slot in slots:
        _place(collected, slot, earlier.get(slot.series), later.get(slot.series))


def _place(collected: Collected, slot: Slot, before: Found | None, after: Found | None) -> None:
    """One series' neighbours of the instant into the rows that it feeds."""
    target, texts = _target(collected, slot)
    picked = list(slot.rows)
    target.rank[picked, slot.column] = slot.rank
    target.max_age[picked, slot.column] = slot.max_age
    said = None if before is None or before.value is None else slot.convert(before.value, before.taken_at)
    if before is not None and not (said is not None and np.isnan(said)):
        target.before_at[picked, slot.column] = before.taken_at
        target.before_taken[picked, slot.column] = before.taken_at
        target.before_quality[picked, slot.column] = before.quality
        if said is not None:
            target.before[picked, slot.column] = said
        texts[picked, slot.column] = before.cited
    if after is not None and after.value is not None:
        target.after_at[picked, slot.column] = after.taken_at
        target.after_quality[picked, slot.column] = after.quality
        target.after[picked, slot.column] = slot.convert(after.value, after.taken_at)


def _target(collected: Collected, slot: Slot) -> tuple[Candidates, Text]:
    if slot.companion:
        return collected.companions[(slot.spec.name, slot.quantity)]
    return collected.candidates[slot.spec.name], collected.texts[slot.spec.name]


def _courses(connection: Connection, site_id: int, collected: Collected, slots: Sequence[Slot], known: int) -> None:
    """Each series is read once over all instants and searched for its neighbours of each."""
    if not slots:
        return
    low, high = int(collected.at.min()), int(collected.at.max())
    reach = max((slot.max_age for slot in slots if slot.max_age < ALWAYS), default=0)
    lasting = any(_remembered(slot) for slot in slots)
    series = sorted({slot.series for slot in slots})
    oldest = int(NEVER) if lasting else low - reach
    found = readings.course(connection, site_id, series, oldest, high + reach, known)
    owner = np.array(found.series_id, dtype=np.int64)
    taken = np.array(found.taken_at, dtype=np.int64)
    value = np.array([np.nan if one is None else one for one in found.value], dtype=np.float64)
    quality = np.array(found.quality, dtype=np.int64)
    for slot in slots:
        vessel = collected.vessels[min(slot.rows[0], len(collected.vessels) - 1)]
        own = owner == slot.series
        if not (slot.spec.of_site or slot.quantity in ALWAYS_KEPT):
            own &= (taken >= vessel.since) & (taken < vessel.until)
        own = np.flatnonzero(own)
        _fill(collected, slot, taken[own], value[own], quality[own])


def _fill(collected: Collected, slot: Slot, taken: Instants, values: NDArray[np.float64], quality: Instants) -> None:
    """One series searched for its neighbours of every instant."""
    target, _ = _target(collected, slot)
    target.rank[:, slot.column] = slot.rank
    target.max_age[:, slot.column] = slot.max_age
    if not len(taken):
        return
    vessel = collected.vessels[min(slot.rows[0], len(collected.vessels) - 1)]
    one_by_one = vessel.history or vessel.body.floating_roof is not None or slot.quantity.startswith("liquid_volume")
    if one_by_one:
        converted = np.array([slot.convert(value, int(at)) for value, at in zip(values, taken, strict=True)])
        kept = np.isfinite(converted)
        taken, converted, quality = taken[kept], converted[kept], quality[kept]
        if not len(taken):
            return
    else:
        converted = np.asarray(slot.convert(values, 0))  # type: ignore[arg-type]
    position = np.searchsorted(taken, collected.at, side="right") - 1
    has = position >= 0
    here = np.maximum(position, 0)
    target.before_at[:, slot.column] = np.where(has, taken[here], NEVER)
    target.before_taken[:, slot.column] = target.before_at[:, slot.column]
    target.before[:, slot.column] = np.where(has, converted[here], np.nan)
    target.before_quality[:, slot.column] = np.where(has, quality[here], 0)
    there = np.minimum(position + 1, len(taken) - 1)
    follows = position + 1 < len(taken)
    target.after_at[:, slot.column] = np.where(follows, taken[there], NEVER)
    target.after[:, slot.column] = np.where(follows, converted[there], np.nan)
    target.after_quality[:, slot.column] = np.where(follows, quality[there], 0)


def _fill_samples(collected: Collected, slot: Slot, samples: Sequence[Sample]) -> None:
    """The sample that stands at each instant: the newest that begins at or before it."""
    if slot.quantity == "sample_holds_from":
        return
    target, texts = _target(collected, slot)
    rows = np.array(slot.rows if len(collected.vessels) > 1 else range(collected.rows))
    target.rank[rows, slot.column] = slot.rank
    target.max_age[rows, slot.column] = slot.max_age
    vessel = collected.vessels[min(slot.rows[0], len(collected.vessels) - 1)]
    own = [one for one in samples if vessel.since <= one.begins < vessel.until]
    begins = np.array([one.begins for one in own], dtype=np.int64)
    place = np.searchsorted(begins, collected.at[rows], side="right") - 1
    for row, position in zip(rows, place, strict=True):
        if position < 0:
            continue
        sample = own[position]
        value = sample.values.get(slot.quantity)
        if value is None:
            continue
        target.before_at[row, slot.column] = sample.begins
        target.before_taken[row, slot.column] = sample.taken_at
        target.before_quality[row, slot.column] = value.quality
        if value.value is not None:
            target.before[row, slot.column] = slot.convert(value.value, sample.taken_at)
        texts[row, slot.column] = value.cited
