"""One period closed: what each node should hold, what it holds, and whether chance explains the difference."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from scipy.sparse import block_array, csc_array, csr_array, diags_array, eye_array
from scipy.sparse.linalg import splu
from scipy.special import chdtrc, erfc, ndtri

from models.arrays import FloatArray
from models.balance.network import OUTSIDE as BEYOND
from models.balance.network import Network, classify
from models.estimate import Estimate, combine

POWER = 0.95  # chance that a detectable imbalance is flagged
RANK_TOLERANCE = 1e-9  # of the largest eigenvalue of the rows' correlation
DENSE_ROWS = 400  # balances of a group up to which its correlation is formed


@dataclass(frozen=True)
class Movement:
    """What moved between two nodes; None as an end is beyond the books, None as a mass was not measured.

    Parameters
    ----------
    name : str
        Its id. [1]
    source, target : str or None
        The nodes that lost and gained it. [1]
    mass : Estimate or None
        Its mass with named errors. [kg]
    """

    name: str
    source: str | None
    target: str | None
    mass: Estimate | None


@dataclass(frozen=True)
class Row:
    """One balance: a node, or nodes merged by what was not measured between them.

    Parameters
    ----------
    members : tuple of str
        The nodes. [1]
    imbalance : Estimate
        Physical less book; a loss is negative. [kg]
    score, p_value : float
        Imbalance over its standard uncertainty, and the chance of such a score or a larger. [1]
    detectable : float
        Imbalance that would be flagged with a chance of 95 %. [kg]
    flagged : bool
        Whether chance does not explain it. [1]
    """

    members: tuple[str, ...]
    imbalance: Estimate
    score: float
    p_value: float
    detectable: float
    flagged: bool


@dataclass(frozen=True)
class Group:
    """Rows that measured movements tie together, tested as one.

    Parameters
    ----------
    members : tuple of str
        The nodes. [1]
    statistic, p_value : float
        r' H^-1 r and its chance under no fault. [1]
    degrees_of_freedom : int
        Rank of H. [1]
    """

    members: tuple[str, ...]
    statistic: float
    degrees_of_freedom: int
    p_value: float


@dataclass(frozen=True)
class Night:
    """The books of one period: rows, groups, what stands without a row, and what is known of movements.

    Parameters
    ----------
    rows : tuple of Row
        One for each balance. [1]
    without : tuple of str
        Nodes that have no row: something at their edge was not measured. [1]
    groups : tuple of Group
        One for each set of rows tied by movements. [1]
    observability : mapping of str to str
        By movement: redundant, nonredundant, observable or unobservable. [1]
    critical : float
        Score above which a row is flagged. [1]
    """

    rows: tuple[Row, ...]
    without: tuple[str, ...]
    groups: tuple[Group, ...]
    observability: Mapping[str, str]
    critical: float


OUTSIDE = ""  # the node that stands for everything beyond the books


class _Merged:
    """Nodes merged by what is not measured: union-find."""

    def __init__(self, names: Iterable[str]) -> None:
        self.parent = {name: name for name in (OUTSIDE, *names)}

    def find(self, name: str) -> str:
        while self.parent[name] != name:
            self.parent[name] = self.parent[self.parent[name]]
            name = self.parent[name]
        return name

    def join(self, one: str, other: str) -> None:
        self.parent[self.find(one)] = self.find(other)


def critical_score(rows: int, alarm_rate: float) -> float:
    """Score that any of so many balances passes by chance with a given rate.

    Parameters
    ----------
    rows : int
        Number of balances judged. [1]
    alarm_rate : float
        Chance of any flag when nothing is wrong. [1]

    Returns
    -------
    float
        Two-sided critical value of the normal law. [1]

    Notes
    -----
    ::

        c = z(1 − (1 − (1 − α)^(1/n))/2)        (1)

    References
    ----------
    .. [1] Z. Šidák, J. Am. Stat. Assoc. 62 (1967) 626–633.
    """
    if rows < 1:
        return math.inf
    each = -math.expm1(math.log1p(-alarm_rate) / rows)  # eq. 1
    return float(-ndtri(0.5 * each))


def night(
    opening: Mapping[str, Estimate | None], closing: Mapping[str, Estimate | None],
    movements: Sequence[Movement], alarm_rate: float,
) -> Night:  # fmt: skip
    """Balances of one period.

    Parameters
    ----------
    opening, closing : mapping of str to Estimate or None
        Mass of each node at both ends, None where it was not measured. [kg]
    movements : sequence of Movement
        What moved in the period. [kg]
    alarm_rate : float
        Chance of any flag when nothing is wrong. [1]

    Returns
    -------
    Night
        Rows, groups and what is known of each movement. [kg]

    Notes
    -----
    With shared errors added by sign before they are squared::

        imbalance = closing − opening − received + delivered        (1)

    What was not measured is an edge that merges the balances at its ends; a balance merged with what is
    beyond the books is none.

    References
    ----------
    .. [1] R. S. H. Mah, G. M. Stanley, D. M. Downing, Ind. Eng. Chem. Process Des. Dev. 15 (1976) 175–183.
    """
    names = sorted(closing)
    merged = _Merged(names)
    for name in names:
        if closing[name] is None or opening.get(name) is None:
            merged.join(name, OUTSIDE)
    for movement in movements:
        if movement.mass is None:
            merged.join(movement.source or OUTSIDE, movement.target or OUTSIDE)
    outside = merged.find(OUTSIDE)
    members: dict[str, list[str]] = {}
    for name in names:
        members.setdefault(merged.find(name), []).append(name)
    without = tuple(members.pop(outside, ()))
    critical = critical_score(len(members), alarm_rate)
    terms: dict[str, list[tuple[float, Estimate]]] = {root: [] for root in members}
    for name in names:
        if (root := merged.find(name)) in terms:
            terms[root] += [(1.0, _known(closing[name])), (-1.0, _known(opening[name]))]  # eq. 1
    for movement in movements:
        if movement.mass is None:
            continue
        for end, sign in ((movement.target, -1.0), (movement.source, 1.0)):
            if end is not None and (root := merged.find(end)) in terms:
                terms[root].append((sign, movement.mass))
    rows = {root: _row(tuple(members[root]), combine(terms[root]), critical) for root in members}
    observability = _observability(names, opening, closing, movements)
    return Night(tuple(rows.values()), without, _groups(rows, movements, merged), observability, critical)


def _known(estimate: Estimate | None) -> Estimate:
    assert estimate is not None
    return estimate


def _row(members: tuple[str, ...], imbalance: Estimate, critical: float) -> Row:
    u = imbalance.uncertainty
    score = imbalance.value / u if u > 0.0 else math.copysign(math.inf, imbalance.value) if imbalance.value else 0.0
    reach = critical + float(ndtri(POWER))
    p_value = float(erfc(abs(score) / math.sqrt(2.0)))
    return Row(members, imbalance, score, p_value, reach * u, abs(score) > critical)


def limits(row: Row, critical: float, label: Callable[[str], str], count: int = 3) -> tuple[tuple[str, float], ...]:
    """Instruments that keep smaller imbalances from being seen, and what could be seen without each.

    Parameters
    ----------
    row : Row
        One balance. [kg]
    critical : float
        Score above which it is flagged. [1]
    label : callable
        The instrument of an error's name; errors of one instrument are taken away together. [1]
    count : int
        How many are named. [1]

    Returns
    -------
    tuple of (str, float)
        Instrument and detectable imbalance without it, largest gain first. [1, kg]
    """
    variance: dict[str, float] = {}
    for name, part in row.imbalance.parts.items():
        variance[label(name)] = variance.get(label(name), 0.0) + part * part
    whole = math.fsum(variance.values())
    reach = critical + float(ndtri(POWER))
    largest = sorted(variance.items(), key=lambda item: (-item[1], item[0]))[:count]
    return tuple((name, reach * math.sqrt(max(0.0, whole - own))) for name, own in largest)


def _groups(rows: Mapping[str, Row], movements: Sequence[Movement], merged: _Merged) -> tuple[Group, ...]:
    """Rows tied by movements, each set tested as one."""
    tied = _Merged(rows)
    for movement in movements:
        if movement.source is not None and movement.target is not None:
            one, other = merged.find(movement.source), merged.find(movement.target)
            if one in rows and other in rows:
                tied.join(one, other)
    sets: dict[str, list[Row]] = {}
    for root, row in rows.items():
        sets.setdefault(tied.find(root), []).append(row)
    return tuple(_tested(sorted(own, key=lambda row: row.members)) for own in sets.values())


def _tested(rows: Sequence[Row]) -> Group:
    """One group's statistic r' H^-1 r, with H from the named errors that its rows share."""
    members = tuple(name for row in rows for name in row.members)
    residual = np.array([row.imbalance.value for row in rows])
    parts = _parts([row.imbalance for row in rows])
    scale = np.sqrt(np.asarray(parts.power(2).sum(axis=1)))
    certain = scale == 0.0
    if np.any(residual[certain] != 0.0) or np.all(certain):
        return Group(members, math.nan, 0, math.nan)
    parts, residual = csr_array(parts[~certain]), residual[~certain] / scale[~certain]  # 0 ± 0 says nothing
    parts = csr_array(diags_array(1.0 / scale[~certain]) @ parts)
    statistic, freedom = (_ranked if len(residual) <= DENSE_ROWS else _sparse)(parts, residual)
    return Group(members, statistic, freedom, float(chdtrc(freedom, max(statistic, 0.0))))


def _ranked(parts: csr_array, residual: FloatArray) -> tuple[float, int]:
    """Statistic and rank of few rows."""
    values, vectors = np.linalg.eigh((parts @ parts.T).toarray())
    kept = values > RANK_TOLERANCE * values[-1]
    along = vectors[:, kept].T @ residual
    return float(np.sum(along**2 / values[kept])), int(kept.sum())


def _sparse(parts: csr_array, residual: FloatArray) -> tuple[float, int]:
    """Statistic of many rows, the errors that they share as unknowns; a trace of variance keeps H regular."""
    often = np.bincount(parts.indices, minlength=parts.shape[1])
    own = np.asarray(parts[:, often == 1].power(2).sum(axis=1)) + RANK_TOLERANCE
    shared = csr_array(parts[:, often > 1])
    matrix = csc_array(block_array([[diags_array(own), shared], [shared.T, -eye_array(shared.shape[1])]]))
    lu = splu(matrix, permc_spec="MMD_AT_PLUS_A", options={"SymmetricMode": True})
    right = np.concatenate([residual, np.zeros(shared.shape[1])])
    found = lu.solve(right)
    found += lu.solve(right - matrix @ found)
    return float(residual @ found[: len(residual)]), len(residual)


def _parts(estimates: Sequence[Estimate]) -> csr_array:
    """Signed parts of the errors that estimates name: a row for each, a column for each error."""
    place: dict[str, int] = {}
    entries = [
        (row, place.setdefault(name, len(place)), part)
        for row, estimate in enumerate(estimates)
        for name, part in estimate.parts.items()
    ]
    table = np.array(entries, dtype=np.float64).reshape(-1, 3)
    at = table[:, 0].astype(np.intp), table[:, 1].astype(np.intp)
    return csr_array((table[:, 2], at), shape=(len(estimates), len(place)))


def _observability(
    names: Sequence[str], opening: Mapping[str, Estimate | None], closing: Mapping[str, Estimate | None],
    movements: Sequence[Movement],
) -> dict[str, str]:  # fmt: skip
    """Of each movement; an inventory that was not measured is an unmeasured way to the outside."""
    place = {name: index for index, name in enumerate(names)}
    place[OUTSIDE] = BEYOND
    lost = [place[name] for name in names if closing[name] is None or opening.get(name) is None]
    source = [place[one.source or OUTSIDE] for one in movements] + lost
    target = [place[one.target or OUTSIDE] for one in movements] + [BEYOND] * len(lost)
    measured = [one.mass is not None for one in movements] + [False] * len(lost)
    streams = [one.name for one in movements] + [""] * len(lost)
    network = Network(
        names, streams, np.array(source, dtype=np.intp), np.array(target, dtype=np.intp), np.array(measured, dtype=bool)
    )
    return dict(zip(streams, classify(network).observability[: len(movements)], strict=False))
