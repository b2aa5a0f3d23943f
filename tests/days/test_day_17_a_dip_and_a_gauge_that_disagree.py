"""A dip and an automatic gauge that disagree by 8 mm, in either order of posting.

What happened: tank 17 (1,000 m², 800 kg/m³: 800 kg to the millimetre) has a radar that is read every ten minutes
and comes first in its order of sources; the hand dip comes second. The tank stands still. On the 14th the radar
shows 8.231 m at 05:50 and at 06:00. At 05:55 the operator dips 8.239 m.

What is declared: the radar 1 mm at each reading and 2 mm of unknown offset, the tape 1.5 mm and 1 mm.

What the service must say:

- The radar counts: 8.231 m, 6,584,800 kg. The dip is a check: 8 mm more than the radar at 05:55, with a standard
  uncertainty of √(0.5 + 2² + 1.5² + 1²) mm = 2.78 mm; halfway between two readings the radar's 1 mm is 1/√2 mm.
  8 mm are more than twice that: `sources_disagree`. The status stays `measured`.
- A dip of 5 mm more is answered as a check and raises nothing: 5 is less than 2 × 2.8.
- Whether the dip was posted before the radar's readings or after them changes nothing.
- Without an order of sources the newest value counts, and the answer says `two_sources`.
"""

from __future__ import annotations

import math

import pytest

AT, DIPPED = "2026-03-14 06:00", "2026-03-14 05:55"
RADAR = [("2026-03-14 05:50", 8.231), (AT, 8.231)]
# Halfway between two readings of the radar, each with 1 mm: 1/√2 mm; its offset 2 mm; the tape's 1.5 and 1 mm.
DIFFERENCE_U = math.sqrt(0.5 + 2.0**2 + 1.5**2 + 1.0**2) * 1e-3
ORDER = [
    {"source": "radar", "instruments": {"level_m": {"random": 0.001, "systematic": 0.002}}},
    {"source": "hand", "instruments": {"level_m": {"random": 0.0015, "systematic": 0.001, "instrument": "tape 7"}}},
]


def tank(site, name="tk-17", **body):
    site.liquid("gas-oil", 800.0)
    site.tank(name, "gas-oil", area_m2=1000.0, **body)
    return site


def post(site, name, dip, *, dip_first):
    rows = [(at, "radar", level) for at, level in RADAR]
    rows.insert(0 if dip_first else len(rows), (DIPPED, "hand", dip))
    for at, source, level in rows:
        site.reads(name, at, source=source, level_m=level)


@pytest.mark.parametrize("dip_first", [True, False])
def test_eight_millimetres_are_said_in_either_order(site, dip_first):
    """8.239 − 8.231 = 8 mm against 2 × 2.784 mm."""
    tank(site, sources=ORDER)
    post(site, "tk-17", 8.239, dip_first=dip_first)
    inventory = site.inventory(AT)
    stock = inventory.of("tk-17")
    assert stock["mass_kg"] == pytest.approx(6_584_800.0, abs=0.5)
    assert stock["mass_uncertainty_kg"] == pytest.approx(math.hypot(800.0, 1_600.0), abs=0.5)
    assert inventory.input("tk-17", "level_m")["source"] == "radar"
    assert len(stock["checks"]) == 1
    check = stock["checks"][0]
    assert (check["quantity"], check["source"], check["at"]) == ("level_m", "hand", "2026-03-14T05:55:00Z")
    assert check["value"] == pytest.approx(8.239, abs=1e-9)
    assert check["difference"] == pytest.approx(0.008, abs=1e-9)
    assert check["standard_uncertainty"] == pytest.approx(DIFFERENCE_U, rel=0.01)
    assert "sources_disagree" in inventory.warnings("tk-17")
    assert stock["status"] == "measured"


@pytest.mark.parametrize("dip_first", [True, False])
def test_five_millimetres_are_a_check_and_no_warning(site, dip_first):
    """5 mm against 2 × 2.784 = 5.57 mm."""
    tank(site, sources=ORDER)
    post(site, "tk-17", 8.236, dip_first=dip_first)
    inventory = site.inventory(AT)
    assert inventory.of("tk-17")["checks"][0]["difference"] == pytest.approx(0.005, abs=1e-9)
    assert "sources_disagree" not in inventory.warnings("tk-17")


def test_a_dip_that_is_less_is_as_much_of_a_disagreement(site):
    tank(site, sources=ORDER)
    post(site, "tk-17", 8.223, dip_first=False)
    inventory = site.inventory(AT)
    assert inventory.of("tk-17")["checks"][0]["difference"] == pytest.approx(-0.008, abs=1e-9)
    assert "sources_disagree" in inventory.warnings("tk-17")


def test_the_books_are_the_radars_in_either_order(site):
    """Opened and closed by the radar: 6,584,800 kg twice, nothing missing, whatever was dipped and when it came."""
    nights = []
    for name, dip_first in (("tk-17", True), ("tk-18", False)):
        tank(site, name, sources=ORDER)
        site.reads(name, "2026-03-13 06:00", source="radar", level_m=8.231)
        post(site, name, 8.239, dip_first=dip_first)
    night = site.closes("2026-03-13")
    for name in ("tk-17", "tk-18"):
        book = night.of(name)
        nights.append({key: value for key, value in book.items() if key not in ("vessel", "limited_by")})
        assert book["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
        # The radar's offset is one and the same at both ends; what is fresh at either reading remains.
        assert book["imbalance_uncertainty_kg"] == pytest.approx(math.sqrt(2.0) * 800.0, abs=0.5)
    assert nights[0] == nights[1]


def test_where_the_radar_is_silent_the_dip_counts_and_checks_nothing(site):
    """Only the dip of 05:55 at six: 8.239 m, 6,591,200 kg."""
    tank(site, sources=ORDER)
    site.reads("tk-17", DIPPED, source="hand", level_m=8.239)
    inventory = site.inventory(AT)
    assert inventory.of("tk-17")["mass_kg"] == pytest.approx(6_591_200.0, abs=0.5)
    assert inventory.input("tk-17", "level_m")["source"] == "hand"
    assert not inventory.of("tk-17").get("checks")
    assert not {"sources_disagree", "two_sources"} & inventory.warnings("tk-17")


@pytest.mark.parametrize("dip_first", [True, False])
def test_without_an_order_the_newest_counts_and_says_that_there_are_two(site, dip_first):
    """The radar's 06:00 is newer than the dip of 05:55."""
    tank(site)
    post(site, "tk-17", 8.239, dip_first=dip_first)
    inventory = site.inventory(AT)
    assert inventory.input("tk-17", "level_m")["source"] == "radar"
    assert "two_sources" in inventory.warnings("tk-17")


def test_a_dip_that_is_entered_late_changes_no_book(site):
    """The radar counts with and without it: the night stands at its first revision; the live answer has the check."""
    tank(site, sources=ORDER)
    site.reads("tk-17", "2026-03-13 06:00", source="radar", level_m=8.231)
    for at, level in RADAR:
        site.reads("tk-17", at, source="radar", level_m=level)
    first = site.closes("2026-03-13")
    before = site.inventory(AT)
    site.reads("tk-17", DIPPED, source="hand", level_m=8.239)
    second = site.closes("2026-03-13")
    assert (second["id"], second["vessels"]) == ("2026-03-13.1", first["vessels"])
    assert site.changes("2026-03-13") == []  # the first revision, and nothing before it
    assert "sources_disagree" in site.inventory(AT).warnings("tk-17")
    assert "sources_disagree" not in site.inventory(AT, as_of=before["known_at"]).warnings("tk-17")


def test_a_corrected_value_of_the_radar_does_what_the_late_dip_did_not(site):
    """The radar's 06:00 was 8.229 m, 2 mm less: 8.231 × 1,000 × 800 = 6,584,800 kg become 6,583,200 kg.

    1,600 kg short of the opening, with 800 kg fresh at either reading: 1,600 / 1,131 = 1.41, flagged in neither
    revision. The dip that came with it is named nowhere.
    """
    tank(site, sources=ORDER)
    site.reads("tk-17", "2026-03-13 06:00", source="radar", level_m=8.231)
    for at, level in RADAR:
        site.reads("tk-17", at, source="radar", level_m=level)
    assert site.closes("2026-03-13")["id"] == "2026-03-13.1"
    site.reads("tk-17", DIPPED, source="hand", level_m=8.239)
    site.reads("tk-17", AT, source="radar", level_m=8.229)
    second = site.closes("2026-03-13")
    assert second["id"] == "2026-03-13.2" and not second.flagged
    assert second.of("tk-17")["score"] == pytest.approx(-math.sqrt(2.0), abs=0.001)
    first = site.book("2026-03-13.1").of("tk-17")
    assert first["closing_mass_kg"] == pytest.approx(6_584_800.0, abs=0.5)
    assert first["imbalance_kg"] == pytest.approx(0.0, abs=0.5)

    told = {one["field"]: one for one in site.changes("2026-03-13.2")}
    assert set(told) == {"closing_mass_kg", "imbalance_kg"}
    closing, imbalance = told["closing_mass_kg"], told["imbalance_kg"]
    assert (closing["vessel"], imbalance["vessel"]) == ("tk-17", "tk-17")
    assert (closing["before"], closing["after"]) == pytest.approx((6_584_800.0, 6_583_200.0), abs=0.5)
    assert (imbalance["before"], imbalance["after"]) == pytest.approx((0.0, -1_600.0), abs=0.5)
    assert site.because("2026-03-13.2") == {("revised_reading", "tk-17 level_m 2026-03-14T06:00:00Z from radar")}
    assert site.words("2026-03-13.2")[0].startswith(
        "tk-17: closing mass 6,584,800 → 6,583,200 kg because the level of tk-17 of 2026-03-14T06:00:00Z from radar "
        "was revised on "
    )
