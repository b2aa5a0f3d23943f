"""A ticket divided at two instants on the way errs as a bridge does; a proving measures the interval before it."""

from __future__ import annotations

import math
import random
from typing import Any

import pytest

from app.schemas.meter import Meter
from app.schemas.transfer import Transfer
from app.schemas.types import canonical
from app.services import move
from app.store.transfers import Transfer as Ticket
from models.estimate import Estimate, combine
from tests.app.services.plant import Plant, instant, row, ticket

JETTY, RACK = "boundary:jetty-1", "boundary:rack-1"
DAY = "2026-03-14T"
START = instant(f"{DAY}00:00")
HOUR = 3_600_000_000
WHOLE = 24_000.0  # kg in 24 h: 1,000 kg an hour, and 5 % of it 1,200 kg


def part(body: Transfer, first: int, last: int, asked: int | None = None, **meters: Meter) -> Estimate:
    assert body.ended_at is not None
    kept = Ticket("t-1", 1, 0, body.started_at, body.ended_at, False, body.void, canonical(body))
    found = move.moved(kept, first, last, {}, meters, {}, None, asked).mass
    assert found is not None
    return found


def day_long(**said: Any) -> Transfer:
    return ticket(JETTY, "tk-1", f"{DAY}00:00", "2026-03-15T00:00", mass_kg=WHOLE, mass_uncertainty_kg=0.0, **said)


def at(hours: float) -> int:
    return START + round(hours * HOUR)


def spread(hours: float, whole: float = WHOLE, length: float = 24.0) -> float:
    """5 % of the whole, at most half of the smaller part."""
    share = hours / length
    return min(0.05 * whole, 0.5 * whole * min(share, 1.0 - share))


# --- the bridge -------------------------------------------------------------------------------------


def test_a_move_between_two_divisions_is_known_better_the_shorter_it_is() -> None:
    found = [part(day_long(), at(18.0 - hours), at(18.0), at(18.0)).uncertainty for hours in (0.01, 0.1, 1.0, 6.0)]
    for hours, one in zip((0.01, 0.1, 1.0, 6.0), found, strict=True):
        low, high = (18.0 - hours) / 24.0, 18.0 / 24.0
        rho = math.sqrt(low * (1.0 - high) / (high * (1.0 - low)))
        assert one == pytest.approx(1_200.0 * math.sqrt(2.0 * (1.0 - rho)), rel=1e-6)
    assert found == sorted(found)
    assert found[0] < 60.0


def test_the_instant_that_is_asked_for_keeps_the_whole_error_of_a_book() -> None:
    found = part(day_long(), at(17.0), at(18.0), at(18.0))
    assert found.parts[f"split:t-1:{at(18.0)}"] == pytest.approx(
        1_200.0 * (1.0 - math.sqrt(17 * 6 / (18 * 7))), rel=1e-9
    )  # the error there less what the other end has of it: ρ² = 17/24 · 6/24 / (18/24 · 7/24)
    book = part(day_long(), START, at(18.0))
    assert book.parts == {f"split:t-1:{at(18.0)}": pytest.approx(1_200.0)}


def test_a_close_less_what_was_received_until_it_is_off_by_the_division_at_the_reading_alone() -> None:
    """M(read) + moved − received: whatever was divided at the close goes out, what the reading's is off by stays."""
    rng = random.Random(5)
    for _ in range(50):
        read, close = rng.uniform(0.1, 23.9), rng.uniform(0.1, 23.9)
        first, last, sign = (read, close, 1.0) if read < close else (close, read, -1.0)
        moved = part(day_long(), at(first), at(last), at(close))
        received = part(day_long(), START, at(close))
        left = combine([(sign, moved), (-1.0, received)])
        assert left.value == pytest.approx(-WHOLE * read / 24.0, rel=1e-9)
        assert left.uncertainty == pytest.approx(spread(read), rel=1e-6)


def test_parts_of_a_night_and_the_moves_at_its_ends_add_up_to_the_ticket() -> None:
    rng = random.Random(6)
    for _ in range(50):
        closes = sorted(rng.uniform(0.0, 24.0) for _ in range(3))
        edges = [at(-1.0), *(at(one) for one in closes), at(25.0)]
        nights = [part(day_long(), low, high) for low, high in zip(edges, edges[1:], strict=False)]
        total = combine((1.0, one) for one in nights)
        assert total.value == pytest.approx(WHOLE, rel=1e-12)
        assert all(abs(one) < 1e-9 for one in total.parts.values())
        read = closes[1] - 0.2
        there, back = part(day_long(), at(read), at(closes[1]), at(closes[1])), nights[2]
        rest = part(day_long(), at(read), at(25.0))
        assert there.value + back.value + nights[3].value == pytest.approx(rest.value, rel=1e-9)


def test_progress_between_the_two_unties_them() -> None:
    body = day_long(progress=[{"at": f"{DAY}12:00:00Z", "mass_kg": 12_000.0}])
    found = part(body, at(9.0), at(15.0), at(15.0))
    # Two pieces of 12,000 kg in 12 h, each divided on its own: 5 % of it is 600 kg.
    assert found.value == pytest.approx(6_000.0, rel=1e-12)
    assert found.parts == {f"split:t-1:{at(9.0)}": pytest.approx(-600.0), f"split:t-1:{at(15.0)}": pytest.approx(600.0)}
    exact = part(body, at(12.0), at(15.0), at(15.0))
    assert exact.parts == {f"split:t-1:{at(15.0)}": pytest.approx(600.0)}


def test_an_imbalance_keeps_the_five_percent_of_what_was_divided_by_time(plant: Plant) -> None:
    """The book's own division at the close is part of the imbalance where the level was read at the close."""
    plant.tank("tk-1", instruments={"level_m": {"random": 0.001, "systematic": 0.0},
                                    "capacity_pct": {"systematic": 0.0, "local": 0.0}})  # fmt: skip
    plant.read("tk-1", f"{DAY}06:00", level_m=5.0)
    plant.read("tk-1", "2026-03-15T06:00", level_m=5.4)
    plant.ticket("ship", "tk-1", RACK, "2026-03-15T02:00", "2026-03-15T08:00", mass_kg=48_000.0, mass_uncertainty_kg=0)
    own = row(plant.close("2026-03-14"), "tk-1")
    assert own["delivered_kg"] == pytest.approx(32_000.0, rel=1e-12)
    density = 2.0 / 800.0 * (own["closing_mass_kg"] - own["opening_mass_kg"])  # the substance's own
    expected = math.sqrt(2 * 80.0**2 + 2_400.0**2 + density**2)
    assert own["imbalance_uncertainty_kg"] == pytest.approx(expected, rel=1e-9)


# --- provings ---------------------------------------------------------------------------------------


def meter(*provings: dict[str, Any], **said: Any) -> Meter:
    return Meter.model_validate({"name": "m", "random_pct": 0.0, "systematic_pct": 0.2, "provings": provings} | said)


def metered(started: str, measured_by: Meter, mass: float = 100_000.0) -> Estimate:
    body = ticket(JETTY, "tk-1", f"{DAY}{started}", f"{DAY}23:00", by="meter", meter="m", mass_kg=mass)
    return part(body, START, at(24.0), m=measured_by)


FOUND = {"as_found_pct": 0.3, "as_found_uncertainty_pct": 0.03}


def test_a_proving_measures_the_interval_before_it_and_not_the_one_after() -> None:
    proved = meter({"at": f"{DAY}04:00:00Z"}, {"at": f"{DAY}12:00:00Z", "systematic_pct": 0.05, **FOUND})
    # 0.30 ± 0.03 % weighed with 0 ± 0.2 %: w = 0.04/0.0409, and √w of the 0.03 % is what stays unknown.
    weight = 0.2**2 / (0.2**2 + 0.03**2)
    before = metered("05:00", proved)
    assert before.value == pytest.approx(100_000.0 / (1.0 + weight * 0.003), rel=1e-12)
    assert before.uncertainty == pytest.approx(before.value * 0.0003 * math.sqrt(weight), rel=1e-9)
    after = metered("12:00", proved)
    assert (after.value, after.uncertainty) == (100_000.0, pytest.approx(50.0, rel=1e-12))
    # The interval before the first proving is another one, of which nothing was found.
    assert (metered("03:00", proved).value, metered("03:00", proved).uncertainty) == (100_000.0, pytest.approx(200.0))


def test_tickets_of_one_interval_share_what_the_proving_left() -> None:
    proved = meter({"at": f"{DAY}04:00:00Z"}, {"at": f"{DAY}12:00:00Z", **FOUND})
    one, other, later = (metered(started, proved) for started in ("05:00", "11:59", "12:00"))
    assert set(one.parts) == set(other.parts)
    assert set(one.parts).isdisjoint(later.parts)
    both = combine([(1.0, one), (1.0, other)])
    assert both.uncertainty == pytest.approx(one.uncertainty + other.uncertainty, rel=1e-12)


@pytest.mark.parametrize(("sigma", "share"), [(0.0, 1.0), (0.2, 0.5), (2.0, 0.04 / 4.04)])
def test_a_proving_is_worth_as_much_as_it_is_sure(sigma: float, share: float) -> None:
    proved = meter({"at": f"{DAY}12:00:00Z", "as_found_pct": -0.4, "as_found_uncertainty_pct": sigma})
    found = metered("05:00", proved)
    assert found.value == pytest.approx(100_000.0 / (1.0 - 0.004 * share), rel=1e-12)
    # Of two independent measurements of one thing: 1/u² = 1/0.2² + 1/σ².
    expected = 0.0 if sigma == 0.0 else 0.01 / math.sqrt(1.0 / 0.2**2 + 1.0 / sigma**2)
    assert found.uncertainty == pytest.approx(found.value * expected, rel=1e-9, abs=1e-9)


def test_a_proving_that_found_nothing_ends_the_interval() -> None:
    """The next one's finding is of its own interval, whatever began before the one in between."""
    proved = meter({"at": f"{DAY}08:00:00Z"}, {"at": f"{DAY}12:00:00Z", **FOUND})
    assert metered("05:00", proved).value == 100_000.0
    assert metered("09:00", proved).value < 99_800.0


def test_a_meter_that_is_perfect_by_declaration_is_not_corrected() -> None:
    proved = meter({"at": f"{DAY}12:00:00Z", **FOUND}, systematic_pct=0.0)
    assert metered("05:00", proved) == Estimate(100_000.0, metered("05:00", proved).parts)
    assert metered("05:00", proved).uncertainty == 0.0
