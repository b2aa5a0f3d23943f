"""What the instruments should show: put back into an inventory it gives the mass again, and physics agrees."""

from __future__ import annotations

import json
import math
import random
from typing import Any

import pytest
from CoolProp.CoolProp import PropsSI

from app.errors import Unprocessable
from app.schemas.calculation import InventoryCalculation
from app.schemas.expected import ExpectedReading, ExpectedReadingCalculation
from app.services.calculate import calculate
from app.services.expected import CAUTION, GIVEN, expect
from tests.app.services.worked import BULLET, GAS_OIL, HYDROGEN, PROPANE, RECEIVER, SPHERE, TANK, Body

BOX: Body = {"kind": "box", "length_m": 6.0, "width_m": 2.5, "height_m": 4.0}
RIGID: Body = {"expansion_per_k": 0.0}
WATER: Body = {"name": "water", "liquid": {"model": "water"}}
NITROGEN: Body = {
    "name": "nitrogen",
    "vapour": {"model": "virial", "components": [{"id": "nitrogen", "mole_fraction": 1.0}]},
}
CRUDE: Body = {"name": "crude", "liquid": {"model": "petroleum", "commodity": "crude", "density_kg_m3": 850.0}}
LPG: Body = {
    "name": "lpg",
    "liquid": {"model": "light_hydrocarbon", "components": [
        {"id": "propane", "mole_fraction": 0.7}, {"id": "isobutane", "mole_fraction": 0.3}]},
    "vapour": {"model": "virial", "components": [{"id": "propane", "mole_fraction": 1.0}]},
}  # fmt: skip
STEEL: Body = {"expansion_per_k": 1.12e-5, "thickness_m": 0.018, "elastic_modulus_gpa": 207}


def asked(shape: Body, substance: Body, mass: float, known: Body, **vessel: Any) -> Body:
    """The answer, as it goes over the wire and comes back."""
    body = {"vessel": {"shape": shape} | vessel, "substance": substance, "mass_kg": mass} | known
    request = ExpectedReadingCalculation.model_validate_json(json.dumps(body))
    return dict(json.loads(ExpectedReading.model_validate(expect(request)).model_dump_json()))


def inventory(shape: Body, substance: Body, reading: Body, **vessel: Any) -> Body:
    """The inventory of a reading."""
    body = {"vessel": {"shape": shape} | vessel, "substance": substance, "readings": [reading]}
    return calculate(InventoryCalculation.model_validate_json(json.dumps(body)), working=False, budget=False)[0]


def put_back(known: Body, shown: Body, *means: str) -> Body:
    """What was known, with what the instruments should show in place of what was not."""
    return known | {name: shown[name] for name in means if shown[name] is not None}


# --- the way back ---------------------------------------------------------------------------------

ROOF: Body = {"mass_kg": 120_000, "lands_at_m": 1.8, "floats_at_m": 2.1}
DECANTED: Body = {"kind": "capacity_table", "rows": [[0.1, 3.0], [6.0, 420.0], [14.0, 1300.0]], "total_volume_m3": 1400}
COURSED = STEEL | {"courses": [[5.0, 0.02], [5.0, 0.014], [5.0, 0.008]]}
LIQUIDS: dict[str, tuple[Body, Body, Body]] = {
    "cone": (TANK | {"bottom": {"kind": "cone", "depth_m": 0.3}}, GAS_OIL, {}),
    "roof": (TANK, GAS_OIL, {"floating_roof": ROOF}),
    "roof in the table": (
        {"kind": "capacity_table", "rows": [[0.0, 0.0], [15.0, 10_600.0]], "total_volume_m3": 10_600.0,
         "roof_deducted_at_kg_m3": 845.0}, GAS_OIL, {"floating_roof": ROOF}),
    "courses": (TANK, GAS_OIL, {"shell": COURSED}),
    "box": (BOX, WATER, {"deadwood": [[0.0, 1.0, 0.7]], "gauging": {"datum_m": 0.05, "reference_height_m": 4.6}}),
    "table": (DECANTED, GAS_OIL, {}),
    "bullet": (BULLET, PROPANE, {"shell": STEEL}),
    "sphere": (SPHERE, PROPANE, {"shell": STEEL | {"insulated": True}}),
    "blanketed": (SPHERE, PROPANE, {"vapour_space": {"kind": "blanketed", "blanket": "nitrogen"}}),
    "tapes, and a point on the shell": (
        TANK, CRUDE, {"instruments": {"level_m": {"expansion_per_k": 1.1e-5, "offset": 0.004},
                                      "ullage_m": {"expansion_per_k": 1.1e-5}},
                      "gauging": {"reference_height_m": 16.1, "reference_on": "shell"}}),
    "by composition": (SPHERE, LPG, {"shell": STEEL}),
    "with offsets": (
        TANK, GAS_OIL, {"instruments": {
            "level_m": {"systematic": 0.002, "offset": -0.011}, "liquid_temperature_c": {"random": 0.2, "offset": 0.4}},
            "gauging": {"reference_height_m": 16.1}}),
}  # fmt: skip


def known_of(kind: str, rng: random.Random) -> Body:
    """Something that may be known beside a mass in each kind of vessel."""
    cold = kind in ("bullet", "sphere", "blanketed", "by composition")
    known: Body = {"liquid_temperature_c": rng.uniform(5.0, 30.0)}
    if cold and (kind == "blanketed" or rng.random() < 0.5):
        known["pressure_kpa"] = rng.uniform(1150.0, 1250.0) if kind == "blanketed" else rng.uniform(500.0, 900.0)
    if cold and rng.random() < 0.5:
        known["vapour_temperature_c"] = known["liquid_temperature_c"] + rng.uniform(0.0, 8.0)
    if rng.random() < 0.6:
        known["ambient_temperature_c"] = rng.uniform(-10.0, 35.0)
    if not cold and kind != "box":
        if rng.random() < 0.5:
            known |= {"observed_density_kg_m3": rng.uniform(830.0, 860.0), "observed_density_temperature_c": 18.0}
        if rng.random() < 0.5:
            known |= {"sediment_water_pct": rng.uniform(0.0, 0.8), "density_basis": rng.choice(["wet", "dry"])}
    if not cold and rng.random() < 0.5:
        known["free_water_level_m"] = rng.uniform(0.15, 0.4)
    if kind == "roof" and rng.random() < 0.5:
        known["roof_load_kg"] = rng.uniform(0.0, 9000.0)
    return known


@pytest.mark.parametrize("kind", LIQUIDS)
def test_the_level_put_back_gives_the_mass(kind: str) -> None:
    """Random states of every shape: by the level, by the ullage, and with what vapour and pressure should show."""
    shape, substance, vessel = LIQUIDS[kind]
    rng = random.Random(kind)
    for _ in range(20):
        known = known_of(kind, rng)
        large = dict.fromkeys(("sphere", "blanketed", "by composition"), 1.4e6)
        full = ({"box": 5.5e4, "bullet": 4.5e4, "table": 1.05e6} | large).get(kind, 8.5e6)
        mass = full * rng.uniform(0.2, 0.95)
        shown = asked(shape, substance, mass, known, **vessel)
        assert "reason" not in shown
        assert shown["mass_kg"] == pytest.approx(mass, rel=1e-12)
        if "vapour_temperature_c" in known and "pressure_kpa" not in known:  # of which the chain makes nothing alone
            known["pressure_kpa_abs"] = shown["pressure_kpa_abs"]
        means = ["level_m"] if shown["ullage_m"] is None else ["level_m", "ullage_m"]
        for one in means:
            back = inventory(shape, substance, put_back(known, shown, one), **vessel)
            assert back["mass_kg"] == pytest.approx(mass, rel=1e-9)
            assert back["liquid_density_kg_m3"] == pytest.approx(shown["liquid_density_kg_m3"], rel=1e-12)
            assert back["warnings"] == shown["warnings"]
        absolute = [] if known.keys() & {"pressure_kpa", "pressure_kpa_abs"} else ["pressure_kpa_abs"]
        whole = put_back(known, shown, "level_m", "vapour_temperature_c", *absolute)
        assert inventory(shape, substance, whole, **vessel)["mass_kg"] == pytest.approx(mass, rel=1e-9)


@pytest.mark.parametrize(("substance", "most"), [(NITROGEN, 9e3), (HYDROGEN, 8e2), (PROPANE, 1.2e3)])
@pytest.mark.parametrize("shape", [RECEIVER, BULLET | {"tilt_deg": 0.0}])
def test_the_pressure_or_the_temperature_put_back_gives_the_mass(shape: Body, substance: Body, most: float) -> None:
    gas = {name: value for name, value in substance.items() if name != "liquid"}
    rng = random.Random(f"{gas} {shape}")
    for _ in range(20):
        mass = most * rng.uniform(0.01, 1.0)
        known: Body = {"vapour_temperature_c": rng.uniform(20.0, 60.0)}
        if rng.random() < 0.5:
            known["ambient_temperature_c"] = rng.uniform(-10.0, 35.0)
        shown = asked(shape, gas, mass, known, shell=STEEL)
        for one in ("pressure_kpa", "pressure_kpa_abs"):
            back = inventory(shape, gas, put_back(known, shown, one), shell=STEEL)
            assert back["mass_kg"] == pytest.approx(mass, rel=1e-9)
        celsius = known.pop("vapour_temperature_c")
        again = asked(shape, gas, mass, known | {"pressure_kpa": shown["pressure_kpa"]}, shell=STEEL)
        assert again["vapour_temperature_c"] == pytest.approx(celsius, abs=1e-8)


def test_other_means_of_a_level_put_back_give_the_mass() -> None:
    known = {"liquid_temperature_c": 24.0, "ambient_temperature_c": 9.0}
    vessel = {"gauging": {"tap_m": 0.4}, "instruments": {"liquid_volume_m3": {"random": 1.0, "offset": -2.0}}}
    shown = asked(TANK, GAS_OIL, 4e6, known, **vessel)
    for one, many in (("differential_pressure_kpa", 1e-9), ("liquid_volume_m3", 1e-9)):
        back = inventory(TANK, GAS_OIL, put_back(known, shown, one), **vessel)
        assert back["mass_kg"] == pytest.approx(4e6, rel=many)
    assert shown["fill_pct"] == pytest.approx(100.0 * (shown["liquid_volume_m3"] - 2.0) / (math.pi * 225.0 * 15.0))


# --- worked by hand -------------------------------------------------------------------------------


def test_a_box_of_water() -> None:
    """30 t of water in 15 m² at 20 °C and one atmosphere: 998.2071 kg/m³ by IAPWS-95 (CoolProp 8.0.0)."""
    density = PropsSI("D", "T", 293.15, "P", 101_325.0, "Water")
    gauging = {"reference_height_m": 4.5, "tap_m": 0.2}
    shown = asked(BOX, WATER, 3e4, {"liquid_temperature_c": 20.0}, shell=RIGID, gauging=gauging)
    level = 3e4 / (density * 15.0)
    assert shown["level_m"] == pytest.approx(level, rel=2e-5)
    assert shown["ullage_m"] == pytest.approx(4.5 - level, abs=5e-5)
    assert shown["liquid_volume_m3"] == pytest.approx(3e4 / density, rel=2e-5)
    assert shown["fill_pct"] == pytest.approx(3e4 / density / 0.6, rel=2e-5)
    assert shown["differential_pressure_kpa"] == pytest.approx(9.80665 * density * (level - 0.2) / 1e3, rel=3e-5)
    assert (shown["pressure_kpa"], shown["pressure_kpa_abs"]) == (0.0, 101.325)
    assert (shown["vapour_temperature_c"], shown["vapour_mass_kg"]) == (None, None)
    assert "liquid_full_caution" not in shown and shown["liquid_full_temperature_c"] is None


def test_a_warm_afternoon_is_no_loss_and_a_loss_is_no_warm_afternoon() -> None:
    """10 K lift 2 m of gas oil by β ΔT h = 16.6 mm; what stands lower than that is missing: A ρ a metre."""
    rigid = {"shell": RIGID}
    mass = inventory(BOX, GAS_OIL, {"level_m": 2.0, "liquid_temperature_c": 15.0}, **rigid)["mass_kg"]
    warm = asked(BOX, GAS_OIL, mass, {"liquid_temperature_c": 25.0}, **rigid)
    first, second = 8.3e-4 * 10.0 * 2.0, (8.3e-4 * 10.0) ** 2 * 2.0
    assert 0.0 < warm["level_m"] - 2.0 - first < second
    assert warm["level_m"] == pytest.approx(2.0 * math.exp(8.3e-3), rel=1e-12)
    observed = {"level_m": 2.0, "liquid_temperature_c": 25.0}
    lost = mass - inventory(BOX, GAS_OIL, observed, **rigid)["mass_kg"]
    assert lost == pytest.approx((warm["level_m"] - 2.0) * 15.0 * 840.0 * math.exp(-8.3e-3), rel=1e-9)


def test_the_uncertainty_of_the_level_is_that_of_everything_but_the_gauge() -> None:
    """A known β, a perfect table, a still thermometer: ± 1 kg/m³ of 840 on 2 m is 2.38 mm whatever the gauge is."""
    sample = {"density_uncertainty_kg_m3": 1.0}
    substance = GAS_OIL | {"liquid": GAS_OIL["liquid"] | sample}
    for gauge in (1e-4, 0.5):
        instruments = {
            "level_m": {"random": gauge, "systematic": gauge},
            "liquid_temperature_c": {"random": 0.0, "systematic": 0.0},
            "capacity_pct": {"systematic": 0.0, "local": 0.0},
        }
        vessel = {"shell": RIGID, "instruments": instruments}
        shown = asked(BOX, substance, 2.0 * 15.0 * 840.0, {"liquid_temperature_c": 15.0}, **vessel)
        assert shown["level_standard_uncertainty_m"] == pytest.approx(2.0 / 840.0, rel=1e-4)


def test_a_bullet_of_propane_shows_its_vapour_pressure() -> None:
    shown = asked(BULLET, PROPANE, 2.5e4, {"liquid_temperature_c": 20.0})
    assert shown["pressure_kpa_abs"] * 1e3 == pytest.approx(PropsSI("P", "T", 293.15, "Q", 1, "Propane"), rel=2e-4)
    assert shown["pressure_kpa"] == pytest.approx(shown["pressure_kpa_abs"] - 101.325, rel=1e-12)
    assert shown["vapour_temperature_c"] == pytest.approx(20.0, abs=1e-9)
    assert shown["liquid_mass_kg"] + shown["vapour_mass_kg"] == pytest.approx(2.5e4, rel=1e-12)


def test_a_receiver_of_nitrogen_agrees_with_its_reference_equation() -> None:
    """5 m³ at 20 °C and 50 bar: R. Span et al., J. Phys. Chem. Ref. Data 29 (2000), by CoolProp 8.0.0."""
    shape = {"kind": "fixed_volume", "volume_m3": 5.0}
    mass = 5.0 * PropsSI("D", "T", 293.15, "P", 5e6, "Nitrogen")
    shown = asked(shape, NITROGEN, mass, {"vapour_temperature_c": 20.0}, shell=RIGID)
    assert shown["pressure_kpa_abs"] == pytest.approx(5000.0, rel=1e-3)
    warm = asked(shape, NITROGEN, mass, {"pressure_kpa_abs": 5000.0}, shell=RIGID)
    assert warm["vapour_temperature_c"] + 273.15 == pytest.approx(293.15, rel=1e-3)
    assert (shown["level_m"], shown["fill_pct"], shown["liquid_density_kg_m3"]) == (None, None, None)


def propane_by_table() -> Body:
    """Saturated densities of propane by E. W. Lemmon et al., J. Chem. Eng. Data 54 (2009), CoolProp 8.0.0."""
    rows = [[t, PropsSI("D", "T", t + 273.15, "Q", 0, "Propane")] for t in [0.0, *range(2, 87, 2)]]
    liquid = {"model": "density_table", "rows": rows, "compressibility_per_kpa": 0.0}
    return {"name": "propane", "liquid": liquid, "vapour": PROPANE["vapour"]}


def test_propane_at_85_percent_fills_its_sphere_where_the_reference_equation_says() -> None:
    reading = {"level_m": 1.0, "liquid_temperature_c": 15.0}
    volume, low, high = math.pi / 6.0 * 18.0**3, 0.0, 18.0
    for _ in range(60):
        half = 0.5 * (low + high)
        below = math.pi * half**2 * (27.0 - half) / 3.0
        low, high = (half, high) if below < 0.85 * volume else (low, half)
    mass = inventory(SPHERE, propane_by_table(), reading | {"level_m": low}, shell=STEEL)["mass_kg"]

    def room(celsius: float) -> float:
        grown = (1.0 + 1.12e-5 * (celsius - 15.0)) ** 3
        return volume * grown * float(PropsSI("D", "T", celsius + 273.15, "Q", 0, "Propane"))

    cold, hot = 15.0, 90.0
    for _ in range(60):
        middle = 0.5 * (cold + hot)
        cold, hot = (middle, hot) if room(middle) > mass else (cold, middle)
    shown = asked(SPHERE, propane_by_table(), mass, {"liquid_temperature_c": 15.0}, shell=RIGID)
    steel = asked(
        SPHERE, propane_by_table(), mass, {"liquid_temperature_c": 15.0}, shell={"expansion_per_k": 1.12e-5}
    )
    assert steel["liquid_full_temperature_c"] == pytest.approx(cold, abs=0.05)
    assert steel["liquid_full_caution"] == CAUTION and "no filling limit" in CAUTION
    assert shown["liquid_full_temperature_c"] < steel["liquid_full_temperature_c"]


def test_a_cylinder_of_stamped_volume_has_a_full_temperature_though_no_reading() -> None:
    """Liquid and vapour in one: its pressure says nothing of the mass, but 42 kg/100 L is full at about 60 °C."""
    shape = {"kind": "fixed_volume", "volume_m3": 0.1}
    shown = asked(shape, propane_by_table(), 42.0, {"vapour_temperature_c": 20.0}, shell=RIGID)
    assert shown["reason"]["code"] == "guard_refused" and shown["pressure_kpa"] is None
    full = shown["liquid_full_temperature_c"] + 273.15
    assert PropsSI("D", "T", full, "Q", 0, "Propane") == pytest.approx(420.0, rel=1e-3)


def test_where_the_method_does_not_reach_the_full_temperature_is_unknown_and_the_caution_stands() -> None:
    shown = asked(SPHERE, propane_by_table(), 2e5, {"liquid_temperature_c": 15.0})
    assert shown["liquid_full_temperature_c"] is None and shown["liquid_full_caution"] == CAUTION


# --- no reading -----------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("shape", "substance", "mass", "known", "code", "words"),
    [
        (BOX, GAS_OIL, 6e4, {"liquid_temperature_c": 15.0}, "outside_vessel", "more than full: at 15 °C"),
        (DECANTED, GAS_OIL, 2e6, {"liquid_temperature_c": 15.0}, "outside_table", "to its highest level of 14 m"),
        (SPHERE, PROPANE, 1e3, {"liquid_temperature_c": 15.0}, "outside_vessel", "below the bottom"),
        (DECANTED, GAS_OIL, 1e3, {"liquid_temperature_c": 15.0}, "outside_table", "below the bottom"),
        (BOX, WATER, 3e4, {"liquid_temperature_c": 500.0}, "outside_method", "150"),
        (BULLET, PROPANE, 3e4, {"liquid_temperature_c": 120.0}, "outside_method", "120"),
        (RECEIVER, NITROGEN, 9e4, {"vapour_temperature_c": 20.0}, "guard_refused", "too dense"),
        (RECEIVER, NITROGEN, 9e4, {"pressure_kpa": 200.0}, "guard_refused", "too near to the limit"),
        (RECEIVER, NITROGEN, 1.0, {"pressure_kpa": 200.0}, "outside_method", "would be hotter"),
    ],
)
def test_a_mass_without_a_reading_says_why(
    shape: Body, substance: Body, mass: float, known: Body, code: str, words: str
) -> None:
    shown = asked(shape, substance, mass, known)
    assert shown["reason"]["code"] == code and words in shown["reason"]["detail"]
    names = ("level_m", "liquid_volume_m3", "pressure_kpa", "vapour_temperature_c", "mass_kg")
    assert [shown[name] for name in names] == [None] * 5


def test_a_gauge_that_rides_on_the_roof_shows_nothing_below_its_legs() -> None:
    riding = {"floating_roof": ROOF | {"gauge_sees": "roof"}}
    shown = asked(TANK, GAS_OIL, 8e5, {"liquid_temperature_c": 15.0}, **riding)
    assert shown["reason"]["code"] == "roof_landing_zone" and shown["level_m"] is None
    assert asked(TANK, GAS_OIL, 8e6, {"liquid_temperature_c": 15.0}, **riding)["level_m"] > 2.1


def test_warnings_are_those_of_the_chain() -> None:
    shown = asked(TANK, GAS_OIL, 1.1e6, {"liquid_temperature_c": 15.0}, floating_roof=ROOF)
    assert 1.8 < shown["level_m"] < 2.1
    assert {one["code"] for one in shown["warnings"]} == {"roof_landing_zone", "input_assumed"}


def test_a_tap_that_is_not_in_the_liquid_shows_nothing_of_it() -> None:
    known = {"liquid_temperature_c": 15.0}
    for gauging, water in (({"tap_m": 3.0}, None), ({"tap_m": 0.1}, 0.3)):
        shown = asked(BOX, GAS_OIL, 2e4, known | {"free_water_level_m": water}, gauging=gauging)
        assert shown["differential_pressure_kpa"] is None and shown["level_m"] < 3.0
    shown = asked(BOX, GAS_OIL, 2e4, known | {"free_water_level_m": 0.1}, gauging={"tap_m": 0.3})
    assert shown["differential_pressure_kpa"] > 0.0


@pytest.mark.parametrize(
    ("shape", "substance", "known", "vessel", "pointer", "code"),
    [
        (BOX, GAS_OIL, {}, {}, "/liquid_temperature_c", "missing"),
        (RECEIVER, NITROGEN, {}, {}, "/vapour_temperature_c", "missing"),
        (RECEIVER, NITROGEN, {"vapour_temperature_c": 20.0, "pressure_kpa": 900.0}, {}, "/pressure_kpa", "conflicting"),
        (RECEIVER, NITROGEN, {"vapour_temperature_c": 20.0, "pressure_kpa_abs": 900.0}, {}, "/pressure_kpa_abs",
         "conflicting"),
        (SPHERE, PROPANE, {"liquid_temperature_c": 15.0},
         {"vapour_space": {"kind": "blanketed", "blanket": "nitrogen"}}, "/pressure_kpa", "missing"),
        (RECEIVER, GAS_OIL, {"liquid_temperature_c": 15.0}, {}, "/vessel/shape/kind", "no_level"),
        ({"kind": "junction"}, GAS_OIL, {"liquid_temperature_c": 15.0}, {}, "/vessel/shape/kind", "no_level"),
        (TANK, NITROGEN, {}, {"floating_roof": ROOF}, "/vessel/floating_roof", "impossible_definition"),
    ],
)  # fmt: skip
def test_too_little_or_too_much_is_refused_with_its_place(
    shape: Body, substance: Body, known: Body, vessel: Body, pointer: str, code: str
) -> None:
    with pytest.raises(Unprocessable) as refused:
        asked(shape, substance, 100.0, known, **vessel)
    assert [(one.pointer, one.code) for one in refused.value.errors] == [(pointer, code)]


def test_what_the_vessel_assumes_counts_as_known() -> None:
    assumed = {"assumed": {"liquid_temperature_c": {"value": 15.0, "standard_uncertainty": 2.0}}}
    shown = asked(BOX, GAS_OIL, 3e4, {}, **assumed)
    assert shown["level_m"] == pytest.approx(3e4 / 840.0 / 15.0, rel=1e-4)
    assert "input_assumed" in {one["code"] for one in shown["warnings"]}


def test_everything_known_but_the_mass_is_a_reading() -> None:
    own = {"site", "vessel", "substance", "mass_kg"}
    assert set(GIVEN) == set(ExpectedReadingCalculation.model_fields) - own
