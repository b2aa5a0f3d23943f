"""The simulated site is what it says: its errors have their law, and each fault shows as its sign and size say."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
import pytest

from models.arrays import FloatArray
from models.balance.rows import assemble
from models.balance.window import Part, Stock, Window
from tests.simulation.plan import Plan, plan
from tests.simulation.plant import KINDS, draw_fault
from tests.simulation.site import LAB, Errors, Fault, Site, simulate, unshared

NIGHTS = 12
NIGHT = 5


def site() -> Plan:
    return plan(7, nights=NIGHTS)


def imbalance(window: Window, of: Plan) -> FloatArray:
    """Physical less book by vessel and night, summed by hand."""
    found = np.zeros((len(of.vessels), of.nights))
    for stock in window.stocks:
        assert stock.mass is not None
        at, k = of.place[stock.vessel], stock.close
        if k > 0:
            found[at, k - 1] += stock.mass.value
        if k < of.nights:
            found[at, k] -= stock.mass.value
    for ticket in window.tickets:
        assert ticket.mass is not None
        for end, sign in ((ticket.source, 1.0), (ticket.target, -1.0)):
            if end is not None:
                found[of.place[end], ticket.night - 1] += sign * ticket.mass.value
    return found


def shown(fault: Fault) -> FloatArray:
    """What a fault adds to the imbalances, all else the same."""
    return imbalance(simulate(site(), 3, [fault]).window, site()) - imbalance(simulate(site(), 3).window, site())


def at_close(window: Window, vessel: str) -> Mapping[int, Stock]:
    return {stock.close: stock for stock in window.stocks if stock.vessel == vessel}


def group(found: Site) -> Part:
    return Part(tuple(sorted(vessel.name for vessel in found.plan.vessels)), found.window)


def test_one_seed_is_one_window() -> None:
    assert simulate(site(), 3).window == simulate(site(), 3).window
    assert simulate(site(), 3).window != simulate(site(), 4).window
    assert plan(7, nights=NIGHTS).movements == site().movements != plan(8, nights=NIGHTS).movements


def test_a_site_has_the_size_that_was_asked_for() -> None:
    made = plan(1, layout=((3, 1),) * 20, nights=4, tickets=3)
    assert len(made.vessels) == 80
    assert sum(vessel.round for vessel in made.vessels) == 20
    assert len(made.movements) == 20 * 4 * 3
    names = {vessel.name: vessel.group for vessel in made.vessels}
    assert all(len({names[end] for end in (one.source, one.target) if end is not None}) == 1 for one in made.movements)
    found = simulate(made, 2).window
    assert len(found.stocks) == 80 * 5


def test_levels_and_volumes_are_inverse_and_a_sphere_holds_what_it_should() -> None:
    for vessel in site().vessels:
        level = np.linspace(0.1, 0.9, 9) * vessel.height
        assert vessel.level(vessel.volume(level)) == pytest.approx(level, rel=1e-9)
        step = 1e-4
        slope = (vessel.volume(level + step) - vessel.volume(level - step)) / (2.0 * step)
        assert vessel.area(level) == pytest.approx(slope, rel=1e-6)
    sphere = site().vessels[-1]
    assert sphere.volume(np.array(sphere.height)) == pytest.approx(4.0 / 3.0 * np.pi * sphere.radius**3, rel=1e-12)


def test_vessels_stay_between_their_limits() -> None:
    made = plan(5, nights=30)
    content = simulate(made, 1).content
    filled = content / np.array([vessel.capacity for vessel in made.vessels])[:, None]
    assert 0.11 < filled.min() < filled.max() < 0.89


def test_without_errors_every_imbalance_is_what_was_lost() -> None:
    exact = Errors(true_over_declared=0.0)
    found = simulate(site(), 3, [Fault("vessel_loss", (site().vessels[1].name,), NIGHT, 4_000.0)], exact)
    assert imbalance(found.window, site()) == pytest.approx(-found.lost, abs=1e-4)
    assert found.lost.sum() == 4_000.0


@pytest.mark.parametrize("name", ["level:g0-tk-3", "temperature:g0-sp-0", "capacity:g0-tk-0:1", LAB, "sample", "local"])
def test_the_parts_are_what_an_error_does(name: str) -> None:
    # Windows drawn by other seeds: the spread of one vessel's mass over them is the root of the sum of its parts.
    vessel = "g0-sp-0" if "sp" in name else "g0-tk-3" if "tk-3" in name else "g0-tk-0"
    kind = name.split(":")[0]
    alone = {"level": "level", "temperature": "temperature", "capacity": "capacity", "density": "laboratory",
             "sample": "sample", "local": "local"}[kind]  # fmt: skip
    off = dict.fromkeys(("level_random", "temperature_random", "level", "temperature", "capacity", "local", "sample",
                         "laboratory"), 0.0)  # fmt: skip
    errors = Errors(**{**off, alone: getattr(Errors(), alone)})
    made = plan(7, layout=((4, 1),), nights=1)
    masses, sigma = [], 0.0
    for seed in range(300):
        close = at_close(simulate(made, seed, errors=errors).window, vessel)[0]
        assert close.mass is not None
        masses.append(close.mass.value)
        sigma = close.mass.uncertainty
    assert np.std(masses) == pytest.approx(sigma, rel=0.15)


def test_a_clean_window_is_noise_of_the_declared_size() -> None:
    squares = []
    for seed in range(12):
        made = plan(100 + seed, nights=NIGHTS)
        squares.append(np.mean(assemble(group(simulate(made, seed))).white ** 2))
    assert np.mean(squares) == pytest.approx(1.0, abs=0.08)


def test_a_window_with_splits_revisions_dips_and_provings_is_noise_as_well() -> None:
    squares, extra = [], []
    for seed in range(12):
        made = plan(200 + seed, nights=NIGHTS, split=0.5)
        names = [vessel.name for vessel in made.vessels]
        provings = [(meter, own[-1].night) for meter, own in made.meters.items()]
        found = simulate(
            made, seed, dips=[(names[1], 4), (names[-1], 9)], provings=provings, revised={names[2]: 6, names[3]: 7}
        )
        rows = assemble(group(found))
        squares.append(np.mean(rows.white**2))
        assert len(rows.check_rows) == 2 + len(provings)
        extra += list(rows.white[rows.check_rows])
        parts = [ticket.name for ticket in found.window.tickets]
        assert len(set(parts)) < len(parts) > len(made.meters)
    assert np.mean(squares) == pytest.approx(1.0, abs=0.08)
    assert np.mean(np.square(extra)) == pytest.approx(1.0, abs=0.4)


def test_a_dip_sees_a_gauge_and_not_a_loss_and_a_proving_sees_a_meter() -> None:
    of, exact = site(), Errors(true_over_declared=0.0)
    vessel, meter = of.vessels[0].name, next(iter(of.meters))
    for fault, level, factor in (
        (Fault("level_bias", (vessel,), NIGHT, 12.0), 12e-3, 0.0),
        (Fault("vessel_loss", (vessel,), NIGHT, 3_000.0), 0.0, 0.0),
        (Fault("meter_bias", (meter,), 1, -0.8), 0.0, -0.8),
    ):
        dip, proving = simulate(of, 3, [fault], exact, dips=[(vessel, NIGHT)], provings=[(meter, NIGHT)]).window.checks
        assert dip.difference.value / dip.slope == pytest.approx(level, abs=1e-9)
        assert proving.difference.value / proving.slope == pytest.approx(factor, abs=1e-9)
        assert (dip.night, dip.kind, proving.kind) == (NIGHT, "level", "meter")


def test_a_revised_vessel_closes_by_the_old_definition_and_opens_by_the_new() -> None:
    of = site()
    vessel = of.vessels[0].name
    closes = at_close(simulate(of, 3, revised={vessel: NIGHT}).window, vessel)
    close = closes[NIGHT]
    assert close.mass is not None and close.reopened is not None
    both = set(close.mass.parts) & set(close.reopened.parts)
    assert f"r:{vessel}:{NIGHT}:level" in both and f"temperature:{vessel}" in both
    assert not {name for name in both if name.startswith(("level", "capacity"))}
    later = closes[NIGHT + 1].mass
    assert later is not None and f"capacity:{vessel}:2" in later.parts
    assert [k for k, stock in closes.items() if stock.reopened is not None] == [NIGHT]


def test_errors_taken_for_new_ones_hide_what_is_shared() -> None:
    found = simulate(site(), 3)
    alone = unshared(found.window)
    masses = [*(one.mass for one in alone.stocks), *(one.mass for one in alone.tickets)]
    names = [name for mass in masses if mass is not None for name in mass.parts]
    assert len(names) == len(set(names))
    raw = [one.mass.uncertainty for one in found.window.stocks if one.mass is not None]
    assert [one.mass.uncertainty for one in alone.stocks if one.mass is not None] == pytest.approx(raw, rel=1e-12)


def test_biased_instruments_add_their_slope_from_the_onset_on() -> None:
    of, clean = site(), simulate(site(), 3).window
    for kind, quantity, size, per in (
        ("level_bias", "level", 10.0, 1e-3),
        ("temperature_bias", "temperature", 2.0, 1.0),
    ):
        for vessel in (of.vessels[2].name, of.vessels[-1].name):
            closes = at_close(clean, vessel)
            held = [size * per * closes[k].slopes[quantity] * (k >= NIGHT) for k in range(NIGHTS + 1)]
            added = shown(Fault(kind, (vessel,), NIGHT, size))
            reach = 0.02 * np.abs(held).max()  # a slope changes a little within the step, and the table's waves too
            assert added[of.place[vessel]] == pytest.approx(np.diff(held), abs=reach)
            assert np.delete(added, of.place[vessel], axis=0) == pytest.approx(0.0)


def test_a_wrong_density_reaches_all_that_cites_it() -> None:
    of, clean = site(), simulate(site(), 3).window
    sample = of.sample[4][NIGHT]
    added = shown(Fault("density_bias", (sample,), 0, 5.0))
    closes = at_close(clean, of.vessels[4].name)
    held = [5.0 * closes[k].slopes["density"] * (sample in closes[k].samples) for k in range(NIGHTS + 1)]
    assert added[4] == pytest.approx(np.diff(held), rel=1e-6, abs=1.0)
    assert np.delete(added, 4, axis=0) == pytest.approx(0.0)
    everywhere = shown(Fault("density_bias", (LAB,), NIGHT, 5.0))
    assert (everywhere[:, NIGHT - 1] > 0.0).all()
    assert everywhere[:, : NIGHT - 1] == pytest.approx(0.0)


def test_masses_that_are_lost_moved_or_misread_show_with_their_signs() -> None:
    of = site()
    one, other = of.vessels[0].name, of.vessels[1].name
    lost = shown(Fault("vessel_loss", (one,), NIGHT, 3_000.0))
    assert lost[0, NIGHT - 1] == pytest.approx(-3_000.0, rel=0.01)  # a table's error is lost with the mass
    assert np.abs(lost[1:]).max() == 0.0
    slow = shown(Fault("slow_loss", (one,), NIGHT, 300.0))
    assert slow[0] == pytest.approx([0.0] * (NIGHT - 1) + [-300.0] * (NIGHTS - NIGHT + 1), rel=0.03, abs=1e-4)
    take = shown(Fault("bad_stock_take", (one,), NIGHT, 3_000.0))
    assert take[0, NIGHT - 1 : NIGHT + 1] == pytest.approx([3_000.0, -3_000.0])
    unrecorded = shown(Fault("unrecorded_transfer", (one, other), NIGHT, 3_000.0))
    assert unrecorded[:2, NIGHT - 1] == pytest.approx([-3_000.0, 3_000.0], rel=0.01)
    outwards = shown(Fault("unrecorded_transfer", (one, ""), NIGHT, 3_000.0))
    assert outwards[:2, NIGHT - 1] == pytest.approx([-3_000.0, 0.0], rel=0.01)


def test_tickets_show_with_their_signs() -> None:
    of = site()
    ticket = next(one for one in of.movements if one.night == NIGHT and one.source and one.target)
    assert ticket.source is not None and ticket.target is not None
    mass = next(one.mass.value for one in simulate(of, 3).window.tickets if one.name == ticket.name and one.mass)
    source, target = of.place[ticket.source], of.place[ticket.target]

    def ends(added: FloatArray, night: int = NIGHT) -> list[float]:
        return [float(added[source, night - 1]), float(added[target, night - 1])]

    assert ends(shown(Fault("wrong_transfer", (ticket.name,), NIGHT, 900.0))) == pytest.approx([900.0, -900.0])
    assert ends(shown(Fault("duplicated_transfer", (ticket.name,), NIGHT))) == pytest.approx([mass, -mass])
    late = shown(Fault("late_transfer", (ticket.name, "previous"), NIGHT))  # moved in its night, written in the next
    assert ends(late) == pytest.approx([-mass, mass])
    assert ends(late, NIGHT + 1) == pytest.approx([mass, -mass])
    early = shown(Fault("late_transfer", (ticket.name, "next"), NIGHT - 1))  # written the night before it moved
    assert ends(early, NIGHT - 1) == pytest.approx([mass, -mass])
    assert ends(early) == pytest.approx([-mass, mass])
    named = next(one.name for one in of.vessels if one.name not in (ticket.source, ticket.target))
    wrong = shown(Fault("misrouted_transfer", (ticket.name, named, ticket.target), NIGHT))
    assert ends(wrong) == pytest.approx([0.0, mass])
    assert wrong[of.place[named], NIGHT - 1] == pytest.approx(-mass)
    biased = shown(Fault("meter_bias", (ticket.meter,), NIGHT, 1.0))
    assert biased[:, : NIGHT - 1] == pytest.approx(0.0)
    received = sum(one.mass for one in of.meters[ticket.meter] if one.night >= NIGHT and one.source is None)
    moved = sum(one.mass for one in of.meters[ticket.meter] if one.night >= NIGHT)
    assert np.abs(biased).sum() <= 0.0201 * moved
    assert biased.sum() == pytest.approx(-0.01 * received, rel=0.01, abs=1e-6)


def test_a_stuck_gauge_shows_what_it_showed() -> None:
    of = site()
    vessel = of.vessels[3].name
    stuck = at_close(simulate(of, 3, [Fault("level_stuck", (vessel,), NIGHT, 0.0, NIGHT + 2)]).window, vessel)
    clean = at_close(simulate(of, 3).window, vessel)
    assert [k for k, stock in stuck.items() if stock.still and not clean[k].still] == [NIGHT, NIGHT + 1, NIGHT + 2]
    for k in range(NIGHTS + 1):
        assert (stuck[k].mass == clean[k].mass) is not (NIGHT <= k <= NIGHT + 2)


@pytest.mark.parametrize("kind", KINDS)
def test_every_kind_can_be_drawn_and_changes_the_books(kind: str) -> None:
    rng = np.random.default_rng(41)
    drawn = [fault for fault in (draw_fault(site(), rng, kind, 2 + tries) for tries in range(8)) if fault is not None]
    assert drawn
    for fault in drawn[:3]:
        assert fault.kind == kind
        assert np.abs(shown(fault)).max() > 1.0
