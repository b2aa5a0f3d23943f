"""A table is recalibrated from today 06:00; another is dated back to the first of the month.

What happened: tank 4 holds a liquid of 800 kg/m³. Its old table says 100.0 m³ to the metre. The strapping crew
found 100.4 m³. The liquid did not know: it stood at 5.000 m before and after.

By the old table 5.000 m are 500.0 m³, 400,000 kg. By the new one 502.0 m³, 401,600 kg. The 1,600 kg between
them are paper: no product came, and none may be called a gain. In the days below, 80,320 kg are delivered by
a weighbridge: 100.4 m³ of 800 kg/m³, exactly one metre of the new table.

What the books must say: `restated_kg` 1,600 in the one night in which the table changes, and nothing else.
"""

from __future__ import annotations

import math

import pytest

OLD, NEW = 100.0, 100.4  # m³ to the metre
DENSITY = 800.0


def table(m3_per_m):
    """A straight table of 10 m."""
    rows = [[0.0, 0.0], [5.0, 5.0 * m3_per_m], [10.0, 10.0 * m3_per_m]]
    return {"kind": "capacity_table", "of": "vertical_cylinder", "rows": rows}


def at_six(site, day, level_m):
    site.reads("tk-4", f"{day} 06:00", level_m=level_m)


def loads_a_metre(site, day):
    """80,320 kg between nine and ten in the morning."""
    site.delivers("tk-4", f"truck-{day}", f"{day} 09:00", f"{day} 10:00", mass_kg=80_320.0)


@pytest.fixture
def tank(site):
    site.liquid("kerosene", DENSITY)
    site.tank("tk-4", "kerosene", shape=table(OLD))
    return site


def recalibrated(site, since):
    return site.tank("tk-4", "kerosene", shape=table(NEW), effective_from=since)


def test_a_table_from_today_restates_the_opening_of_today_and_no_night_before(tank):
    """Idle until the 14th, 06:00; one metre delivered on the 14th.

    Night of the 13th, by the old table: 400,000 to 400,000. Night of the 14th: opens with 400,000 as closed,
    restated by +1,600; less 80,320 that is 321,280. Measured: 4.000 m × 100.4 × 800 = 321,280.
    """
    at_six(tank, "2026-03-13", 5.0)
    at_six(tank, "2026-03-14", 5.0)
    at_six(tank, "2026-03-15", 4.0)
    loads_a_metre(tank, "2026-03-14")
    assert recalibrated(tank, "2026-03-14 06:00") == "revised"

    before = tank.closes("2026-03-13").of("tk-4")
    assert before["opening_mass_kg"] == pytest.approx(400_000.0, abs=0.01)
    assert before["closing_mass_kg"] == pytest.approx(400_000.0, abs=0.01)
    assert not before.get("restated_kg")

    # A live answer at 06:00 is of the new text already: the old one ended with the night.
    assert tank.inventory("2026-03-14 06:00").of("tk-4")["mass_kg"] == pytest.approx(401_600.0, abs=0.01)
    assert tank.inventory("2026-03-14 05:59").of("tk-4")["status"] == "unmeasured"  # the dip was 24 h old
    assert cited(tank.inventory("2026-03-14 06:00")) == "2026-03-14T06:00:00Z"

    night = tank.closes("2026-03-14")
    book = night.of("tk-4")
    assert book["opening_mass_kg"] == before["closing_mass_kg"]
    assert book["restated_kg"] == pytest.approx(1_600.0, abs=0.01)
    assert book["book_mass_kg"] == pytest.approx(321_280.0, abs=0.01)
    assert book["closing_mass_kg"] == pytest.approx(321_280.0, abs=0.01)
    assert book["imbalance_kg"] == pytest.approx(0.0, abs=0.01)
    assert not night.flagged
    # Two readings of 1 mm, each 80.3 kg by the table that the night is judged by.
    assert book["imbalance_uncertainty_kg"] == pytest.approx(math.sqrt(2) * 80.32, abs=1.0)


def cited(inventory):
    """From when the text of the vessel holds that an inventory was computed by."""
    used = [one for one in inventory.of("tk-4")["definitions"] if one["kind"] == "vessel"]
    return used[0]["effective_from"]


def test_nothing_is_restated_in_the_night_after(tank):
    """The night of the 15th opens by the new table and closes by it, one metre lower."""
    for day, level in (("2026-03-13", 5.0), ("2026-03-14", 5.0), ("2026-03-15", 5.0), ("2026-03-16", 4.0)):
        at_six(tank, day, level)
    loads_a_metre(tank, "2026-03-15")
    recalibrated(tank, "2026-03-14 06:00")
    nights = [tank.closes(day) for day in ("2026-03-13", "2026-03-14", "2026-03-15")]
    assert [round(one.of("tk-4").get("restated_kg") or 0.0, 3) for one in nights] == [0.0, 1600.0, 0.0]
    assert [one.of("tk-4")["imbalance_kg"] for one in nights] == pytest.approx([0.0, 0.0, 0.0], abs=0.01)
    assert nights[2].of("tk-4")["opening_mass_kg"] == pytest.approx(401_600.0, abs=0.01)


def test_the_totals_carry_the_restated_mass_and_no_gain(tank):
    """The site has one tank: its total moves by the same paper, and its imbalance is the tank's."""
    at_six(tank, "2026-03-14", 5.0)
    at_six(tank, "2026-03-15", 5.0)
    tank.tank("tk-4", "kerosene", shape=table(NEW), effective_from="2026-03-14 18:00")
    night = tank.closes("2026-03-14")
    assert night.of("tk-4")["opening_mass_kg"] == pytest.approx(400_000.0, abs=0.01)
    assert night.of("tk-4")["restated_kg"] == pytest.approx(1_600.0, abs=0.01)
    assert night.of("tk-4")["imbalance_kg"] == pytest.approx(0.0, abs=0.01)
    assert night.total("kerosene")["imbalance_kg"] == pytest.approx(0.0, abs=0.01)


def test_a_table_dated_back_to_the_first_revises_every_night_since(tank):
    """The certificate of the 1st, 06:00, is filed on the 4th. A metre was delivered on the 2nd.

    As first closed, all by the old table: 400,000 on the 1st and the 2nd; on the 3rd 4.000 m are 320,000, and
    the book says 400,000 − 80,320 = 319,680: the night of the 2nd seemed to gain 320 kg.

    By the new table: the night of 28 February stands, 400,000. The night of the 1st opens with it, is restated
    by 1,600 and closes at 401,600. The night of the 2nd opens with 401,600, less 80,320 is 321,280, which is
    4.000 m. Its gain was never there.
    """
    for day, level in (("2026-02-28", 5.0), ("2026-03-01", 5.0), ("2026-03-02", 5.0), ("2026-03-03", 4.0)):
        at_six(tank, day, level)
    loads_a_metre(tank, "2026-03-02")
    days = ("2026-02-28", "2026-03-01", "2026-03-02")
    first = [tank.closes(day).of("tk-4") for day in days]
    assert [one["closing_mass_kg"] for one in first] == pytest.approx([400_000.0, 400_000.0, 320_000.0], abs=0.01)
    assert [one["imbalance_kg"] for one in first] == pytest.approx([0.0, 0.0, 320.0], abs=0.01)
    then = tank.inventory("2026-03-02 06:00")
    assert then.of("tk-4")["mass_kg"] == pytest.approx(400_000.0, abs=0.01)

    assert recalibrated(tank, "2026-03-01 06:00") == "revised"
    second = [tank.closes(day) for day in days]
    assert [one["id"] for one in second] == ["2026-02-28.1", "2026-03-01.2", "2026-03-02.2"]
    books = [one.of("tk-4") for one in second]
    assert [one["opening_mass_kg"] for one in books] == pytest.approx([400_000.0, 400_000.0, 401_600.0], abs=0.01)
    assert [one.get("restated_kg") or 0.0 for one in books] == pytest.approx([0.0, 1_600.0, 0.0], abs=0.01)
    assert [one["closing_mass_kg"] for one in books] == pytest.approx([400_000.0, 401_600.0, 321_280.0], abs=0.01)
    assert [one["imbalance_kg"] for one in books] == pytest.approx([0.0, 0.0, 0.0], abs=0.01)

    # Each revision says that the table did it; the night of the 2nd names it for its opening, too.
    assert tank.because("2026-03-01") == tank.because("2026-03-02") == {("definition", "vessel tk-4")}
    changed = {one["field"]: (one["before"], one["after"]) for one in tank.changes("2026-03-02")}
    assert changed["opening_mass_kg"] == pytest.approx((400_000.0, 401_600.0), abs=0.01)
    assert changed["closing_mass_kg"] == pytest.approx((320_000.0, 321_280.0), abs=0.01)
    assert tank.words("2026-03-02")[0].startswith(
        "tk-4: opening mass 400,000 → 401,600 kg because the definition of vessel tk-4 was changed on "
    )

    # What was said before stays readable: the first revision, and the stock as it was known then.
    assert tank.book("2026-03-02.1").of("tk-4")["imbalance_kg"] == pytest.approx(320.0, abs=0.01)
    again = tank.inventory("2026-03-02 06:00", as_of=then["known_at"])
    assert again.of("tk-4")["mass_kg"] == then.of("tk-4")["mass_kg"]
    assert tank.inventory("2026-03-02 06:00").of("tk-4")["mass_kg"] == pytest.approx(401_600.0, abs=0.01)
