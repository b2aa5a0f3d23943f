"""What a judgement says: of each group, each signal in it, and each vessel."""

from __future__ import annotations

from dataclasses import dataclass

from models.balance.health import Health
from models.balance.naming import Suspect
from models.balance.reconciled import Reconciled
from models.balance.trends import LossRate


@dataclass(frozen=True)
class Settings:
    """How often a quiet site may be flagged, and what else is chosen.

    Parameters
    ----------
    false_alarms_per_month : float
        Nights with a flag that the reader accepts in a month without faults. [1/month]
    standing : float
        Chance that anything is listed as standing since before when nothing is. [1]
    picks : int
        Signals that are named in one group at most. [1]
    twin_gain : float
        Log-likelihood from which a repeated ticket that has a twin is flagged by evidence alone. [1]
    """

    false_alarms_per_month: float = 0.5
    standing: float = 0.02
    picks: int = 6
    twin_gain: float = 3.0


@dataclass(frozen=True)
class Signal:
    """Something that chance does not explain, with its explanations.

    Parameters
    ----------
    suspects : tuple of Suspect
        Largest share first, together 95 % of it. [unit]
    score : float
        Of the signature that gave it away. [1]
    standing : bool
        Whether only older nights speak of it: listed and corrected for, not flagged. [1]
    """

    suspects: tuple[Suspect, ...]
    score: float
    standing: bool


@dataclass(frozen=True)
class GroupJudged:
    """One group of vessels tied by movements.

    Parameters
    ----------
    members : tuple of str
        Its vessels. [1]
    statistic, p_value, residual_p_value : float
        r' H⁻¹ r, its chance under no fault, and the chance of what the signals leave. [1]
    degrees_of_freedom : int
        Rows that remain after merging. [1]
    largest_p_value : float
        Chance under no fault of the largest score tested tonight. [1]
    critical : float
        Score that flags in this group. [1]
    signals : tuple of Signal
        In the order in which they were found. [1]
    stocks, movements : tuple of Reconciled
        Masses at the last close and movements of the last night. [kg]
    """

    members: tuple[str, ...]
    statistic: float
    degrees_of_freedom: int
    p_value: float
    residual_p_value: float
    largest_p_value: float
    critical: float
    signals: tuple[Signal, ...]
    stocks: tuple[Reconciled, ...]
    movements: tuple[Reconciled, ...]


@dataclass(frozen=True)
class VesselJudged:
    """One vessel in the last night.

    Parameters
    ----------
    vessel : str
        Its id. [1]
    judged_with : tuple of str
        Others in its balance; what is said of the imbalance is then said of all. [1]
    since : int or None
        Close at which its balance of the last night opens; None where it has none. [1]
    imbalance, uncertainty, score, p_value : float or None
        Physical less book, its standard uncertainty, their ratio and the chance of it; None without a balance. [kg]
    detectable : float or None
        Loss in the last night that would be flagged with a chance of 95 %; None where none would. [kg]
    flagged : bool
        Whether it or what serves it leads a signal of tonight. [1]
    innovation : float or None
        Score of its imbalance less what the nights before foretold, positive for a loss. [1]
    statistic, limit : float
        Of the sum that watches it for slow losses and stands nearest to its limit. [1]
    drifting : bool
        Whether that sum alarms tonight. [1]
    rates : tuple of LossRate
        Of a loss in the last 1, 7 and 30 nights. [kg/d]
    cumulative, cumulative_uncertainty : float
        Sum of its imbalances over the window. [kg]
    health : Health
        Its declared uncertainties against those shown. [1]
    """

    vessel: str
    judged_with: tuple[str, ...]
    since: int | None
    imbalance: float | None
    uncertainty: float | None
    score: float | None
    p_value: float | None
    detectable: float | None
    flagged: bool
    innovation: float | None
    statistic: float
    limit: float
    drifting: bool
    rates: tuple[LossRate, ...]
    cumulative: float
    cumulative_uncertainty: float
    health: Health


@dataclass(frozen=True)
class Judgement:
    """The window's last night.

    Parameters
    ----------
    groups : tuple of GroupJudged
        In the order of their first members. [1]
    vessels : tuple of VesselJudged
        By group, then by name. [1]
    """

    groups: tuple[GroupJudged, ...]
    vessels: tuple[VesselJudged, ...]

    @property
    def flagged(self) -> bool:
        """Whether anything is flagged tonight. [1]"""
        fresh = any(not signal.standing for group in self.groups for signal in group.signals)
        return fresh or any(vessel.drifting for vessel in self.vessels)
