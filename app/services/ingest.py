"""Readings come in: rows become values, good ones are kept, bad ones are named, all are counted."""

from __future__ import annotations

import json
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any, cast

from sqlalchemy import Connection

from app.clock import Clock
from app.schemas.batch import ERRORS_LISTED, RowError
from app.schemas.reading import Reading, Values
from app.schemas.substance import Substance
from app.services import mark
from app.services.compositions import components_of
from app.services.find import ALL_TIME, site_number
from app.store import definitions, readings
from app.store.engine import Store, Writing
from app.store.readings import Value
from app.store.sites import watermark
from models.components import COMPONENTS

QUALITY = {"good": 0, "uncertain": 1, "bad": 2}
FUTURE_US = 300_000_000  # µs; clocks of historians run ahead by less
EARLIEST_US = 946_684_800_000_000  # µs, 2000-01-01: PostgreSQL keeps a partition for each month
BLOCK = 5_000  # rows of one transaction where more than two such blocks came
WHOLE = 10_000


@dataclass
class Outcome:
    """What became of a batch, counted in readings."""

    stored: int = 0
    revised: int = 0
    unchanged: int = 0
    rejected: int = 0
    known_at: int | None = None


def quality_of(reading: Values, quantity: str) -> int:
    """Quality of one quantity of a reading: the word for all, or its own; good where nothing is said."""
    if isinstance(reading.quality, str):
        return QUALITY[reading.quality]
    return QUALITY[cast("Mapping[str, str]", reading.quality).get(quantity, "good")]


def text_of(value: object) -> str:
    """A value that is no number as the text that is kept: a composition in one spelling."""
    if isinstance(value, dict):
        return json.dumps(value, sort_keys=True, separators=(",", ":"))
    return str(value)


def values_of(reading: Reading) -> list[Value]:
    """The values of one reading, each on its own."""
    vessel = reading.vessel or ""
    values = []
    for quantity in sorted(reading.named()) + _labels(reading):
        said = getattr(reading, quantity)
        number = float(said) if isinstance(said, int | float) else None
        values.append(
            Value(
                vessel, quantity, reading.source, reading.taken_at, number,
                None if number is not None else text_of(said), quality_of(reading, quantity),
                reading.corrects,
            )
        )  # fmt: skip
    return values


LABELS = ("observed_density_by", "density_basis", "sample", "sample_holds_from")


def _labels(reading: Reading) -> list[str]:
    """What a reading says about its sample, beside the quantities."""
    return [name for name in LABELS if getattr(reading, name) is not None]


def ingest(
    store: Store, clock: Clock, site: str, rows: Sequence[tuple[int, Reading]], errors: list[RowError], *,
    request: str = "",
) -> Outcome:  # fmt: skip
    """Keep the good rows of a batch; ``errors`` gains the rows that no vessel of this site could have.

    A batch of more than 10,000 rows is committed in blocks of 5,000, each before the next is begun.
    """
    outcome = Outcome()
    with store.reading() as connection:
        site_id = site_number(connection, site)
        known = outcome.known_at = watermark(connection, site_id)
        vessels = {one.name for one in definitions.in_force(connection, site_id, "vessel", ALL_TIME, known)}
        components = _components(connection, site_id, known, rows)
    good = list(_acceptable(rows, errors, vessels, components, clock.now() + FUTURE_US))
    size = BLOCK if len(good) > WHOLE else max(len(good), 1)
    for start in range(0, len(good), size):
        with store.writing(site, deed="readings", request=request) as writing:
            _write(writing, good[start : start + size], errors, outcome)
    outcome.rejected = len({error.index for error in errors})
    errors.sort(key=lambda error: error.index)
    return outcome


def _components(
    connection: Connection, site_id: int, known: int, rows: Sequence[tuple[int, Reading]]
) -> frozenset[str]:  # fmt: skip
    """Components that an analysis may name: those of the table, and those that a substance gives in full."""
    if not any(_analysed(reading) for _, reading in rows):
        return frozenset()
    found = definitions.timeline(connection, site_id, "substance", -ALL_TIME, ALL_TIME, known)
    given = [components_of(Substance.model_validate_json(one.body)).values() for one in found]
    return frozenset(COMPONENTS).union(one.id for parts in given for part in parts for one in part)


def _analysed(reading: Reading) -> dict[str, set[str]]:
    """The components that each analysis of a reading names."""
    given = {"liquid_composition": reading.liquid_composition, "vapour_composition": reading.vapour_composition}
    return {name: set(composition) for name, composition in given.items() if composition is not None}


def _acceptable(
    rows: Iterable[tuple[int, Reading]], errors: list[RowError], vessels: set[str], components: frozenset[str],
    latest: int,
) -> Iterable[tuple[int, Reading]]:  # fmt: skip
    for index, reading in rows:
        if reading.vessel is not None and reading.vessel not in vessels:
            errors.append(_error(index, "vessel", "unknown_vessel", "This site has no vessel of that id"))
        elif reading.taken_at < EARLIEST_US:
            errors.append(_error(index, "taken_at", "too_old", "taken_at lies before the year 2000"))
        elif reading.taken_at > latest:
            errors.append(
                _error(index, "taken_at", "future", "taken_at lies more than 300 s ahead of this server's clock")
            )
        elif unknown := [name for name, found in _analysed(reading).items() if not found <= components]:
            detail = f"{unknown[0]} names a component that is neither in the table nor given in full by a substance"
            errors.append(_error(index, unknown[0], "unknown_component", detail))
        else:
            yield index, reading


def _error(index: int, field: str, code: str, detail: str) -> RowError:
    return RowError(index=index, field=field, code=code, detail=detail)


def _write(writing: Writing, rows: Sequence[tuple[int, Reading]], errors: list[RowError], outcome: Outcome) -> None:
    """One transaction: the values of all rows, and what became of each row."""
    values: list[Value] = []
    owner: list[int] = []
    for position, (_, reading) in enumerate(rows):
        own = values_of(reading)
        values.extend(own)
        owner.extend([position] * len(own))
    fates: list[set[Any]] = [set() for _ in rows]
    for position, became in zip(owner, readings.write_values(writing, values), strict=True):
        fates[position].add(became)
    for (index, _), fate in zip(rows, fates, strict=True):
        if "stale_correction" in fate:
            detail = "corrects does not name the newest value of this instant: something newer stands"
            errors.append(_error(index, "corrects", "stale_correction", detail))
        elif "revised" in fate:
            outcome.revised += 1
        elif "stored" in fate:
            outcome.stored += 1
        else:
            outcome.unchanged += 1
    changed = ("stored", "revised")
    kept = [
        (mark.begins(one.taken_at, named := one.named(), one.sample_holds_from, revised="revised" in fate), named)
        for (_, one), fate in zip(rows, fates, strict=True)
        if not fate.isdisjoint(changed)
    ]
    mark.readings(writing, kept)
    outcome.known_at = writing.recorded_at


def listed(errors: list[RowError]) -> list[RowError]:
    """The errors that an answer lists; all of them are counted."""
    return errors[:ERRORS_LISTED]
