"""Three weeks out of service, cleaned and gas-free; back in service from empty.

What happened: tank 12 (100 m², 800 kg/m³: 80 kg to the millimetre) held 2.000 m, 160,000 kg, on the 1st of March
at 06:00. From 08:00 to 12:00 it was pumped to tank 13, down to 0.100 m: 152,000 kg by the meter. In the afternoon
the last 8,000 kg went to slops by vacuum truck, and at 06:00 on the 2nd the man-hole was opened: empty. The tank
is out of service from then on, washed, entered, inspected. Its gauge was never switched off: on the 9th it showed
1.200 m of washing water, on the 23rd at 05:50 some 4 mm of rust. On the 23rd at 06:00 it is in service again,
found empty and dry; from 10:00 to 14:00 it receives 400,000 kg, and at 06:00 on the 24th it stands at 5.000 m.

What the books must say:

- The night of the 1st: 160,000 − 152,000 − 8,000 = 0, found 0. Without the vacuum truck's ticket: 8,000 kg short.
- Twenty-one nights out of service: 0 ± 0, `out_of_service`, complete, balanced. The gauge's readings are kept
  and count for nothing.
- The night of the 23rd: opened with 0, received 400,000 kg, holds 5.000 m × 100 m² × 800 = 400,000 kg. Nothing from
  before counts, neither the 4 mm nor the sample of February (805).
"""

from __future__ import annotations

from datetime import date, timedelta

import pytest

OUT, BACK = "2026-03-02 06:00", "2026-03-23 06:00"
KG_PER_MM = 80.0


@pytest.fixture
def tank(site):
    """Both tanks until the man-hole is opened, and the text of tank 12 that takes it out."""
    site.liquid("gas-oil", 800.0)
    site.tank("tk-12", "gas-oil")
    site.tank("tk-13", "gas-oil")
    site.meter("m-p", systematic_pct=0.1)
    site.reads("tk-12", "2026-02-20 09:00", source="lab", observed_density_kg_m3=800.0,
               observed_density_temperature_c=15.0, sample="s-0220")  # fmt: skip
    site.reads("tk-12", "2026-03-01 06:00", level_m=2.0)
    site.moves("pump-0301", "tk-12", "tk-13", "2026-03-01 08:00", "2026-03-01 12:00", meter="m-p", mass_kg=152_000.0)
    for day, level in (("01", 1.0), ("02", 2.9), ("03", 2.9), ("23", 2.9), ("24", 2.9)):
        site.reads("tk-13", f"2026-03-{day} 06:00", level_m=level)
    site.reads("tk-12", OUT, source="manhole", empty=True)
    assert site.tank("tk-12", "gas-oil", service="out", effective_from=OUT) == "revised"
    return site


def vacuum_truck(site):
    site.delivers("tk-12", "truck-0301", "2026-03-01 14:00", "2026-03-01 15:30", by_way_of="slops", mass_kg=8_000.0,
                  by="weighbridge", mass_uncertainty_kg=20.0)  # fmt: skip


def back_in_service(site):
    assert site.tank("tk-12", "gas-oil", effective_from=BACK) == "revised"


def test_the_last_night_ends_at_nothing(tank):
    """160,000 in, 160,000 out; √(80² of the opening's millimetre + 152² of the meter + 20² of the weighbridge)."""
    vacuum_truck(tank)
    night = tank.closes("2026-03-01")
    book = night.of("tk-12")
    assert book["opening_mass_kg"] == pytest.approx(160_000.0, abs=0.5)
    assert book["delivered_kg"] == pytest.approx(160_000.0, abs=0.5)
    assert book["closing_mass_kg"] == 0.0
    assert book["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
    assert book["imbalance_uncertainty_kg"] == pytest.approx((80.0**2 + 152.0**2 + 20.0**2) ** 0.5, abs=0.5)
    assert night.of("tk-13")["imbalance_kg"] == pytest.approx(0.0, abs=0.5)  # 1.000 m to 2.900 m: 152,000 kg
    assert night["complete"] and not night.flagged


def test_a_heel_that_nobody_wrote_down_is_missed_until_its_ticket_is_there(tank):
    """8,000 kg with an error of √(80² + 152²) = 172 kg."""
    night = tank.closes("2026-03-01")
    assert night.flagged == {"tk-12"}
    assert night.of("tk-12")["imbalance_kg"] == pytest.approx(-8_000.0, abs=0.5)
    vacuum_truck(tank)
    night = tank.closes("2026-03-01")
    assert night["id"] == "2026-03-01.2" and not night.flagged
    change = next(one for one in tank.changes("2026-03-01.2") if one.get("field") == "delivered_kg")
    assert (change["vessel"], change["before"], change["after"]) == ("tk-12", 152_000.0, 160_000.0)
    assert [(one["kind"], one["subject"]) for one in change["because"]] == [("late_transfer", "truck-0301")]


def test_no_night_is_incomplete_for_a_tank_that_is_out_of_service(tank):
    """Three of the twenty-one: the first, the last, and the one that the washing water stood in."""
    vacuum_truck(tank)
    tank.reads("tk-13", "2026-03-09 06:00", level_m=2.9)
    tank.reads("tk-13", "2026-03-10 06:00", level_m=2.9)
    tank.reads("tk-12", "2026-03-10 06:00", source="gauge", level_m=1.2)
    tank.closes("2026-03-01")
    back_in_service(tank)
    for day in ("2026-03-02", "2026-03-09", "2026-03-22"):
        if day == "2026-03-22":
            tank.reads("tk-13", "2026-03-22 06:00", level_m=2.9)
        night = tank.closes(day)
        book = night.of("tk-12")
        assert book["status"] == "out_of_service"
        assert (book["opening_mass_kg"], book["closing_mass_kg"], book["imbalance_kg"]) == (0.0, 0.0, 0.0)
        assert night["complete"] and night["status"] == "balanced"
        assert night.of("tk-13")["imbalance_kg"] == pytest.approx(0.0, abs=0.5)


def test_what_the_gauge_shows_meanwhile_is_kept_and_not_used(tank):
    """1.200 m of washing water are no product: 0 ± 0."""
    tank.reads("tk-12", "2026-03-09 11:00", source="gauge", level_m=1.2)
    stock = tank.inventory("2026-03-09 11:00").of("tk-12")
    assert stock["status"] == "out_of_service"
    assert (stock["mass_kg"], stock["mass_uncertainty_kg"]) == (0.0, 0.0)
    kept = tank.get("/vessels/tk-12/readings", from_="2026-03-09 10:00", to="2026-03-09 12:00")["items"]
    assert [(one["quantity"], one["value"]) for one in kept] == [("level_m", 1.2)]


def test_back_in_service_nothing_from_before_counts(tank):
    """At 06:30 the 4 mm of 05:50 are 40 minutes old: of another time. Without a stock-take nobody knows."""
    back_in_service(tank)
    tank.reads("tk-12", "2026-03-23 05:50", source="gauge", level_m=0.004)
    stock = tank.inventory("2026-03-23 06:30").of("tk-12")
    assert stock["status"] == "unmeasured" and stock["mass_kg"] is None


def test_found_empty_it_is_filled_by_the_ticket_alone_until_it_is_read(tank):
    """Empty at 06:00; at 12:00 half of the receipt's time has passed: 200,000 kg, moved from the stock-take.

    The counter at 11:00 leaves nothing to divide by time there: 100,000 kg.
    """
    a_day = {"level_m": 86_400}
    assert tank.tank("tk-12", "gas-oil", effective_from=BACK, max_age_s=a_day) == "revised"
    tank.reads("tk-12", BACK, source="manhole", empty=True)
    at_seven = tank.inventory("2026-03-23 07:00").of("tk-12")
    assert (at_seven["status"], at_seven["mass_kg"], at_seven["mass_uncertainty_kg"]) == ("measured", 0.0, 0.0)
    tank.receives("tk-12", "line-0323", "2026-03-23 10:00", "2026-03-23 14:00", meter="m-p", mass_kg=400_000.0,
                  progress=[{"at": "2026-03-23 11:00", "mass_kg": 100_000.0}])  # fmt: skip
    at_eleven = tank.inventory("2026-03-23 11:00").of("tk-12")
    assert at_eleven["mass_kg"] == pytest.approx(100_000.0, abs=0.5)
    assert at_eleven["moved_kg"] == pytest.approx(100_000.0, abs=0.5)
    assert at_eleven["mass_uncertainty_kg"] == pytest.approx(100.0, abs=0.1)  # the meter's 0.1 %
    at_noon = tank.inventory("2026-03-23 12:00").of("tk-12")
    assert at_noon["mass_kg"] == pytest.approx(200_000.0, abs=0.5)  # 100,000 + a third of 300,000


def test_the_first_night_back_balances_from_nothing(tank):
    """0 + 400,000 = 5.000 m; the meter's 400 kg and the closing's millimetre. All twenty-one nights were closed."""
    vacuum_truck(tank)
    back_in_service(tank)
    tank.reads("tk-12", BACK, source="manhole", empty=True)
    tank.receives("tk-12", "line-0323", "2026-03-23 10:00", "2026-03-23 14:00", meter="m-p", mass_kg=400_000.0)
    tank.reads("tk-12", "2026-03-24 06:00", source="gauge", level_m=5.0)
    first = date(2026, 3, 2)
    for day in range(4, 23):
        tank.reads("tk-13", f"2026-03-{day:02} 06:00", level_m=2.9)
    nights = [tank.closes((first + timedelta(days=number)).isoformat()) for number in range(22)]
    assert all(night["complete"] and not night.flagged for night in nights)
    assert [night.of("tk-12")["status"] for night in nights] == ["out_of_service"] * 21 + ["measured"]
    book = nights[-1].of("tk-12")
    assert (book["opening_mass_kg"], book["received_kg"]) == (0.0, 400_000.0)
    assert book["closing_mass_kg"] == pytest.approx(400_000.0, abs=0.5)
    assert book["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
    assert book["imbalance_uncertainty_kg"] == pytest.approx((400.0**2 + KG_PER_MM**2) ** 0.5, abs=0.5)


def test_the_sample_of_february_does_not_come_back(site):
    """805 was another filling: after the wash it is the substance's own 800 until the laboratory has drawn."""
    site.liquid("gas-oil", 800.0)
    site.tank("tk-12", "gas-oil")
    site.reads("tk-12", "2026-02-20 09:00", source="lab", observed_density_kg_m3=805.0,
               observed_density_temperature_c=15.0)  # fmt: skip
    site.reads("tk-12", "2026-03-01 06:00", level_m=5.0)
    site.tank("tk-12", "gas-oil", service="out", effective_from=OUT)
    site.tank("tk-12", "gas-oil", effective_from=BACK)
    site.reads("tk-12", "2026-03-24 06:00", level_m=5.0)
    assert site.inventory("2026-03-01 06:00").of("tk-12")["mass_kg"] == pytest.approx(402_500.0, abs=0.5)
    assert site.inventory("2026-03-24 06:00").of("tk-12")["mass_kg"] == pytest.approx(400_000.0, abs=0.5)


def test_what_went_out_or_came_in_on_the_day_of_the_change_is_in_the_totals(site):
    """Taken out at 16:00 on the 1st, after its 160,000 kg had left; back at 08:00 on the 23rd, filled at ten."""
    site.liquid("gas-oil", 800.0)
    site.tank("tk-12", "gas-oil")
    site.reads("tk-12", "2026-03-01 06:00", level_m=2.0)
    site.delivers("tk-12", "road-0301", "2026-03-01 08:00", "2026-03-01 12:00", mass_kg=160_000.0)
    site.tank("tk-12", "gas-oil", service="out", effective_from="2026-03-01 16:00")
    site.tank("tk-12", "gas-oil", effective_from="2026-03-23 08:00")
    site.receives("tk-12", "line-0323", "2026-03-23 10:00", "2026-03-23 14:00", mass_kg=400_000.0)
    site.reads("tk-12", "2026-03-24 06:00", level_m=5.0)
    out, back = site.closes("2026-03-01"), site.closes("2026-03-23")
    expected = {"opening_mass_kg": (160_000.0, 0.0), "delivered_kg": (160_000.0, 0.0), "received_kg": (0.0, 400_000.0),
                "closing_mass_kg": (0.0, 400_000.0), "imbalance_kg": (0.0, 0.0)}  # fmt: skip
    for name, told in expected.items():
        assert (out.of("tk-12")[name], back.of("tk-12")[name]) == pytest.approx(told, abs=0.5)
        assert (out.total("gas-oil")[name], back.total("gas-oil")[name]) == pytest.approx(told, abs=0.5)
