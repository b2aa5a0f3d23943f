"""A fault's column is what planting that fault does to the balances."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

import numpy as np
import pytest

from models.arrays import FloatArray
from models.balance.faults import candidates
from models.balance.rows import assemble
from models.balance.signatures import KINDS, Candidates
from models.balance.window import Check, Part, Stock, Ticket, Window
from models.estimate import Estimate
from tests.models.balance.drawn_window import draw

WINDOW = draw(np.random.default_rng(11), vessels=3, nights=5, tickets=4)
VESSELS = ("tk-0", "tk-1", "tk-2")
Change = Callable[[Window], Window]


def residual(window: Window) -> FloatArray:
    return assemble(Part(VESSELS, window)).residual


def column(found: Candidates, kind: str, subject: tuple[str, ...], onset: int | None = None) -> int:
    own = found.kind == KINDS.index(kind)
    own &= np.array([found.subjects[at] == subject for at in found.subject])
    own &= (found.onset == onset) if onset is not None else True
    assert own.sum() == 1
    return int(np.flatnonzero(own)[0])


def shifted(stock: Stock, mass: float) -> Stock:
    assert stock.mass is not None
    return replace(stock, mass=Estimate(stock.mass.value + mass, stock.mass.parts))


def stocks(change: Callable[[Stock], float]) -> Change:
    return lambda window: replace(window, stocks=[shifted(stock, change(stock)) for stock in window.stocks])


def tickets(change: Callable[[Ticket], list[Ticket]]) -> Change:
    return lambda window: replace(window, tickets=[new for ticket in window.tickets for new in change(ticket)])


def scaled(ticket: Ticket, factor: float) -> Ticket:
    assert ticket.mass is not None
    return replace(ticket, mass=Estimate(ticket.mass.value * factor, ticket.mass.parts))


def biased(quantity: str, per: float, vessel: str, since: int) -> Change:
    return stocks(lambda s: s.slopes[quantity] / per if s.vessel == vessel and s.close >= since else 0.0)


TICKET = next(t for t in WINDOW.tickets if t.night == 3 and t.source is not None and t.target is not None)
ASIDE = next(vessel for vessel in VESSELS if vessel not in (TICKET.source, TICKET.target))
MASS = TICKET.mass.value if TICKET.mass is not None else 0.0


def on_ticket(change: Callable[[Ticket], list[Ticket]]) -> Change:
    return tickets(lambda t: change(t) if t.name == TICKET.name else [t])


@pytest.mark.parametrize(
    ("kind", "subject", "onset", "change"),
    [
        ("level_bias", ("tk-1",), 2, biased("level", 1000.0, "tk-1", 2)),
        ("level_bias", ("tk-1",), 0, biased("level", 1000.0, "tk-1", 0)),
        ("temperature_bias", ("tk-2",), 3, biased("temperature", 1.0, "tk-2", 3)),
        ("density_bias", ("sample:tk-0:1",), 4,
         stocks(lambda s: s.slopes["density"] if "sample:tk-0:1" in s.samples and s.close >= 4 else 0.0)),
        ("density_bias", ("density:lab",), 2, stocks(lambda s: s.slopes["density"] if s.close >= 2 else 0.0)),
        ("bad_stock_take", ("tk-0",), 3, stocks(lambda s: float((s.vessel, s.close) == ("tk-0", 3)))),
        ("bad_stock_take", ("tk-0",), 5, stocks(lambda s: float((s.vessel, s.close) == ("tk-0", 5)))),
        ("vessel_loss", ("tk-1",), 2, stocks(lambda s: -float(s.vessel == "tk-1" and s.close >= 2))),
        ("slow_loss", ("tk-1",), 2, stocks(lambda s: -float(max(0, s.close - 1) * (s.vessel == "tk-1")))),
        ("unrecorded_transfer", ("tk-0", "tk-2"), 4,
         stocks(lambda s: float(s.close >= 4) * {"tk-0": -1.0, "tk-1": 0.0, "tk-2": 1.0}[s.vessel])),
        ("unrecorded_transfer", ("tk-2", ""), 4, stocks(lambda s: -float(s.vessel == "tk-2" and s.close >= 4))),
        ("meter_bias", ("M",), 3, tickets(lambda t: [scaled(t, 1.01 if t.night >= 3 else 1.0)])),
        ("wrong_transfer", (TICKET.name,), 3, on_ticket(lambda t: [scaled(t, 1.0 + 1.0 / MASS)])),
        ("duplicated_transfer", (TICKET.name,), 3, on_ticket(lambda t: [t, replace(t, name="again")])),
        ("misrouted_transfer", (TICKET.name, TICKET.target, ASIDE), 3,
         lambda w: replace(w, stocks=on_arrival(TICKET.target, -MASS, w) )),
        ("misrouted_transfer", (TICKET.name, TICKET.source, ASIDE), 3,
         lambda w: replace(w, stocks=on_arrival(TICKET.source, MASS, w))),
        ("late_transfer", (TICKET.name, "next"), 3, lambda w: physically(w, 4)),
        ("late_transfer", (TICKET.name, "previous"), 2, lambda w: physically(w, 2)),
    ],
)  # fmt: skip
def test_a_column_is_what_planting_the_fault_adds(
    kind: str, subject: tuple[str, ...], onset: int, change: Change
) -> None:  # fmt: skip
    found = candidates(assemble(Part(VESSELS, WINDOW)))
    added = residual(change(WINDOW)) - residual(WINDOW)
    own = found.columns[:, [column(found, kind, subject, onset)]].toarray()[:, 0]
    assert np.abs(added).max() > 0.5
    assert own == pytest.approx(added, abs=1e-6)


def on_arrival(named: str | None, mass: float, window: Window) -> list[Stock]:
    """The books say one vessel, the mass truly moved at another: from that night on its contents differ."""
    change = {named: mass, ASIDE: -mass}
    return [shifted(s, change.get(s.vessel, 0.0) if s.close >= 3 else 0.0) for s in window.stocks]


def physically(window: Window, night: int) -> Window:
    """The ticket's mass moved in another night than the books have it."""
    sign = {TICKET.target: 1.0, TICKET.source: -1.0}
    between = [3] if night == 4 else [2]  # closes at which the contents differ from what the ticket says
    step = -1.0 if night == 4 else 1.0
    return replace(window, stocks=[
        shifted(s, step * MASS * sign.get(s.vessel, 0.0) if s.close in between else 0.0) for s in window.stocks
    ])  # fmt: skip


def test_fixed_sizes_scales_and_what_was_moved() -> None:
    found = candidates(assemble(Part(VESSELS, WINDOW)))
    fixed = {kind for at, kind in enumerate(KINDS) if found.fixed[found.kind == at].any()}
    assert fixed == {"late_transfer", "duplicated_transfer", "misrouted_transfer"}
    per_mm = 160.0  # kg: 200 m² of 800 kg/m³
    loss, slow = column(found, "vessel_loss", ("tk-1",), 2), column(found, "slow_loss", ("tk-1",), 2)
    assert found.scale[[loss, slow]] == pytest.approx([20.0 * per_mm, 2.0 * per_mm])  # 20 mm, 2 mm a day
    assert found.moved[[loss, slow]].tolist() == [1.0, 4.0]
    scales = {kind: found.scale[found.kind == KINDS.index(kind)][0] for kind in KINDS}
    instruments = ("level_bias", "temperature_bias", "density_bias", "meter_bias")
    assert [scales[one] for one in instruments] == [15.0, 2.5, 5.0, 0.7]  # mm, K, kg/m3, %
    last = next(s for s in WINDOW.stocks if (s.vessel, s.close) == ("tk-1", 5))
    level = column(found, "level_bias", ("tk-1",), 2)
    assert found.moved[level] == pytest.approx(last.slopes["level"] / 1000.0)
    assert found.unit[column(found, "duplicated_transfer", (TICKET.name,))] == pytest.approx(MASS)


def test_a_check_sees_the_instrument_in_use_and_the_meter() -> None:
    mass = Estimate(100.0, {"level:a": 3.0, "sample:s": 2.0})
    both = [Stock("a", k, mass, {"level": 5000.0, "density": 7.0}, ("sample:s",)) for k in (0, 1, 2)]
    moved = [Ticket("t", 2, None, "a", Estimate(300.0), "M")]
    checks = [
        Check("a", 2, Estimate(4.0, {"dip": 1.0}), "level", 5000.0),
        Check("a", 2, Estimate(4.0, {"sample:s": 2.0, "density:x": -1.0}), "density", 7.0),
        Check("M", 2, Estimate(2.0, {"meter:M": 1.0}), "meter", 3.0),
        Check("a", 2, Estimate(2.0, {"probe": 1.0}), "temperature", 3.0),
    ]
    rows = assemble(Part(("a",), Window((1.0, 1.0), both, moved, checks)))
    found = candidates(rows)
    seen = found.columns.toarray()[rows.check_rows]
    assert seen[:, column(found, "level_bias", ("a",), 1)].tolist() == [5.0, 0.0, 0.0, 0.0]
    assert seen[:, column(found, "density_bias", ("sample:s",), 1)].tolist() == [0.0, 7.0, 0.0, 0.0]
    assert seen[:, column(found, "meter_bias", ("M",), 2)].tolist() == [0.0, 0.0, 3.0, 0.0]
    assert not seen[:, column(found, "vessel_loss", ("a",), 1)].any()


def test_where_no_close_knows_a_millimetre_a_share_of_the_balances_spread_stands_for_it() -> None:
    full = [Stock("a", k, Estimate(100.0, {f"{k}": 30.0}), {}) for k in (0, 1, 2)]
    found = candidates(assemble(Part(("a",), Window((1.0, 1.0), full, []))))
    assert found.scale[column(found, "vessel_loss", ("a",), 1)] == pytest.approx(20 * 0.05 * 30.0 * 2.0**0.5)
