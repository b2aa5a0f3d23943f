"""Analyses of liquids and vapours: which row takes which composition, and what it makes of the columns."""

from __future__ import annotations

import json
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field, replace
from typing import TYPE_CHECKING, TypeVar

import numpy as np
from numpy.typing import NDArray

from app.services.compile import Analysed, CompiledVessel, all_of, analysed_mixture
from app.services.compositions import Boiling, analysed_fractions, virial_columns
from app.services.liquids import own_density
from models.errors import DefinitionError
from models.liquid.definition import Liquid, MixtureLiquid
from models.space import NO_SERIES
from models.vapour.series import VapourMixture

if TYPE_CHECKING:
    from app.services.measure import States

T = TypeVar("T")
Rows = NDArray[np.intp]
Make = Callable[[CompiledVessel, Mapping[str, float]], T | None]  # what an analysis makes of a vessel's substance
UNCHANGED = -1  # of a row that no analysis speaks of


@dataclass
class Analyses:
    """What the analyses of some rows brought."""

    mixed: NDArray[np.intp]
    vapour_row: Rows | None = None
    liquid_row: Rows | None = None
    saturation_row: Rows | None = None
    extra: Analysed = Analysed()
    own_densities: dict[int, float] = field(default_factory=dict)
    refused: dict[int, str] = field(default_factory=dict)
    refused_liquids: frozenset[int] = frozenset()


def analyses_of(builder: States) -> Analyses:
    """Vapours, liquids and vapour pressures of every row."""
    result = Analyses(np.full(builder.collected.rows, UNCHANGED, dtype=np.intp))
    vapours, no_vapour = _each(builder, "vapour_composition", _vapour)
    liquids: dict[int, Liquid]
    liquids, no_liquid = _each(builder, "liquid_composition", _liquid)
    bubbles, _ = _each(builder, "liquid_composition", _bubbles)  # what cannot boil leaves the substance's own
    dews, _ = _each(builder, "vapour_composition", _dews)
    boiling = dews | bubbles
    for part, found in (("vapour", no_vapour), ("liquid", no_liquid)):
        words = f"the substance's {part} model cannot take the analysis"
        result.refused |= {row: f"{words}: {why}" for row, why in found.items()}
    result.refused_liquids = frozenset(no_liquid)
    for row, mixture in vapours.items():
        result.mixed[row] = len(mixture.fractions) > 1
    for row, liquid in liquids.items():
        density = builder.vessels[row if len(builder.vessels) > 1 else 0].density
        result.own_densities[row] = own_density(liquid, (density[1], density[2]))
    result.extra = Analysed(
        tuple(dict.fromkeys(vapours.values())), tuple(dict.fromkeys(liquids.values())),
        tuple(dict.fromkeys(boiling.values())),
    )  # fmt: skip
    held = all_of(tuple(builder.vessels), result.extra)
    rows = builder.collected.rows
    result.vapour_row = _rows(builder, rows, vapours, held.mixtures, lambda vessel: vessel.mixture)
    if no_vapour and result.vapour_row is None:
        result.vapour_row = _rows(builder, rows, {}, held.mixtures, lambda vessel: vessel.mixture, always=True)
    if no_vapour and result.vapour_row is not None:
        result.vapour_row[list(no_vapour)] = NO_SERIES
    result.liquid_row = _rows(builder, rows, liquids, held.liquids, lambda vessel: vessel.liquid)
    result.saturation_row = _rows(builder, rows, boiling, held.boiling, lambda vessel: vessel.boiling)
    return result


def _rows(
    builder: States, rows: int, found: Mapping[int, T], held: tuple[T, ...],
    own: Callable[[CompiledVessel], T | None], *, always: bool = False,
) -> Rows | None:  # fmt: skip
    """Place of each row's own in the columns; None where no analysis speaks."""
    if not found and not always:
        return None
    place = {one: at for at, one in enumerate(held)}
    default = [own(vessel) for vessel in builder.vessels]
    each = [found.get(row, default[row if len(default) > 1 else 0]) for row in range(rows)]
    return np.array([0 if one is None else place[one] for one in each], dtype=np.intp)


def _each(
    builder: States, name: str, make: Make[T]
) -> tuple[dict[int, T], dict[int, str]]:
    """What each row's analysis makes of its vessel's substance, or why none; each distinct one is made once."""
    chosen, texts = builder.chosen[name], builder.collected.texts[name]
    seen: dict[tuple[int, str], tuple[T | None, str]] = {}
    found: dict[int, T] = {}
    refused: dict[int, str] = {}
    for row in np.flatnonzero(chosen.usable).tolist():
        which = row if len(builder.vessels) > 1 else 0
        text = texts[row, int(chosen.source[row])]
        if text is None:
            continue
        key = (which, str(text))
        if key not in seen:
            seen[key] = _made(make, builder.vessels[which], json.loads(text))
        one, why = seen[key]
        if why:
            refused[row] = why
        if one is not None:
            found[row] = one
    return found, refused


def _made(make: Make[T], vessel: CompiledVessel, analysis: Mapping[str, float]) -> tuple[T | None, str]:
    """What an analysis makes, or why the substance's model cannot take it."""
    try:
        return make(vessel, analysis), ""
    except DefinitionError as refusal:
        return None, str(refusal)


def _vapour(vessel: CompiledVessel, analysis: Mapping[str, float]) -> VapourMixture | None:
    if vessel.mixture is None or vessel.is_blanketed:
        return None
    mixture = analysed_mixture(vessel, analysis)
    virial_columns((mixture,))
    return mixture


def _liquid(vessel: CompiledVessel, analysis: Mapping[str, float]) -> Liquid | None:
    if not isinstance(vessel.liquid, MixtureLiquid):
        return None
    liquid: Liquid = replace(vessel.liquid, components=analysed_fractions(vessel.substance, analysis))
    own_density(liquid, (vessel.density[1], vessel.density[2]))
    return liquid


def _bubbles(vessel: CompiledVessel, analysis: Mapping[str, float]) -> Boiling | None:
    return None if vessel.boiling is None else Boiling(analysed_fractions(vessel.substance, analysis))


def _dews(vessel: CompiledVessel, analysis: Mapping[str, float]) -> Boiling | None:
    """An analysed vapour boils where nothing is known of its liquid; beside a blanket its analysis is of both."""
    if vessel.boiling is None or not vessel.boiling.of_vapour or vessel.is_blanketed:
        return None
    return Boiling(analysed_fractions(vessel.substance, analysis), of_vapour=True)
