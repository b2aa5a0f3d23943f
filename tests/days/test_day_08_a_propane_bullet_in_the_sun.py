"""A propane bullet in the sun without a vapour thermometer; road loading with vapour return; the weighbridge.

What happened: bullet 8 is a lying cylinder of 60 m³ whose table is straight: 30 m³ to the metre. It holds propane
(500 kg/m³; neither β nor κ, so that the arithmetic stays visible). At six it stands at 1.500 m, 45 m³, and the
sun is on it: the gauge at its top says 1,000 kPa absolute. Nobody measures the vapour's temperature.

Where there is liquid, vapour at 1,000 kPa is saturated vapour: the surface has seen to that. Saturated propane
vapour at 1,000 kPa is at 26.94 °C and has 21.68 kg/m³ (reference equation of state: E. W. Lemmon, M. O. McLinden,
W. Wagner, J. Chem. Eng. Data 54 (2009) 3141). The bullet holds

    45 m³ × 500 + 15 m³ × 21.68 = 22,500 + 325.2 = 22,825.2 kg.

A road tanker is loaded with 20 m³ of liquid, 10,000 kg by the meter, and its vapour comes back over the return
line: 20 m³ at the bullet's own conditions, 20 × 21.68 = 433.6 kg. The bullet then stands at 25 m³:

    25 m³ × 500 + 35 m³ × 21.68 = 12,500 + 758.8 = 13,258.8 kg: 9,566.4 kg less.

What the books must say: the ticket counts net. 10,000 − 433.6 = 9,566.4 kg left, however the vapour that came back
was measured: as a mass, as a volume with its temperature and pressure, or as "the same volume". The weighbridge
weighs the tanker before and after and sees the net at once. Forgetting the vapour is a false gain of 433.6 kg.
"""

from __future__ import annotations

import pytest

T_SATURATED_C = 26.94
P_KPA = 1_000.0 - 101.325  # gauge, at an atmosphere of 101.325 kPa
NIGHT, BEFORE, AFTER = "2026-03-13", "2026-03-13 06:00", "2026-03-14 06:00"
TABLE = {
    "kind": "capacity_table", "of": "horizontal_cylinder", "diameter_m": 2.0, "total_volume_m3": 60.0,
    "rows": [[0.0, 0.0], [1.0, 30.0], [2.0, 60.0]],
}  # fmt: skip
EXACT = {"random": 0.0, "systematic": 0.0}


@pytest.fixture
def bullet(site):
    """The bullet at 45 m³ and, a day later, at 25 m³; the same sun on both mornings."""
    site.substance(
        "propane",
        liquid={"model": "expansivity", "density_kg_m3": 500.0, "density_uncertainty_kg_m3": 0.0,
                "expansivity_per_k": 0.0, "at_pressure_kpa_abs": 1000.0},
        vapour={"model": "virial", "components": [{"id": "propane", "mole_fraction": 1.0}]},
    )  # fmt: skip
    site.tank("v-8", "propane", shape=TABLE, instruments={"pressure_kpa": EXACT})
    site.meter("m-road", systematic_pct=0.1)
    for at, level in ((BEFORE, 1.5), (AFTER, 25.0 / 30.0)):
        site.reads("v-8", at, level_m=level, liquid_temperature_c=25.0, pressure_kpa=P_KPA)
    return site


def loads(site, **body):
    site.delivers("v-8", "road-77", f"{NIGHT} 10:00", f"{NIGHT} 10:40", by_way_of="road", **body)


def test_without_a_thermometer_the_vapour_is_saturated_at_the_measured_pressure(bullet):
    """15 m³ × 21.68 kg/m³ = 325.2 kg of vapour over 22,500 kg of liquid, within half a percent of the vapour."""
    stock = bullet.inventory(BEFORE).of("v-8")
    assert stock["liquid_mass_kg"] == pytest.approx(22_500.0, abs=0.5)
    assert stock["vapour_volume_m3"] == pytest.approx(15.0, abs=1e-6)
    assert stock["vapour_mass_kg"] == pytest.approx(325.2, abs=1.6)
    assert stock["mass_kg"] == pytest.approx(22_825.2, abs=1.6)
    assert "vapour_temperature_c" not in [one["quantity"] for one in stock["inputs"]]


def test_the_working_says_that_it_was_taken_as_saturated(bullet):
    steps = bullet.working("v-8", BEFORE)["working"]
    assert any("saturated at the measured pressure" in one["method"] for one in steps)


WAYS = {
    "mass": {"mass_kg": 433.6},
    "volume": {"volume_m3": 20.0, "temperature_c": T_SATURATED_C, "pressure_kpa": P_KPA},
    "same_volume": "same_volume",
}


@pytest.mark.parametrize("way", WAYS)
def test_the_ticket_counts_net_however_the_vapour_was_measured(bullet, way):
    """9,566.4 kg left the bullet; the meter's 0.1 % (10 kg) and 1 mm of level at either end are what is not known."""
    loads(bullet, meter="m-road", mass_kg=10_000.0, vapour_return=WAYS[way])
    night = bullet.closes(NIGHT)
    book = night.of("v-8")
    assert book["delivered_kg"] == pytest.approx(9_566.4, abs=2.2)
    assert book["imbalance_kg"] == pytest.approx(0.0, abs=4.0)
    assert not night.flagged


def test_the_same_volume_is_known_to_a_fifth(bullet):
    """20 % of 433.6 kg are 87 kg; a vapour return that was weighed adds nothing."""
    spread = {}
    for way in ("mass", "same_volume"):
        loads(bullet, meter="m-road", mass_kg=10_000.0, vapour_return=WAYS[way])
        spread[way] = bullet.closes(NIGHT).of("v-8")["imbalance_uncertainty_kg"]
    added = (spread["same_volume"] ** 2 - spread["mass"] ** 2) ** 0.5
    assert added == pytest.approx(0.2 * 433.6, abs=2.0)


def test_the_weighbridge_sees_the_net_at_once(bullet):
    """The tanker gave its vapour while it took liquid: it is 9,566.4 kg heavier, and no return is on the ticket."""
    loads(bullet, by="weighbridge", mass_kg=9_566.4, mass_uncertainty_kg=10.0)
    night = bullet.closes(NIGHT)
    assert night.of("v-8")["delivered_kg"] == pytest.approx(9_566.4, abs=0.01)
    assert night.of("v-8")["imbalance_kg"] == pytest.approx(0.0, abs=4.0)
    assert not night.flagged


def test_vapour_that_nobody_wrote_down_is_a_false_gain(bullet):
    """433.6 kg more in the bullet than the book has; 25 kg or so are not known: flagged."""
    loads(bullet, meter="m-road", mass_kg=10_000.0)
    night = bullet.closes(NIGHT)
    assert night.of("v-8")["imbalance_kg"] == pytest.approx(433.6, abs=4.0)
    assert night.flagged == {"v-8"}


def test_the_corrected_ticket_revises_the_night(bullet):
    """10,000 kg delivered become 10,000 − 433.6 = 9,566.4 kg; the false gain of 433.6 kg goes."""
    loads(bullet, meter="m-road", mass_kg=10_000.0)
    assert bullet.closes(NIGHT).flagged == {"v-8"}
    loads(bullet, meter="m-road", mass_kg=10_000.0, vapour_return=WAYS["mass"])
    night = bullet.closes(NIGHT)
    assert night["id"] == f"{NIGHT}.2" and not night.flagged
    assert bullet.book(f"{NIGHT}.1").flagged == {"v-8"}
    assert bullet.book(f"{NIGHT}.1").of("v-8")["delivered_kg"] == pytest.approx(10_000.0, abs=0.01)
    told = {one["field"]: one for one in bullet.changes(f"{NIGHT}.2") if "vessel" in one}
    delivered = told["delivered_kg"]
    assert delivered["vessel"] == "v-8"
    assert (delivered["before"], delivered["after"]) == pytest.approx((10_000.0, 9_566.4), abs=0.01)
    assert (told["flagged"]["before"], told["flagged"]["after"]) == (True, False)
    assert bullet.because(f"{NIGHT}.2") == {("late_transfer", "road-77")}
    assert bullet.words(f"{NIGHT}.2")[0].startswith(
        "v-8: deliveries 10,000 → 9,566 kg because ticket road-77 was corrected on "
    )


def test_the_slip_of_the_weighbridge_comes_a_day_late(bullet):
    """Nobody brought the slip before the close: 22,825.2 − 13,258.8 = 9,566.4 kg are missing, and flagged.

    The slip says 9,566.4 kg. It moves the deliveries from 0 and the imbalance to 0; the bullet's own two masses
    stay what they are.
    """
    first = bullet.closes(NIGHT)
    assert first.flagged == {"v-8"}
    assert first.of("v-8")["imbalance_kg"] == pytest.approx(-9_566.4, abs=4.0)
    loads(bullet, by="weighbridge", mass_kg=9_566.4, mass_uncertainty_kg=10.0)
    second = bullet.closes(NIGHT)
    assert second["id"] == f"{NIGHT}.2" and not second.flagged
    assert bullet.book(f"{NIGHT}.1").of("v-8")["delivered_kg"] == 0.0
    assert bullet.book(f"{NIGHT}.1").flagged == {"v-8"}

    told = {(one.get("vessel") or one["transfer"], one["field"]): one for one in bullet.changes(f"{NIGHT}.2")}
    of_the_bullet = {field for name, field in told if name == "v-8"}
    assert of_the_bullet == {"delivered_kg", "imbalance_kg", "flagged", "verdict"}
    moved = {key: (one["before"], one["after"]) for key, one in told.items()}
    assert moved["v-8", "delivered_kg"] == pytest.approx((0.0, 9_566.4), abs=0.01)
    assert moved["v-8", "imbalance_kg"] == pytest.approx((-9_566.4, 0.0), abs=4.0)
    assert moved["v-8", "verdict"] == ("fail", "pass")
    assert moved["road-77", "measured_mass_kg"] == (None, pytest.approx(9_566.4, abs=0.01))
    assert bullet.because(f"{NIGHT}.2") == {("late_transfer", "road-77")}
    assert bullet.words(f"{NIGHT}.2")[0].startswith("v-8: deliveries 0 → 9,566 kg because ticket road-77 came on ")
