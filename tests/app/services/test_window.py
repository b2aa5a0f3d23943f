"""A window of nights: what each close keeps, and what the balance then says of them."""

from __future__ import annotations

import json
from typing import Any

import pytest

from app.services import window
from app.services.close import Opening
from app.store import books
from app.store.engine import Store
from app.store.sites import number
from models.balance.judge import judge
from models.balance.window import Window
from tests.app.services.plant import KG_PER_M, Plant, instant

DAYS = [f"2026-03-{day:02d}" for day in range(10, 22)]
NEXT = "2026-03-22"


@pytest.fixture
def plant(store: Store, site_id: str) -> Plant:
    made = Plant(store, site_id)
    made.tank("tk-1")
    made.tank("tk-2")
    return made


def month(plant: Plant, *, from_day: int | None = None, reads_high: float = 0.0) -> None:
    """Twelve nights; each morning both tanks are read, and 0.5 m goes from the first to the second and back."""
    level = {"tk-1": 6.0, "tk-2": 2.0}
    for place, day in enumerate([*DAYS, NEXT]):
        high = reads_high if from_day is not None and place >= from_day else 0.0
        plant.read("tk-1", f"{day}T06:00", level_m=round(level["tk-1"] + high, 6))
        plant.read("tk-2", f"{day}T06:00", level_m=level["tk-2"])
        if day == NEXT:
            break
        source, target = ("tk-1", "tk-2") if place % 2 == 0 else ("tk-2", "tk-1")
        plant.ticket(f"t-{place}", source, target, f"{day}T10:00", f"{day}T11:00", mass_kg=0.5 * KG_PER_M)
        level[source] -= 0.5
        level[target] += 0.5
    for day in DAYS:
        plant.close(day)


def window_at(plant: Plant, day: str, nights: int) -> Window:
    """The window that the last closed night would be judged in, from what the closes kept."""
    first, last = instant(f"{day}T06:00"), instant(f"{day}T06:00") + window.DAY_US
    with plant.store.reading() as connection:
        site_id, known = number(connection, plant.site), 2**62
        own = books.chain(connection, site_id, last, known, 1)[0]
        kept = [books.BookVessel(one.vessel, one.mass_kg, one.parts, one.flagged, own.slopes.get(one.vessel, ""))
                for one in own.vessels]  # fmt: skip
        nothing = Opening({}, {}, {}, {}, "")
        made, digests = window.window_of(
            connection, site_id, plant.site, (first, last), known, nights, (kept, own.moves), nothing
        )
    assert all(len(one) == 64 for one in digests)
    return made


def test_a_window_is_the_nights_before_and_tonight(plant: Plant) -> None:
    month(plant)
    made = window_at(plant, DAYS[-1], 30)
    assert made.days == (1.0,) * 12
    masses = {(one.vessel, one.close): one.mass for one in made.stocks}
    assert sorted({close for _, close in masses}) == list(range(13))
    first = [masses[("tk-1", close)] for close in range(3)]
    assert [round(mass.value) for mass in first if mass is not None] == [480_000, 440_000, 480_000]
    assert [(one.name, one.night, one.source, one.target) for one in made.tickets][:2] == [
        ("t-0", 1, "tk-1", "tk-2"), ("t-1", 2, "tk-2", "tk-1"),
    ]  # fmt: skip
    stock = next(one for one in made.stocks if (one.vessel, one.close) == ("tk-1", 5))
    assert stock.slopes["level"] == pytest.approx(KG_PER_M)
    assert stock.per_mm == pytest.approx(KG_PER_M / 1e3)
    assert stock.samples == ("density:substance:oil",)


def test_a_full_window_is_opened_by_the_book_before_it(plant: Plant) -> None:
    month(plant)
    made = window_at(plant, DAYS[-1], 5)
    assert len(made.days) == 5
    assert {one.close for one in made.stocks} == set(range(6))
    assert [one.name for one in made.tickets] == ["t-7", "t-8", "t-9", "t-10", "t-11"]


def test_a_gauge_that_was_moved_is_named_from_the_closed_nights(plant: Plant) -> None:
    """The first tank's gauge reads 60 mm high from the ninth morning on: 4.8 t, where nights scatter by 0.1 t."""
    month(plant, from_day=8, reads_high=0.06)
    found = judge(window_at(plant, DAYS[8], 30))
    suspects = [one for group in found.groups for signal in group.signals for one in signal.suspects]
    named = {(one.kind, str(one.subject)): one for one in suspects}
    assert found.flagged
    assert any(kind == "level_bias" and "tk-1" in subject for kind, subject in named), named
    gauge = next(one for (kind, subject), one in named.items() if kind == "level_bias" and "tk-1" in subject)
    assert gauge.magnitude == pytest.approx(60.0, rel=0.1)


def test_nights_without_a_fault_are_quiet(plant: Plant) -> None:
    month(plant)
    assert not judge(window_at(plant, DAYS[-1], 30)).flagged


def test_a_close_keeps_a_check_with_the_errors_of_both_instruments(plant: Plant) -> None:
    hand = {"source": "hand", "instruments": {"level_m": {"random": 0.0, "systematic": 0.002, "instrument": "tape 7"}}}
    plant.tank("tk-3", sources=[{"source": "radar"}, hand])
    for day in ("2026-03-10", "2026-03-11"):
        plant.read("tk-3", f"{day}T06:00", "radar", level_m=5.01)
    plant.read("tk-3", "2026-03-11T06:00", "hand", level_m=5.0)
    plant.close("2026-03-10")
    with plant.store.reading() as connection:
        (night,) = books.chain(connection, number(connection, plant.site), instant("2026-03-11T06:00"), 2**62, 1)
    notes: dict[str, Any] = json.loads(night.slopes["tk-3"])
    (check,) = notes["checks"]
    assert check["difference"] == pytest.approx(0.01 * KG_PER_M)  # the gauge reads high: too much mass
    assert check["parts"]["level:tape 7"] == pytest.approx(-0.002 * KG_PER_M)
    assert check["parts"]["level:tk-3/radar"] == pytest.approx(0.003 * KG_PER_M)
