"""A capacity table as CSV: two columns, each with its unit, and every cell judged before any is used.

::

    level [ft-in-16],volume [bbl]
    00-00-00,12.4
    00-00-04,31.9
"""

from __future__ import annotations

import csv
import io
import re
from collections.abc import Sequence
from dataclasses import dataclass

from app.errors import BadRequest, FieldError, TooLarge, Unprocessable
from app.schemas.batch import ERRORS_LISTED
from app.schemas.shape import TABLE_ROWS
from app.services.convert import Conversion, UnitError, conversion

FIELDS = {"level": "level_m", "volume": "volume_m3"}
_WITH_UNIT = re.compile(r"(level|volume)\s*\[([^\[\]]*)\]")
_DECIMALS = re.compile(r"[+-]?[0-9]*\.?([0-9]*)")
_COLUMN = "It is level_m, volume_m3, or level or volume with its unit, such as level [ft-in-16] or volume [bbl]."


@dataclass(frozen=True)
class Table:
    """Rows of a table in metres and cubic metres, and the last digit to which volumes are written. [m³]"""

    levels: tuple[float, ...]
    volumes: tuple[float, ...]
    resolution: float


def read(text: bytes) -> Table:
    """A table; ``Unprocessable`` names each cell that cannot be, ``BadRequest`` a text that is no CSV in UTF-8."""
    try:
        lines = io.StringIO(text.decode("utf-8-sig"), newline="")
        rows = [cells for cells in csv.reader(lines, strict=True) if cells]
    except UnicodeDecodeError:
        raise _malformed("The text is not in UTF-8.") from None
    except csv.Error:
        raise _malformed("The text cannot be read as CSV: its quoting is wrong.") from None
    columns = _header(rows[0] if rows else [])
    if len(rows) - 1 > TABLE_ROWS:
        raise TooLarge(f"A capacity table has at most {TABLE_ROWS} rows.")
    errors: list[FieldError] = []
    read_rows = [_row(index, cells, columns, errors) for index, cells in enumerate(rows[1:])]
    if errors:
        raise _refused(errors)
    if len(read_rows) < 2:
        raise _refused([FieldError("", "wrong_length", "A capacity table has at least 2 rows below its header.")])
    place = [column.field for column in columns].index("volume_m3")
    digits = max(_digits(cells[place]) for cells in rows[1:])
    return Table(
        tuple(row["level_m"] for row in read_rows), tuple(row["volume_m3"] for row in read_rows),
        columns[place].factor * 10.0**-digits,
    )  # fmt: skip


def _malformed(detail: str) -> BadRequest:
    return BadRequest(detail, code="malformed_csv", errors=[FieldError("", "malformed_csv", detail)])


def _refused(errors: Sequence[FieldError]) -> Unprocessable:
    return Unprocessable(" ".join(error.detail for error in errors[:3]), errors=errors[:ERRORS_LISTED])


def _header(names: Sequence[str]) -> list[Conversion]:
    """How the cells of both columns are read, in the order in which they stand."""
    columns: list[Conversion] = []
    errors: list[FieldError] = []
    for number, name in enumerate(names, start=1):
        try:
            columns.append(_column(name.strip()))
        except UnitError as refused:
            errors.append(FieldError(f"/header/{number - 1}", refused.code, f"Column {number}: {refused.detail}"))
    if not errors and sorted(column.field for column in columns) != sorted(FIELDS.values()):
        detail = "The first line names both columns, each once, such as level_m,volume_m3."
        errors.append(FieldError("/header", "missing", detail))
    if errors:
        raise _refused(errors)
    return columns


def _column(name: str) -> Conversion:
    if name in FIELDS.values():
        return Conversion(name)
    found = _WITH_UNIT.fullmatch(name)
    if found is None:
        raise UnitError("unknown_column", _COLUMN)
    return conversion(FIELDS[found[1]], found[2].strip())


def _row(
    index: int, cells: Sequence[str], columns: Sequence[Conversion], errors: list[FieldError]
) -> dict[str, float]:  # fmt: skip
    """One row by its fields; what is wrong with it is added to the errors."""
    if len(cells) != len(columns):
        detail = f"Row {index} has {len(cells)} cell{'' if len(cells) == 1 else 's'}; the header has {len(columns)}."
        errors.append(FieldError(f"/{index}", "wrong_length", detail, index))
        return {}
    row: dict[str, float] = {}
    for column, cell in zip(columns, cells, strict=True):
        try:
            row[column.field] = column.text(cell.strip())
        except ValueError:
            errors.append(FieldError(f"/{index}/{column.field}", "wrong_type", f"Row {index}: {column.form}", index))
    return row


def _digits(cell: str) -> int:
    """Decimals of a number as it is written; none where it has a power of ten."""
    found = _DECIMALS.fullmatch(cell.strip())
    return len(found[1]) if found else 0
