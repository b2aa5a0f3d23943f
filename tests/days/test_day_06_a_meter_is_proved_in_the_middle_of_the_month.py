"""A meter is proved in the middle of the month, and found to read 0.30 % high.

What happened: tank 6 (100 m², 800 kg/m³) is drawn down over the rack's meter. The meter was last proved on
the 1st; between provings its error is one unknown number, 0.2 % or so. On the 15th at 10:00 it is proved
again: it had read 0.30 % high, ± 0.03 %. It is adjusted, and good for 0.05 % from then on.

    ticket            meter says    has left the tank
    14th, 08-16 h     401,200 kg    400,000 kg           0.30 % high
    15th, 12-18 h     400,000 kg    400,000 kg           after the proving

    level at 06:00:  14th 15.000 m,  15th 10.000 m,  16th 5.000 m    (400,000 kg are 5.000 m)

What the books must say: before the proving is known, the night of the 14th is 1,200 kg over, with 0.2 % of
401,200 kg, 802 kg, for the meter: a score of 1.5, which is nothing. Once it is known, that night balances within
0.03 % (120 kg), and the proving's 0.30 % is the reason. The ticket of the 15th, after the proving, is as read.
"""

from __future__ import annotations

import math

import pytest

SINCE = "2026-03-01T06:00:00Z"
GAUGE = math.sqrt(2) * 80.0  # kg; 1 mm at either end
FIRST = {"at": "2026-03-01 06:00", "systematic_pct": 0.2}
PROVED = {
    "at": "2026-03-15 10:00", "systematic_pct": 0.05, "as_found_pct": 0.30, "as_found_uncertainty_pct": 0.03,
}  # fmt: skip


@pytest.fixture
def rack(site):
    site.liquid("gas-oil", 800.0)
    site.tank("tk-6", "gas-oil")
    site.meter("m-rack", effective_from=SINCE, provings=[FIRST])
    for day, level in (("2026-03-14", 15.0), ("2026-03-15", 10.0), ("2026-03-16", 5.0)):
        site.reads("tk-6", f"{day} 06:00", level_m=level)
    for name, hours, mass in (("rack-0314", ("08:00", "16:00"), 401_200.0), ("rack-0315", ("12:00", "18:00"), 4e5)):
        day = f"2026-03-{name[-2:]}"
        site.delivers("tk-6", name, f"{day} {hours[0]}", f"{day} {hours[1]}", meter="m-rack", mass_kg=mass)
    return site


def test_before_the_proving_is_known_the_meter_may_be_wrong_by_so_much(rack):
    night = rack.closes("2026-03-14")
    book = night.of("tk-6")
    assert book["delivered_kg"] == pytest.approx(401_200.0, abs=0.01)
    assert book["imbalance_kg"] == pytest.approx(1_200.0, abs=0.01)
    assert book["imbalance_uncertainty_kg"] == pytest.approx(math.hypot(802.4, GAUGE), abs=1.0)
    assert not night.flagged


def test_once_known_the_proving_measures_the_error_of_the_interval_before_it(rack):
    """401,200 / 1.003 = 400,000 kg ± 0.03 %, 120 kg.

    What was known before the proving, 0 ± 0.2 %, weighs (0.03/0.2)² = 2 % against it: whether it is weighed in
    or not, the delivery is within 30 kg of 400,000 and its error between 118 and 121 kg.
    """
    before = rack.closes("2026-03-14")
    assert rack.meter("m-rack", effective_from=SINCE, provings=[FIRST, PROVED]) == "revised"
    night = rack.closes("2026-03-14")
    assert night["revision"] == before["revision"] + 1
    book = night.of("tk-6")
    assert book["delivered_kg"] == pytest.approx(400_000.0, abs=30.0)
    assert book["imbalance_kg"] == pytest.approx(0.0, abs=30.0)
    assert book["imbalance_uncertainty_kg"] == pytest.approx(math.hypot(119.5, GAUGE), abs=3.0)
    assert night.ticket("rack-0314")["measured_mass_kg"] == book["delivered_kg"]
    assert rack.book(before["id"]).of("tk-6")["delivered_kg"] == pytest.approx(401_200.0, abs=0.01)
    assert rack.because("2026-03-14") == {("definition", "meter m-rack")}
    (ticket,) = (one for one in rack.changes("2026-03-14") if one.get("transfer") == "rack-0314")
    assert (ticket["before"], ticket["after"]) == (401_200.0, book["delivered_kg"])
    assert "because the definition of meter m-rack was changed on " in rack.words("2026-03-14")[0]


def test_a_ticket_after_the_proving_is_as_read(rack):
    """0.05 % of 400,000 kg are 200 kg from now on, and nothing is taken off."""
    rack.meter("m-rack", effective_from=SINCE, provings=[FIRST, PROVED])
    rack.closes("2026-03-14")
    book = rack.closes("2026-03-15").of("tk-6")
    assert book["delivered_kg"] == pytest.approx(400_000.0, abs=0.01)
    assert book["imbalance_kg"] == pytest.approx(0.0, abs=0.01)
    assert book["imbalance_uncertainty_kg"] == pytest.approx(math.hypot(200.0, GAUGE), abs=1.0)


def test_over_both_days_the_errors_of_the_two_intervals_are_two(rack):
    """Before the proving 802.4 kg, after it 200 kg: two unknown numbers, not one that adds up to 1,002 kg."""
    proving = {"at": PROVED["at"], "systematic_pct": 0.05}
    rack.meter("m-rack", effective_from=SINCE, provings=[FIRST, proving])
    both = rack.closes(opening="2026-03-14 06:00", closing="2026-03-16 06:00").of("tk-6")
    expected = math.sqrt(802.4**2 + 200.0**2 + GAUGE**2)
    assert both["imbalance_uncertainty_kg"] == pytest.approx(expected, abs=1.0)


def test_without_a_proving_between_them_both_tickets_share_one_error(rack):
    """0.2 % of 801,200 kg: 1,602 kg, in full."""
    both = rack.closes(opening="2026-03-14 06:00", closing="2026-03-16 06:00").of("tk-6")
    assert both["imbalance_uncertainty_kg"] == pytest.approx(math.hypot(1_602.4, GAUGE), abs=1.0)
