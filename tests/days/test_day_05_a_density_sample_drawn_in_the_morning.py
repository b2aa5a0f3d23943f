"""A density sample drawn in the morning after an evening receipt, reported two days later.

What happened: tank 5 (100 m²) held 500 m³ of 800.0 kg/m³ (sample of the 1st). On the evening of the 13th,
18:00 to 20:00, a barge brought 402,000 kg: 500 m³ of 804.0 kg/m³. The tank then held 1,000 m³ of 802.0 kg/m³,
802,000 kg, and stood still. The laboratory drew its sample on the 14th at 08:00, and reported 802.0 on the 16th.

    level at 06:00:  13th 5.000 m,  14th, 15th and 16th 10.000 m

What the books must say:

- Until the report, the sample of the 1st is all there is. It was drawn before the receipt, and the answer says
  so: `sample_predates_receipt`, `uncertain`. 1,000 m³ × 800 = 800,000 kg against a book of 802,000: 2,000 kg
  short, with an error of 3 kg/m³ on the half that came. No loss is flagged.
- If the barge's ticket carries its density, the blend counts: (400,000 + 402,000) / (500 + 500) = 802.0.
- When the report comes, the sample stands from the end of the receipt on, 20:00 on the 13th, although it was
  drawn after the close. All nights since then are revised.
"""

from __future__ import annotations

import math

import pytest

GAUGE = math.hypot(80.0, 80.2)  # kg; 1 mm of 100 m² at the opening and at the close
ENDED = "2026-03-13 20:00"


@pytest.fixture
def tank(site):
    site.liquid("diesel", 800.0)
    site.tank("tk-5", "diesel")
    site.reads("tk-5", "2026-03-01 09:00", source="lab", observed_density_kg_m3=800.0,
               observed_density_temperature_c=15.0, sample="s-0301")  # fmt: skip
    site.reads("tk-5", "2026-03-13 06:00", level_m=5.0)
    for day in ("2026-03-14", "2026-03-15", "2026-03-16"):
        site.reads("tk-5", f"{day} 06:00", level_m=10.0)
    return site


def barge(site, **density):
    site.receives("tk-5", "barge-0313", "2026-03-13 18:00", ENDED, mass_kg=402_000.0, **density)


def report(site, density=802.0, **holds):
    return site.reads("tk-5", "2026-03-14 08:00", source="lab", observed_density_kg_m3=density,
                      observed_density_temperature_c=15.0, sample="s-0314", **holds)  # fmt: skip


def test_before_the_report_the_old_sample_counts_and_says_that_it_predates_the_receipt(tank):
    """3 kg/m³ × ½ of 1,000 m³ are 1,500 kg: 2,000 kg short is a score of 1.3."""
    barge(tank)
    inventory = tank.inventory("2026-03-14 06:00")
    assert inventory.of("tk-5")["status"] == "uncertain"
    assert "sample_predates_receipt" in inventory.warnings("tk-5")
    assert inventory.of("tk-5")["mass_kg"] == pytest.approx(800_000.0, abs=0.5)
    assert inventory.of("tk-5")["mass_uncertainty_kg"] == pytest.approx(1_500.0, abs=15.0)
    night = tank.closes("2026-03-13")
    book = night.of("tk-5")
    assert book["status"] == "uncertain"
    assert book["imbalance_kg"] == pytest.approx(-2_000.0, abs=0.5)
    assert book["imbalance_uncertainty_kg"] == pytest.approx(math.hypot(1_500.0, GAUGE), abs=15.0)
    assert not night.flagged


def test_before_the_receipt_nothing_is_doubtful(tank):
    """At 06:00 on the 13th the sample of the 1st is twelve days old and as good as ever."""
    barge(tank)
    inventory = tank.inventory("2026-03-13 06:00")
    assert inventory.of("tk-5")["status"] == "measured"
    assert "sample_predates_receipt" not in inventory.warnings("tk-5")
    assert inventory.of("tk-5")["mass_kg"] == pytest.approx(400_000.0, abs=0.5)
    assert inventory.of("tk-5")["mass_uncertainty_kg"] == pytest.approx(80.0, abs=0.1)


def test_a_ticket_with_a_density_makes_the_blend(tank):
    """802.0 at once. How well it mixed nobody knows: the shift of 2 kg/m³, over √3, on 1,000 m³: 1,155 kg."""
    barge(tank, density_kg_m3=804.0, density_temperature_c=15.0)
    inventory = tank.inventory("2026-03-14 06:00")
    assert inventory.of("tk-5")["status"] == "uncertain"
    assert "sample_predates_receipt" in inventory.warnings("tk-5")
    assert inventory.of("tk-5")["standard_density_kg_m3"] == pytest.approx(802.0, abs=0.0005)
    assert inventory.of("tk-5")["mass_kg"] == pytest.approx(802_000.0, abs=0.5)
    book = tank.closes("2026-03-13").of("tk-5")
    assert book["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
    expected = math.hypot(2.0 / math.sqrt(3.0) * 1_000.0, GAUGE)
    assert book["imbalance_uncertainty_kg"] == pytest.approx(expected, abs=2.0)


def test_the_report_stands_from_the_end_of_the_receipt_and_revises_the_nights(tank):
    """The night of the 13th is whole: 802,000 against 802,000, and the gauge's two millimetres remain.

    The nights of the 14th and 15th opened and closed with 800,000, now with 802,000; they lost nothing before
    and lose nothing after.
    """
    barge(tank)
    days = ("2026-03-13", "2026-03-14", "2026-03-15")
    before = [tank.closes(day) for day in days]
    then = tank.inventory("2026-03-14 06:00")
    assert [one.of("tk-5")["closing_mass_kg"] for one in before] == pytest.approx([800_000.0] * 3, abs=0.5)

    report(tank, sample_holds_from=ENDED)
    after = [tank.closes(day) for day in days]
    assert [one["id"] for one in after] == [f"{day}.2" for day in days]
    assert [one.of("tk-5")["closing_mass_kg"] for one in after] == pytest.approx([802_000.0] * 3, abs=0.5)
    assert [one.of("tk-5")["imbalance_kg"] for one in after] == pytest.approx([0.0] * 3, abs=0.5)
    first = after[0].of("tk-5")
    assert first["status"] == "measured"
    assert first["opening_mass_kg"] == pytest.approx(400_000.0, abs=0.5)  # the 13th at six: still the old sample
    assert first["imbalance_uncertainty_kg"] == pytest.approx(GAUGE, abs=1.0)
    assert not any(one.flagged for one in after)

    # Every one of the three nights names the report, and only that.
    drawn = "2026-03-14T08:00:00Z from lab"
    for day in days:
        causes = tank.because(day)
        assert {kind for kind, _ in causes} == {"late_reading"}
        assert ("late_reading", f"tk-5 observed_density_kg_m3 {drawn}") in causes
        assert all(subject.endswith(drawn) for _, subject in causes)
    opened = [one for one in tank.changes("2026-03-14") if one["field"] == "opening_mass_kg"]
    assert (opened[0]["before"], opened[0]["after"]) == pytest.approx((800_000.0, 802_000.0), abs=0.5)
    assert any(
        line.startswith("tk-5: closing mass 800,000 → 802,000 kg because the density of tk-5 of 2026-03-14T08:00:00Z")
        for line in tank.words("2026-03-13")
    )

    now = tank.inventory("2026-03-14 06:00")
    assert now.of("tk-5")["mass_kg"] == pytest.approx(802_000.0, abs=0.5)
    assert "sample_predates_receipt" not in now.warnings("tk-5")
    assert now.input("tk-5", "observed_density_kg_m3")["value"] == 802.0
    as_known = tank.inventory("2026-03-14 06:00", as_of=then["known_at"])
    assert as_known.of("tk-5")["mass_kg"] == pytest.approx(800_000.0, abs=0.5)
    assert tank.book("2026-03-13.1").of("tk-5")["imbalance_kg"] == pytest.approx(-2_000.0, abs=0.5)


def test_during_the_receipt_the_report_does_not_count_yet(tank):
    """At 19:00, halfway, the content is another: the report stands from 20:00 on only."""
    barge(tank)
    report(tank, sample_holds_from=ENDED)
    tank.reads("tk-5", "2026-03-13 19:00", level_m=7.5)
    assert tank.inventory("2026-03-13 19:00").input("tk-5", "observed_density_kg_m3")["value"] == 800.0
    tank.reads("tk-5", ENDED, level_m=10.0)
    assert tank.inventory(ENDED).input("tk-5", "observed_density_kg_m3")["value"] == 802.0


def test_a_report_that_does_not_say_since_when_stands_from_when_it_was_drawn(tank):
    """Drawn at 08:00 on the 14th: the close at 06:00 keeps the old sample, the next one has the new."""
    barge(tank)
    report(tank)
    first, second = tank.closes("2026-03-13").of("tk-5"), tank.closes("2026-03-14").of("tk-5")
    assert first["closing_mass_kg"] == pytest.approx(800_000.0, abs=0.5)
    assert second["closing_mass_kg"] == pytest.approx(802_000.0, abs=0.5)
    assert (first["status"], second["status"]) == ("uncertain", "measured")
