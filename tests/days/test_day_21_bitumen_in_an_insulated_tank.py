"""Bitumen at 165 °C in an insulated tank whose table was computed at 160 °C.

What happened: tank 21 has 100 m² of table, upright sides, and holds bitumen (930 kg/m³ at 160 °C, β = 6.2e-4 1/K).
On the 13th at 06:00 it stands at 8.000 m and 165 °C; it is 5 °C outside. Its shell (1.2e-5 1/K) is insulated, and
its table was computed for a shell of 160 °C, as the order asked.

By hand:

- The liquid: 930 × exp(−6.2e-4 × 5) = 927.1215 kg/m³.
- The shell is as hot as the liquid: 5 K above the table's 160 °C. Two of its three directions count at a fixed
  level: K = (1 + 1.2e-5 × 5)² = 1.000120.
- 800 m³ × 1.000120 × 927.1215 = 741,786.2 kg.
- At the site's 15 °C, where the volumes of the books are stated: 930 × exp(6.2e-4 × 145) = 1,017.4803 kg/m³, so
  that 741,786.2 kg are 729.0423 m³. Nothing is ever measured at 15 °C, and the mass does not depend on it.

What a wrong definition does: a shell that is not declared as insulated is taken at (7 × 165 + 5)/8 = 145 °C,
K = (1 − 1.2e-5 × 15)² = 0.999640: 356 kg too little. A table of 160 °C that passes for one of 15 °C: K = 1.003603,
2,583 kg too much.

Then the heating is off for a day: 158 °C on the 14th at 06:00, and nothing was moved. The level falls, because the
liquid shrinks more than the tank: 8.000 m × (1.000120 × 927.1215) / (0.999952 × 931.1539) = 7.966694 m. 33 mm, 3 t
of bitumen for whoever reads levels only; nothing for the books.
"""

from __future__ import annotations

import math

import pytest

AREA, BETA, ALPHA = 100.0, 6.2e-4, 1.2e-5
OPENS, CLOSES, NIGHT = "2026-03-13 06:00", "2026-03-14 06:00", "2026-03-13"
EXACT = {"random": 0.0, "systematic": 0.0}
INSULATED = {"expansion_per_k": ALPHA, "at_temperature_c": 160.0, "insulated": True}


def density(celsius):
    """930 kg/m³ at 160 °C, less or more by β."""
    return 930.0 * math.exp(-BETA * (celsius - 160.0))


def upright(shell_c, table_c=160.0):
    """The factor of an upright shell at a fixed level: twice the strain."""
    return (1.0 + ALPHA * (shell_c - table_c)) ** 2


MASS = 8.0 * AREA * upright(165.0) * density(165.0)
COOLED_LEVEL = MASS / (AREA * upright(158.0) * density(158.0))


@pytest.fixture
def tank(site):
    """The substance and the two mornings; each test says what the shell is."""
    site.substance("bitumen", liquid={"model": "expansivity", "density_kg_m3": 930.0, "at_temperature_c": 160.0,
                                      "density_uncertainty_kg_m3": 0.0, "expansivity_per_k": BETA})  # fmt: skip
    return site


def stands(site, name="tk-21", shell=INSULATED, **body):
    site.tank(name, "bitumen", shell=shell, assumed={}, **{"instruments": {"liquid_temperature_c": EXACT}, **body})
    site.reads(name, OPENS, level_m=8.0, liquid_temperature_c=165.0, ambient_temperature_c=5.0)
    site.reads(name, CLOSES, level_m=COOLED_LEVEL, liquid_temperature_c=158.0, ambient_temperature_c=5.0)


def test_the_arithmetic():
    """The figures of the docstring, on paper."""
    assert density(165.0) == pytest.approx(927.1215, abs=1e-4)
    assert density(158.0) == pytest.approx(931.1539, abs=1e-4)
    assert pytest.approx(741_786.2, abs=0.1) == MASS
    assert pytest.approx(7.966694, abs=1e-6) == COOLED_LEVEL


def test_the_shell_is_as_hot_as_the_bitumen_and_the_table_as_hot_as_it_says(tank):
    """800 m³ × 1.000120 × 927.1215."""
    stands(tank)
    stock = tank.inventory(OPENS).of("tk-21")
    assert stock["status"] == "measured"
    assert stock["liquid_density_kg_m3"] == pytest.approx(927.1215, abs=1e-4)
    assert stock["gross_observed_volume_m3"] == pytest.approx(800.096, abs=1e-4)
    assert stock["mass_kg"] == pytest.approx(741_786.2, abs=0.5)


def test_the_standard_volume_is_at_the_sites_fifteen_degrees(tank):
    """1,017.4803 kg/m³ and 729.0423 m³; the mass is theirs, too."""
    stands(tank)
    stock = tank.inventory(OPENS).of("tk-21")
    assert stock["standard_density_kg_m3"] == pytest.approx(1_017.4803, abs=1e-3)
    assert stock["gross_standard_volume_m3"] == pytest.approx(729.0423, abs=1e-3)
    assert stock["gross_standard_volume_m3"] * stock["standard_density_kg_m3"] == pytest.approx(MASS, abs=0.5)


def test_the_mass_is_the_same_at_a_site_whose_base_is_sixty_degrees(new_site):
    """At 60 °C the standard density is 930 × exp(6.2e-4 × 100) = 989.4850 kg/m³; the tank holds what it holds."""
    site = new_site(base_temperature_c=60.0)
    site.substance("bitumen", liquid={"model": "expansivity", "density_kg_m3": 930.0, "at_temperature_c": 160.0,
                                      "density_uncertainty_kg_m3": 0.0, "expansivity_per_k": BETA})  # fmt: skip
    stands(site)
    stock = site.inventory(OPENS).of("tk-21")
    assert stock["standard_density_kg_m3"] == pytest.approx(989.4850, abs=1e-3)
    assert stock["mass_kg"] == pytest.approx(741_786.2, abs=0.5)


def test_the_weather_outside_is_no_input_of_an_insulated_tank(tank):
    """5 °C or 35 °C outside: the same mass, and no ambient temperature among the inputs."""
    stands(tank)
    inventory = tank.inventory(OPENS)
    assert "ambient_temperature_c" not in [one["quantity"] for one in inventory.of("tk-21")["inputs"]]
    tank.reads("tk-21", "2026-03-13 06:30", level_m=8.0, liquid_temperature_c=165.0, ambient_temperature_c=35.0)
    assert tank.inventory("2026-03-13 06:30").of("tk-21")["mass_kg"] == pytest.approx(MASS, abs=0.5)


def test_the_working_names_the_shell_and_its_temperature(tank):
    stands(tank)
    steps = {one["symbol"]: one for one in tank.working("tk-21", OPENS)["working"]}
    assert steps["T_shell"]["value"] == pytest.approx(165.0, abs=1e-6)
    assert "insulated" in steps["T_shell"]["method"]
    assert steps["K"]["value"] == pytest.approx(1.0001200036, abs=1e-10)


WRONG = {
    "not insulated": ({"expansion_per_k": ALPHA, "at_temperature_c": 160.0}, upright(145.0), -356.0),
    "a table of 15 °C": ({"expansion_per_k": ALPHA, "insulated": True}, upright(165.0, 15.0), 2_583.5),
}


@pytest.mark.parametrize("case", WRONG)
def test_what_a_wrong_shell_does(tank, case):
    """K = 0.999640 or 1.003603 in place of 1.000120."""
    shell, factor, difference = WRONG[case]
    stands(tank, shell=shell)
    mass = tank.inventory(OPENS).of("tk-21")["mass_kg"]
    assert mass == pytest.approx(800.0 * factor * density(165.0), abs=0.5)
    assert mass - MASS == pytest.approx(difference, abs=0.5)


def test_a_day_without_heating_loses_nothing(tank):
    """33 mm less at 158 °C, the same 741,786 kg."""
    stands(tank)
    night = tank.closes(NIGHT)
    book = night.of("tk-21")
    assert book["closing_mass_kg"] == pytest.approx(MASS, abs=0.5)
    assert book["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
    assert not night.flagged
    # 1 mm at either end, 92.7 and 93.1 kg; β itself is in doubt by 2 %, over the 7 K between the two: 64.4 kg.
    doubt = 0.02 * BETA * 7.0 * MASS
    assert doubt == pytest.approx(64.4, abs=0.1)
    assert book["imbalance_uncertainty_kg"] == pytest.approx(
        math.hypot(0.1 * density(165.0), 0.1 * density(158.0), doubt), abs=1.0
    )


def test_it_shows_what_the_cooling_did_to_each_input(tank):
    """Level −33.306 mm: −3,088 kg; 7 K colder: +3,088 kg. Together nothing."""
    stands(tank)
    told = tank.change("tk-21", OPENS, CLOSES)
    steps = {one["input"]: one["contribution_kg"] for one in told["steps"]}
    by_level = (COOLED_LEVEL - 8.0) * AREA * upright(165.0) * density(165.0)
    assert by_level == pytest.approx(-3_088.2, abs=0.5)
    assert steps["level_m"] == pytest.approx(by_level, abs=0.5)
    assert steps["liquid_temperature_c"] == pytest.approx(-by_level, abs=0.5)
    assert told["difference_kg"] == pytest.approx(0.0, abs=0.5)


def test_the_thermometer_was_read_late(tank):
    """At the close only the level was sent; an hour after it still nobody knows. The temperature comes at ten.

    Without it the tank is unmeasured, not cold: no mass is made up. The late value revises the night.
    """
    tank.tank("tk-21", "bitumen", shell=INSULATED, assumed={}, instruments={"liquid_temperature_c": EXACT})
    tank.reads("tk-21", OPENS, level_m=8.0, liquid_temperature_c=165.0)
    tank.reads("tk-21", CLOSES, level_m=COOLED_LEVEL)
    first = tank.closes(NIGHT)
    assert first.of("tk-21")["closing_mass_kg"] is None and not first["complete"]
    tank.reads("tk-21", CLOSES, liquid_temperature_c=158.0)
    second = tank.closes(NIGHT)
    assert second["id"] == f"{NIGHT}.2" and second["complete"]
    assert second.of("tk-21")["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
    told = next(one for one in tank.changes(f"{NIGHT}.2") if one["field"] == "closing_mass_kg")
    assert told["before"] is None and told["after"] == pytest.approx(MASS, abs=0.5)
    assert [one["kind"] for one in told["because"]] == ["late_reading"]
    assert "liquid_temperature_c" in told["because"][0]["subject"]
