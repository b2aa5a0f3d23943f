"""What every liquid model answers: the density at a state and how it changes from there."""

from __future__ import annotations

from dataclasses import dataclass

from models.arrays import FloatArray


@dataclass(frozen=True)
class LiquidPoint:
    """Density of a liquid at a state, with its logarithmic slopes; NaN where the method does not reach.

    What tells one content from another of its kind is the *key* of the method: the density at 60 °F of a
    petroleum, the relative density of a light hydrocarbon, a factor beside 1 for a liquid whose density is
    a function of temperature and pressure alone.

    Parameters
    ----------
    density : FloatArray, shape (...)
        Density at the state. [kg/m³]
    expansivity : FloatArray, shape (...)
        β = −∂ln ρ/∂T at fixed key and pressure. [1/K]
    compressibility : FloatArray, shape (...)
        κ = ∂ln ρ/∂P at fixed key and temperature. [1/Pa]
    by_key : FloatArray, shape (...)
        ∂ln ρ/∂ln key at fixed temperature and pressure. [1]
    """

    density: FloatArray
    expansivity: FloatArray
    compressibility: FloatArray
    by_key: FloatArray
