"""Reconciled masses against least squares with every unknown written out."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy.sparse import csc_array

from models.balance.faults import candidates
from models.balance.reconciled import last_close, of_stock, of_ticket, reconcile
from models.balance.rows import assemble
from models.balance.signatures import KINDS, Candidates
from models.balance.window import Part, Stock, Window
from models.estimate import Estimate
from tests.models.balance.drawn_window import draw, masses_of
from tests.models.balance.test_evidence import NIGHTS, VESSELS, explicit


def column(found: Candidates, kind: str, subject: tuple[str, ...], onset: int) -> int:
    own = (found.kind == KINDS.index(kind)) & (found.onset == onset)
    own &= np.array([found.subjects[at] == subject for at in found.subject])
    return int(np.flatnonzero(own)[0])


@pytest.mark.parametrize("seed", range(3))
def test_without_a_fault_masses_and_deviations_are_those_of_least_squares(seed: int) -> None:
    window = draw(np.random.default_rng(seed), 3, NIGHTS, 4)
    rows = assemble(Part(VESSELS, window))
    measured = masses_of(window)
    none = csc_array((len(rows.white), 0))
    values, spread = reconcile(rows, measured, none, np.zeros((len(measured), 0)))
    _, _, found, _ = explicit(rows, window, np.zeros((15, 0)))
    assert values == pytest.approx(found, abs=1e-3)
    h = rows.lower @ rows.lower.T
    names = sorted({name for one in measured for name in one.parts})
    parts = np.array([[one.parts.get(name, 0.0) for name in names] for one in measured])
    across = parts @ np.array([[rows.errors[i, rows.names[n]] for n in names] for i in range(15)]).T
    dense = parts @ parts.T - across @ np.linalg.solve(h, across.T)
    assert spread == pytest.approx(np.sqrt(np.diag(dense)), rel=1e-6)
    assert np.all(spread <= np.sqrt(np.diag(parts @ parts.T)) * (1 + 1e-9))


@pytest.mark.parametrize("kind", ["vessel_loss", "level_bias"])
def test_masses_beside_a_fault_are_right_on_average_and_as_sure_as_they_say(kind: str) -> None:
    """Sampled: departures of the reconciled masses from the truth over their stated deviations."""
    scores = []
    for seed in range(250):
        truth = draw(np.random.default_rng(seed), 3, NIGHTS, 4, quiet=True)
        window = draw(np.random.default_rng(seed), 3, NIGHTS, 4)
        stocks, size = [], 5000.0 if kind == "vessel_loss" else 20.0
        for stock in window.stocks:
            assert stock.mass is not None
            per = -1.0 if kind == "vessel_loss" else stock.slopes["level"] / 1000.0
            shift = per * size if stock.vessel == "tk-1" and stock.close >= 4 else 0.0
            mass = Estimate(stock.mass.value + shift, stock.mass.parts)
            stocks.append(replace(stock, mass=mass))
        rows = assemble(Part(VESSELS, Window(window.days, stocks, window.tickets)))
        found = candidates(rows)
        masses, moved = last_close(rows, found, [[column(found, kind, ("tk-1",), 4)]])
        true = {s.vessel: s.mass.value for s in truth.stocks if s.close == NIGHTS and s.mass is not None}
        if kind == "vessel_loss":
            true["tk-1"] -= size
        true |= {t.name: t.mass.value for t in truth.tickets if t.mass is not None}
        scores.append([(one.mass - true[one.subject]) / one.uncertainty for one in (*masses, *moved[:2])])
    assert np.abs(np.mean(scores, axis=0)).max() < 4.0 / 250**0.5
    assert np.std(scores, axis=0) == pytest.approx(np.ones(5), abs=0.18)


def test_where_a_loss_and_a_gauge_disagree_the_vessels_mass_rests_on_its_own_reading() -> None:
    window = draw(np.random.default_rng(1), 3, NIGHTS, 4)
    last = ("tk-1", NIGHTS)
    shifted = [biased(one, 40.0) if (one.vessel, one.close) == last else one for one in window.stocks]
    rows = assemble(Part(VESSELS, Window(window.days, shifted, window.tickets)))
    found = candidates(rows)
    loss, gauge = (column(found, kind, ("tk-1",), NIGHTS) for kind in ("vessel_loss", "level_bias"))
    both, _ = last_close(rows, found, [[gauge, loss]])
    assert both == last_close(rows, found, [[loss]])[0]  # a free loss in that balance leaves it out
    corrected, _ = last_close(rows, found, [[gauge]])
    own, other = both[1], corrected[1]
    assert abs(own.mass - own.measured) < 1500.0
    assert other.measured - other.mass == pytest.approx(40.0 * 162.0, abs=1500.0)  # kg: 40 mm of 200 m²


def biased(stock: Stock, millimetres: float) -> Stock:
    assert stock.mass is not None
    mass = Estimate(stock.mass.value + millimetres * stock.slopes["level"] / 1000.0, stock.mass.parts)
    return replace(stock, mass=mass)


def test_what_a_fault_adds_to_a_reading_and_to_a_record() -> None:
    window = draw(np.random.default_rng(1), 3, NIGHTS, 4)
    found = candidates(assemble(Part(VESSELS, window)))
    stock = next(s for s in window.stocks if (s.vessel, s.close) == ("tk-1", NIGHTS))
    other = next(s for s in window.stocks if (s.vessel, s.close) == ("tk-2", NIGHTS))
    for kind, quantity, per in (("level_bias", "level", 1e3), ("temperature_bias", "temperature", 1.0)):
        at = column(found, kind, ("tk-1",), 4)
        assert of_stock(found, at, stock) == pytest.approx(stock.slopes[quantity] / per)
        assert of_stock(found, at, other) == 0.0
    assert of_stock(found, column(found, "density_bias", ("density:lab",), 4), other) == other.slopes["density"]
    assert of_stock(found, column(found, "bad_stock_take", ("tk-1",), NIGHTS), stock) == 1.0
    assert of_stock(found, column(found, "bad_stock_take", ("tk-1",), NIGHTS - 1), stock) == 0.0
    assert of_stock(found, column(found, "vessel_loss", ("tk-1",), NIGHTS), stock) == 0.0
    ticket = next(t for t in window.tickets if t.night == NIGHTS)
    assert ticket.mass is not None
    mass = ticket.mass.value
    assert of_ticket(found, column(found, "meter_bias", ("M",), 4), ticket, mass) == pytest.approx(mass / 100.0)
    wrong = column(found, "wrong_transfer", (ticket.name,), NIGHTS)
    assert of_ticket(found, wrong, ticket, 2.0 * mass) == pytest.approx(0.5)
    assert of_ticket(found, column(found, "duplicated_transfer", (ticket.name,), NIGHTS), ticket, 2.0 * mass) == mass
    assert of_ticket(found, column(found, "vessel_loss", ("tk-1",), NIGHTS), ticket, mass) == 0.0
