"""A tank changes its product over a heel.

What happened: tank 9 (100 m²) is drawn down to a heel of 0.500 m of gasoline, 50 m³ of 750 kg/m³, 37,500 kg. On
the 14th at 12:00 the planners make it a naphtha tank (700 kg/m³); the heel stays where it is. From 14:00 to
20:00 it receives 350,000 kg of naphtha, 500 m³. At 06:00 on the 15th it stands at 5.500 m and the morning's
sample, which stands from 20:00, says 704.545 kg/m³: (37,500 + 350,000) / 550.

What the books must say:

- The vessel opened with 37,500 kg, received 350,000 kg and holds 387,500 kg: nothing is missing. Mass stays
  mass; the heel is not recomputed at naphtha's density, which would be a loss of 2,500 kg that never was.
- The substances' totals: 37,500 kg of gasoline became naphtha at noon, `reclassified_kg`, minus in one total and
  plus in the other.
- Nothing that was read about the gasoline counts for the naphtha: between noon and the next reading the tank is
  unmeasured, whatever ages are allowed, and the gasoline's density sample never comes back.
"""

from __future__ import annotations

import math

import pytest

NOON = "2026-03-14 12:00"
A_DAY = {"level_m": 86_400}
DENSITY = 387_500.0 / 550.0


@pytest.fixture
def heel(site):
    """The heel of gasoline with its sample; of the planners' change nobody has said anything."""
    site.liquid("gasoline", 745.0)
    site.liquid("naphtha", 700.0)
    site.tank("tk-9", "gasoline", max_age_s=A_DAY)
    site.reads("tk-9", "2026-03-12 09:00", source="lab", observed_density_kg_m3=750.0,
               observed_density_temperature_c=15.0, sample="s-0312")  # fmt: skip
    for day in ("2026-03-13", "2026-03-14"):
        site.reads("tk-9", f"{day} 06:00", level_m=0.5)
    return site


def becomes_naphtha(site):
    assert site.tank("tk-9", "naphtha", max_age_s=A_DAY, effective_from=NOON) == "revised"


@pytest.fixture
def tank(heel):
    """The heel, and the tank's new text from noon on."""
    becomes_naphtha(heel)
    return heel


def fills(site):
    site.receives("tk-9", "barge-0314", "2026-03-14 14:00", "2026-03-14 20:00", mass_kg=350_000.0,
                  density_kg_m3=700.0, density_temperature_c=15.0)  # fmt: skip
    site.reads("tk-9", "2026-03-15 06:00", level_m=5.5)


def morning_sample(site):
    site.reads("tk-9", "2026-03-15 05:30", source="lab", observed_density_kg_m3=DENSITY,
               observed_density_temperature_c=15.0, sample="s-0315",
               sample_holds_from="2026-03-14 20:00")  # fmt: skip


def test_before_noon_it_is_gasoline_after_noon_nobody_knows_until_it_is_read(tank):
    """11:59: the level of six o'clock, 50 m³ × 750. 12:01: that level was of another liquid."""
    before = tank.inventory("2026-03-14 11:59").of("tk-9")
    assert before["substance"] == "gasoline"
    assert before["mass_kg"] == pytest.approx(37_500.0, abs=0.5)
    after = tank.inventory("2026-03-14 12:01").of("tk-9")
    assert after["substance"] == "naphtha"
    assert after["status"] == "unmeasured" and after["mass_kg"] is None


def test_a_dip_after_noon_counts_by_the_new_liquid_and_never_by_the_old_sample(tank):
    """13:00, 0.500 m: 50 m³ × 700, naphtha's own figure; the gasoline's 750 of the 12th is gone."""
    tank.reads("tk-9", "2026-03-14 13:00", level_m=0.5)
    stock = tank.inventory("2026-03-14 13:00").of("tk-9")
    assert stock["standard_density_kg_m3"] == pytest.approx(700.0, abs=1e-6)
    assert stock["mass_kg"] == pytest.approx(35_000.0, abs=0.5)
    # ... nor does the dip of the naphtha reach back before noon: at 11:59 the gasoline is as it was.
    assert tank.inventory("2026-03-14 11:59").of("tk-9")["mass_kg"] == pytest.approx(37_500.0, abs=0.5)


def test_the_night_before_is_gasoline_throughout(tank):
    night = tank.closes("2026-03-13")
    assert night.of("tk-9")["opening_mass_kg"] == pytest.approx(37_500.0, abs=0.5)
    assert night.of("tk-9")["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
    assert night.total("gasoline")["closing_mass_kg"] == pytest.approx(37_500.0, abs=0.5)
    assert not night.total("gasoline").get("reclassified_kg")


def test_the_vessel_keeps_its_mass_over_the_change(tank):
    """37,500 + 350,000 = 387,500 = 5.500 m × 100 m² × 704.545; 1 mm at either end: 75 and 70.5 kg."""
    fills(tank)
    morning_sample(tank)
    tank.closes("2026-03-13")
    night = tank.closes("2026-03-14")
    book = night.of("tk-9")
    assert book["opening_mass_kg"] == pytest.approx(37_500.0, abs=0.5)
    assert not book.get("restated_kg")
    assert book["received_kg"] == pytest.approx(350_000.0, abs=0.5)
    assert book["book_mass_kg"] == pytest.approx(387_500.0, abs=0.5)
    assert book["closing_mass_kg"] == pytest.approx(387_500.0, abs=0.5)
    assert book["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
    assert book["imbalance_uncertainty_kg"] == pytest.approx(math.hypot(75.0, 70.45), abs=0.5)
    assert not night.flagged


def test_the_totals_say_what_became_of_the_gasoline(tank):
    fills(tank)
    morning_sample(tank)
    tank.closes("2026-03-13")
    night = tank.closes("2026-03-14")
    expected = {  # opening, received, reclassified, closing
        "gasoline": (37_500.0, 0.0, -37_500.0, 0.0),
        "naphtha": (0.0, 350_000.0, 37_500.0, 387_500.0),
    }
    for substance, masses in expected.items():
        total = night.total(substance)
        told = [total[f"{name}_kg"] for name in ("opening_mass", "received", "reclassified", "closing_mass")]
        assert told == pytest.approx(masses, abs=0.5)
        assert total["delivered_kg"] == 0.0
        assert total["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
        assert total["complete"]


def test_gasoline_that_was_drawn_before_noon_was_gasoline(tank):
    """At nine 7,500 kg leave by road, 0.100 m. At noon 30,000 kg are left, and those become naphtha.

    The next morning: (30,000 + 350,000) / 540 m³ = 703.704 kg/m³ at 5.400 m.
    """
    tank.delivers("tk-9", "road-0314", "2026-03-14 09:00", "2026-03-14 09:30", mass_kg=7_500.0)
    tank.receives("tk-9", "barge-0314", "2026-03-14 14:00", "2026-03-14 20:00", mass_kg=350_000.0)
    tank.reads("tk-9", "2026-03-15 06:00", level_m=5.4)
    tank.reads("tk-9", "2026-03-15 05:30", source="lab", observed_density_kg_m3=380_000.0 / 540.0,
               observed_density_temperature_c=15.0, sample_holds_from="2026-03-14 20:00")  # fmt: skip
    night = tank.closes("2026-03-14")
    assert night.of("tk-9")["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
    gasoline, naphtha = night.total("gasoline"), night.total("naphtha")
    assert gasoline["delivered_kg"] == pytest.approx(7_500.0, abs=0.5)
    assert gasoline["reclassified_kg"] == pytest.approx(-30_000.0, abs=0.5)
    assert gasoline["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
    assert naphtha["reclassified_kg"] == pytest.approx(30_000.0, abs=0.5)
    assert naphtha["delivered_kg"] == 0.0
    assert naphtha["imbalance_kg"] == pytest.approx(0.0, abs=0.5)


def test_the_late_sample_revises_the_night(tank):
    """Until the sample there is naphtha's own 700: 385,000 kg, 2,500 kg short. The sample brings them back."""
    fills(tank)
    tank.closes("2026-03-13")
    first = tank.closes("2026-03-14")
    assert first.of("tk-9")["closing_mass_kg"] == pytest.approx(385_000.0, abs=0.5)
    morning_sample(tank)
    second = tank.closes("2026-03-14")
    assert second["id"] == "2026-03-14.2"
    assert second.of("tk-9")["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
    assert tank.book("2026-03-14.1").of("tk-9")["imbalance_kg"] == pytest.approx(-2_500.0, abs=0.5)
    closing = next(one for one in tank.changes("2026-03-14.2") if one["field"] == "closing_mass_kg")
    assert closing["vessel"] == "tk-9"
    assert (closing["before"], closing["after"]) == pytest.approx((385_000.0, 387_500.0), abs=0.5)
    assert {one["kind"] for one in closing["because"]} == {"late_reading"}
    subjects = {one["subject"] for one in closing["because"]}
    assert "tk-9 observed_density_kg_m3 2026-03-15T05:30:00Z from lab" in subjects
    assert tank.words("2026-03-14.2")[0].startswith(
        "tk-9: closing mass 385,000 → 387,500 kg because the density of tk-9 of 2026-03-15T05:30:00Z from lab came on "
    )


def test_the_change_of_product_is_entered_a_day_late(heel):
    """Closed as gasoline, the barge's density blends with the heel: (37,500 + 350,000) / (50 + 500) = 704.545.

    5.500 m are 550 m³ and 387,500 kg, all of it gasoline, nothing missing. Then the change at noon is entered: the
    gasoline's sample is no part of any blend, and naphtha's own 700 counts: 550 × 700 = 385,000 kg, 2,500 kg short
    until there is a sample. A millimetre at either end is 75 and 70 kg, so that this is flagged, and says why. The
    opening and the receipt are what they were; the heel became naphtha.
    """
    fills(heel)
    heel.closes("2026-03-13")
    first = heel.closes("2026-03-14")
    assert first.of("tk-9")["closing_mass_kg"] == pytest.approx(387_500.0, abs=0.5)
    assert first.total("gasoline")["closing_mass_kg"] == pytest.approx(387_500.0, abs=0.5)
    assert not first.total("gasoline").get("reclassified_kg")

    becomes_naphtha(heel)
    second = heel.closes("2026-03-14")
    assert second["id"] == "2026-03-14.2"
    assert heel.closes("2026-03-13")["id"] == "2026-03-13.1"  # it was gasoline throughout
    assert second.of("tk-9")["closing_mass_kg"] == pytest.approx(385_000.0, abs=0.5)
    assert second.total("gasoline")["reclassified_kg"] == pytest.approx(-37_500.0, abs=0.5)
    assert second.total("naphtha")["reclassified_kg"] == pytest.approx(37_500.0, abs=0.5)
    assert heel.book("2026-03-14.1").of("tk-9")["closing_mass_kg"] == pytest.approx(387_500.0, abs=0.5)
    assert not heel.book("2026-03-14.1").total("gasoline").get("reclassified_kg")

    told = {one["field"]: one for one in heel.changes("2026-03-14.2") if "vessel" in one}
    assert set(told) == {"closing_mass_kg", "imbalance_kg", "flagged", "verdict"}
    assert (told["flagged"]["before"], told["flagged"]["after"]) == (False, True)
    closing, imbalance = told["closing_mass_kg"], told["imbalance_kg"]
    assert (closing["vessel"], imbalance["vessel"]) == ("tk-9", "tk-9")
    assert (closing["before"], closing["after"]) == pytest.approx((387_500.0, 385_000.0), abs=0.5)
    assert (imbalance["before"], imbalance["after"]) == pytest.approx((0.0, -2_500.0), abs=0.5)
    assert heel.because("2026-03-14.2") == {("definition", "vessel tk-9")}
    assert "because the definition of vessel tk-9 was changed on " in heel.words("2026-03-14.2")[0]


def test_what_only_the_totals_tell_is_told_of_the_substances(heel):
    """With the morning's sample 550 m³ × 704.545 are 387,500 kg, whatever they are called: no vessel's figure moves.

    What was gasoline at six, received as gasoline and closed as gasoline, became naphtha at noon.
    """
    fills(heel)
    morning_sample(heel)
    heel.closes("2026-03-13")
    heel.closes("2026-03-14")
    becomes_naphtha(heel)
    second = heel.closes("2026-03-14")
    assert second["id"] == "2026-03-14.2"
    changes = {(one["substance"], one["field"]): one for one in heel.changes("2026-03-14.2")}
    moved = {key: (one["before"], one["after"]) for key, one in changes.items()}
    assert moved["gasoline", "closing_mass_kg"] == pytest.approx((387_500.0, 0.0), abs=0.5)
    assert moved["gasoline", "received_kg"] == pytest.approx((350_000.0, 0.0), abs=0.5)
    assert moved["gasoline", "reclassified_kg"] == (None, pytest.approx(-37_500.0, abs=0.5))
    assert moved["naphtha", "reclassified_kg"] == (None, pytest.approx(37_500.0, abs=0.5))
    because = [(one["kind"], one["subject"]) for one in changes["gasoline", "reclassified_kg"]["because"]]
    assert because == [("definition", "vessel tk-9")]
    said = next(one for one in heel.words("2026-03-14.2") if one.startswith("gasoline: reclassified"))
    assert "none → -37,500 kg because the definition of vessel tk-9 was changed on " in said
