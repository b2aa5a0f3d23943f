"""A sphere of liquefied gas by its density and a bullet by its composition, through a warm afternoon.

What happened: sphere 31 has a straight table, 200 m³ to the metre, 2,000 m³ in all. Its propane is known by a
density, 507.0 kg/m³ at 15 °C, and stands at 5.000 m in the morning: 1,000 m³ of liquid at 15 °C, and over it 1,000 m³
of vapour, saturated: 731.5 kPa absolute and 15.813 kg/m³. In the afternoon everything is at 30 °C: 1,079.0 kPa and
23.451 kg/m³ (reference equation of state, E. W. Lemmon, M. O. McLinden, W. Wagner, J. Chem. Eng. Data 54 (2009)
3141). The liquid then has 507.0 × 0.954186 = 483.772 kg/m³ (GPA TP-27, 507 kg/m³ at 15 °C taken to 30 °C).

    morning      1,000 × 507.000 + 1,000 × 15.813 = 522,813 kg
    afternoon    the same in 2,000 m³: x × 483.772 + (2,000 − x) × 23.451 gives x = 1,033.87 m³, 5.169 m

The level rose by 169 mm, the pressure by 347 kPa, 6.8 t of liquid became vapour, and nothing came or went. A book of
level and a fixed density shows a gain of 33.87 m³ × 507 = 17.2 t, and loses it again in the evening.

Bullet 31 (60 m³, 30 m³ to the metre; its vapour is left out of this day) holds propane and n-butane, known by their
mole fractions, 0.6 and 0.4. By COSTALD (R. W. Hankinson, G. H. Thomson, AIChE J. 25 (1979) 653) that is 543.46 kg/m³
at 15 °C and 523.22 at 30 °C. At six it stands at 1.000 m: 30 × 543.46 = 16,303.9 kg; in the afternoon, at 30 °C,
at 1.0387 m. On the second day a road tanker brings 3,812.9 kg of butane by the weighbridge, a fifth as many moles as
there were, and the next analysis says half and half: 551.24 kg/m³ at 15 °C, 20,116.8 kg in 36.494 m³: 1.2165 m.

What the books must say: the afternoon balances, and so does the day of the butane, once its analysis is in. By the
analysis of the day before, the bullet is 284 kg short, and the answer says that its sample predates a receipt.
"""

from __future__ import annotations

import pytest

SPHERE = {"kind": "capacity_table", "of": "sphere", "diameter_m": 10.0, "total_volume_m3": 2_000.0,
          "rows": [[0.0, 0.0], [10.0, 2_000.0]]}  # fmt: skip
BULLET = {"kind": "capacity_table", "of": "horizontal_cylinder", "diameter_m": 2.0, "total_volume_m3": 60.0,
          "rows": [[0.0, 0.0], [2.0, 60.0]]}  # fmt: skip
EXACT = {"random": 0.0, "systematic": 0.0}
GOOD = dict.fromkeys(("liquid_temperature_c", "vapour_temperature_c", "pressure_kpa"), EXACT)
MORNING, NOON, NEXT, LAST = "2026-06-13 06:00", "2026-06-13 15:00", "2026-06-14 06:00", "2026-06-15 06:00"
VAPOUR = {15.0: (731.5, 15.813), 30.0: (1_079.0, 23.451)}  # kPa absolute and kg/m³ of saturated propane
LIQUID = {15.0: 507.0, 30.0: 507.0 * 0.954186}
HELD = 1_000.0 * LIQUID[15.0] + 1_000.0 * VAPOUR[15.0][1]
WARM = (HELD - 2_000.0 * VAPOUR[30.0][1]) / (LIQUID[30.0] - VAPOUR[30.0][1])  # m³ of liquid

# V* [cm³/mol], T_c [K], acentric factor, molar mass [g/mol]: API Technical Data Book, propane and n-butane
PURE = {"propane": (200.1, 369.83, 0.1532, 44.096), "n-butane": (254.4, 425.12, 0.2008, 58.122)}


def costald(fractions, celsius):
    """Density of a saturated liquid by its composition [kg/m³], equation by equation."""
    parts = [(x, *PURE[name]) for name, x in fractions.items()]
    volume = 0.25 * (sum(x * v for x, v, *_ in parts) + 3.0 * sum(x * v ** (2 / 3) for x, v, *_ in parts)
                     * sum(x * v ** (1 / 3) for x, v, *_ in parts))  # fmt: skip
    critical = sum(x * (v * t) ** 0.5 for x, v, t, *_ in parts) ** 2 / volume
    acentric, molar = sum(x * w for x, _, _, w, _ in parts), sum(x * m for x, _, _, _, m in parts)
    reduced = (celsius + 273.15) / critical
    s = (1.0 - reduced) ** (1 / 3)
    spherical = 1.0 - 1.52816 * s + 1.43907 * s**2 - 0.81446 * s**3 + 0.190454 * s**4
    apart = (-0.296123 + 0.386914 * reduced - 0.0427258 * reduced**2 - 0.0480645 * reduced**3) / (reduced - 1.00001)
    return 1000.0 * molar / (volume * spherical * (1.0 - acentric * apart))


def molar_mass(fractions):
    return sum(x * PURE[name][3] for name, x in fractions.items()) / 1000.0


FIRST, SECOND = {"propane": 0.6, "n-butane": 0.4}, {"propane": 0.5, "n-butane": 0.5}
FILLED = 30.0 * costald(FIRST, 15.0)
BUTANE = 0.2 * FILLED / molar_mass(FIRST) * PURE["n-butane"][3] / 1000.0  # kg
NEW_LEVEL = (FILLED + BUTANE) / costald(SECOND, 15.0) / 30.0


@pytest.fixture
def sphere(site):
    propane = [{"id": "propane", "mole_fraction": 1.0}]
    liquid = {"model": "light_hydrocarbon", "density_kg_m3": 507.0, "at_temperature_c": 15.0,
              "density_uncertainty_kg_m3": 0.0}  # fmt: skip
    site.substance("propane", liquid=liquid, vapour={"model": "virial", "components": propane})
    site.tank("v-31", "propane", shape=SPHERE, instruments=GOOD, assumed={})
    return site


@pytest.fixture
def bullet(site):
    mixed = [{"id": name, "mole_fraction": x} for name, x in FIRST.items()]
    site.substance("lpg", liquid={"model": "light_hydrocarbon", "components": mixed, "density_uncertainty_kg_m3": 0.0})
    site.tank("v-32", "lpg", shape=BULLET, instruments=GOOD, assumed={})
    return site


def gauged(site, at, level, celsius):
    kilopascal = VAPOUR[celsius][0]
    site.reads("v-31", at, level_m=level, liquid_temperature_c=celsius, vapour_temperature_c=celsius,
               pressure_kpa_abs=kilopascal)  # fmt: skip


def filled(site, at, level, celsius):
    site.reads("v-32", at, level_m=level, liquid_temperature_c=celsius)


def analysed(site, at, fractions, **body):
    site.reads("v-32", at, source="lab", liquid_composition=fractions, **body)


def brings_butane(site):
    site.receives("v-32", "road-0614", "2026-06-14 10:00", "2026-06-14 10:40", of="road", by="weighbridge",
                  mass_kg=BUTANE, mass_uncertainty_kg=2.0)  # fmt: skip


def test_the_paper_is_right():
    """Propane at 272.04 K has 530.3 kg/m³ (published, API Technical Data Book); the figures of the text above."""
    assert costald({"propane": 1.0}, 272.03889 - 273.15) == pytest.approx(530.301, abs=0.08)  # rounded V* and T_c
    assert pytest.approx((522_813.0, 1_033.87), abs=0.6) == (HELD, WARM)
    assert [costald(FIRST, 15.0), costald(FIRST, 30.0), costald(SECOND, 15.0)] == pytest.approx(
        [543.46, 523.22, 551.24], abs=0.01
    )
    assert pytest.approx((16_303.9, 3_812.9, 1.2165), rel=1e-4) == (FILLED, BUTANE, NEW_LEVEL)


def test_a_warm_afternoon_raises_level_and_pressure_and_no_mass(sphere):
    gauged(sphere, MORNING, 5.0, 15.0)
    gauged(sphere, NOON, WARM / 200.0, 30.0)
    cold, warm = sphere.inventory(MORNING), sphere.inventory(NOON)
    assert cold.of("v-31")["mass_kg"] == pytest.approx(HELD, abs=30.0)  # the virial equation of 15.8 t of vapour
    assert warm.of("v-31")["mass_kg"] == pytest.approx(HELD, abs=60.0)
    assert warm.of("v-31")["liquid_density_kg_m3"] == pytest.approx(483.772, abs=0.0005)
    became = warm.of("v-31")["vapour_mass_kg"] - cold.of("v-31")["vapour_mass_kg"]
    assert became == pytest.approx(966.13 * 23.451 - 15_813.0, rel=0.01)
    for told in (cold, warm):
        assert told.of("v-31")["status"] == "measured" and not told.of("v-31")["warnings"]
    fixed = (WARM - 1_000.0) * 507.0
    assert fixed == pytest.approx(17_171.0, abs=5.0)  # what a fixed density would have gained


def test_asked_why_the_level_rose_the_sphere_names_its_temperature(sphere):
    """Level and temperature cancel: +17 t of level at the morning's density, and the same again as expansion."""
    gauged(sphere, MORNING, 5.0, 15.0)
    gauged(sphere, NOON, WARM / 200.0, 30.0)
    why = sphere.change("v-31", MORNING, NOON)
    assert why["difference_kg"] == pytest.approx(0.0, abs=70.0)
    each = {one["input"]: one["contribution_kg"] for one in why["steps"]}
    assert each["level_m"] > 15_000.0 and each["liquid_temperature_c"] < -15_000.0
    assert sum(each.values()) == pytest.approx(why["difference_kg"], abs=1e-3)


def test_the_night_of_the_warm_afternoon_balances(sphere):
    """From six to three, a period of its own: 1 mm of 200 m² at either end is 0.2 m³, some 100 kg each."""
    gauged(sphere, MORNING, 5.0, 15.0)
    gauged(sphere, NOON, WARM / 200.0, 30.0)
    period = sphere.closes(opening=MORNING, closing=NOON)
    assert period.of("v-31")["imbalance_kg"] == pytest.approx(0.0, abs=70.0)
    assert not period.flagged


def test_the_bullet_holds_the_same_in_the_afternoon(bullet):
    """16,303.9 / 523.22 / 30 = 1.0387 m at 30 °C."""
    filled(bullet, MORNING, 1.0, 15.0)
    filled(bullet, NOON, FILLED / costald(FIRST, 30.0) / 30.0, 30.0)
    masses = [bullet.inventory(at).of("v-32")["mass_kg"] for at in (MORNING, NOON)]
    assert masses[0] == pytest.approx(16_303.9, rel=2e-4)
    assert masses[1] == pytest.approx(masses[0], rel=2e-5)


def test_the_day_of_the_butane_balances_by_its_own_analysis(bullet):
    """16,303.9 + 3,812.9 = 20,116.8 kg, half and half by moles."""
    analysed(bullet, "2026-06-14 05:00", FIRST)
    filled(bullet, NEXT, 1.0, 15.0)
    brings_butane(bullet)
    analysed(bullet, "2026-06-15 05:00", SECOND, sample_holds_from="2026-06-14 10:40")
    filled(bullet, LAST, NEW_LEVEL, 15.0)
    night = bullet.closes("2026-06-14")
    book = night.of("v-32")
    assert book["received_kg"] == pytest.approx(3_812.9, abs=0.1)
    assert book["closing_mass_kg"] == pytest.approx(20_116.8, rel=2e-4)
    assert book["imbalance_kg"] == pytest.approx(0.0, abs=1.0)
    assert book["status"] == "measured" and not night.flagged


def test_by_the_analysis_of_the_day_before_it_is_short_and_says_why(bullet):
    """36.494 m³ × (551.24 − 543.46) = 284 kg; the laboratory's report revises the night."""
    analysed(bullet, "2026-06-14 05:00", FIRST)
    filled(bullet, NEXT, 1.0, 15.0)
    brings_butane(bullet)
    filled(bullet, LAST, NEW_LEVEL, 15.0)
    first = bullet.closes("2026-06-14")
    assert first.of("v-32")["imbalance_kg"] == pytest.approx(-284.0, abs=3.0)
    assert "sample_predates_receipt" in bullet.inventory(LAST).warnings("v-32")
    assert first.of("v-32")["status"] == "uncertain"
    analysed(bullet, "2026-06-15 05:00", SECOND, sample_holds_from="2026-06-14 10:40")
    second = bullet.closes("2026-06-14")
    assert second["id"] == "2026-06-14.2" and second.of("v-32")["status"] == "measured"
    assert second.of("v-32")["imbalance_kg"] == pytest.approx(0.0, abs=1.0)
    subjects = {cause["subject"] for one in bullet.changes("2026-06-14.2") for cause in one["because"]}
    assert "v-32 liquid_composition 2026-06-15T05:00:00Z from lab" in subjects
