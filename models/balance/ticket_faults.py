"""What a wrong, shifted, doubled or misdirected ticket would add to a group's balances."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np

from models.arrays import FloatArray, IntArray
from models.balance.rows import Rows
from models.balance.signatures import DUPLICATED, LATE, MISROUTED, WRONG, Columns
from models.balance.window import Ticket

PLAUSIBLE_MASS = 20.0  # mm of the vessel's level, one standard deviation: a proposal, tried on simulated sites
ALL_WAYS = 16  # vessels of a group up to which a movement may join any two; above, those that some ticket joins
TWIN_PRIOR = 50.0  # times as likely: two movements of one mass between the same ends in one night


def tickets(rows: Rows, columns: Columns, ends: Mapping[int, tuple[int, int]], per_mm: FloatArray) -> None:
    """Tickets that are wrong, early or late, entered twice, or given to another vessel.

    Parameters
    ----------
    rows : Rows
        The group's balances. [kg]
    columns : Columns
        Where they are added. [kg per unit]
    ends : mapping of int to (int, int)
        By place of the ticket: rows of its source and target. [1]
    per_mm : FloatArray, shape (vessels,)
        Mass of one millimetre of level. [kg]
    """
    place = {vessel: at for at, vessel in enumerate(rows.part.vessels)}
    twins, linked = twin_names(rows.part.window.tickets), ways(rows)
    parts: dict[str, list[tuple[Ticket, float, int, int]]] = {}
    for at, ticket in enumerate(rows.part.window.tickets):
        if ticket.mass is not None and ticket.mass.value != 0.0:
            parts.setdefault(ticket.name, []).append((ticket, ticket.mass.value, *ends[at]))
    for name, own in parts.items():
        first = own[0][0]
        onset = np.array([min(ticket.night for ticket, *_ in own)])
        whole = sum(mass for _, mass, _, _ in own)
        source, target = (np.array([[one[at] for one in own]]) for at in (2, 3))
        mass = np.array([[one[1] for one in own]])
        known = [per_mm[place[end]] for end in (first.source, first.target) if end is not None]
        both = [(target, -mass), (source, mass)]
        share = [(row, value / whole) for row, value in both]
        columns.add(WRONG, columns.subject(name), onset, share, scale=PLAUSIBLE_MASS * sum(known) / len(known))
        prior = TWIN_PRIOR if name in twins else 1.0
        columns.add(
            DUPLICATED, columns.subject(name), onset, both, fixed=True, unit=whole, moved=whole, prior=prior
        )
        if len(own) == 1:
            _shifted(rows, columns, first, both, place)
        _misrouted(rows, columns, onset, [one[0] for one in own], mass, (source, target), place, linked)


def _shifted(
    rows: Rows, columns: Columns, ticket: Ticket, both: Sequence[tuple[IntArray, FloatArray]],
    place: Mapping[str, int],
) -> None:  # fmt: skip
    """A ticket that belongs to the next night, or to the one before; what the last night lacks is still to come."""
    mass = abs(ticket.mass.value) if ticket.mass is not None else 0.0
    for word, step in (("next", 1), ("previous", -1)):
        night = ticket.night + step
        if night < 1:
            continue
        entries = list(both)
        for end, (_, value) in zip((ticket.target, ticket.source), both, strict=True):
            if end is not None and night <= rows.nights:
                entries.append((rows.row_of[place[end], night - 1], -value))
        onset = np.array([min(night, ticket.night)])
        subject = columns.subject(ticket.name, word)
        columns.add(LATE, subject, onset, entries, fixed=True, unit=mass, moved=mass)


def _misrouted(
    rows: Rows, columns: Columns, onset: IntArray, tickets: Sequence[Ticket], mass: FloatArray,
    ends: tuple[IntArray, IntArray], place: Mapping[str, int], linked: frozenset[tuple[int, int]],
) -> None:  # fmt: skip
    """A ticket that names one vessel where another moved, for every other vessel of the group."""
    first, whole = tickets[0], float(mass.sum())
    nights = np.array([ticket.night - 1 for ticket in tickets])
    for named, rows_named, sign in ((first.target, ends[1], -1.0), (first.source, ends[0], 1.0)):
        other = first.source if named == first.target else first.target
        others = [at for vessel, at in place.items() if vessel not in (first.source, first.target)]
        if len(place) > ALL_WAYS and other is not None:
            others = [at for at in others if (place[other], at) in linked]
        if named is None or not others:
            continue
        there = rows.row_of[np.array(others)[:, None], nights[None, :]]
        here = np.broadcast_to(rows_named, there.shape)
        subject = np.array([columns.subject(first.name, named, rows.part.vessels[at]) for at in others])
        entries = [
            (here, np.broadcast_to(sign * mass, there.shape)),
            (there, np.broadcast_to(-sign * mass, there.shape)),
        ]
        many = np.repeat(onset, len(others))
        columns.add(MISROUTED, subject, many, entries, fixed=True, unit=whole, moved=whole)


def ways(rows: Rows) -> frozenset[tuple[int, int]]:
    """Vessels between which some ticket of the window runs.

    Parameters
    ----------
    rows : Rows
        A group's balances. [kg]

    Returns
    -------
    frozenset of (int, int)
        Places of both, in either order. [1]
    """
    place = {vessel: at for at, vessel in enumerate(rows.part.vessels)}
    pairs: set[tuple[int, int]] = set()
    for ticket in rows.part.window.tickets:
        if ticket.source is not None and ticket.target is not None:
            pair = place[ticket.source], place[ticket.target]
            pairs |= {pair, pair[::-1]}
    return frozenset(pairs)


def twin_names(tickets: Sequence[Ticket]) -> frozenset[str]:
    """Movements of one mass between the same ends by the same meter in one night.

    Parameters
    ----------
    tickets : sequence of Ticket
        Movements. [kg]

    Returns
    -------
    frozenset of str
        Names of those that have a twin. [1]
    """
    alike: dict[tuple[object, ...], set[str]] = {}
    for ticket in tickets:
        if ticket.mass is not None:
            key = (ticket.night, ticket.source, ticket.target, ticket.meter, ticket.mass.value)
            alike.setdefault(key, set()).add(ticket.name)
    return frozenset(name for names in alike.values() if len(names) > 1 for name in names)
