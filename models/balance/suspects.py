"""Which single faults explain what does not balance: their size, their interval, and what looks the same."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.special import ndtri

from models.arrays import FloatArray, IntArray
from models.balance.network import Network, equivalent_faults
from models.balance.night import critical_score
from models.balance.reconcile import Group, Reconciliation

MOST_FAULTS = 12  # of one group at once; with more, the network or its uncertainties are misdescribed
LISTED_SHARE = 0.95  # of the evidence: alternatives are listed until their shares pass it
DEPENDENT_TOLERANCE = 1e-9  # of a fault's own weight: below, the chosen faults explain all that it would
TIE_TOLERANCE = 1e-9  # relative difference of statistics that rounding explains


@dataclass(frozen=True)
class Fault:
    """One fault of one subject.

    Parameters
    ----------
    kind : str
        stream_bias or node_loss. [1]
    subject : str
        The stream or node. [1]
    magnitude : float
        Positive for a stream that reads high and for mass that left. [unit of the streams]
    """

    kind: str
    subject: str
    magnitude: float


@dataclass(frozen=True)
class Suspect:
    """A fault that explains an imbalance, alone or together with the others that were found.

    Parameters
    ----------
    fault : Fault
        What it is. [unit of the streams]
    low, high : float
        Interval of 95 % for the magnitude. [unit of the streams]
    statistic : float
        What it takes off the group's statistic, given the other faults. [1]
    share : float
        Its part of the evidence among all faults that could stand in its place. [1]
    number : int
        Which of the group's faults it may be; suspects of one number are alternatives. [1]
    equivalent_to : tuple of Fault
        Faults that leave the very same residuals. [unit of the streams]
    """

    fault: Fault
    low: float
    high: float
    statistic: float
    share: float
    number: int
    equivalent_to: tuple[Fault, ...]


class Candidates:
    """The distinct single faults of one group; each is one class of equivalent ones.

    Parameters
    ----------
    group : Group
        Its balances, factored. [unit of the streams]
    classes : list of (first, second, members)
        Balances that a fault touches and the faults that do so, with their signs. [1]
    """

    def __init__(self, group: Group, classes: list[tuple[int, int, list[tuple[str, str, int]]]]) -> None:
        self.group = group
        # Ties go to the name that sorts first, so the same network always gives the same answer.
        ordered = sorted(
            ((first, second, sorted(members, key=lambda one: (one[1], one[0]))) for first, second, members in classes),
            key=lambda one: (one[2][0][1], one[2][0][0]),
        )
        self.members = [members for _, _, members in ordered]
        self.first = np.array([first for first, _, _ in ordered], dtype=np.intp) - group.first
        second = np.array([second for _, second, _ in ordered], dtype=np.intp)
        self.second = np.where(second >= 0, second - group.first, group.rows)  # the row of zeros below
        self.weight = self._own_weight()

    def __len__(self) -> int:
        return len(self.members)

    def given(self, chosen: list[int]) -> tuple[FloatArray, FloatArray, FloatArray]:
        """Statistic, size and its variance of every class beside faults already chosen.

        Parameters
        ----------
        chosen : list of int
            Classes that are taken as there, of sizes that fit best. [1]

        Returns
        -------
        tuple of FloatArray, each of shape (classes,)
            T, size in the sign of the first member's balance, variance; T is zero for a fault that the chosen
            ones explain. [1, unit of the streams, its square]

        Notes
        -----
        With f the residual of a unit of the fault and P = H⁻¹ − H⁻¹F (F' H⁻¹ F)⁻¹ F' H⁻¹, F the chosen::

            T = (f' P r)² / (f' P f),  size = f' P r / f' P f,  variance = 1 / f' P f        (1)

        References
        ----------
        .. [1] S. Narasimhan, R. S. H. Mah, AIChE J. 33 (1987) 1514–1521.
        .. [2] J. Y. Keller, M. Darouach, G. Krzakala, Comput. Chem. Eng. 18 (1994) 1001–1004.
        """
        pull, weight = self.group.pull, self.weight
        if chosen:
            assert self.group.factor is not None
            shapes = np.zeros((self.group.rows + 1, len(chosen)))
            shapes[self.first[chosen], range(len(chosen))] = 1.0
            shapes[self.second[chosen], range(len(chosen))] = -1.0
            shapes = shapes[:-1]
            solved = self.group.factor.solve(shapes)
            inner = shapes.T @ solved
            pull = pull - solved @ np.linalg.solve(inner, shapes.T @ pull)
            along = self._along(solved)
            weight = weight - np.sum(along * np.linalg.solve(inner, along.T).T, axis=1)
        free = weight > DEPENDENT_TOLERANCE * self.weight
        weight = np.where(free, weight, np.inf)
        along = np.where(free, self._along(pull), 0.0)
        size = along / weight
        return along * size, size, 1.0 / weight  # eq. 1

    def best(self, statistic: FloatArray) -> int:
        """The class of largest statistic; of equal ones the first by name.

        Parameters
        ----------
        statistic : FloatArray, shape (classes,)
            T. [1]

        Returns
        -------
        int
            Its index. [1]
        """
        return int(np.argmax(statistic >= statistic.max() * (1.0 - TIE_TOLERANCE)))

    def faults(self, index: int, size: float) -> tuple[Fault, ...]:
        """The faults of one class for one size.

        Parameters
        ----------
        index : int
            Which class. [1]
        size : float
            What is added to the first balance. [unit of the streams]

        Returns
        -------
        tuple of Fault
            All of them, by name. [unit of the streams]
        """
        return tuple(Fault(kind, subject, sign * size) for kind, subject, sign in self.members[index])

    def _along(self, columns: FloatArray) -> FloatArray:
        """f' times columns, for every class."""
        nothing = np.zeros((1, *columns.shape[1:]))
        columns = np.concatenate([columns, nothing])
        return np.asarray(columns[self.first] - columns[self.second])

    def _own_weight(self) -> FloatArray:
        factor, first, second = self.group.factor, self.first, self.second
        assert factor is not None
        weight = factor.inverse(first, first)
        both = second < self.group.rows
        one, other = first[both], second[both]
        weight[both] += factor.inverse(other, other) - 2.0 * factor.inverse(one, other)
        return weight


def candidates(network: Network, reconciled: Reconciliation) -> tuple[Candidates | None, ...]:
    """The single faults that could be seen, group by group.

    Parameters
    ----------
    network : Network
        Nodes and streams. [1]
    reconciled : Reconciliation
        The same, reconciled. [unit of the streams]

    Returns
    -------
    tuple of Candidates or None
        One for each group; None where nothing is balanced. [1]
    """
    structure = reconciled.structure
    sorted_out: list[list[tuple[int, int, list[tuple[str, str, int]]]]] = [[] for _ in reconciled.groups]
    starts = np.array([group.first for group in reconciled.groups if group.rows])
    owners = [index for index, group in enumerate(reconciled.groups) if group.rows]
    for (first, second), members in equivalent_faults(network, structure).items():
        owner = owners[int(np.searchsorted(starts, first, side="right")) - 1]
        named = [
            (kind, network.streams[index] if kind == "stream_bias" else network.nodes[index], sign)
            for kind, index, sign in members
        ]
        sorted_out[owner].append((first, second, named))
    return tuple(
        Candidates(group, classes) if group.rows else None
        for group, classes in zip(reconciled.groups, sorted_out, strict=True)
    )


def suspects(network: Network, reconciled: Reconciliation, alarm_rate: float) -> tuple[tuple[Suspect, ...], ...]:
    """Faults that chance does not explain, found one after the other and sized together.

    Parameters
    ----------
    network : Network
        Nodes and streams. [1]
    reconciled : Reconciliation
        The same, reconciled. [unit of the streams]
    alarm_rate : float
        Chance of any suspect when nothing is wrong. [1]

    Returns
    -------
    tuple of tuple of Suspect
        For each group, the strongest fault first, each with its alternatives after it. [unit of the streams]

    Notes
    -----
    A fault counts if its T passes the square of Šidák's critical value for all distinct faults of the
    network. The one of largest T is taken, its direction projected out, and so on (orthogonal matching);
    then each is exchanged for a better one, if there is one beside the others. Among all faults j that
    could stand in one place, with equal chances beforehand::

        share_j = exp(T_j / 2) / Σ exp(T / 2)        (1)

    References
    ----------
    .. [1] Y. C. Pati, R. Rezaiifar, P. S. Krishnaprasad, 27th Asilomar Conf. on Signals, Systems and
       Computers (1993) 40–44.
    .. [2] Z. Šidák, J. Am. Stat. Assoc. 62 (1967) 626–633.
    """
    every = candidates(network, reconciled)
    critical = critical_score(sum(len(one) for one in every if one is not None), alarm_rate)
    return tuple(() if one is None or not len(one) else _found(one, critical**2) for one in every)


def _found(own: Candidates, least: float) -> tuple[Suspect, ...]:
    chosen: list[int] = []
    while len(chosen) < min(own.group.rows, MOST_FAULTS):
        statistic, _, _ = own.given(chosen)
        index = own.best(statistic)
        if statistic[index] < least:
            break
        chosen.append(index)
    if len(chosen) > 1:
        _exchange(own, chosen)
    beside = _beside(own, chosen)
    while chosen and min(beside[index][0][index] for index in chosen) < least:  # the others explain it by now
        chosen.remove(min(chosen, key=lambda index: (beside[index][0][index], -index)))
        beside = _beside(own, chosen)
    chosen.sort(key=lambda index: (-beside[index][0][index], index))
    return tuple(
        suspect
        for number, index in enumerate(chosen, start=1)
        for suspect in _alternatives(own, number, *beside[index])
    )


def _beside(own: Candidates, chosen: list[int]) -> dict[int, tuple[FloatArray, FloatArray, FloatArray]]:
    """For each chosen fault, what every class is worth beside the others."""
    return {index: own.given([other for other in chosen if other != index]) for index in chosen}


def _exchange(own: Candidates, chosen: list[int]) -> None:
    """Each chosen fault for a better one beside the others; what is explained only grows, so this ends."""
    changed = True
    while changed:
        changed = False
        for at, index in enumerate(chosen):
            statistic, _, _ = own.given(chosen[:at] + chosen[at + 1 :])
            best = own.best(statistic)
            if statistic[best] > statistic[index] * (1.0 + 2.0 * TIE_TOLERANCE):
                chosen[at] = best
                changed = True


def _alternatives(
    own: Candidates, number: int, statistic: FloatArray, size: FloatArray, variance: FloatArray
) -> list[Suspect]:  # fmt: skip
    """Faults that could stand in one place, until their shares are enough."""
    weight = np.where(statistic > 0.0, np.exp(0.5 * (statistic - statistic.max())), 0.0)
    share = weight / weight.sum()  # eq. 1
    rounded = _rounded(statistic)
    rank: IntArray = np.lexsort((np.arange(len(share)), -rounded))
    last = rank[min(int(np.searchsorted(np.cumsum(share[rank]), LISTED_SHARE)), len(rank) - 1)]
    count = int(np.sum(rounded >= rounded[last]))  # with all that are as good as the last
    reach = float(ndtri(0.975))
    listed = []
    for index in rank[:count].tolist():
        first, *others = own.faults(index, float(size[index]))
        half = reach * float(np.sqrt(variance[index]))
        low, high = first.magnitude - half, first.magnitude + half
        listed.append(Suspect(first, low, high, float(statistic[index]), float(share[index]), number, tuple(others)))
    return listed


def _rounded(statistic: FloatArray) -> FloatArray:
    """To thirty bits, so that rounding in the last place does not decide a rank."""
    fraction, exponent = np.frexp(statistic)
    return np.asarray(np.ldexp(np.round(fraction * 2.0**30), exponent - 30))
