"""What each fault would add to a group's balances: one column for each kind, subject and onset."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np

from models.arrays import FloatArray, IntArray
from models.balance.rows import BEYOND, Rows, check_of
from models.balance.signatures import (
    DENSITY,
    LEVEL,
    LOSS,
    METER,
    OUTSIDE,
    SLOW,
    STOCK_TAKE,
    TEMPERATURE,
    UNRECORDED,
    Candidates,
    Columns,
)  # fmt: skip
from models.balance.ticket_faults import ALL_WAYS, PLAUSIBLE_MASS, tickets, ways
from models.balance.window import Ticket, plausible

MM_PER_M = 1000.0  # exact
PER_CENT = 100.0  # exact
# How large a fault may plausibly be, one standard deviation: proposals, tried on simulated sites.
PLAUSIBLE = {LEVEL: 15.0, TEMPERATURE: 2.5, DENSITY: 5.0, METER: 0.7}  # mm, K, kg/m3, %
PLAUSIBLE_RATE = 2.0  # mm of the vessel's level a day
FALLBACK_ROWS = 0.05  # of the spread of a vessel's balance, for 1 mm where no close knows what it holds


def _stocks(rows: Rows, columns: Columns, per_mm: FloatArray) -> None:
    """Losses, and stock-takes that were wrong once."""
    nights = np.arange(1, rows.nights + 1)
    days = np.array(rows.part.window.days)
    later = np.where(nights[None, :] >= nights[:, None], days[None, :], 0.0)  # nights of onset by nights
    for at, vessel in enumerate(rows.part.vessels):
        subject, own = columns.subject(vessel), rows.row_of[at]
        following = np.append(own[1:], BEYOND)
        mass = PLAUSIBLE_MASS * per_mm[at]
        columns.add(LOSS, subject, nights, [(own, -np.ones(len(own)))], scale=mass)
        everywhere = np.broadcast_to(own, later.shape)
        rate = PLAUSIBLE_RATE * per_mm[at]
        columns.add(SLOW, subject, nights, [(everywhere, -later)], scale=rate, moved=later.sum(axis=1))
        one = np.ones(len(own))
        columns.add(STOCK_TAKE, subject, nights, [(own, one), (following, -one)], scale=mass)


def _biased(
    rows: Rows, columns: Columns, kind: int, name: str, slopes: Mapping[str, FloatArray],
    checks: Sequence[tuple[int, int, float]], since: IntArray,
) -> None:  # fmt: skip
    """An instrument that reads high from a close on: what it adds at each close, and to the checks since."""
    closes = np.arange(rows.nights + 1)
    from_on = closes[None, :] >= since[:, None]  # onsets by closes
    entries: list[tuple[IntArray, FloatArray]] = []
    moved = np.zeros(len(since))
    place = {vessel: at for at, vessel in enumerate(rows.part.vessels)}
    for vessel, slope in slopes.items():
        held = np.where(from_on, slope[None, :], 0.0)
        own = np.broadcast_to(rows.row_of[place[vessel]], (len(since), rows.nights))
        entries.append((own, np.diff(held, axis=1)))
        moved += held[:, -1]
    for row, night, value in checks:
        entries.append((np.full(len(since), row), np.where(since <= night, value, 0.0)))
    columns.add(kind, columns.subject(name), since, entries, scale=PLAUSIBLE[kind], moved=moved)


def _instruments(rows: Rows, columns: Columns) -> None:
    """Levels, temperatures and densities that are read wrong from a close on."""
    closes = rows.nights + 1
    slopes: dict[int, dict[str, dict[str, FloatArray]]] = {LEVEL: {}, TEMPERATURE: {}, DENSITY: {}}
    for stock in rows.part.window.stocks:
        if stock.mass is None and stock.reopened is None:
            continue
        for kind, quantity, per in ((LEVEL, "level", MM_PER_M), (TEMPERATURE, "temperature", 1.0)):
            if (slope := stock.slopes.get(quantity, 0.0)) != 0.0:
                own = slopes[kind].setdefault(stock.vessel, {}).setdefault(stock.vessel, np.zeros(closes))
                own[stock.close] = slope / per
        for sample in stock.samples:
            own = slopes[DENSITY].setdefault(sample, {}).setdefault(stock.vessel, np.zeros(closes))
            own[stock.close] = stock.slopes.get("density", 0.0)
    checks: dict[tuple[int, str], list[tuple[int, int, float]]] = {}
    for row, check in check_of(rows):
        if check.kind == "density":
            for error, part in check.difference.parts.items():  # the check's own errors enter with a minus
                checks.setdefault((DENSITY, error), []).append((row, check.night, float(np.sign(part)) * check.slope))
        elif check.kind in ("level", "temperature"):
            kind, per = (LEVEL, MM_PER_M) if check.kind == "level" else (TEMPERATURE, 1.0)
            checks.setdefault((kind, check.vessel), []).append((row, check.night, check.slope / per))
    for kind, subjects in slopes.items():
        for name, of_vessel in subjects.items():
            since = np.flatnonzero(np.any([slope != 0.0 for slope in of_vessel.values()], axis=0))
            _biased(rows, columns, kind, name, of_vessel, checks.get((kind, name), ()), since)


def _meters(rows: Rows, columns: Columns, ends: Mapping[int, tuple[int, int]]) -> None:
    """Meters that read high from a night on, until they were proved again."""
    checks: dict[str, list[tuple[int, int, float]]] = {}
    for row, check in check_of(rows):
        if check.kind == "meter":
            checks.setdefault(check.vessel, []).append((row, check.night, check.slope))
    used: dict[str, list[tuple[Ticket, int, int]]] = {}
    for at, ticket in enumerate(rows.part.window.tickets):
        if ticket.meter is not None and ticket.mass is not None:
            used.setdefault(ticket.meter, []).append((ticket, *ends[at]))
    for meter, own in used.items():
        night = np.array([ticket.night for ticket, *_ in own])
        source, target = (np.array([one[place] for one in own]) for place in (1, 2))
        mass = np.array([ticket.mass.value for ticket, *_ in own if ticket.mass is not None]) / PER_CENT
        since = np.unique(night)
        after = np.where(night[None, :] >= since[:, None], mass[None, :], 0.0)
        shape = after.shape
        entries = [(np.broadcast_to(source, shape), after), (np.broadcast_to(target, shape), -after)]
        for row, known, value in checks.get(meter, ()):
            entries.append((np.full(len(since), row), np.where(since <= known, value, 0.0)))
        columns.add(METER, columns.subject(meter), since, entries, scale=PLAUSIBLE[METER], moved=after.sum(axis=1))


def _unrecorded(rows: Rows, columns: Columns, per_mm: FloatArray) -> None:
    """Movements without a ticket, between two vessels or one and what is beyond the books."""
    linked, small = ways(rows), len(rows.part.vessels) <= ALL_WAYS
    nights = np.arange(1, rows.nights + 1)
    for one, vessel in enumerate(rows.part.vessels):
        minus = -np.ones(rows.nights)
        mass = PLAUSIBLE_MASS * per_mm[one]
        columns.add(UNRECORDED, columns.subject(vessel, OUTSIDE), nights, [(rows.row_of[one], minus)], scale=mass)
        others = np.array([at for at in range(one + 1, len(rows.part.vessels)) if small or (one, at) in linked])
        if len(others):
            subject = np.array([columns.subject(vessel, rows.part.vessels[other]) for other in others])
            many = np.tile(nights, len(others))
            here, there = np.tile(rows.row_of[one], len(others)), rows.row_of[others].ravel()
            mass_of_two = np.repeat(0.5 * PLAUSIBLE_MASS * (per_mm[one] + per_mm[others]), rows.nights)
            ones = np.ones(len(many))
            entries = [(here, -ones), (there, ones)]
            columns.add(UNRECORDED, np.repeat(subject, rows.nights), many, entries, scale=mass_of_two)


def candidates(rows: Rows) -> Candidates:
    """Every fault that a group's balances could show.

    Parameters
    ----------
    rows : Rows
        The group's balances over the window. [kg]

    Returns
    -------
    Candidates
        One column for each kind, subject and onset. [kg per unit]

    Notes
    -----
    With S_k = ∂m_k/∂x at close k, q a movement's mass and n the onset, a fault of one unit adds to A y::

        an instrument reads high from close n on: f_k = S_k [k ≥ n] − S_k−1 [k−1 ≥ n]        (1)
        mass is lost: −1 in night n, or −(days of night k) for k ≥ n        (2)
        a stock-take is too high once: +1 in night n, −1 in the next        (3)
        a meter reads 1 % high: −q/100 at the vessel that received, +q/100 at that which delivered        (4)

    An unrecorded movement takes 1 from one vessel and gives it to the other; a ticket's fault takes its own
    contribution away and puts it where it belongs: nowhere, in another night, or at another vessel.

    References
    ----------
    .. [1] S. Narasimhan, R. S. H. Mah, AIChE J. 33 (1987) 1514–1521: a fault is a signature of unknown size.
    """
    per_mm = _per_mm(rows)
    place = {vessel: at for at, vessel in enumerate(rows.part.vessels)}

    def row(vessel: str | None, night: int) -> int:
        return BEYOND if vessel is None else int(rows.row_of[place[vessel], night - 1])

    moved = enumerate(rows.part.window.tickets)
    ends = {at: (row(one.source, one.night), row(one.target, one.night)) for at, one in moved}
    columns = Columns()
    _stocks(rows, columns, per_mm)  # eq. 2, 3
    _instruments(rows, columns)  # eq. 1
    _meters(rows, columns, ends)  # eq. 4
    _unrecorded(rows, columns, per_mm)
    tickets(rows, columns, ends, per_mm)
    return columns.gather(len(rows.white))


def _per_mm(rows: Rows) -> FloatArray:
    """Mass of one millimetre of each vessel; where no close knows it, a share of the spread of its balances."""
    known: dict[str, list[float]] = {}
    for stock in rows.part.window.stocks:
        known.setdefault(stock.vessel, []).append(stock.per_mm)
    spread = rows.uncertainty()
    found = []
    for at, vessel in enumerate(rows.part.vessels):
        own = rows.row_of[at][rows.row_of[at] != BEYOND]
        fallback = FALLBACK_ROWS * float(np.median(spread[own])) if len(own) else 1.0
        found.append(plausible(known.get(vessel, ()), max(fallback, 1e-3)))
    return np.array(found)
