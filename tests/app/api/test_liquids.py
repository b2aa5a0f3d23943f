"""Every liquid over HTTP: put, read back, read, and its mass by a figure from elsewhere; refused where it ends.

A box of 10 m by 5 m whose wall does not expand holds 100 m³ at a level of 2 m, so that a mass is a hundred
times a density.
"""

from __future__ import annotations

import math

import pytest

AT = "2026-05-01T06:00:00Z"
RIGID = {"expansion_per_k": 0.0}
BOX = {"kind": "box", "length_m": 10.0, "width_m": 5.0, "height_m": 12.0}
F60_C = (60.0 - 32.0) / 1.8
D1250 = "recomputed from ASTM D1250-04 / API MPMS 11.1-2004"
TP27 = "recomputed from GPA TP-27 (2007)"
SPIRIT = {"model": "ethanol_water", "density_kg_m3": 913.771, "at_temperature_c": 20.0}
BITUMEN = {
    "model": "density_table", "rows": [[120.0, 1004.1], [160.0, 979.6], [200.0, 955.2]],
    "compressibility_per_kpa": 5e-7,
}  # fmt: skip
LPG = {"ethane": 0.0009, "propane": 0.2510, "propylene": 0.0001, "isobutane": 0.3555, "n-butane": 0.3925}


def parts(**fractions):
    return [{"id": name.replace("_", "-"), "mole_fraction": share} for name, share in fractions.items()]


def petroleum(commodity, density, **more):
    return {"model": "petroleum", "commodity": commodity, "density_kg_m3": density} | more


def light(density, **more):
    return {"model": "light_hydrocarbon", "density_kg_m3": density} | more


PROPANE = {"model": "light_hydrocarbon", "components": parts(propane=1.0)}
CARGO = {"model": "light_hydrocarbon", "components": [{"id": n, "mole_fraction": x} for n, x in LPG.items()]}
MASSES = [  # a liquid's body, its temperature [°C], its density there [kg/m³], half of the last digit, where from
    ({"model": "expansivity", "density_kg_m3": 840.0, "expansivity_per_k": 8.3e-4}, 40.0,
     840.0 * math.exp(-8.3e-4 * 25.0), 1e-9, "the exponential of β ΔT"),
    ({"model": "expansivity", "density_kg_m3": 840.0, "expansivity_per_k": [8.3e-4, 1e-6]}, 40.0,
     840.0 * math.exp(-(8.3e-4 * 25.0 + 1e-6 * 25.0**2 / 2.0)), 1e-9, "β's polynomial, integrated"),
    (petroleum("crude", 850.0), 40.0, 850.0 * 0.97861576, 5e-6, D1250),
    (petroleum("refined", 745.0), 30.0, 745.0 * 0.98170215, 5e-6, D1250 + ", gasolines"),
    (petroleum("refined", 780.0), 30.0, 780.0 * 0.98422612, 5e-6, D1250 + ", transition"),
    (petroleum("refined", 820.0), 30.0, 820.0 * 0.98667929, 5e-6, D1250 + ", jet fuels"),
    (petroleum("refined", 960.0), 60.0, 960.0 * 0.96779026, 5e-6, D1250 + ", fuel oils"),
    (petroleum("lubricating", 880.0), 60.0, 880.0 * 0.96760618, 5e-6, D1250),
    (petroleum("special", 800.0, alpha60_per_f=910e-6, at_temperature_c=F60_C), (30.0 - 32.0) / 1.8,
     800.0 * 1.0271, 0.04, "published, table 6C of 1980: 910e-6 1/°F and 30 °F"),
    (petroleum("special", 800.0, alpha60_per_f=650e-6, at_temperature_c=F60_C), (30.0 - 32.0) / 1.8,
     800.0 * 1.0194, 0.04, "published, table 24C of 1980: 650e-6 1/°F and 30 °F"),
    (light(507.0), 30.0, 507.0 * 0.954186, 3e-4, TP27),
    (light(507.0), 0.0, 507.0 * 1.041834, 3e-4, TP27),
    (light(500.0, at_temperature_c=20.0), 30.0, 500.0 * 0.968578, 3e-4, TP27 + ", table 59E/60E"),
    (PROPANE, 40.0, 467.46, 2.5e-4 * 467.46, "reference equation of propane, by CoolProp; COSTALD is as near as that"),
    (CARGO, -38.0, 620.7, 0.05, "published, SIGTTO example of a cargo of liquefied gas: 0.6207 kg/L"),
    ({"model": "water"}, 60.0, 983.1958, 0.005, "IAPWS-95, by CoolProp"),
    (BITUMEN, 160.0, 979.6, 1e-9, "the table's own row"),
    ({"model": "ethanol_water", "alcohol_volume_pct": 96.0}, 20.0, 807.42, 0.005, "recomputed from OIML R 22"),
    (SPIRIT, 30.0, 905.712, 1e-3, "recomputed from OIML R 22, half and half by mass"),
]  # fmt: skip


@pytest.fixture
def terminal(place):
    """A site with a base of 15 °C, 101.325 kPa and nothing in it."""
    place.define()
    return place


def holding(site, liquid, **vessel):
    """A vessel that holds a liquid; a box of stiff walls unless more is said."""
    site.put("/substances/s", {"name": "s", "liquid": liquid}, status=201)
    site.put("/vessels/v", {"name": "v", "substance": "s", "shape": BOX, "shell": RIGID} | vessel, status=201)
    return site


def read(site, celsius, *, level_m=2.0, **more):
    row = {"vessel": "v", "taken_at": AT, "level_m": level_m, "liquid_temperature_c": celsius} | more
    answer = site.post("/readings", {"readings": [row]})
    assert answer["rejected"] == 0, answer
    (found,) = site.get("/inventory", at=AT)["vessels"]
    return found


def steps(site):
    return {one["symbol"]: one for one in site.get("/vessels/v/working", at=AT)["working"]}


# --- the mass ------------------------------------------------------------------------------------


@pytest.mark.parametrize(("liquid", "celsius", "density", "half", "source"), MASSES, ids=[one[-1] for one in MASSES])
def test_each_liquid_comes_back_as_it_was_sent_and_has_its_mass(terminal, liquid, celsius, density, half, source):
    site = holding(terminal, liquid)
    assert site.get("/substances/s")["definition"]["liquid"] == liquid
    found = read(site, celsius)
    assert found["status"] == "measured", (source, found)
    assert found["liquid_density_kg_m3"] == pytest.approx(density, abs=half), source
    assert found["mass_kg"] == pytest.approx(100.0 * density, abs=100.0 * half)
    assert found["mass_kg"] == pytest.approx(steps(site)["GOV"]["value"] * steps(site)["ρ"]["value"], rel=1e-12)


def test_the_working_shows_the_factor_unrounded_and_as_a_table_prints_it(terminal):
    """850 kg/m³ at 15 °C, crude, at 40 °C: recomputed from ASTM D1250-04."""
    read(holding(terminal, petroleum("crude", 850.0)), 40.0)
    found = steps(terminal)
    assert found["C_T"]["value"] == pytest.approx(0.97861576, abs=5e-9)
    assert found["C_T,5"]["value"] == 0.97862
    assert found["ρ60"]["value"] == pytest.approx(849.59848, abs=5e-6)
    assert "ASTM D1250-04" in found["C_T"]["reference"]


def test_a_cold_cargo_by_its_density(terminal):
    """560 kg/m³ at 15 °C, at −38 °C: published 1.10600 by table 54 of 1952; recomputed from GPA TP-27: 1.106099."""
    read(holding(terminal, light(560.0)), -38.0)
    found = steps(terminal)
    saturated = found["CTL"]["value"] / found["CTL_std"]["value"]
    assert saturated == pytest.approx(1.10600, abs=1.5e-4) and saturated == pytest.approx(1.106099, abs=5e-7)
    assert found["Δp"]["value"] > 0.0  # under one atmosphere the cold liquid does not boil: it is compressed a little
    assert found["ρ"]["value"] / 560.0 == pytest.approx(saturated, rel=2e-4)


@pytest.mark.parametrize(
    ("liquid", "observed", "fahrenheit", "at_60f"),
    [
        (petroleum("crude", 850.0), 820.0, 95.0, 834.38270),
        (petroleum("refined", 745.0), 730.0, 88.0, 744.14827),
        (petroleum("refined", 745.0), 765.0, 110.0, 786.38163),  # the group is that of the sample
        (petroleum("lubricating", 880.0), 860.0, 120.0, 881.07407),
        (light(590.0), 0.50004 * 999.016, 190.04, 0.5917589 * 999.016),
    ],
)
def test_a_sample_at_its_own_temperature_gives_the_standard_density(place, liquid, observed, fahrenheit, at_60f):
    """A site with a base of 60 °F; recomputed from ASTM D1250-04, and from GPA TP-27 table 23E."""
    place.define(base_temperature_c=F60_C)
    found = read(
        holding(place, liquid), 20.0, observed_density_kg_m3=observed,
        observed_density_temperature_c=(fahrenheit - 32.0) / 1.8,
    )  # fmt: skip
    assert found["standard_density_kg_m3"] == pytest.approx(at_60f, abs=5e-5)


@pytest.mark.parametrize(("by", "at_15"), [("hydrometer", 786.65), ("digital", 786.826)])
def test_the_glass_of_a_hydrometer_counts_and_a_tube_has_none(terminal, by, at_15):
    """Published, table 53A of 1980: a hydrometer that reads 779.0 at 25 °C; without glass recomputed."""
    found = read(
        holding(terminal, petroleum("crude", 800.0)), 25.0, observed_density_kg_m3=779.0,
        observed_density_temperature_c=25.0, observed_density_by=by,
    )  # fmt: skip
    assert found["standard_density_kg_m3"] == pytest.approx(at_15, abs=0.01)


def test_an_analysis_of_the_liquid_gives_its_density(terminal):
    """Published, SIGTTO example: 0.6207 kg/L at −38 °C, in a vessel that was defined for propane."""
    site = holding(terminal, PROPANE)
    found = read(site, -38.0, liquid_composition=LPG)
    assert found["liquid_density_kg_m3"] == pytest.approx(620.7, abs=0.05)
    assert {one["quantity"]: one for one in found["inputs"]}["liquid_composition"]["composition"] == LPG
    assert steps(site)["x(isobutane)"]["value"] == 0.3555


def test_an_analysis_that_the_method_cannot_take_is_kept_and_said(terminal):
    found = read(holding(terminal, PROPANE), -38.0, liquid_composition={"propane": 0.1, "helium": 0.9})
    assert (found["status"], found["mass_kg"]) == ("unmeasured", None)
    assert found["reason"]["code"] == "outside_method"
    assert found["reason"]["detail"].startswith("the substance's liquid model cannot take the analysis: ")
    row = {"vessel": "v", "taken_at": AT, "liquid_composition": {"propane": 0.5, "unobtainium": 0.5}}
    (error,) = terminal.post("/readings", {"readings": [row]})["errors"]
    assert error["code"] == "unknown_component" and "unobtainium" not in str(error)


def test_an_analysis_may_name_what_the_liquid_gives_in_full_and_nothing_else_that_is_not_in_the_table(terminal):
    """n-Butane's constants under another name: Reid, Prausnitz and Poling, from memory."""
    constants = {
        "critical_temperature_k": 425.1, "critical_pressure_kpa_abs": 3796.0, "acentric_factor": 0.200,
        "molar_mass_g_mol": 58.12,
    }  # fmt: skip
    own = {"model": "light_hydrocarbon", "components": [{"id": "own-butane", "mole_fraction": 1.0} | constants]}
    site = holding(terminal, own)
    found = read(site, 20.0, liquid_composition={"own-butane": 0.5, "propane": 0.5})
    # half and half by moles: 544.61 kg/m³ by the multi-fluid equation of state, CoolProp 8.0.0
    assert found["liquid_density_kg_m3"] == pytest.approx(544.61, rel=0.01)
    reading = {"level_m": 1.0, "liquid_temperature_c": 20.0}
    for name, status in (("own-butane", 200), ("unobtainium", 422)):
        body = {"vessel": {"name": "v", "shape": BOX}, "substance": {"name": "s", "liquid": own},
                "readings": [reading, reading | {"liquid_composition": {name: 1.0}}]}  # fmt: skip
        answer = site.client.post("/v1/calculations/inventory", json=body)
        assert answer.status_code == status
    (error,) = answer.json()["errors"]
    assert (error["pointer"], error["code"]) == ("/readings/1/liquid_composition", "unknown_component")


# --- where a method ends -------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("liquid", "celsius", "words"),
    [
        (petroleum("crude", 850.0), 170.0, ("170 °C", "-50 to 150 °C", "density_table")),
        (light(507.0), 95.0, ("95 °C", "-46 to 93 °C", "density_table", "components")),
        (PROPANE, 85.0, ("85.00 °C", "to 78.2 °C", "density_table")),
        ({"model": "water"}, 160.0, ("160 °C", "0 to 150 °C", "density_table")),
        (SPIRIT, 45.0, ("45 °C", "-20 to 40 °C", "density_table")),
        (BITUMEN, 100.0, ("100 °C", "120 to 200 °C", "not extrapolated")),
    ],
)
def test_outside_its_method_a_liquid_is_unmeasured_and_the_reason_names_the_limit(terminal, liquid, celsius, words):
    found = read(holding(terminal, liquid), celsius)
    assert (found["status"], found["mass_kg"]) == ("unmeasured", None)
    assert found["reason"]["code"] == "outside_method"
    assert all(word in found["reason"]["detail"] for word in words), found["reason"]["detail"]


def test_hot_bitumen_has_a_mass_and_no_standard_volume(terminal):
    """Its table begins at 120 °C: at 15 °C it is no liquid that anybody measured."""
    site = holding(terminal, BITUMEN)
    found = read(site, 160.0)
    assert found["status"] == "measured" and found["mass_kg"] == pytest.approx(97_960.0, abs=1e-6)
    unknown = ("gross_standard_volume_m3", "net_standard_volume_m3", "standard_density_kg_m3")
    assert [found[name] for name in unknown] == [None, None, None]
    (warning,) = found["warnings"]
    assert warning["code"] == "outside_method" and "standard volumes are unknown" in warning["detail"]
    assert steps(site)["ρ_s,std"]["value"] is None and steps(site)["M"]["value"] == found["mass_kg"]


REFUSED = [  # a body that cannot be, where, its code, words of its sentence
    (petroleum("special", 880.0), "alpha60_per_f", "missing", ("special", "alpha60_per_f", "1/°F")),
    (petroleum("crude", 850.0, alpha60_per_f=5e-4), "alpha60_per_f", "conflicting", ("special",)),
    (petroleum("special", 880.0, alpha60_per_f=2e-3), "alpha60_per_f", "out_of_range", ("at most 0.00093",)),
    (petroleum("diesel", 840.0), "commodity", "not_one_of", ("'crude', 'refined', 'lubricating' or 'special'",)),
    (petroleum("crude", 300.0), "density_kg_m3", "impossible_definition",
     ("density at 15 °C is 300 kg/m³", "of crude oil", "611.", "to 1163.8 kg/m³")),
    (petroleum("lubricating", 700.0), "density_kg_m3", "impossible_definition", ("of a lubricating oil", "801.2")),
    (petroleum("crude", 850.0, at_temperature_c=160.0), "at_temperature_c", "impossible_definition",
     ("160 °C", "-50 to 150 °C", "density_table")),
    (petroleum("crude", 850.0, at_pressure_kpa_abs=20_000.0), "at_pressure_kpa_abs", "impossible_definition",
     ("198.987 bar", "103.4 bar")),
    (PROPANE | {"density_kg_m3": 507.0}, "density_kg_m3", "conflicting", ("either", "both are given")),
    ({"model": "light_hydrocarbon"}, "density_kg_m3", "missing", ("components", "density_kg_m3", "neither is given")),
    (PROPANE | {"at_temperature_c": 15.0}, "at_temperature_c", "conflicting", ("density_kg_m3",)),
    (light(900.0), "density_kg_m3", "impossible_definition", ("900 kg/m³ at 15 °C", "351.673 to 687.789 kg/m³")),
    (light(507.0, at_temperature_c=120.0), "at_temperature_c", "impossible_definition", ("120 °C", "-46 to 93 °C")),
    (PROPANE | {"components": parts(propane=0.5)}, "components", "fractions_sum", ("sum to 1",)),
    (PROPANE | {"components": parts(helium=1.0)}, "components", "impossible_definition", ("helium", "quantum")),
    (PROPANE | {"components": parts(propane=0.5, unobtainium=0.5)}, "components/1/id", "unknown_component",
     ("critical_temperature_k", "n-butane")),
    (BITUMEN | {"rows": [[0, 900], [10, 890], [5, 880]]}, "rows", "table_falls", ("rise in temperature",)),
    (BITUMEN | {"rows": [[0, 900]]}, "rows", "wrong_length", ("at least 2",)),
    ({"model": "ethanol_water"}, "alcohol_volume_pct", "missing", ("either", "neither is given")),
    (SPIRIT | {"alcohol_volume_pct": 50.0}, "alcohol_volume_pct", "conflicting", ("both are given",)),
    (SPIRIT | {"density_kg_m3": 700.0}, "density_kg_m3", "impossible_definition",
     ("700 kg/m³ at 20 °C", "789.24 kg/m³ (pure ethanol)", "998.20 kg/m³ (water)")),
    (SPIRIT | {"at_temperature_c": 60.0}, "at_temperature_c", "out_of_range", ("at most 40 °C",)),
    ({"model": "water", "density_kg_m3": 998.0}, "density_kg_m3", "unknown_field", ()),
]  # fmt: skip


@pytest.mark.parametrize(("liquid", "pointer", "code", "words"), REFUSED)
def test_what_no_liquid_can_be_is_refused_where_it_stands_with_a_way_out(terminal, liquid, pointer, code, words):
    answer = terminal.put("/substances/s", {"name": "s", "liquid": liquid}, status=422)
    (error,) = answer["errors"]
    assert (error["pointer"], error["code"]) == (f"/liquid/{pointer}", code), error
    assert all(word in error["detail"] for word in words), error["detail"]
    assert terminal.get("/substances")["items"] == []


# --- the vessel around it ------------------------------------------------------------------------

UPRIGHT = {"kind": "vertical_cylinder", "diameter_m": 50.0, "height_m": 15.0}
STRAPPED = {"kind": "capacity_table", "of": "vertical_cylinder", "diameter_m": 50.0,
            "rows": [[0.0, 0.0], [15.0, math.pi * 625.0 * 15.0]]}  # fmt: skip
COURSED = RIGID | {"courses": [[15.0, 0.010]], "elastic_modulus_gpa": 207.0}
BULGE = 28.80  # m³: π ρ g D³ H²/(8 E t) of 12 m of 860 kg/m³; recomputed from thin-shell theory, to 0.005
STEEL = 1.1e-5  # 1/K, of a tape: common practice


def exact(density):
    """A liquid that neither warmth nor pressure changes."""
    return {"model": "expansivity", "density_kg_m3": density, "expansivity_per_k": 0.0}


@pytest.mark.parametrize(
    ("shape", "density", "widened"),
    [
        (UPRIGHT, 860.0, BULGE),
        (STRAPPED, 860.0, BULGE),
        (STRAPPED | {"head_included_at_kg_m3": 860.0}, 860.0, 0.0),
        (STRAPPED | {"head_included_at_kg_m3": 860.0}, 817.0, -0.05 * BULGE),
    ],
    ids=["by its dimensions", "strapped empty", "strapped full", "strapped full of a heavier liquid"],
)
def test_a_shell_of_courses_widens_under_its_head(terminal, shape, density, widened):
    site = holding(terminal, exact(density), shape=shape, shell=COURSED)
    found = read(site, 15.0, level_m=12.0)
    assert found["status"] == "measured", found["reason"]
    assert found["gross_observed_volume_m3"] - math.pi * 625.0 * 12.0 == pytest.approx(widened, abs=0.006)
    assert steps(site)["ΔV_head"]["value"] == pytest.approx(widened, abs=0.006)
    assert site.get("/vessels/v")["definition"]["shell"] == COURSED


def test_rain_on_a_roof_displaces_its_own_mass_of_oil(terminal):
    """50 t on oil of 850 kg/m³ displace 58.8 m³, and 50 t of oil fewer stand at that level."""
    roof = {"mass_kg": 412_000, "lands_at_m": 1.8, "floats_at_m": 2.1}
    site = holding(terminal, exact(850.0), shape=STRAPPED, floating_roof=roof)
    dry = read(site, 15.0, level_m=12.0)
    wet = read(site, 15.0, level_m=12.0, roof_load_kg=50_000.0)
    gone = dry["gross_observed_volume_m3"] - wet["gross_observed_volume_m3"]
    assert gone == pytest.approx(58.8, abs=0.05)
    assert dry["mass_kg"] - wet["mass_kg"] == pytest.approx(50_000.0, rel=1e-9)


def test_a_warm_tape_reads_short(terminal):
    """10 m of steel, 20 K above its 20 °C: 10 × 1.1e-5 × 20 = 2.2 mm, 110 kg of 50 m² of water-like liquid."""
    dips = {"level_m": {"expansion_per_k": STEEL}}
    site = holding(terminal, exact(1000.0), instruments=dips)
    found = read(site, 40.0, level_m=10.0)
    assert found["mass_kg"] == pytest.approx(500_000.0 + 110.0, abs=1e-6)
    assert steps(site)["Δ_tape"]["value"] == pytest.approx(0.0022, abs=1e-12)
    assert site.get("/vessels/v")["definition"]["instruments"] == dips


@pytest.mark.parametrize(("carrier", "risen_m"), [("ground", 0.0), ("shell", 0.004464), ("still_pipe", 0.004464)])
def test_a_reference_point_on_a_warm_shell_stands_higher(terminal, carrier, risen_m):
    """20 m of carbon steel, 20 K warm: 20 × 1.116e-5 × 20 = 4.464 mm; air and liquid are at 35 °C."""
    gauging = {"reference_height_m": 20.0, "reference_on": carrier}
    tall = UPRIGHT | {"height_m": 20.0}
    site = holding(terminal, exact(1000.0), shape=tall, shell={"expansion_per_k": 1.116e-5, "at_temperature_c": 35.0},
                   gauging=gauging)  # fmt: skip
    row = {"vessel": "v", "taken_at": AT, "ullage_m": 14.0, "liquid_temperature_c": 35.0, "ambient_temperature_c": 35.0}
    site.post("/readings", {"readings": [row]})
    found = steps(site)
    assert found["h"]["value"] == pytest.approx(6.0 + risen_m, abs=1e-9)
    assert found["M"]["value"] == pytest.approx(math.pi * 625.0 * (6.0 + risen_m) * 1000.0, rel=1e-9)
    assert found.get("Δ_H", {"value": 0.0})["value"] == pytest.approx(risen_m, abs=1e-9)
