"""What temperature and pressure do to a shell, and how much more the liquid below a level is then."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from models.arrays import ArrayLike, FloatArray, as_floats
from models.errors import DefinitionError
from models.geometry.heads import positive

LIQUID_WEIGHT = 7.0 / 8.0  # of the shell's temperature without insulation: API MPMS 12.1.1, common practice


def _cylinder(ratio: float, poisson: float) -> tuple[float, float]:
    """Hoop and axial strain of a closed cylinder."""
    return 0.5 * ratio * (1.0 - 0.5 * poisson), 0.25 * ratio * (1.0 - 2.0 * poisson)  # eqs. 1, 2


def _upright(ratio: float, poisson: float) -> tuple[float, float]:
    hoop, axial = _cylinder(ratio, poisson)
    return 2.0 * hoop + axial, axial


def _lying(ratio: float, poisson: float) -> tuple[float, float]:
    hoop, axial = _cylinder(ratio, poisson)
    return 2.0 * hoop + axial, hoop


def _sphere(ratio: float, poisson: float) -> tuple[float, float]:
    strain = 0.25 * ratio * (1.0 - poisson)  # eq. 3
    return 3.0 * strain, strain


STRAINS: dict[str, Callable[[float, float], tuple[float, float]]] = {
    "vertical_cylinder": _upright,
    "horizontal_cylinder": _lying,
    "sphere": _sphere,
}
UNSTRAINED = ("box", "fixed_volume", "capacity_table")  # flat walls bend; the others have no known form


def pressure_strain(
    kind: str, diameter: float, thickness: float, elastic_modulus: float, poisson_ratio: float
) -> tuple[float, float]:
    """Strain of a thin closed shell for each pascal of gauge pressure.

    Parameters
    ----------
    kind : str
        Name of the shape; of a capacity table, the shape that it tabulates. [1]
    diameter, thickness : float
        Of the shell. [m]
    elastic_modulus : float
        Young's modulus of the shell's material. [Pa]
    poisson_ratio : float
        Poisson's ratio of the shell's material. [1]

    Returns
    -------
    strain_sum, strain_vertical : float
        Sum of the strains in three directions, and the vertical one; 0 where the form is not known, as of
        a box. [1/Pa, 1/Pa]

    Notes
    -----
    With D/(t E) the diameter over thickness and modulus, and ν Poisson's ratio, for each pascal::

        hoop of a cylinder    ε_h = D/(2 t E) (1 − ν/2)        (1)
        along its axis        ε_a = D/(4 t E) (1 − 2 ν)        (2)
        of a sphere           ε   = D/(4 t E) (1 − ν)          (3)

    References
    ----------
    .. [1] W. C. Young, R. G. Budynas, "Roark's Formulas for Stress and Strain", 7th ed., McGraw-Hill,
       2002, table 13.1 (place from memory).
    """
    if kind in UNSTRAINED:
        return 0.0, 0.0
    if kind not in STRAINS:
        raise DefinitionError(f"no strain is known of this shape; known are {', '.join(STRAINS)}", field="of")
    if not (np.isfinite(elastic_modulus) and elastic_modulus > 0.0):
        raise DefinitionError("elastic_modulus_gpa must be above 0 GPa", field="elastic_modulus_gpa")
    ratio = positive(diameter, "diameter_m") / positive(thickness, "thickness_m") / elastic_modulus
    if not 0.0 <= poisson_ratio <= 0.5:
        raise DefinitionError(
            f"poisson_ratio is {poisson_ratio:.6g}; it must be between 0 and 0.5", field="poisson_ratio"
        )
    return STRAINS[kind](ratio, poisson_ratio)


def shell_temperature(
    liquid_temperature: ArrayLike, ambient_temperature: ArrayLike, insulated: ArrayLike
) -> FloatArray:
    """Mean temperature of a shell between its liquid and the air.

    Parameters
    ----------
    liquid_temperature, ambient_temperature : array_like, shape (...)
        Temperatures; the ambient one may be NaN where the shell is insulated. [K]
    insulated : array_like of bool, shape (...)
        True where the shell follows the liquid alone. [1]

    Returns
    -------
    FloatArray, shape (...)
        Temperature of the shell. [K]

    Notes
    -----
    Without insulation::

        T_shell = (7 T_liquid + T_ambient)/8        (1a)

    References
    ----------
    .. [1] API MPMS ch. 12.1.1, as quoted in inspectors' handbooks.
    """
    liquid, ambient = as_floats(liquid_temperature, ambient_temperature)
    mean = LIQUID_WEIGHT * liquid + (1.0 - LIQUID_WEIGHT) * ambient  # eq. 1a
    return np.where(np.asarray(insulated, dtype=bool), liquid, mean)


def shell_factor(
    level: ArrayLike, area: ArrayLike, volume: ArrayLike, strain_sum: ArrayLike, strain_vertical: ArrayLike
) -> FloatArray:
    """Volume below a measured level in the strained shell, relative to the shell as tabulated.

    Parameters
    ----------
    level : array_like, shape (...)
        Level above the datum, which stays where it is on the shell. [m]
    area, volume : array_like, shape (...)
        Surface and volume at that level by the capacity curve. [m², m³]
    strain_sum, strain_vertical : array_like, shape (...)
        Sum of the strains in three directions, and the vertical one; of a temperature 3ε and ε. [1, 1]

    Returns
    -------
    FloatArray, shape (...)
        K, by which the volume is multiplied; of no volume, the factor of a flat floor. [1]

    Notes
    -----
    The shell grows in every direction while the level stays where the gauge reads it, so with S the sum
    of its strains::

        K = (1 + S/3)³/(1 + ε_z h A/V)        (4)

    In an upright cylinder h A = V: a temperature's strain ε gives K = (1 + ε)² = 1 + 2 α ΔT + α² ΔT²
    exactly, the trade's C_TSh. Elsewhere (4) is right to the first order, 1 + S − ε_z h A/V: in a
    sphere 1 + 3ε R/(3R − h), and the square of a strain below 1e-3 is nothing.

    References
    ----------
    .. [1] V(h; ε) = (1 + ε)³ V(h/(1 + ε)), which is geometry; API MPMS ch. 12.1.1 for upright cylinders.
    """
    h, a, v, total, vertical = as_floats(level, area, volume, strain_sum, strain_vertical)
    reach = np.divide(h * a, v, out=np.ones(np.broadcast(h, a, v).shape), where=v > 0.0)
    return np.asarray((1.0 + total / 3.0) ** 3 / (1.0 + vertical * reach))  # eq. 4


def full_factor(strain_sum: ArrayLike) -> FloatArray:
    """Capacity of the whole strained vessel relative to the vessel as tabulated.

    Parameters
    ----------
    strain_sum : array_like, shape (...)
        Sum of the strains in three directions. [1]

    Returns
    -------
    FloatArray, shape (...)
        The factor. [1]

    Notes
    -----
    With S the sum of the three strains::

        K_T = (1 + S/3)³        (5)

    References
    ----------
    .. [1] (1 + ε_x)(1 + ε_y)(1 + ε_z), which is geometry; exact where the three are equal, as of a
       temperature, and right to the first order where they are not.
    """
    (total,) = as_floats(strain_sum)
    return np.asarray((1.0 + total / 3.0) ** 3)  # eq. 5
