"""The demo: an invented site in a database of its own, its month closed, what stands out said."""

from __future__ import annotations

import json
from collections.abc import Iterator
from datetime import date, timedelta
from pathlib import Path
from typing import Any

from app.clock import Clock
from app.services import close, report
from app.store.engine import Store

DATA = Path(__file__).resolve().parents[2] / "demo_data"
KEY = json.loads((DATA / "key.json").read_text(encoding="utf-8"))
FOLDER = DATA / str(KEY["site"])


def fresh_file(folder: Path) -> Path:
    """The demo's own SQLite file, emptied of an earlier demo."""
    folder.mkdir(parents=True, exist_ok=True)
    path = folder / "demo.db"
    for ending in ("", "-wal", "-shm", ".lock"):
        path.with_name(path.name + ending).unlink(missing_ok=True)
    return path


def days() -> list[date]:
    """The local days of the demo's month."""
    first, last = (date.fromisoformat(KEY[name]) for name in ("first_day", "last_day"))
    return [first + timedelta(days=offset) for offset in range((last - first).days + 1)]


def close_month(store: Store, clock: Clock) -> Iterator[str]:
    """Close every day in order; the flagged nights in words, then what had been planted."""
    flagged = 0
    nights = days()
    for day in nights:
        body, _ = close.close(store, clock, FOLDER.name, day.isoformat())
        if body["status"] == "imbalanced" or not body["complete"]:
            flagged += 1
            yield from report.night(body)
    yield f"{len(nights)} days closed, {flagged} flagged. What was planted in these invented data:"
    for fault in KEY["faults"]:
        yield f"  {planted(fault)}"


def planted(fault: dict[str, Any]) -> str:
    """One planted fault as its key tells it."""
    return f"{fault['first_night']}: {fault['kind']}, {fault['subject']}, {fault['size']:g} {fault['unit']}"
