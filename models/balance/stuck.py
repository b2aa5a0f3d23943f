"""Gauges that stood still while their vessels' tickets moved much: a rule, where no signature can tell."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from models.balance.evidence import Search
from models.balance.naming import Suspect
from models.balance.rows import BEYOND, Rows
from models.balance.signatures import STOCK_TAKE, Candidates

MOVED = 6.0  # standard uncertainties of the imbalance, that the tickets' net mass exceeds
HALF_WIDTH = 1.959964  # standard deviations, 97.5 % of the normal law


@dataclass(frozen=True)
class Stuck:
    """A gauge that shows one level while mass moves.

    Parameters
    ----------
    vessel : str
        Whose. [1]
    first, last : int
        Closes that it shows the same level as the one before. [1]
    columns : tuple of int
        One for each of them: that inventory taken out. [1]
    """

    vessel: str
    first: int
    last: int
    columns: tuple[int, ...]


def find_stuck(rows: Rows, found: Candidates) -> tuple[Stuck, ...]:
    """Gauges that are stuck, or were within the window.

    Parameters
    ----------
    rows : Rows
        A group's balances. [kg]
    found : Candidates
        Explanations; the wrong stock-takes among them take an inventory out. [kg per unit]

    Returns
    -------
    tuple of Stuck
        One for each run of closes. [1]

    Notes
    -----
    A run begins in a night whose tickets' net mass exceeds six standard uncertainties of the imbalance while a
    fresh reading shows the level of the close before, and goes on as long as the level does not move.
    """
    stocks = {(stock.vessel, stock.close): stock for stock in rows.part.window.stocks if stock.still}
    if not stocks:
        return ()
    net: dict[tuple[str, int], float] = {}
    for ticket in rows.part.window.tickets:
        if ticket.mass is not None:
            for end, sign in ((ticket.source, -1.0), (ticket.target, 1.0)):
                if end is not None:
                    net[end, ticket.night] = net.get((end, ticket.night), 0.0) + sign * ticket.mass.value
    column = {
        (found.subjects[found.subject[at]][0], int(found.onset[at])): int(at)
        for at in np.flatnonzero(found.kind == STOCK_TAKE)
    }
    spread = rows.uncertainty()
    runs: list[Stuck] = []
    for place, vessel in enumerate(rows.part.vessels):
        begun: int | None = None
        for night in range(1, rows.nights + 2):
            still = (vessel, night) in stocks
            if begun is not None and not still:
                taken = (column.get((vessel, one)) for one in range(begun, night))
                runs.append(Stuck(vessel, begun, night - 1, tuple(one for one in taken if one is not None)))
                begun = None
            if still and begun is None:
                row = rows.row_of[place, night - 1]
                if row != BEYOND and abs(net.get((vessel, night), 0.0)) > MOVED * spread[row]:
                    begun = night
    return tuple(run for run in runs if run.columns)


def describe_stuck(run: Stuck, search: Search) -> Suspect:
    """A stuck gauge as the suspect that it is: how far its last reading is from the truth.

    Parameters
    ----------
    run : Stuck
        The gauge. [1]
    search : Search
        Evidence with everything named but its last inventory. [1]

    Returns
    -------
    Suspect
        Magnitude is the reconciled less the reported mass. [kg]
    """
    last = run.columns[-1]
    size, sd = float(search.evidence.size[last]), float(search.evidence.sd[last])
    half = HALF_WIDTH * sd if np.isfinite(sd) else 0.0
    statistic = float(search.evidence.statistic[last])
    interval = (-size - half, -size + half)
    return Suspect("level_stuck", (run.vessel,), -size, interval, "kg", -size, run.first, statistic, 1.0, (), last)
