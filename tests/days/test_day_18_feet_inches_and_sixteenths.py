"""Feet, inches and sixteenths; degrees API; psi; barrels.

What happened: an American terminal. Its base temperature is 60 °F, its tapes are in feet, inches and sixteenths, its
laboratory reports degrees API at the temperature at which it floated the hydrometer, its historian writes psi
and °F, and its tickets are in barrels. Nobody converts anything by hand any more: every column of a table says
its unit once.

    tank 18    60 ft across, 40 ft high; gauged 23-04-11 at the opening, 20-10-03 at the close
    tape       23-04-11 = 23 ft 4 11/16 in = 280.6875 in × 0.0254 m = 7.129 462 5 m
               20-10-03 = 20 ft 10 3/16 in = 250.1875 in × 0.0254 m = 6.354 762 5 m
    shell      60 ft = 18.288 m; π/4 × 18.288² = 262.677 m²; that is 503.59 barrels to the foot, the trade's
               0.1399 D² (common practice)
    gravity    35.0 °API at 60 °F: 141.5 / (131.5 + 35.0) = 0.849850 of water at 60 °F, 999.016 kg/m³ (API MPMS
               11.1-2004): 849.014 kg/m³
    barrel     42 US gallons of 231 cubic inches: 9,702 × 0.0254³ m³ = 0.158 987 294 928 m³

What the books must say: (280.6875 − 250.1875) in × 0.0254 m × 262.677 m² = 203.496 m³ have left, 1,279.95
barrels; the ticket of 1,280 barrels makes the night 7 kg over, of an error of some 315 kg.
"""

from __future__ import annotations

import math

import pytest

INCH = 0.0254
BARREL = 9_702.0 * INCH**3
AREA = math.pi / 4.0 * (60.0 * 0.3048) ** 2
API_35 = 141.5 / 166.5 * 999.016
OPENED, CLOSED = "2026-03-14T06:00:00-05:00", "2026-03-15T06:00:00-05:00"


@pytest.fixture
def terminal(new_site):
    """A site of 60 °F, and a crude whose density does not change with temperature, for the sake of the paper."""
    site = new_site(time_zone="America/Chicago", base_temperature_c=140.0 / 9.0)
    site.liquid("crude", 850.0)
    shape = {"kind": "vertical_cylinder", "diameter_m": 60 * 0.3048, "height_m": 40 * 0.3048}
    site.tank("tk-18", "crude", shape=shape, assumed={})
    return site


def table(site, *lines):
    """Post a table; every row of it has to be good."""
    answer = site.client.post(f"{site.path}/readings", content="\n".join(lines), headers={"content-type": "text/csv"})
    assert answer.status_code == 200, answer.text
    told = answer.json()
    assert told["rejected"] == 0, told["errors"]
    return told


def gauged(site):
    """The gauger's sheet and the laboratory's, each as it is written."""
    told = table(
        site,
        "vessel,taken_at,source,level [ft-in-16],liquid_temperature [degF]",
        f"tk-18,{OPENED},hand,23-04-11,68.0",
        f"tk-18,{CLOSED},hand,20-10-03,66.2",
    )
    assert told["stored"] == 2
    table(
        site,
        "vessel,taken_at,source,observed_density [degAPI],observed_density_temperature [degF],sample",
        "tk-18,2026-03-14T05:30:00-05:00,lab,35.0,60.0,s-0314",
    )


def test_the_tape_the_gravity_and_the_thermometer_are_read_as_they_are_written(terminal):
    """280.6875 in; 849.0136 kg/m³; 68.0 °F = 20 °C."""
    gauged(terminal)
    inventory = terminal.inventory(OPENED)
    assert inventory.input("tk-18", "level_m")["value"] == pytest.approx(7.1294625, abs=1e-12)
    assert inventory.input("tk-18", "observed_density_kg_m3")["value"] == pytest.approx(849.0136, abs=0.0001)
    assert inventory.input("tk-18", "observed_density_kg_m3")["value"] == pytest.approx(API_35, abs=1e-9)
    assert inventory.input("tk-18", "liquid_temperature_c")["value"] == pytest.approx(20.0, abs=1e-12)


def test_the_mass_is_barrels_times_gravity(terminal):
    """23 ft 4 11/16 in = 23.390625 ft × 503.59 bbl/ft = 11,779 bbl, 1,872.75 m³; × 849.0136 = 1,589,988 kg."""
    gauged(terminal)
    stock = terminal.inventory(OPENED).of("tk-18")
    assert stock["gross_observed_volume_m3"] == pytest.approx(AREA * 280.6875 * INCH, abs=1e-6)
    assert stock["gross_observed_volume_m3"] / BARREL == pytest.approx(23.390625 * 503.59, abs=1.0)
    assert stock["mass_kg"] == pytest.approx(1_872.75 * 849.0136, abs=5.0)
    assert stock["mass_kg"] == pytest.approx(AREA * 280.6875 * INCH * API_35, abs=0.5)


def test_the_night_balances_in_barrels(terminal):
    """1,279.95 barrels off the tape, 1,280 on the ticket: 0.05 bbl × 0.158987 × 849.014 = 7 kg over the book.

    A millimetre is 262.677 m² × 0.001 m × 849.014 = 223 kg, twice: ± 315 kg.
    """
    gauged(terminal)
    off_the_tape = 30.5 * INCH * AREA
    assert off_the_tape / BARREL == pytest.approx(1_279.95, abs=0.05)
    terminal.delivers("tk-18", "line-0314", "2026-03-14T08:00:00-05:00", "2026-03-14T12:00:00-05:00",
                      observed_volume_m3=1_280.0 * BARREL, temperature_c=20.0)  # fmt: skip
    night = terminal.closes("2026-03-14")
    book = night.of("tk-18")
    assert book["delivered_kg"] == pytest.approx(1_280.0 * BARREL * API_35, abs=0.5)
    assert book["imbalance_kg"] == pytest.approx((1_280.0 * BARREL - off_the_tape) * API_35, abs=0.5)
    assert book["imbalance_uncertainty_kg"] == pytest.approx(math.sqrt(2.0) * 223.0, abs=1.0)
    assert not night.flagged


def test_eighths_and_relative_density_are_the_same_tank(terminal):
    """20-10-3 in eighths is 20 ft 10 3/8 in = 250.375 in; RD 0.84985 at 60/60 °F is 849.014 kg/m³."""
    table(
        terminal,
        "vessel,taken_at,source,level [ft-in-8],liquid_temperature [°F],observed_density [RD60/60],"
        "observed_density_temperature_c",
        f"tk-18,{OPENED},hand,20-10-3,59.0,0.849850,{140 / 9}",
    )
    stock = terminal.inventory(OPENED).of("tk-18")
    assert stock["gross_observed_volume_m3"] == pytest.approx(AREA * 250.375 * INCH, abs=1e-6)
    assert stock["standard_density_kg_m3"] == pytest.approx(849.0138, abs=0.001)


def test_a_nitrogen_receiver_is_read_in_psi_gauge(terminal):
    """1,000 ft³ of nitrogen at 300 psi gauge and 80.33 °F, which is 300 K.

    300 psi × 6.894757 kPa = 2,068.427 kPa, and 101.325 of air: 2,169.752 kPa. The compressibility of nitrogen at
    300 K is 0.9971 at 2.0 MPa and 0.9957 at 4.0 MPa (Perry's Chemical Engineers' Handbook, from memory), 0.9970
    here: ρ = 2,169,752 × 0.0280134 / (0.9970 × 8.314463 × 300) = 24.441 kg/m³, of 28.3168 m³: 692.1 kg.
    """
    terminal.substance("nitrogen", vapour={"model": "virial", "components": [{"id": "nitrogen", "mole_fraction": 1.0}]})
    terminal.vessel("r-1", "nitrogen", shape={"kind": "fixed_volume", "volume_m3": 1_000 * 0.3048**3},
                    shell={"expansion_per_k": 0.0})  # fmt: skip
    table(
        terminal,
        "vessel,taken_at,pressure [psi],vapour_temperature [degF]",
        f"r-1,{OPENED},300.0,80.33",
    )
    inventory = terminal.inventory(OPENED)
    assert inventory.input("r-1", "pressure_kpa")["value"] == pytest.approx(2_068.427, abs=0.001)
    stock = inventory.of("r-1")
    assert stock["compressibility_factor"] == pytest.approx(0.9970, abs=0.0003)
    assert stock["mass_kg"] == pytest.approx(692.1, rel=0.0005)


def test_an_inch_that_would_carry_is_refused_and_named(terminal):
    """23-12-00 is no reading, and 23-04-16 neither; the good row beside them is kept."""
    lines = [
        "vessel,taken_at,source,level [ft-in-16]",
        f"tk-18,{OPENED},hand,23-12-00",
        f"tk-18,{CLOSED},hand,20-10-03",
        "tk-18,2026-03-15T07:00:00-05:00,hand,23-04-16",
    ]
    answer = terminal.client.post(
        f"{terminal.path}/readings", content="\n".join(lines), headers={"content-type": "text/csv"}
    )
    told = answer.json()
    assert answer.status_code == 200
    assert (told["stored"], told["rejected"]) == (1, 2)
    assert [(one["index"], one["field"]) for one in told["errors"]] == [(0, "level_m"), (2, "level_m")]


def test_the_laboratorys_sheet_comes_late_and_says_what_it_changed(terminal):
    """The crude counts at its own 850, then at 35.0 °API: 1,872.75 m³ × (849.0136 − 850) = −1,847 kg."""
    table(
        terminal,
        "vessel,taken_at,source,level [ft-in-16],liquid_temperature [degF]",
        f"tk-18,{OPENED},hand,23-04-11,68.0",
        f"tk-18,{CLOSED},hand,23-04-11,66.2",
    )
    terminal.closes("2026-03-14")
    table(
        terminal,
        "vessel,taken_at,source,observed_density [degAPI],observed_density_temperature [degF]",
        "tk-18,2026-03-14T05:30:00-05:00,lab,35.0,60.0",
    )
    night = terminal.closes("2026-03-14")
    assert night["id"] == "2026-03-14.2"
    assert night.of("tk-18")["imbalance_kg"] == pytest.approx(0.0, abs=0.5)
    change = next(one for one in terminal.changes("2026-03-14.2") if one["field"] == "closing_mass_kg")
    assert change["after"] - change["before"] == pytest.approx(-1_847.0, abs=2.0)
    assert "late_reading" in {one["kind"] for one in change["because"]}
