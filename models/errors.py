"""What the models refuse, and why.

::

    ModelError
    ├── DefinitionError      a vessel, table, substance or network that cannot be
    ├── OutsideRange         a value beyond the limits in which a method is defined
    │   ├── OutsideVessel    a level below the zero or above the top, a volume above the capacity
    │   └── OutsideTable     a level beyond the rows of a capacity table
    └── NoVapourRoot         a pressure that no vapour of this composition can have

``code`` is the stable word that a client sees; ``field`` and ``index`` say where. The models know
no HTTP: the service turns these into problem answers or into an inventory's reason.
"""

from __future__ import annotations

from typing import ClassVar


class ModelError(Exception):
    """Base of everything that the models refuse."""

    code: ClassVar[str] = "model_error"

    def __init__(self, detail: str, *, field: str | None = None, index: int | None = None) -> None:
        super().__init__(detail)
        self.detail = detail
        self.field = field
        self.index = index


class DefinitionError(ModelError):
    """A definition that describes nothing that can exist."""

    code = "impossible_definition"


class OutsideRange(ModelError):
    """A value outside the limits of the method."""

    code = "outside_method"


class OutsideVessel(OutsideRange):
    """A level or volume that the vessel cannot have."""

    code = "outside_vessel"


class OutsideTable(OutsideVessel):
    """A level beyond the rows of the capacity table: tables are never extrapolated."""

    code = "outside_table"


class NoVapourRoot(ModelError):
    """No vapour density satisfies the virial equation at this pressure and temperature."""

    code = "no_vapour_root"


def at_index(index: int | None) -> str:
    """`` at index 3`` for messages about one element of a column, nothing for a scalar.

    Parameters
    ----------
    index : int or None
        Position in the column. [1]

    Returns
    -------
    str
        Text that starts with a space, or nothing. [1]
    """
    return "" if index is None else f" at index {index}"
