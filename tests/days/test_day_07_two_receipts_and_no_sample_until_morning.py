"""A blend tank with two receipts of other densities and no sample until morning; and components of a blend.

What happened, first part: tank 7 (100 m²) holds 500 m³ of 800 kg/m³. In the evening 84,000 kg come in, 100 m³ of
840 kg/m³; before midnight another 246,000 kg, 300 m³ of 820 kg/m³. At 06:00 it stands at 9.000 m.

    (400,000 + 84,000 + 246,000) / (500 + 100 + 300) = 730,000 / 900 = 811.111 kg/m³

The last sample, 800, would make 720,000 kg of it and miss 10 t. Both tickets carry their densities, so the blend
counts: 730,000 kg. How well a tank is mixed by itself nobody knows; a third of the shift's square is its
variance: 11.111/√3 kg/m³ × 900 m³ = 5,774 kg. At eight the morning's sample says 811.0, for what has been
there since midnight: 729,900 kg, 100 kg short of the book, and nothing doubtful is left.

Second part: a blender makes motor fuel out of two components. 70,000 kg of alkylate (700 kg/m³) and 80,000 kg
of reformate (800 kg/m³) go into 150,000 kg of fuel of 750 kg/m³. No tank lost anything and nothing crossed the
fence: 150,000 kg were called one thing at six in the evening and another at midnight. The totals say that as
`reclassified_kg`, and it sums to nothing over the site.
"""

from __future__ import annotations

import math

import pytest

SIX = "2026-03-14 06:00"


@pytest.fixture
def blender(site):
    """The tank, the sample of the 12th, its two levels, and both receipts of the evening."""
    site.liquid("fuel-oil", 800.0)
    site.tank("tk-7", "fuel-oil")
    site.reads("tk-7", "2026-03-12 09:00", source="lab", observed_density_kg_m3=800.0,
               observed_density_temperature_c=15.0, sample="s-0312")  # fmt: skip
    site.reads("tk-7", "2026-03-13 06:00", level_m=5.0)
    site.reads("tk-7", SIX, level_m=9.0)
    return site


def receipts(site, *, second_has_a_density=True):
    known = {"density_kg_m3": 820.0, "density_temperature_c": 15.0} if second_has_a_density else {}
    site.receives("tk-7", "barge-1", "2026-03-13 18:00", "2026-03-13 20:00", mass_kg=84_000.0,
                  density_kg_m3=840.0, density_temperature_c=15.0)  # fmt: skip
    site.receives("tk-7", "barge-2", "2026-03-13 21:00", "2026-03-14 00:00", mass_kg=246_000.0, **known)


def test_until_the_sample_the_blend_of_both_receipts_counts(blender):
    receipts(blender)
    inventory = blender.inventory(SIX)
    assert inventory.of("tk-7")["status"] == "uncertain"
    assert "sample_predates_receipt" in inventory.warnings("tk-7")
    assert inventory.of("tk-7")["standard_density_kg_m3"] == pytest.approx(811.1111, abs=0.0005)
    night = blender.closes("2026-03-13")
    book = night.of("tk-7")
    assert book["received_kg"] == pytest.approx(330_000.0, abs=0.01)
    assert book["closing_mass_kg"] == pytest.approx(730_000.0, abs=0.5)
    assert book["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
    # the blend's 5,774 kg, and 1 mm at either end: 80 kg of 800, 81 kg of 811 kg/m³
    expected = math.hypot(100.0 / 9.0 / math.sqrt(3.0) * 900.0, 80.0, 81.1)
    assert book["imbalance_uncertainty_kg"] == pytest.approx(expected, abs=5.0)
    assert not night.flagged


def test_in_the_evening_only_the_first_receipt_is_blended(blender):
    """At 20:30 the tank stands at 6.000 m: (400,000 + 84,000) / 600 = 806.667 kg/m³."""
    receipts(blender)
    blender.reads("tk-7", "2026-03-13 20:30", level_m=6.0)
    stock = blender.inventory("2026-03-13 20:30").of("tk-7")
    assert stock["standard_density_kg_m3"] == pytest.approx(806.6667, abs=0.0005)
    assert stock["mass_kg"] == pytest.approx(484_000.0, abs=0.5)


def test_one_ticket_without_a_density_leaves_the_old_sample(blender):
    """Nobody can say what came: 800 kg/m³ × 900 m³ = 720,000 kg, 10 t short of the book.

    The error is 3 kg/m³ × the share received, 400 of 900 m³: 1,200 kg. That is a guess of the trade for
    receipts that resemble what was there; these do not, and the night says so.
    """
    receipts(blender, second_has_a_density=False)
    book = blender.closes("2026-03-13").of("tk-7")
    assert book["status"] == "uncertain"
    assert book["closing_mass_kg"] == pytest.approx(720_000.0, abs=0.5)
    assert book["imbalance_kg"] == pytest.approx(-10_000.0, abs=0.5)
    assert 1_150.0 < book["imbalance_uncertainty_kg"] < 1_300.0
    assert book["flagged"]


def test_the_morning_sample_replaces_the_blend(blender):
    """811.0 × 900 = 729,900 kg; 100 kg short of the book, with √(80² + 81.1²) = 114 kg.

    The blend had made it 730,000 kg, what the book says. The opening keeps the old sample: the new one stands
    from midnight on, 18 hours later.
    """
    receipts(blender)
    first = blender.closes("2026-03-13")
    blender.reads("tk-7", "2026-03-14 08:00", source="lab", observed_density_kg_m3=811.0,
                  observed_density_temperature_c=15.0, sample="s-0314",
                  sample_holds_from="2026-03-14 00:00")  # fmt: skip
    night = blender.closes("2026-03-13")
    book = night.of("tk-7")
    assert night["revision"] == first["revision"] + 1
    assert book["status"] == "measured"
    assert book["closing_mass_kg"] == pytest.approx(729_900.0, abs=0.5)
    assert book["imbalance_kg"] == pytest.approx(-100.0, abs=0.5)
    assert book["imbalance_uncertainty_kg"] == pytest.approx(math.hypot(80.0, 81.1), abs=0.5)
    assert not night.flagged

    former = blender.book("2026-03-13.1").of("tk-7")
    assert former["status"] == "uncertain"
    assert former["closing_mass_kg"] == pytest.approx(730_000.0, abs=0.5)
    told = {(one["vessel"], one["field"]): one for one in blender.changes("2026-03-13.2")}
    assert set(told) == {("tk-7", "closing_mass_kg"), ("tk-7", "imbalance_kg")}
    closing, imbalance = told["tk-7", "closing_mass_kg"], told["tk-7", "imbalance_kg"]
    assert (closing["before"], closing["after"]) == pytest.approx((730_000.0, 729_900.0), abs=0.5)
    assert (imbalance["before"], imbalance["after"]) == pytest.approx((0.0, -100.0), abs=0.5)
    drawn = "2026-03-14T08:00:00Z from lab"
    causes = blender.because("2026-03-13.2")
    assert ("late_reading", f"tk-7 observed_density_kg_m3 {drawn}") in causes
    assert all(kind == "late_reading" and subject.endswith(drawn) for kind, subject in causes)  # no ticket among them
    assert blender.words("2026-03-13.2")[0].startswith(
        f"tk-7: closing mass 730,000 → 729,900 kg because the density of tk-7 of {drawn} came on "
    )


def components_into_fuel(site):
    """Two component tanks at 10.000 m and 9.000 m, the fuel's tank at 2.000 m and 4.000 m."""
    for substance, tank, density, levels in (
        ("alkylate", "tk-a", 700.0, (10.0, 9.0)),
        ("reformate", "tk-r", 800.0, (10.0, 9.0)),
        ("motor-fuel", "tk-f", 750.0, (2.0, 4.0)),
    ):
        site.liquid(substance, density)
        site.tank(tank, substance)
        for at, level in zip(("2026-03-13 06:00", SIX), levels, strict=True):
            site.reads(tank, at, level_m=level)
    for tank, mass, density in (("tk-a", 70_000.0, 700.0), ("tk-r", 80_000.0, 800.0)):
        site.moves(f"blend-{tank}", tank, "tk-f", "2026-03-13 18:00", "2026-03-14 00:00", mass_kg=mass,
                   density_kg_m3=density, density_temperature_c=15.0)  # fmt: skip


def test_components_of_a_blend_are_reclassified_and_nothing_crosses_the_fence(site):
    components_into_fuel(site)
    night = site.closes("2026-03-13")
    expected = {  # substance: opening, reclassified, closing
        "alkylate": (700_000.0, -70_000.0, 630_000.0),
        "reformate": (800_000.0, -80_000.0, 720_000.0),
        "motor-fuel": (150_000.0, 150_000.0, 300_000.0),
    }
    for substance, (opening, reclassified, closing) in expected.items():
        total = night.total(substance)
        assert total["opening_mass_kg"] == pytest.approx(opening, abs=0.5)
        assert total["reclassified_kg"] == pytest.approx(reclassified, abs=0.5)
        assert total["closing_mass_kg"] == pytest.approx(closing, abs=0.5)
        assert total["received_kg"] == pytest.approx(0.0, abs=0.01)
        assert total["delivered_kg"] == pytest.approx(0.0, abs=0.01)
        assert total["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
    assert sum(one["reclassified_kg"] for one in night["totals"]) == pytest.approx(0.0, abs=0.01)


def test_the_vessels_books_of_a_blend_are_like_any_others(site):
    components_into_fuel(site)
    night = site.closes("2026-03-13")
    assert night.of("tk-f")["received_kg"] == pytest.approx(150_000.0, abs=0.01)
    assert night.of("tk-a")["delivered_kg"] == pytest.approx(70_000.0, abs=0.01)
    assert night.of("tk-r")["delivered_kg"] == pytest.approx(80_000.0, abs=0.01)
    assert [one["imbalance_kg"] for one in night["vessels"]] == pytest.approx([0.0, 0.0, 0.0], abs=0.5)
    assert not night.flagged


def test_the_fuel_is_blended_from_its_components_densities(site):
    """The fuel's figure of 750 is a sample of the 12th: (150 + 70 + 80 t) / (200 + 100 + 100 m³) is 750 again."""
    components_into_fuel(site)
    site.reads("tk-f", "2026-03-12 09:00", source="lab", observed_density_kg_m3=750.0,
               observed_density_temperature_c=15.0, sample="s-0312")  # fmt: skip
    inventory = site.inventory(SIX)
    assert "sample_predates_receipt" in inventory.warnings("tk-f")
    assert inventory.of("tk-f")["mass_kg"] == pytest.approx(300_000.0, abs=0.5)
