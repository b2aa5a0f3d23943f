"""A value with named, signed one-sigma parts: shared parts cancel or add as they must."""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field


@dataclass(frozen=True)
class Estimate:
    """A mass (or any quantity) and the errors that it carries, each under the name of its cause.

    Parameters
    ----------
    value : float
        The value. [kg, or the unit of the quantity]
    parts : mapping of str to float
        Signed change of the value for one standard deviation of the named error. [unit of value]

    Notes
    -----
    Errors of different names are independent with unit variance, those of one name are one and the
    same. For a signed sum of estimates::

        u²(Σ_i a_i x_i) = Σ_s (Σ_i a_i c_{i,s})²        (1)

    References
    ----------
    .. [1] JCGM 100:2008 (GUM), F.1.2.3: correlation through common influence quantities.
    """

    value: float
    parts: Mapping[str, float] = field(default_factory=dict)

    def __add__(self, other: Estimate) -> Estimate:
        return combine(((1.0, self), (1.0, other)))

    def __sub__(self, other: Estimate) -> Estimate:
        return combine(((1.0, self), (-1.0, other)))

    def __neg__(self) -> Estimate:
        return combine(((-1.0, self),))

    @property
    def uncertainty(self) -> float:
        """Standard uncertainty, the root of the sum of squares of the named parts. [unit of value]"""
        return math.sqrt(math.fsum(part * part for part in self.parts.values()))  # eq. 1


ZERO = Estimate(0.0)


def combine(terms: Iterable[tuple[float, Estimate]]) -> Estimate:
    """Signed sum of estimates; parts of one name are added before they are squared.

    Parameters
    ----------
    terms : iterable of (float, Estimate)
        Factors and estimates. [1, unit of value]

    Returns
    -------
    Estimate
        Sum of factor × estimate. [unit of value]

    References
    ----------
    .. [1] JCGM 100:2008 (GUM), F.1.2.3.
    """
    values: list[float] = []
    parts: dict[str, float] = {}
    for factor, estimate in terms:
        values.append(factor * estimate.value)
        for name, part in estimate.parts.items():
            parts[name] = parts.get(name, 0.0) + factor * part
    return Estimate(math.fsum(values), {name: part for name, part in parts.items() if part != 0.0})
