"""What substances are made of: components, the vapour's mixture, an analysis, what boils at which pressure."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import replace
from functools import lru_cache
from typing import NamedTuple

import numpy as np

from app.schemas.component import Component as WireComponent
from app.schemas.liquid import LightHydrocarbonLiquid
from app.schemas.substance import Substance, VirialVapour
from models import units
from models.components import Component, component, given_component
from models.saturation import SaturationColumns
from models.vapour.series import VapourColumns, VapourMixture

Fractions = tuple[tuple[Component, float], ...]  # substances and mole fractions


class Boiling(NamedTuple):
    """What boils: the composition of a liquid, with its bubble pressure, or of its vapour, with its dew pressure."""

    parts: Fractions
    of_vapour: bool = False


def what_boils(substance: Substance) -> Boiling | None:
    """What boils in a vessel: the liquid's composition where it is known, else the vapour's, which condenses."""
    if isinstance(substance.liquid, LightHydrocarbonLiquid) and substance.liquid.components is not None:
        return Boiling(fractions_of(substance.liquid.components))
    return None if substance.vapour is None else Boiling(fractions_of(substance.vapour.components), of_vapour=True)


def boiling_pressure(composition: Boiling | None, temperature: float) -> float:
    """Vapour pressure of a substance at a temperature; 0 where it has none that we know. [Pa]"""
    if composition is None:
        return 0.0
    pressure, _ = saturation_columns((composition,)).pressure(np.array([temperature]), 0)
    return float(pressure[0]) if math.isfinite(pressure[0]) else 0.0


@lru_cache(maxsize=64)
def saturation_columns(compositions: tuple[Boiling, ...]) -> SaturationColumns:
    """Vapour pressures of some liquids; the same liquids are compiled once."""
    return SaturationColumns.from_compositions(
        [one.parts for one in compositions], [one.of_vapour for one in compositions], extended=True
    )


@lru_cache(maxsize=256)
def virial_columns(mixtures: tuple[VapourMixture, ...]) -> VapourColumns:
    """Virial series of some mixtures; the same mixtures are compiled once."""
    return VapourColumns.from_mixtures(list(mixtures))


def components_of(substance: Substance) -> dict[str, Sequence[WireComponent]]:
    """The components that a substance gives, of its liquid and of its vapour."""
    parts = {"liquid": substance.liquid, "vapour": substance.vapour}
    return {name: getattr(part, "components", None) or () for name, part in parts.items()}


def fractions_of(components: Sequence[WireComponent]) -> Fractions:
    """Substances and mole fractions, which sum to one."""
    total = math.fsum(item.mole_fraction for item in components)
    return tuple((_component(item), item.mole_fraction / total) for item in components)


def _component(item: WireComponent) -> Component:
    if item.critical_temperature_k is None:
        return component(item.id)
    assert item.critical_pressure_kpa_abs is not None and item.acentric_factor is not None
    assert item.molar_mass_g_mol is not None
    volume = item.characteristic_volume_cm3_mol
    return given_component(
        item.id, critical_temperature=item.critical_temperature_k,
        critical_pressure=item.critical_pressure_kpa_abs * units.PASCAL_PER_KPA,
        acentric_factor=item.acentric_factor, molar_mass=item.molar_mass_g_mol * units.KILOGRAM_PER_GRAM,
        characteristic_volume=None if volume is None else volume * units.CUBIC_METRE_PER_CUBIC_CENTIMETRE,
        srk_acentric_factor=item.srk_acentric_factor,
    )  # fmt: skip


def mixture_of(vapour: VirialVapour) -> VapourMixture:
    """The vapour of a substance, as the virial equation takes it."""
    pairs = fractions_of(vapour.components)
    cubic = units.CUBIC_METRE_PER_CUBIC_CENTIMETRE
    return VapourMixture(
        tuple(item for item, _ in pairs), tuple(fraction for _, fraction in pairs), form=vapour.form,
        terms=vapour.terms, coefficients=vapour.coefficients, second_virial=vapour.second_virial,
        third_virial=vapour.third_virial, measured_second=_measured(vapour.second_virial_cm3_mol, cubic),
        measured_third=_measured(vapour.third_virial_cm6_mol2, cubic**2),
    )  # fmt: skip


def _measured(
    given: float | tuple[tuple[float, float], ...] | None, scale: float
) -> float | tuple[tuple[float, float], ...] | None:
    if given is None or isinstance(given, int | float):
        return None if given is None else given * scale
    return tuple((float(units.kelvin(t)), value * scale) for t, value in given)


@lru_cache(maxsize=1024)
def analysed(vapour: VirialVapour, analysis: tuple[tuple[str, float], ...]) -> VapourMixture:
    """The substance's vapour with the composition of an analysis in place of its own."""
    own = {item.id: item for item in vapour.components}
    total = math.fsum(fraction for _, fraction in analysis)
    return replace(
        mixture_of(vapour),
        components=tuple(_component(own[name]) if name in own else component(name) for name, _ in analysis),
        mole_fractions=tuple(fraction / total for _, fraction in analysis),
    )


def analysed_fractions(substance: Substance, analysis: Mapping[str, float]) -> Fractions:
    """An analysis's substances and mole fractions, which sum to one; a substance gives its components in full."""
    own = {item.id: item for given in components_of(substance).values() for item in given}
    total = math.fsum(analysis.values())
    return tuple(
        (_component(own[name]) if name in own else component(name), fraction / total)
        for name, fraction in sorted(analysis.items())
        if fraction > 0.0
    )
