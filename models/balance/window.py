"""A window of nights: what was measured at its closes, what moved between them, and what was checked."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from models.estimate import Estimate


@dataclass(frozen=True)
class Stock:
    """One vessel at one close, as its night closed.

    Parameters
    ----------
    vessel : str
        Its id. [1]
    close : int
        Number of the close: 0 opens the window. [1]
    mass : Estimate or None
        Its content; None where it was not measured. [kg]
    slopes : mapping of str to float
        By quantity (level, temperature, density) what one unit of an instrument's error adds to the mass; what
        is absent has no such instrument. [kg per m, K or kg/m3]
    samples : tuple of str
        Names of the errors of its density, each a possible subject of a wrong density. [1]
    reopened : Estimate or None
        The same content as the next night opens with it, where a definition changed at this close. [kg]
    per_mm : float
        Mass of one millimetre of level: the scale of what is plausible. [kg]
    still : bool
        Whether a fresh reading shows the level of the close before, within the gauge's step. [1]
    """

    vessel: str
    close: int
    mass: Estimate | None
    slopes: Mapping[str, float]
    samples: tuple[str, ...] = ()
    reopened: Estimate | None = None
    per_mm: float = 0.0
    still: bool = False


@dataclass(frozen=True)
class Ticket:
    """One movement's part in one night; a movement split at a close is two of these with one name.

    Parameters
    ----------
    name : str
        Id of the movement. [1]
    night : int
        Number of the night, from 1. [1]
    source, target : str or None
        The vessels that lost and gained it; None is beyond the books. [1]
    mass : Estimate or None
        What was recorded; None where it was not metered. [kg]
    meter : str or None
        The meter, and since which proving. [1]
    """

    name: str
    night: int
    source: str | None
    target: str | None
    mass: Estimate | None
    meter: str | None = None


@dataclass(frozen=True)
class Check:
    """A second source's value of something that a stock or a meter rests on.

    Parameters
    ----------
    vessel : str
        The vessel, or of the kind "meter" the meter as tickets name it. [1]
    night : int
        The first night whose close follows it. [1]
    difference : Estimate
        Value in use less the check's, as mass; its parts name the shared errors of both. [kg]
    kind : str
        level, temperature, density or meter. [1]
    slope : float
        What one unit of error of the value in use adds to the difference. [kg per m, K, kg/m3 or %]
    """

    vessel: str
    night: int
    difference: Estimate
    kind: str
    slope: float


@dataclass(frozen=True)
class Window:
    """Closes 0 … N and the nights 1 … N between them.

    Parameters
    ----------
    days : tuple of float
        Length of each night. [d]
    stocks : sequence of Stock
        At most one for each vessel and close; where there is none nothing was measured. [kg]
    tickets : sequence of Ticket
        What moved. [kg]
    checks : sequence of Check
        What was checked. [kg]
    """

    days: tuple[float, ...]
    stocks: Sequence[Stock]
    tickets: Sequence[Ticket]
    checks: Sequence[Check] = ()

    @property
    def nights(self) -> int:
        """Number of nights. [1]"""
        return len(self.days)


@dataclass(frozen=True)
class Part:
    """What one group of vessels, tied by movements, has in a window.

    Parameters
    ----------
    vessels : tuple of str
        Its members, sorted. [1]
    window : Window
        Their stocks, movements and checks. [kg]
    """

    vessels: tuple[str, ...]
    window: Window


class Merged:
    """Sets of names that have become one: union-find."""

    def __init__(self) -> None:
        self.parent: dict[object, object] = {}

    def find(self, name: object) -> object:
        """The name that stands for the set.

        Parameters
        ----------
        name : object
            Any member. [1]

        Returns
        -------
        object
            One member, the same for all of them. [1]
        """
        parent = self.parent
        parent.setdefault(name, name)
        while parent[name] != name:
            parent[name] = parent[parent[name]]
            name = parent[name]
        return name

    def join(self, one: object, other: object) -> None:
        """Make two sets one.

        Parameters
        ----------
        one, other : object
            A member of each. [1]
        """
        self.parent[self.find(one)] = self.find(other)


def split(window: Window) -> tuple[Part, ...]:
    """The window's groups: vessels tied to each other by movements, and by nothing else.

    Parameters
    ----------
    window : Window
        A whole site. [kg]

    Returns
    -------
    tuple of Part
        One for each group, in the order of their first members. [kg]

    Notes
    -----
    An error that two groups share is given to each as its own, so that the law of each stays exact and only
    their dependence is dropped. A movement without a vessel at either end concerns no group. A check of a
    meter goes to every group that the meter serves.
    """
    tied = Merged()
    for ticket in window.tickets:
        if ticket.source is not None and ticket.target is not None:
            tied.join(ticket.source, ticket.target)
    named = {stock.vessel for stock in window.stocks}
    named |= {end for ticket in window.tickets for end in (ticket.source, ticket.target) if end is not None}
    members: dict[object, list[str]] = {}
    for vessel in sorted(named):
        members.setdefault(tied.find(vessel), []).append(vessel)
    stocks: dict[object, list[Stock]] = {root: [] for root in members}
    tickets: dict[object, list[Ticket]] = {root: [] for root in members}
    checks: dict[object, list[Check]] = {root: [] for root in members}
    serves: dict[str, set[object]] = {}
    for stock in sorted(window.stocks, key=lambda one: (one.vessel, one.close)):
        stocks[tied.find(stock.vessel)].append(stock)
    for ticket in sorted(window.tickets, key=lambda one: (one.night, one.name)):
        end = ticket.source if ticket.source is not None else ticket.target
        if end is not None:
            tickets[tied.find(end)].append(ticket)
            if ticket.meter is not None:
                serves.setdefault(ticket.meter, set()).add(tied.find(end))
    for check in sorted(window.checks, key=lambda one: (one.night, one.vessel, one.kind)):
        roots = serves.get(check.vessel, set()) if check.kind == "meter" else {tied.find(check.vessel)} & set(members)
        for root in roots:
            checks[root].append(check)
    return tuple(
        Part(tuple(own), Window(window.days, stocks[root], tickets[root], checks[root]))
        for root, own in members.items()
    )


def plausible(per_mm: Sequence[float], fallback: float) -> float:
    """Mass of one millimetre of a vessel's level, over the closes that know it.

    Parameters
    ----------
    per_mm : sequence of float
        As the stocks have it; nought where it is not known. [kg]
    fallback : float
        What stands where no close knows it. [kg]

    Returns
    -------
    float
        Mean of those that are known. [kg]
    """
    known = [value for value in per_mm if value > 0.0]
    return math.fsum(known) / len(known) if known else fallback
