"""A folder of definitions and CSV readings goes into the store, by the same verbs as over HTTP.

::

    site-id/                    the folder's name is the site's id
      site.json                 bodies as they would be PUT; the file's stem is the id
      substances/*.json
      vessels/*.json
      meters/*.json
      readings/*.csv            as they would be posted: level_m or level [ft-in-16]; a blank cell was not read
      transfers.json            {"transfers": [...]}
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from pydantic import ValidationError

from app.clock import Clock
from app.errors import AppError
from app.schemas.batch import ERRORS_LISTED, RowError
from app.schemas.errors import explain
from app.schemas.meter import Meter
from app.schemas.site import Site
from app.schemas.substance import Substance
from app.schemas.transfer import validate_transfers
from app.schemas.vessel import Vessel
from app.services import define, ingest, move, read_csv
from app.store.engine import Store

BLOCK = 5_000  # rows of one transaction
FOLDERS = (("substances", "substance", Substance), ("vessels", "vessel", Vessel), ("meters", "meter", Meter))

Progress = Callable[[str, int], None]


class FolderError(Exception):
    """A file that cannot be loaded at all; the sentence names it."""


@dataclass
class Loaded:
    """What a folder brought, counted in files and rows."""

    site: str
    definitions: dict[str, int] = field(default_factory=lambda: {"created": 0, "revised": 0, "unchanged": 0})
    readings: ingest.Outcome = field(default_factory=ingest.Outcome)
    transfers: dict[str, int] = field(default_factory=lambda: {"created": 0, "revised": 0, "unchanged": 0})
    errors: list[str] = field(default_factory=list)
    rejected: int = 0


def rows_in(folder: Path) -> int:
    """How many rows of readings a folder holds, by its lines."""
    return sum(_lines(path) - 1 for path in _tables(folder))


def _lines(path: Path) -> int:
    with path.open("rb") as file:
        return sum(1 for _ in file)


def load(store: Store, clock: Clock, folder: Path, progress: Progress = lambda _, __: None) -> Loaded:
    """Load a site's folder; ``progress`` hears of each file and of the rows that it brought."""
    site = folder.resolve().name
    result = Loaded(site)
    result.definitions[define.put_site(store, site, _body(folder / "site.json", Site)).outcome] += 1
    for name, kind, model in FOLDERS:
        for path in sorted((folder / name).glob("*.json")):
            done = _refused_by(path, lambda path=path, kind=kind, model=model: define.put(  # type: ignore[misc]
                store, site, kind, path.stem, _body(path, model)
            ))  # fmt: skip
            result.definitions[done.outcome] += 1
    for path in _tables(folder):
        _readings(store, clock, site, path, result, progress)
    tickets = folder / "transfers.json"
    if tickets.exists():
        rows, errors = _read(tickets, validate_transfers)
        counts, errors, _ = move.put_many(store, site, rows, errors)
        result.transfers = counts
        _note(result, "transfers.json", errors, lambda index: f"ticket {index}")
        progress(tickets.name, 0)
    return result


def _tables(folder: Path) -> list[Path]:
    return sorted((folder / "readings").glob("*.csv"))


def _body(path: Path, model: Any) -> Any:
    """A definition's file as its body."""
    return _read(path, model.model_validate_json)


def _read(path: Path, act: Callable[[bytes], Any]) -> Any:
    """What a file's bytes say, or a sentence that names the file, the field and the limit."""
    try:
        return act(path.read_bytes())
    except FileNotFoundError:
        raise FolderError(f"{path} is not there: a site's folder holds site.json") from None
    except ValidationError as refused:
        pointer, _, detail = explain(refused)[0]
        raise FolderError(f"{path}: {pointer or 'the body'}: {detail}") from None


def _refused_by(path: Path, act: Callable[[], Any]) -> Any:
    try:
        return act()
    except AppError as refused:
        raise FolderError(f"{path}: {refused.detail}") from None


def _readings(store: Store, clock: Clock, site: str, path: Path, result: Loaded, progress: Progress) -> None:
    """One table in blocks: each is committed before the next is read."""
    with path.open(newline="", encoding="utf-8-sig") as file:
        blocks = read_csv.blocks(file, BLOCK)
        while (block := _refused_by(path, lambda: next(blocks, None))) is not None:
            rows, errors = block.rows, block.errors
            done = ingest.ingest(store, clock, site, rows, errors)
            for name in ("stored", "revised", "unchanged", "rejected"):
                setattr(result.readings, name, getattr(result.readings, name) + getattr(done, name))
            _note(result, path.name, errors, lambda index, block=block: f"line {block.line(index)}")  # type: ignore[misc]
            progress(path.name, len(block.lines))


def _note(result: Loaded, name: str, errors: list[RowError], place: Callable[[int], str]) -> None:
    """Refused rows as sentences that name the file and the line."""
    result.rejected += len({error.index for error in errors})
    for error in errors[:ERRORS_LISTED]:
        result.errors.append(f"{name}, {place(error.index)}: {error.field}: {error.detail}")
