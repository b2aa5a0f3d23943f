"""The columns that the chain of one mass reads and writes: vessels, states, inventories.

Every array is either one value for all rows, shape (1,), or one value a row, shape (n,).
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, fields, replace
from enum import IntFlag
from typing import Any

import numpy as np

from models.arrays import BoolArray, FloatArray, IntArray
from models.geometry.curves import Curves
from models.geometry.head_stress import HeadStress
from models.liquid.compiled import LiquidColumns
from models.saturation import SaturationColumns
from models.vapour.series import VapourColumns


class Method(IntFlag):
    """What has to be computed for a vessel; vessels of one method are computed together."""

    NOTHING = 0
    LIQUID = 1
    VAPOUR = 2
    ROOF = 4
    SATURATION = 8
    FULL = 16
    BLANKET = 32
    HEAD = 64


class Mark(IntFlag):
    """What is doubtful about a row; several may stand together."""

    NONE = 0
    ROOF_LANDING_ZONE = 1
    SATURATION_LOW = 2
    SATURATION_HIGH = 4
    VAPOUR_SATURATED = 8
    VAPOUR_LEFT_OUT = 16
    GUARD_WIDE = 32
    GUARD_REFUSED = 64
    LIQUID_FULL = 128
    OUTSIDE_VESSEL = 256
    OUTSIDE_TABLE = 512
    OUTSIDE_METHOD = 1024
    NO_VAPOUR_ROOT = 2048
    MISSING = 4096
    VAPOUR_AT_PRESSURE = 8192
    VAPOUR_AT_LIQUID_TEMPERATURE = 16384
    LIQUID_OUTSIDE_METHOD = 32768
    STANDARD_OUTSIDE_METHOD = 65536
    VAPOUR_BETWEEN = 131072


UNMEASURED = Mark.GUARD_REFUSED | Mark.OUTSIDE_VESSEL | Mark.OUTSIDE_TABLE | Mark.OUTSIDE_METHOD
UNMEASURED |= Mark.NO_VAPOUR_ROOT | Mark.MISSING | Mark.LIQUID_OUTSIDE_METHOD


@dataclass(frozen=True)
class Vessels:
    """Compiled definitions, one row a vessel and revision.

    Parameters
    ----------
    method : IntArray, shape (v,)
        Flags of :class:`Method`. [1]
    curves : Curves or None
        Capacity curves of the vessels that have a level. [m, m³]
    curve_row : IntArray, shape (v,)
        Row of ``curves``; anything where there is no level. [1]
    bottom, top : FloatArray, shape (v,)
        Lowest and highest level of the curve. [m]
    is_table : FloatArray, shape (v,)
        1 for a capacity table, which is never extrapolated, else 0. [1]
    capacity : FloatArray, shape (v,)
        Volume of the whole vessel. [m³]
    expansion, expansion_temperature : FloatArray, shape (v,)
        Linear expansivity of the shell, and the temperature of its table. [1/K, K]
    liquid_weight : FloatArray, shape (v,)
        Share of the liquid's temperature in the shell's: 1 insulated, 7/8 not. [1]
    strain_sum, strain_vertical, strain_pressure : FloatArray, shape (v,)
        Sum of the three strains and the vertical one for each pascal of gauge pressure, and the gauge
        pressure of the table. [1/Pa, 1/Pa, Pa]
    head_stress, head_row : HeadStress or None, IntArray, shape (v,)
        Courses of the shells that the liquid's head widens, and the row of each vessel's. [m⁴/kg]
    head_included : FloatArray, shape (v,)
        Density at which a table contains that already, or 0. [kg/m³]
    roof_mass, roof_lands, roof_floats, roof_volume_per_mass : FloatArray, shape (v,)
        Floating roof; the last is 1/density at which a table already deducts it, or 0. [kg, m, m, m³/kg]
    liquids, liquid_row : LiquidColumns or None, IntArray, shape (v,)
        The liquids, and the row of each vessel's own. [1]
    standard_temperature, standard_pressure : FloatArray, shape (v,)
        Standard state of the liquid. [K, Pa]
    water_density : FloatArray, shape (v,)
        Density of the water in a sample. [kg/m³]
    vapour, vapour_row : VapourColumns or None, IntArray, shape (v,)
        Virial series of the vapours, and the row of each vessel's own. [1]
    saturation, saturation_row : SaturationColumns or None, IntArray, shape (v,)
        Vapour pressures of the substances, and the row of each vessel's own. [1]
    gas_standard_density : FloatArray, shape (v,)
        Density of the vapour as an ideal gas at the site's gas base state. [kg/m³]
    """

    method: IntArray
    curves: Curves | None
    curve_row: IntArray
    bottom: FloatArray
    top: FloatArray
    is_table: FloatArray
    capacity: FloatArray
    expansion: FloatArray
    expansion_temperature: FloatArray
    liquid_weight: FloatArray
    strain_sum: FloatArray
    strain_vertical: FloatArray
    strain_pressure: FloatArray
    head_stress: HeadStress | None
    head_row: IntArray
    head_included: FloatArray
    roof_mass: FloatArray
    roof_lands: FloatArray
    roof_floats: FloatArray
    roof_volume_per_mass: FloatArray
    liquids: LiquidColumns | None
    liquid_row: IntArray
    standard_temperature: FloatArray
    standard_pressure: FloatArray
    water_density: FloatArray
    vapour: VapourColumns | None
    vapour_row: IntArray
    saturation: SaturationColumns | None
    saturation_row: IntArray
    gas_standard_density: FloatArray

    def kind(self, rows: IntArray) -> IntArray:
        """Which kind of liquid each reading's vessel holds.

        Parameters
        ----------
        rows : IntArray, shape (n,)
            Row of each reading's vessel. [1]

        Returns
        -------
        IntArray, shape (n,)
            A number a kind; 0 where there is no liquid. [1]
        """
        if self.liquids is None:
            return np.zeros(len(rows), dtype=np.intp)
        return np.asarray(self.liquids.kind[self.liquid_row[rows]])

    def take(self, rows: IntArray | slice) -> Vessels:
        """The parameters of given rows, as columns that broadcast with as many readings.

        Parameters
        ----------
        rows : IntArray, shape (n,), or slice
            Row of each reading's vessel. [1]

        Returns
        -------
        Vessels
            Columns of shape (n,). [as above]
        """
        taken: dict[str, Any] = {
            item.name: value[rows] for item in fields(self) if isinstance(value := getattr(self, item.name), np.ndarray)
        }
        return replace(self, **taken)


@dataclass(frozen=True)
class State:
    """What the instruments say, one row a reading; what is missing is NaN.

    Parameters
    ----------
    level, water_level : FloatArray
        Innage of liquid and of free water on the curve's datum; −inf for water where there is none. [m]
    liquid_temperature, ambient_temperature, vapour_temperature : FloatArray
        Temperatures. [K]
    pressure, atmosphere : FloatArray
        Pressure of the space above the liquid, or of the gas, and of the atmosphere. [Pa]
    density, density_temperature, density_pressure : FloatArray
        Density of the sample and the state in which it was measured. [kg/m³, K, Pa]
    sediment_water : FloatArray
        Volume fraction of sediment and water in the sample. [1]
    density_is_dry : FloatArray
        1 where the density is that of the dry liquid, 0 where it is that of the wet sample. [1]
    vapour_row : IntArray or None
        Virial series of each row where its composition was analysed; None for the vessel's own. [1]
    liquid_row, saturation_row : IntArray or None
        Liquid and vapour pressure of each row where the liquid was analysed; None for the vessel's own. [1]
    roof_load : FloatArray or None
        Rain, snow and other load on the floating roof; None for none. [kg]
    pressure_uncertainty, temperature_uncertainty : FloatArray
        Standard uncertainties for the saturation check. [Pa, K]
    """

    level: FloatArray
    water_level: FloatArray
    liquid_temperature: FloatArray
    ambient_temperature: FloatArray
    vapour_temperature: FloatArray
    pressure: FloatArray
    atmosphere: FloatArray
    density: FloatArray
    density_temperature: FloatArray
    density_pressure: FloatArray
    sediment_water: FloatArray
    density_is_dry: FloatArray
    pressure_uncertainty: FloatArray
    temperature_uncertainty: FloatArray
    vapour_row: IntArray | None = None
    liquid_row: IntArray | None = None
    saturation_row: IntArray | None = None
    roof_load: FloatArray | None = None

    @property
    def rows(self) -> int:
        """Number of readings. [1]"""
        return max(len(getattr(self, item.name)) for item in fields(self) if getattr(self, item.name) is not None)

    def take(self, rows: IntArray | slice) -> State:
        """The states of given rows; columns of one value for all stay as they are.

        Parameters
        ----------
        rows : IntArray, shape (m,), or slice
            Rows. [1]

        Returns
        -------
        State
            Columns of shape (m,) or (1,). [as above]
        """
        taken: dict[str, Any] = {
            item.name: value[rows] if len(value) > 1 else value
            for item in fields(self)
            if (value := getattr(self, item.name)) is not None
        }
        return replace(self, **taken)


@dataclass(frozen=True)
class Inventory:
    """Masses and what led to them, one row a reading; NaN where a row has none.

    Parameters
    ----------
    marks : IntArray, shape (n,)
        Flags of :class:`Mark`. [1]
    columns : mapping of str to FloatArray, shape (n,)
        Results by name, in SI. [as named in :data:`models.mass.RESULTS`]
    sensitivities : mapping of str to FloatArray, shape (n,)
        Change of the mass for one unit of each input, in kg per SI unit. [kg/unit]
    """

    marks: IntArray
    columns: Mapping[str, FloatArray]
    sensitivities: Mapping[str, FloatArray]

    def __getitem__(self, name: str) -> FloatArray:
        return self.columns[name]

    @property
    def measured(self) -> BoolArray:
        """True where the row has a mass. [1]"""
        return np.asarray((self.marks & int(UNMEASURED)) == 0)


@dataclass
class Step:
    """What the steps of one block of readings hand on to each other.

    Parameters
    ----------
    vessels : Vessels
        Parameters of each reading's vessel. [SI]
    state : State
        What was read. [SI]
    marks : IntArray, shape (n,)
        Flags of :class:`Mark`, so far. [1]
    out, sens : mapping of str to FloatArray
        Results and sensitivities, so far. [as in :class:`Inventory`]
    conditions : tuple of FloatArray and BoolArray, or None
        Pressure and temperature of the vapour, and how they were found: see ``models.space``. [Pa, K, 1, 1]
    """

    vessels: Vessels
    state: State
    marks: IntArray
    out: dict[str, FloatArray]
    sens: dict[str, FloatArray]
    conditions: tuple[FloatArray, FloatArray, BoolArray, BoolArray] | None = None

    @property
    def saturation_row(self) -> IntArray | int:
        """Row of each reading's vapour pressure; one number where all have the same. [1]"""
        own = self.vessels.saturation_row if self.state.saturation_row is None else self.state.saturation_row
        return own if len(own) > 1 else int(own[0])

    def mark(self, where: BoolArray, flag: Mark) -> None:
        """Mark some rows.

        Parameters
        ----------
        where : BoolArray, shape (n,) or (1,)
            Which. [1]
        flag : Mark
            With what. [1]
        """
        if where.any():  # hardly ever
            self.marks |= np.where(where, int(flag), 0)
