"""Tickets as masses: four quantities, their errors, and their parts in the periods that they span."""

from __future__ import annotations

import math
import random
from typing import Any

import pytest

from app.errors import NotFound, Unprocessable
from app.schemas.batch import RowError
from app.schemas.meter import Meter
from app.schemas.site import Site
from app.schemas.substance import Substance
from app.schemas.transfer import NamedTransfer, Transfer
from app.schemas.types import canonical
from app.schemas.vessel import Vessel
from app.services import move
from app.services.compile import CompiledVessel, compile_bodies
from app.store.transfers import Transfer as Ticket
from models.estimate import Estimate, combine
from tests.app.services.plant import BOX, OIL, SITE, Plant, instant, text_of, ticket

HOUR = 3_600_000_000
START = instant("2026-03-14T00:00")
LONGEST = 31 * 24 * HOUR
JETTY = "boundary:jetty-1"
WARM = OIL["liquid"] | {"expansivity_per_k": 1e-3, "compressibility_per_kpa": 1e-6}
STANDARD = {"tk-1": Estimate(801.0, {"sample:s1": 0.3, "density:lab": 0.4})}


def vessel(name: str = "tk-1", **liquid: Any) -> CompiledVessel:
    substance = Substance.model_validate(OIL | {"liquid": WARM | liquid})
    return compile_bodies(name, Site.model_validate(SITE), Vessel.model_validate(BOX), substance)


def kept(name: str, body: Transfer) -> Ticket:
    ended = body.started_at + LONGEST if body.ended_at is None else body.ended_at
    return Ticket(name, 1, 0, body.started_at, ended, body.ended_at is None, body.void, canonical(body))


def moved(
    body: Transfer, opening: int = START - 24 * HOUR, closing: int = START + 24 * HOUR, name: str = "t-1",
    meters: dict[str, Meter] | None = None, standard: dict[str, Estimate] | None = None,
) -> move.Moved:  # fmt: skip
    held = {"tk-1": vessel(), "tk-2": vessel("tk-2")}
    return move.moved(
        kept(name, body), opening, closing, held, meters or {}, STANDARD if standard is None else standard
    )


def mass(body: Transfer, *period: int, **said: Any) -> Estimate:
    found = moved(body, *period, **said).mass
    assert found is not None
    return found


def received(**said: Any) -> Transfer:
    return ticket(JETTY, "tk-1", "2026-03-14T02:00", "2026-03-14T04:00", **said)


def metered(meter: Meter, started: str, **said: Any) -> Estimate:
    body = ticket(JETTY, "tk-1", started, "2026-03-14T20:00", by="meter", meter="m-7", **said)
    return mass(body, meters={"m-7": meter})


def test_a_mass_is_taken_as_it_stands_with_its_own_error() -> None:
    found = moved(received(mass_kg=20_000.0))
    assert (found.source, found.target, found.water) == (None, "tk-1", False)
    assert found.mass == Estimate(20_000.0, {"t:t-1": 10.0})


def test_a_standard_volume_takes_its_own_density_to_the_standard_state() -> None:
    body = received(standard_volume_m3=100.0, density_kg_m3=790.0, density_temperature_c=25.0)
    found = mass(body)
    # β = 1e-3 over 10 K: ρ₁₅ = 790 e^0.01.
    assert found.value == pytest.approx(100.0 * 790.0 * math.exp(0.01), rel=1e-12)
    # Reproducibility 1.2 and repeatability 0.5 kg/m³ of ISO 3675 (from memory), each over 2.77.
    random_part, shared = 0.5 / 2.77, math.sqrt(1.2**2 - 0.5**2) / 2.77
    assert found.parts["sample:ticket:t-1"] == pytest.approx(100.0 * math.exp(0.01) * random_part, rel=1e-9)
    assert sum(part for name, part in found.parts.items() if name.startswith("density:")) == pytest.approx(
        100.0 * math.exp(0.01) * shared, rel=1e-9
    )


def test_a_standard_volume_without_a_density_shares_the_vessels_sample() -> None:
    assert mass(received(standard_volume_m3=100.0)) == Estimate(
        80_100.0, {"sample:s1": pytest.approx(30.0), "density:lab": pytest.approx(40.0), "t:t-1": 10.0}
    )
    unknown = moved(received(standard_volume_m3=100.0), standard={})
    assert unknown.mass is None


def test_an_observed_volume_is_taken_to_its_temperature_and_pressure() -> None:
    found = mass(received(observed_volume_m3=100.0, temperature_c=35.0, pressure_kpa=500.0))
    # 20 K of β = 1e-3, less 500 kPa of κ = 1e-6.
    ratio = math.exp(-0.02 + 0.0005)
    assert found.value == pytest.approx(100.0 * 801.0 * ratio, rel=1e-12)
    assert found.parts["sample:s1"] == pytest.approx(30.0 * ratio, rel=1e-12)


def test_a_weight_in_air_is_made_a_mass_by_the_conventional_air() -> None:
    # OIML D 28 (2004): air of 1.2 kg/m³, weights of 8,000 kg/m³.
    expected = 10_000.0 * (1.0 - 1.2 / 8000.0) / (1.0 - 1.2 / 801.0)
    assert mass(received(weight_in_air_kg=10_000.0)).value == pytest.approx(expected, rel=1e-12)


def test_sediment_and_water_make_wet_net_and_returned_vapour_is_taken_off() -> None:
    wet = mass(received(standard_volume_m3=100.0, sediment_water_pct=2.0))
    assert wet.value == pytest.approx(0.98 * 80_100.0, rel=1e-12)
    assert wet.parts["sample:s1"] == pytest.approx(0.98 * 30.0, rel=1e-12)
    less = received(mass_kg=20_000.0, vapour_return={"mass_kg": 120.0})
    assert mass(less).value == pytest.approx(19_880.0, rel=1e-12)
    # Half of its time is half of the vapour, too.
    half = mass(less, START, instant("2026-03-14T03:00"))
    assert half.value == pytest.approx(9_940.0, rel=1e-12)


def test_what_measured_nothing_has_no_mass() -> None:
    for said in ({"unmetered": True, "by": "statement"}, {"mass_kg": 5.0, "by": "gauging"}):
        found = moved(received(**said))
        assert (found.mass, found.water) == (None, False)
    drained = moved(received(mass_kg=5.0, of="water"))
    assert (drained.mass, drained.water) == (None, True)


def test_a_meters_error_is_shared_between_two_provings_only() -> None:
    meter = Meter.model_validate({
        "name": "m", "random_pct": 0.02, "systematic_pct": 0.1,
        "provings": [{"at": "2026-03-14T06:00:00Z", "systematic_pct": 0.05}, {"at": "2026-03-14T12:00:00Z"}],
    })  # fmt: skip
    starts = ("05:59", "06:00", "11:59", "12:00", "19:00")
    found = [metered(meter, f"2026-03-14T{start}", mass_kg=10_000.0) for start in starts]
    shared = [{name for name in one.parts if name.startswith("meter:")} for one in found]
    assert shared[1] == shared[2] and shared[3] == shared[4]
    assert shared[0].isdisjoint(shared[1]) and shared[2].isdisjoint(shared[3])
    sizes = [one.parts[name] for one, (name,) in zip(found, shared, strict=True)]
    assert sizes == pytest.approx([10.0, 5.0, 5.0, 10.0, 10.0], rel=1e-12)  # 0.1, 0.05, 0.1 %
    assert all(one.parts["t:t-1"] == pytest.approx(2.0, rel=1e-12) for one in found)


def test_a_meter_of_which_nothing_is_declared_is_of_class_0_5() -> None:
    # Directive 2014/32/EU, annex VII: ±0.3 % for the meter alone, so 0.3/√3; 0.05 % repeats, common practice.
    found = metered(Meter.model_validate({"name": "m"}), "2026-03-14T05:00", mass_kg=10_000.0)
    assert found.parts["t:t-1"] == pytest.approx(5.0, rel=1e-12)
    assert found.uncertainty == pytest.approx(math.hypot(5.0, 30.0 / math.sqrt(3.0)), rel=1e-12)


@pytest.mark.parametrize(
    ("hours", "before", "spread"),
    # 24,000 kg in 24 h: 5 % of the whole is 1,200 kg, at most half of the smaller part.
    [(12, 12_000.0, 1200.0), (2, 2_000.0, 1000.0), (1, 1_000.0, 500.0), (23, 23_000.0, 500.0), (3, 3_000.0, 1200.0)],
)
def test_a_ticket_is_divided_by_time(hours: int, before: float, spread: float) -> None:
    body = ticket(JETTY, "tk-1", "2026-03-14T00:00", "2026-03-15T00:00", mass_kg=24_000.0)
    close = START + hours * HOUR
    first, second = mass(body, START - HOUR, close), mass(body, close, START + 48 * HOUR)
    assert (first.value, second.value) == pytest.approx((before, 24_000.0 - before), rel=1e-12)
    split = f"split:t-1:{close}"
    assert (first.parts[split], second.parts[split]) == pytest.approx((spread, -spread), rel=1e-12)
    assert first.parts["t:t-1"] + second.parts["t:t-1"] == pytest.approx(10.0, rel=1e-12)


def test_progress_divides_without_an_error_where_it_was_read() -> None:
    progress = [
        {"at": "2026-03-14T06:00:00Z", "mass_kg": 20_000.0},
        {"at": "2026-03-14T08:00:00Z", "mass_kg": 22_000.0},
    ]
    body = ticket(JETTY, "tk-1", "2026-03-14T00:00", "2026-03-15T00:00", mass_kg=24_000.0, progress=progress)
    at = mass(body, START, START + 6 * HOUR)
    assert at == Estimate(20_000.0, {"t:t-1": pytest.approx(10.0 * 20 / 24)})
    # Between two of them, by time between those two; 5 % of the 2,000 kg that moved there.
    between = mass(body, START, START + 7 * HOUR)
    assert between.value == pytest.approx(21_000.0, rel=1e-12)
    assert between.parts[f"split:t-1:{START + 7 * HOUR}"] == pytest.approx(100.0, rel=1e-12)


def test_the_parts_of_all_periods_add_up_to_the_ticket() -> None:
    rng = random.Random(11)
    for case in range(60):
        minutes = sorted(rng.sample(range(1, 3000), 3))
        progress = [] if case % 2 else [
            {"at": f"2026-03-14T{6 + k:02}:00:00Z", "standard_volume_m3": q}
            for k, q in enumerate(sorted(rng.uniform(0.0, 500.0) for _ in range(3)))
        ]  # fmt: skip
        body = ticket(
            JETTY, "tk-1", "2026-03-14T05:00", "2026-03-15T17:30", standard_volume_m3=500.0, sediment_water_pct=0.3,
            progress=progress, mass_uncertainty_kg=70.0, vapour_return={"mass_kg": 40.0},
        )  # fmt: skip
        whole = mass(body, START, START + 72 * HOUR)
        edges = [START, *(START + minute * 60_000_000 for minute in minutes), START + 72 * HOUR]
        parts = [mass(body, low, high) for low, high in zip(edges, edges[1:], strict=False)]
        total = combine((1.0, part) for part in parts)
        assert total.value == pytest.approx(whole.value, rel=1e-12)
        assert whole.value == pytest.approx(0.997 * 500.0 * 801.0 - 40.0, rel=1e-12)
        left = {name: part for name, part in total.parts.items() if abs(part) > 1e-9}
        assert left == pytest.approx(dict(whole.parts), rel=1e-12)


def test_a_ticket_of_no_duration_belongs_to_the_period_that_begins_with_it() -> None:
    body = ticket(JETTY, "tk-1", "2026-03-14T00:00", "2026-03-14T00:00", mass_kg=500.0)
    assert mass(body, START - HOUR, START).value == 0.0
    assert mass(body, START - HOUR, START).parts == {}
    assert mass(body, START, START + HOUR) == Estimate(500.0, {"t:t-1": 10.0})


def test_a_ticket_that_runs_counts_what_it_had_moved_when_it_was_last_read() -> None:
    progress = [{"at": "2026-03-14T06:00:00Z", "mass_kg": 600.0}]
    body = ticket(JETTY, "tk-1", "2026-03-14T00:00", None, mass_kg=900.0, progress=progress)
    assert mass(body, START, START + 3 * HOUR).value == pytest.approx(300.0, rel=1e-12)
    assert mass(body, START, START + 24 * HOUR).value == pytest.approx(600.0, rel=1e-12)
    assert mass(body, START + 24 * HOUR, START + 48 * HOUR).value == 0.0


def test_a_ticket_is_kept_revised_and_struck_and_stays_readable(plant: Plant) -> None:
    plant.tank("tk-1")
    said = (JETTY, "tk-1", "2026-03-14T02:00", "2026-03-14T04:00")
    assert plant.ticket("t-1", *said, mass_kg=500.0) == "created"
    assert plant.ticket("t-1", *said, mass_kg=500.0) == "unchanged"
    known = plant.known()
    assert plant.ticket("t-1", *said, mass_kg=600.0) == "revised"
    assert plant.ticket("t-1", *said, mass_kg=600.0, void=True) == "revised"
    stored, body = move.current(plant.store, plant.site, "t-1", None)
    assert (stored.revision, body.void, body.mass_kg) == (3, True, 600.0)
    assert move.current(plant.store, plant.site, "t-1", known)[1].mass_kg == 500.0
    with pytest.raises(NotFound):
        move.current(plant.store, plant.site, "t-2", None)


def test_ends_and_meters_that_nobody_defined_are_named(plant: Plant) -> None:
    plant.tank("tk-1")
    with pytest.raises(Unprocessable) as refused:
        plant.ticket("t-1", "tk-8", "tk-9", "2026-03-14T02:00", None, mass_kg=1.0, by="meter", meter="m-1")
    assert [(one.pointer, one.code) for one in refused.value.errors] == [
        ("/from", "unknown_vessel"), ("/to", "unknown_vessel"), ("/meter", "unknown_meter"),
    ]  # fmt: skip
    with pytest.raises(NotFound):
        move.put(plant.store, "no-such-site", "t-1", received(mass_kg=1.0))


def test_a_batch_keeps_its_good_tickets_and_names_the_others(plant: Plant) -> None:
    plant.tank("tk-1")
    plant.ticket("t-0", JETTY, "tk-1", "2026-03-14T02:00", "2026-03-14T04:00", mass_kg=1.0)

    def named(name: str, target: str, **said: Any) -> NamedTransfer:
        return NamedTransfer.model_validate({
            "id": name, "from": JETTY, "to": target, "by": "weighbridge", "mass_uncertainty_kg": 10.0,
            "started_at": text_of("2026-03-14T02:00"), "ended_at": text_of("2026-03-14T04:00"), **said,
        })  # fmt: skip

    rows = [(0, named("t-0", "tk-1", mass_kg=1.0)), (1, named("t-1", "tk-9", mass_kg=1.0)),
            (2, named("t-2", "tk-1", mass_kg=1.0)), (4, named("t-0", "tk-1", mass_kg=2.0))]  # fmt: skip
    known = [RowError(index=3, field="mass_kg", code="missing", detail="said before")]
    counts, errors, recorded_at = move.put_many(plant.store, plant.site, rows, known)
    assert counts == {"created": 1, "revised": 1, "unchanged": 1}
    assert [(one.index, one.field) for one in errors] == [(1, "to"), (3, "mass_kg")]
    assert recorded_at == plant.known()
    assert move.current(plant.store, plant.site, "t-0", None)[1].mass_kg == 2.0
