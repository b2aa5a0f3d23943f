"""Readings as a table: a header declares each column once, a row is a reading, a blank cell was not read.

::

    vessel,taken_at,level [ft-in-16],liquid_temperature [degF],pressure_kpa
    tk-12,2026-03-14T06:00:00+01:00,23-04-11,63.3,0.4

A column is a field of a reading by its name, or a quantity with the unit that it stands in. What is
wrong with the header refuses the table; what is wrong with a row is said of that row only.
"""

from __future__ import annotations

import csv
import io
import re
from collections import Counter
from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass, field

from app.errors import BadRequest, FieldError, Unprocessable
from app.schemas.batch import ERRORS_LISTED, RowError
from app.schemas.lines import parse_once
from app.schemas.reading import Reading, validate_rows
from app.schemas.types import MEASURED
from app.services.convert import Conversion, UnitError, by_quantity

OBJECTS = ("quality", "liquid_composition", "vapour_composition")
_WITH_UNIT = re.compile(r"([a-z_]{1,64})\s*\[([^\[\]]*)\]")

Rows = tuple[list[tuple[int, Reading]], list[RowError]]


@dataclass(frozen=True)
class Column:
    """A field of a reading, how a cell of it is read, and the sentence for one that cannot be."""

    field: str
    read: Callable[[str], object]
    form: str | None = None


@dataclass
class Block:
    """Some rows of a table, judged; positions count from the table's first row, which is 0."""

    first: int
    lines: list[int] = field(default_factory=list)
    rows: list[tuple[int, Reading]] = field(default_factory=list)
    errors: list[RowError] = field(default_factory=list)

    def line(self, index: int) -> int:
        """The line of the text at which a row ends; the header is line 1."""
        return self.lines[index - self.first]


def readings(text: bytes) -> Rows:
    """All rows of a table: good ones with their positions, and what is wrong with the others.

    ``Unprocessable`` where a column cannot be what it says, ``BadRequest`` where the text is no CSV in UTF-8.
    """
    rows: list[tuple[int, Reading]] = []
    errors: list[RowError] = []
    with io.TextIOWrapper(io.BytesIO(text), encoding="utf-8-sig", newline="") as lines:
        for block in blocks(lines, 100_000):
            rows += block.rows
            errors += block.errors
    return rows, errors


def blocks(lines: Iterable[str], size: int) -> Iterator[Block]:
    """Rows of a table by so many at a time, each block judged before the next is read."""
    table = csv.reader(lines, strict=True)  # strict, or a quote that is never closed swallows the rest
    try:
        columns = header(next((cells for cells in table if cells), []))
        taken: list[tuple[int, list[str]]] = []
        first = 0
        for cells in table:
            if cells:
                taken.append((table.line_num, cells))
            if len(taken) == size:
                yield _judged(columns, first, taken)
                first, taken = first + size, []
        if taken:
            yield _judged(columns, first, taken)
    except UnicodeDecodeError:
        raise _malformed("The text is not in UTF-8.") from None
    except csv.Error:
        detail = f"The text cannot be read as CSV: the quoting at line {table.line_num} or before it is wrong."
        raise _malformed(detail) from None


def _malformed(detail: str) -> BadRequest:
    return BadRequest(detail, code="malformed_csv", errors=[FieldError("", "malformed_csv", detail)])


def header(names: list[str]) -> list[Column]:
    """The columns that a header declares; ``Unprocessable`` names each that cannot be by its number."""
    columns: list[Column] = []
    errors: list[FieldError] = []
    if not names:
        errors.append(FieldError("", "missing", "The first line names the columns, such as vessel,taken_at,level_m."))
    seen: Counter[str] = Counter()
    for number, name in enumerate(names, start=1):
        try:
            column = _column(name.strip())
        except UnitError as refused:
            errors.append(FieldError(f"/header/{number - 1}", refused.code, f"Column {number}: {refused.detail}"))
            continue
        seen[column.field] += 1
        if seen[column.field] == 2:
            detail = f"Column {number}: {column.field} stands in an earlier column already."
            errors.append(FieldError(f"/header/{number - 1}", "repeated_column", detail))
        columns.append(column)
    if errors:
        raise Unprocessable(" ".join(error.detail for error in errors[:3]), errors=errors[:ERRORS_LISTED])
    return columns


def _column(name: str) -> Column:
    if name in MEASURED:
        own = Conversion(name)
        return Column(name, own.text)
    if name == "empty":
        return Column(name, _truth)
    if name in OBJECTS:
        return Column(name, _object)
    if name in Reading.model_fields:
        return Column(name, str)
    found = _WITH_UNIT.fullmatch(name)
    if found is None:
        raise UnitError("unknown_column", _NO_COLUMN)
    try:
        declared = by_quantity(found[1], found[2].strip())
    except UnitError as refused:
        if refused.code == "unknown_quantity":
            raise UnitError("unknown_column", _NO_COLUMN) from None
        raise
    return Column(declared.field, declared.text, declared.form)


_NO_COLUMN = (
    "It is no field of a reading, such as level_m, and no quantity with its unit, such as level [ft-in-16]; "
    "columns are separated by commas."
)


def _truth(text: str) -> bool:
    try:
        return {"true": True, "false": False}[text.lower()]
    except KeyError:
        raise ValueError("neither true nor false") from None


def _object(text: str) -> object:
    return parse_once(text) if text.startswith("{") else text


def _judged(columns: list[Column], first: int, taken: list[tuple[int, list[str]]]) -> Block:
    """One block: cells become what would stand in JSON, and the model of a reading has the last word."""
    block = Block(first, [line for line, _ in taken])
    raw: list[object] = []
    places: list[int] = []
    forms: dict[tuple[int, str], str] = {}
    for index, (_, cells) in enumerate(taken, start=first):
        if len(cells) != len(columns):
            detail = f"The row has {len(cells)} cell{'' if len(cells) == 1 else 's'}; the header has {len(columns)}."
            block.errors.append(RowError(index=index, field="", code="wrong_length", detail=detail))
            continue
        raw.append(_row(index, columns, cells, forms))
        places.append(index)
    rows, errors = validate_rows(raw)
    block.rows = [(places[at], row) for at, row in rows]
    for error in errors:
        place = places[error.index]
        form = forms.get((place, error.field), error.detail)
        block.errors.append(RowError(index=place, field=error.field, code=error.code, detail=form))
    block.errors.sort(key=lambda error: error.index)
    return block


def _row(index: int, columns: list[Column], cells: list[str], forms: dict[tuple[int, str], str]) -> dict[str, object]:
    """One row as it would stand in JSON; a cell that cannot be read stays text, which no number takes."""
    row: dict[str, object] = {}
    for column, cell in zip(columns, cells, strict=True):
        text = cell.strip()
        if not text:
            continue
        try:
            row[column.field] = column.read(text)
        except (ValueError, RecursionError):
            row[column.field] = text
            if column.form is not None:
                forms[index, column.field] = column.form
    return row
