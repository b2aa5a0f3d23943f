"""Definitions become parameters, and say where they do not fit each other."""

from __future__ import annotations

import math

import numpy as np
import pytest

from app.schemas.site import Conditions
from app.services.compile import (
    Analysed,
    all_of,
    analysed_mixture,
    mean_atmosphere,
    stack,
)
from app.services.compositions import boiling_pressure, virial_columns
from app.services.liquids import density_between
from models.columns import Method
from models.errors import DefinitionError
from tests.app.services.worked import HYDROGEN, PROPANE, RECEIVER, SPHERE, TANK, Body, compiled

ROOF = {"mass_kg": 1.2e5, "lands_at_m": 1.8, "floats_at_m": 2.1}
NET_TABLE: Body = {"kind": "capacity_table", "rows": [[0.0, 3.0], [15.0, 10500.0]], "roof_deducted_at_kg_m3": 850.0}


@pytest.mark.parametrize(
    ("vessel", "method"),
    [
        (compiled(TANK), Method.LIQUID),
        (compiled(TANK, floating_roof=ROOF), Method.LIQUID | Method.ROOF),
        (compiled(SPHERE, PROPANE), Method.LIQUID | Method.VAPOUR | Method.SATURATION),
        (compiled(SPHERE, PROPANE, vapour_space={"kind": "open"}), Method.LIQUID),
        (compiled(RECEIVER, HYDROGEN), Method.VAPOUR),
        (compiled({"kind": "junction"}), Method.NOTHING),
    ],
)  # fmt: skip
def test_what_has_to_be_computed_follows_from_shape_space_and_substance(vessel, method) -> None:  # type: ignore[no-untyped-def]
    assert vessel.method == method


@pytest.mark.parametrize(
    ("shape", "substance", "extra"),
    [
        (TANK, HYDROGEN, {"floating_roof": ROOF}),
        (TANK, HYDROGEN, {"vapour_space": {"kind": "open"}}),
    ],
)  # fmt: skip
def test_a_definition_that_gives_no_mass_is_refused(shape: Body, substance: Body, extra: Body) -> None:
    with pytest.raises(DefinitionError):
        compiled(shape, substance, **extra)


def test_shell_roof_and_states_are_taken_to_si() -> None:
    vessel = compiled(
        NET_TABLE, floating_roof=ROOF,
        shell={"expansion_per_k": 1.6e-5, "at_temperature_c": 20.0, "at_pressure_kpa": 30.0},
        site={"base_temperature_c": 20.0, "base_pressure_kpa_abs": 100.0},
    )  # fmt: skip
    p = vessel.parameters
    assert (p["expansion"], p["expansion_temperature"], p["strain_pressure"]) == (1.6e-5, 293.15, 30_000.0)
    assert (p["roof_mass"], p["roof_lands"], p["roof_floats"]) == (1.2e5, 1.8, 2.1)
    assert p["roof_volume_per_mass"] == pytest.approx(1.0 / 850.0)
    assert (p["standard_temperature"], p["standard_pressure"]) == (293.15, 100_000.0)
    assert p["liquid_weight"] == 7.0 / 8.0  # API MPMS ch. 12.1.1
    assert p["water_density"] == pytest.approx(999.10, abs=0.005)  # at 15 °C: Tanaka et al., Metrologia 38 (2001)
    assert vessel.table


def test_a_liquid_that_boils_above_the_base_pressure_stands_at_its_vapour_pressure() -> None:
    vessel = compiled(SPHERE, PROPANE)
    # propane at 15 °C, Lemmon et al. 2009 by CoolProp 8.0.0
    assert vessel.parameters["standard_pressure"] == pytest.approx(7.3151e5, rel=5e-4)
    assert vessel.density[2] == vessel.parameters["standard_pressure"]
    assert boiling_pressure(None, 288.15) == 0.0
    assert boiling_pressure(vessel.boiling, 20.0) == 0.0


def test_a_base_temperature_where_water_is_no_liquid_is_no_hindrance() -> None:
    assert compiled(TANK, site={"base_temperature_c": -40.0}).parameters["standard_temperature"] == pytest.approx(
        233.15
    )


@pytest.mark.parametrize(
    ("site", "pascal", "assumed"),
    [
        ({"atmospheric_pressure_kpa_abs": 98.2}, 98_200.0, False),
        ({"elevation_m": 1000.0}, 89_876.2, False),  # ISO 2533:1975: 898.762 hPa at a height of 1 000 m
        ({}, 101_325.0, True),
    ],
)
def test_the_air_is_declared_or_follows_from_height_or_is_assumed(site: Body, pascal: float, assumed: bool) -> None:
    found, guessed = mean_atmosphere(Conditions.model_validate(site))
    assert found == pytest.approx(pascal, rel=2e-6)
    assert guessed is assumed


def test_an_instrument_is_the_sources_own_before_the_vessels_before_the_default() -> None:
    vessel = compiled(
        TANK, instruments={"level_m": {"systematic": 0.002, "offset": -0.011, "instrument": "radar"}},
        sources=[{"source": "hand", "instruments": {"level_m": {"random": 0.0015, "instrument": "tape 7"}}}],
    )  # fmt: skip
    hand, radar = vessel.instrument("level_m", "hand"), vessel.instrument("level_m", "radar-feed")
    assert (hand.name, hand.random, hand.offset, hand.declared) == ("tape 7", 0.0015, 0.0, True)
    assert hand.systematic == pytest.approx(math.sqrt(6.0) * 1e-3)  # ±3 and ±3 mm as limits: √(9 + 9)/√3
    assert (radar.name, radar.systematic, radar.offset, radar.random) == ("radar", 0.002, -0.011, 0.001)
    default = vessel.instrument("liquid_temperature_c", "hand")
    assert (default.name, default.declared) == ("tk-1/hand", False)
    assert vessel.rank("hand") == 0
    assert vessel.rank("radar-feed") == 1


@pytest.mark.parametrize(
    ("given", "quantity", "seconds"),
    [
        (None, "level_m", 3600), (None, "ambient_temperature_c", 86400), (None, "free_water_level_m", 604800),
        (None, "observed_density_kg_m3", None), (900, "level_m", 900), (900, "observed_density_kg_m3", None),
        ({"level_m": 600}, "level_m", 600), ({"level_m": 600}, "liquid_temperature_c", 3600),
        ({"observed_density_kg_m3": 86400}, "observed_density_kg_m3", 86400),
    ],
)  # fmt: skip
def test_a_value_counts_as_long_as_the_vessel_or_custom_says(given, quantity: str, seconds: int | None) -> None:  # type: ignore[no-untyped-def]
    found = compiled(TANK, **({} if given is None else {"max_age_s": given})).max_age_us(quantity)
    assert found == (None if seconds is None else seconds * 1_000_000)


def test_a_stack_holds_every_vessel_in_its_row() -> None:
    cases = (
        compiled(TANK),
        compiled(RECEIVER, HYDROGEN),
        compiled(SPHERE, PROPANE),
        compiled(SPHERE, PROPANE, name="b"),
    )
    stacked = stack(cases)
    assert stacked.method.tolist() == [1, 2, 11, 11]
    assert np.isnan(stacked.bottom).tolist() == [False, True, False, False]
    assert stacked.liquids is not None
    assert stacked.liquid_row[[0, 2, 3]].tolist() == [0, 1, 1]  # one substance, one liquid
    assert stacked.curve_row[[0, 2, 3]].tolist() == [0, 1, 2]
    assert stacked.vapour_row[1:].tolist() == [0, 1, 1]  # one substance, one series
    # an ideal gas at 0 °C and 101.325 kPa: hydrogen 2.01588 g/mol in 22.41397 l/mol (CODATA 2018)
    assert stacked.gas_standard_density[1] == pytest.approx(2.01588 / 22.41397, rel=1e-5)
    assert stack(cases) is stacked


def test_an_analysis_replaces_the_composition_and_is_normalised() -> None:
    vessel = compiled(RECEIVER, HYDROGEN)
    mixture = analysed_mixture(vessel, {"hydrogen": 0.98, "nitrogen": 0.0098989899})
    assert mixture.fractions == pytest.approx((0.99, 0.01), rel=1e-8)
    # by the atomic weights of IUPAC: 0.99 · 2.01588 + 0.01 · 28.0134
    assert float(virial_columns((mixture,)).molar_mass[0]) * 1e3 == pytest.approx(2.27586, rel=2e-5)
    assert all_of((vessel,), Analysed(mixtures=(mixture,))).mixtures.index(mixture) == 1


def test_a_density_follows_from_the_substances_own_figure() -> None:
    vessel = compiled(TANK)
    expected = 840.0 * math.exp(-8.3e-4 * 10.0 + 7.5e-7 * 100.0)
    density, *at = vessel.density
    assert vessel.liquid is not None
    found = density_between(vessel.liquid, density, (at[0], at[1]), (298.15, 201_325.0), 101_325.0)
    assert found == pytest.approx(expected, rel=1e-12)
    assert vessel.density_declared
    assert compiled(SPHERE, PROPANE).density_uncertainty == pytest.approx(5.074)  # 1 % of 507.4
