"""Masses that agree with every balance of the window, and how well they are known."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from scipy.linalg import qr
from scipy.sparse import csc_array

from models.arrays import FloatArray
from models.balance.rows import BEYOND, Rows, closing
from models.balance.signatures import (
    DENSITY,
    DUPLICATED,
    LEVEL,
    METER,
    STOCK_TAKE,
    TEMPERATURE,
    WRONG,
    Candidates,
)
from models.balance.window import Stock, Ticket
from models.estimate import Estimate

MM_PER_M = 1000.0  # exact
PER_CENT = 100.0  # exact
RANK_TOLERANCE = 1e-9  # of the largest column: less is spanned by the others


@dataclass(frozen=True)
class Reconciled:
    """A measured mass beside what the window makes of it.

    Parameters
    ----------
    subject : str
        The vessel at the last close, or the movement of the last night. [1]
    measured, mass : float
        As it was measured and as it agrees with the balances. [kg]
    uncertainty : float
        Standard uncertainty of the latter. [kg]
    """

    subject: str
    measured: float
    mass: float
    uncertainty: float


def of_stock(found: Candidates, column: int, stock: Stock) -> float:
    """What one unit of a named fault adds to a vessel's reading.

    Parameters
    ----------
    found : Candidates
        Explanations. [kg per unit]
    column : int
        The one named. [1]
    stock : Stock
        The vessel at a close. [kg]

    Returns
    -------
    float
        Nought where the reading is right and the mass is not. [kg per unit]
    """
    kind, since = found.kind[column], found.onset[column]
    name = found.subjects[found.subject[column]][0]
    if kind == DENSITY and name in stock.samples and stock.close >= since:
        return stock.slopes.get("density", 0.0)
    if name != stock.vessel or stock.close < since:
        return 0.0
    if kind == LEVEL:
        return stock.slopes.get("level", 0.0) / MM_PER_M
    if kind == TEMPERATURE:
        return stock.slopes.get("temperature", 0.0)
    return 1.0 if kind == STOCK_TAKE and stock.close == since else 0.0


def of_ticket(found: Candidates, column: int, ticket: Ticket, whole: float) -> float:
    """What one unit of a named fault adds to a movement's recorded mass.

    Parameters
    ----------
    found : Candidates
        Explanations. [kg per unit]
    column : int
        The one named. [1]
    ticket : Ticket
        A metered movement, or its part in one night. [kg]
    whole : float
        Mass of all its parts. [kg]

    Returns
    -------
    float
        Nought where the record is right. [kg per unit]
    """
    kind = found.kind[column]
    name = found.subjects[found.subject[column]][0]
    mass = 0.0 if ticket.mass is None else ticket.mass.value
    if kind == METER and name == ticket.meter and ticket.night >= found.onset[column]:
        return mass / PER_CENT
    if kind in (WRONG, DUPLICATED) and name == ticket.name:
        return mass if kind == DUPLICATED else mass / whole
    return 0.0


def reconcile(
    rows: Rows, measured: Sequence[Estimate], signatures: csc_array, effects: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Measured values made to agree with the balances, beside faults of free size.

    Parameters
    ----------
    rows : Rows
        A group's balances. [kg]
    measured : sequence of Estimate
        Values that enter them. [kg]
    signatures : csc_array, shape (rows, p)
        F: what one unit of each named fault adds to the balances. [kg per unit]
    effects : FloatArray, shape (measured, p)
        E: what it adds to the measured values themselves. [kg per unit]

    Returns
    -------
    tuple of FloatArray, shape (measured,)
        Reconciled values and their standard uncertainties. [kg]

    Notes
    -----
    With S the covariance of the measured values and a the faults' sizes by least squares::

        x = y − E a − S A' H⁻¹ (r − F a)        (1)
        cov x = S − S A' H⁻¹ A S + G (F' H⁻¹ F)⁻¹ G',  G = E − S A' H⁻¹ F        (2)

    References
    ----------
    .. [1] R. S. H. Mah, "Chemical Process Structures and Information Flows", Butterworths, 1990, ch. 8.
    """
    values = np.array([estimate.value for estimate in measured])
    if not len(values):
        return values, values
    across, variance = rows.shared_with(measured)
    seen = across @ rows.losses.T  # S A' L'⁻¹
    white = rows.losses @ signatures.toarray()
    residual, spread = rows.white, variance - np.einsum("ij,ij->i", seen, seen)  # eq. 2
    if white.shape[1]:
        basis, upper, order = qr(white, mode="economic", pivoting=True)
        rank = int(np.sum(np.abs(np.diag(upper)) > RANK_TOLERANCE * abs(upper[0, 0]))) if upper[0, 0] else 0
        basis, kept = basis[:, :rank], order[:rank]
        left = np.linalg.solve(upper[:rank, :rank].T, (effects[:, kept] - seen @ white[:, kept]).T)
        size = np.linalg.solve(upper[:rank, :rank], basis.T @ rows.white) if rank else np.zeros(0)
        values = values - effects[:, kept] @ size  # eq. 1
        residual = residual - white[:, kept] @ size
        spread = spread + np.einsum("ij,ij->j", left, left)  # eq. 2
    return values - seen @ residual, np.sqrt(np.maximum(spread, 0.0))  # eq. 1


def last_close(
    rows: Rows, found: Candidates, named: Sequence[Sequence[int]]
) -> tuple[tuple[Reconciled, ...], tuple[Reconciled, ...]]:
    """Closing masses and the last night's movements, corrected for what is named.

    Parameters
    ----------
    rows : Rows
        A group's balances. [kg]
    found : Candidates
        Explanations. [kg per unit]
    named : sequence of sequence of int
        For each signal the columns of its explanations, the first first. [1]

    Returns
    -------
    tuple of (tuple of Reconciled, tuple of Reconciled)
        Vessels that were measured, and metered movements. [kg]

    Notes
    -----
    Where explanations of one signal disagree on a vessel's closing mass, a loss and a wrong gauge, its balance
    of the night of the onset is left out and its mass rests on its own reading.
    """
    window = rows.part.window
    stocks = [stock for stock in window.stocks if stock.close == window.nights and closing(stock) is not None]
    tickets = [ticket for ticket in window.tickets if ticket.night == window.nights and ticket.mass is not None]
    whole: dict[str, float] = {}
    for ticket in window.tickets:
        whole[ticket.name] = whole.get(ticket.name, 0.0) + (0.0 if ticket.mass is None else ticket.mass.value)
    columns: list[FloatArray] = []
    effects: list[FloatArray] = []
    for explanations in named:
        of_stocks = np.array([[of_stock(found, one, stock) for one in explanations] for stock in stocks])
        apart = [at for at, own in enumerate(of_stocks) if own.any() and not own.all()]
        if apart:
            for at in apart:
                columns.append(_unit(rows, stocks[at].vessel, int(found.onset[explanations[0]])))
                effects.append(np.zeros(len(stocks) + len(tickets)))
            continue
        first = explanations[0]
        columns.append(found.columns[:, [first]].toarray()[:, 0])
        of_tickets = [of_ticket(found, first, ticket, whole[ticket.name]) for ticket in tickets]
        effects.append(np.concatenate([of_stocks[:, 0] if len(stocks) else [], of_tickets]))
    measured = [mass for stock in stocks if (mass := closing(stock)) is not None]
    measured += [ticket.mass for ticket in tickets if ticket.mass is not None]
    shape = (len(rows.white), len(columns))
    signatures = csc_array(np.array(columns).T if columns else np.zeros(shape))
    direct = np.array(effects).T if effects else np.zeros((len(measured), 0))
    values, spread = reconcile(rows, measured, signatures, direct)
    names = [stock.vessel for stock in stocks] + [ticket.name for ticket in tickets]
    found_masses = tuple(
        Reconciled(name, float(own.value), float(value), float(u))
        for name, own, value, u in zip(names, measured, values, spread, strict=True)
    )
    return found_masses[: len(stocks)], found_masses[len(stocks) :]


def _unit(rows: Rows, vessel: str, night: int) -> FloatArray:
    """A column that leaves one vessel's balance of one night out."""
    column = np.zeros(len(rows.white))
    at = rows.row_of[rows.part.vessels.index(vessel), max(night, 1) - 1]
    if at != BEYOND:
        column[at] = 1.0
    return column
