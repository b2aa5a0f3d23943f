"""What the head of the liquid does to an upright shell: it widens it, the thinner the course the more."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from models.arrays import ArrayLike, FloatArray, IntArray, as_floats
from models.constants import STANDARD_GRAVITY
from models.errors import DefinitionError
from models.geometry.heads import positive

ROUNDING = 1e-9  # of the height: courses that add up to it in decimals may miss it in binary


@dataclass(frozen=True)
class CoursedShell:
    """The shell of one upright cylinder, compiled.

    Parameters
    ----------
    feet : FloatArray, shape (k+1,)
        Levels at which the courses begin, and the one at which the last ends. [m]
    weights : FloatArray, shape (k+1,)
        By how much the stretch changes from the course below, for each unit of density. [m⁴/kg]
    """

    feet: FloatArray
    weights: FloatArray


def coursed_shell(
    *, diameter: float, elastic_modulus: float, courses: Sequence[tuple[float, float]], foot: float, top: float
) -> CoursedShell:
    """A shell from its courses.

    Parameters
    ----------
    diameter : float
        Inside diameter. [m]
    elastic_modulus : float
        Young's modulus of the plates. [Pa]
    courses : sequence of (float, float)
        Height of each course itself and its thickness, from the bottom up. [m, m]
    foot : float
        Level at which the lowest course begins. [m]
    top : float
        Level that the courses have to reach: the shell's end, or the highest row of a table. [m]

    Returns
    -------
    CoursedShell
        What :class:`HeadStress` stacks. [m, m⁴/kg]

    Notes
    -----
    A wall that stands free of the bottom carries the head by its hoops alone, so at a height z under a
    level h it widens by ε = ρ g (h − z) D/(2 E t), and the courses from z_k to z_(k+1) hold more by::

        ΔV = ρ (π g D³/8E) Σ_k [(h − z_k)₊² − (h − z_(k+1))₊²]/t_k
           = ρ Σ_k w_k (h − z_k)₊²,  w_k = (π g D³/8E) (1/t_k − 1/t_(k−1))        (1)

    with 1/t = 0 below the first course and above the last. g is the standard one: the local one changes
    a thousandth of the volume by less than a three-hundredth.

    References
    ----------
    .. [1] Thin-wall elasticity; the same content as ISO 7507-1:2003 and API MPMS ch. 2.2A, expansion of
       the shell by the head of the liquid (places from memory).
    """
    size = positive(diameter, "diameter_m")
    if not (np.isfinite(elastic_modulus) and elastic_modulus > 0.0):
        raise DefinitionError("elastic_modulus_gpa must be above 0 GPa", field="elastic_modulus_gpa")
    if not courses:
        raise DefinitionError("courses hold no course at all", field="courses")
    heights, thicknesses = (np.array(column, dtype=np.float64) for column in zip(*courses, strict=True))
    wrong = ~((heights > 0.0) & (thicknesses > 0.0) & np.isfinite(heights) & np.isfinite(thicknesses))
    if wrong.any():
        row = int(np.argmax(wrong))
        raise DefinitionError(
            f"courses/{row} is {heights[row]:.6g} m high and {thicknesses[row]:.6g} m thick; both must be above 0 m",
            field=f"courses/{row}", index=row,
        )  # fmt: skip
    feet = foot + np.append(0.0, np.cumsum(heights))
    if feet[-1] < top - ROUNDING * abs(top):
        raise DefinitionError(
            f"courses end {feet[-1]:.6g} m above the zero of the levels; they must reach {top:.6g} m: give the "
            "height of each course itself, from the bottom up, to the end of the shell",
            field="courses",
        )
    stiffness = np.pi * STANDARD_GRAVITY * size**3 / (8.0 * elastic_modulus)
    return CoursedShell(feet, stiffness * np.diff(1.0 / thicknesses, prepend=0.0, append=0.0))  # eq. 1


@dataclass(frozen=True)
class HeadStress:
    """Shells one after another: shell i is row i; one without courses does not widen.

    Parameters
    ----------
    feet, weights : tuple of FloatArray, each of shape (n,)
        Of each course in turn, counted from the bottom, those of all shells; weight 0 where a shell has
        fewer courses. [m, m⁴/kg]
    """

    feet: tuple[FloatArray, ...]
    weights: tuple[FloatArray, ...]

    @classmethod
    def from_shells(cls, shells: Sequence[CoursedShell | None]) -> HeadStress | None:
        """A stack of shells; None where none of them has courses.

        Parameters
        ----------
        shells : sequence of CoursedShell or None
            One for each vessel; None where the head does not count. [m, m⁴/kg]

        Returns
        -------
        HeadStress or None
            The same shells, as rows in the same order. [m, m⁴/kg]
        """
        width = max((len(shell.feet) for shell in shells if shell is not None), default=0)
        if width == 0:
            return None
        columns = np.zeros((2, width, len(shells)))
        for row, shell in enumerate(shells):
            if shell is not None:
                columns[0, : len(shell.feet), row] = shell.feet
                columns[1, : len(shell.feet), row] = shell.weights
        return cls(tuple(columns[0]), tuple(columns[1]))

    def volume_per_density(self, level: ArrayLike, row: IntArray | int = 0) -> tuple[FloatArray, FloatArray]:
        """Room that the head of the liquid adds below its level, for each unit of density.

        Parameters
        ----------
        level : array_like, shape (...)
            Level above the datum; NaN stays NaN. [m]
        row : IntArray, shape (...), or int
            Shell of each level. [1]

        Returns
        -------
        volume, slope : FloatArray, shape (...)
            Volume for each unit of the liquid's density, and its derivative by the level.
            [m³/(kg/m³), m²/(kg/m³)]

        Notes
        -----
        Equation (1) of :func:`coursed_shell` without ρ, and its slope 2 Σ_k w_k (h − z_k)₊.

        References
        ----------
        .. [1] As of :func:`coursed_shell`.
        """
        volume, slope, _ = self.above(level, np.full((), -np.inf), row)
        return volume, slope

    def above(
        self, level: ArrayLike, floor: ArrayLike, row: IntArray | int = 0
    ) -> tuple[FloatArray, FloatArray, FloatArray]:
        """The part of that room that lies above a floor: what the liquid over free water gets of it.

        Parameters
        ----------
        level, floor : array_like, shape (...)
            Level of the liquid, and of the water below it, on one datum; where the floor is at or above
            the level there is no room between, −inf for no water. NaN stays NaN. [m]
        row : IntArray, shape (...), or int
            Shell of each level. [1]

        Returns
        -------
        volume, slope, slope_by_floor : FloatArray, shape (...)
            Volume for each unit of density, and its derivatives by the level and by the floor.
            [m³/(kg/m³), m²/(kg/m³), m²/(kg/m³)]

        Notes
        -----
        The wall beside the water is stretched by the whole column, not by the water alone. What of it is
        above a floor h_w counts with every course cut off there::

            ΔV/ρ = Σ_k w_k (h − max(z_k, h_w))₊²        (2)

        One density stands for the whole column. Water is heavier than the oil over it by a fifth, so a
        depth of it d under a level h makes the head greater by about 0.2 d/h of itself: not counted.

        References
        ----------
        .. [1] As of :func:`coursed_shell`.
        """
        h, low = as_floats(level, floor)
        volume = np.zeros(np.broadcast(h, low, row).shape) + np.where(np.isnan(h), np.nan, 0.0)
        slope, by_floor = volume.copy(), volume.copy()
        for feet, weights in zip(self.feet, self.weights, strict=True):  # a few courses, never the readings
            foot, weight = feet[row], weights[row]
            pull = weight * np.maximum(h - np.maximum(foot, low), 0.0)
            volume += pull * np.maximum(h - np.maximum(foot, low), 0.0)  # eq. 2
            slope += 2.0 * pull
            by_floor -= np.where(foot < low, 2.0 * pull, 0.0)
        return volume, slope, by_floor

    def widening(
        self, level: ArrayLike, water_level: ArrayLike, density: ArrayLike, density_included: ArrayLike,
        row: IntArray | int = 0,
    ) -> Widening:  # fmt: skip
        """What the head adds to the volumes of a capacity curve, above free water and below.

        Parameters
        ----------
        level, water_level : array_like, shape (...)
            Level of the liquid, and of free water under it, on one datum; −inf for no water. [m]
        density : array_like, shape (...)
            Density of the liquid at its temperature and pressure; it stands for the whole column. [kg/m³]
        density_included : array_like, shape (...)
            Density at which a capacity table holds the widening already; 0 where it does not. [kg/m³]
        row : IntArray, shape (...), or int
            Shell of each level. [1]

        Returns
        -------
        Widening
            Volumes to be added, with their derivatives. [m³]

        Notes
        -----
        With S(h) of (1) and S(h|h_w) of (2), each for one unit of density, a table made at ρ_t holds
        ρ_t S(h) at the level and ρ_t S(h_w) at the water's, so what is missing is::

            of the liquid    ΔV   = ρ S(h|h_w) − ρ_t [S(h) − S(h_w)]        (3)
            of the water     ΔV_w = ρ [S(h) − S(h|h_w)] − ρ_t S(h_w)        (4)

        and of both together (ρ − ρ_t) S(h).

        References
        ----------
        .. [1] As of :func:`coursed_shell`.
        """
        rho, table = as_floats(density, density_included)
        over, slope, by_floor = self.above(level, water_level, row)
        whole, whole_slope = self.volume_per_density(level, row)
        water, water_slope = self.volume_per_density(water_level, row)
        return Widening(
            volume=rho * over - table * (whole - water),  # eq. 3
            water_volume=rho * (whole - over) - table * water,  # eq. 4
            by_level=rho * slope - table * whole_slope,
            by_water_level=rho * by_floor + table * water_slope,
            by_density=over,
        )


@dataclass(frozen=True)
class Widening:
    """Volumes that the head of a liquid adds to those of a capacity curve.

    Parameters
    ----------
    volume : FloatArray, shape (...)
        To the liquid's, free water excluded; below 0 where the table was made for a heavier one. [m³]
    water_volume : FloatArray, shape (...)
        To the free water's. [m³]
    by_level, by_water_level : FloatArray, shape (...)
        Derivatives of the liquid's volume by both levels. [m²]
    by_density : FloatArray, shape (...)
        Its derivative by the liquid's density. [m³/(kg/m³)]
    """

    volume: FloatArray
    water_volume: FloatArray
    by_level: FloatArray
    by_water_level: FloatArray
    by_density: FloatArray
