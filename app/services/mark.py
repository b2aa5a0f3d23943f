"""Closed nights that new facts touch become due, in the transaction that brings the facts."""

from __future__ import annotations

from collections.abc import Iterable

from app.services.find import ALL_TIME
from app.services.samples import LATEST_US
from app.store import books, due
from app.store.engine import Writing
from app.store.tables import LABORATORY

LONGEST_AGE_US = 35 * 86_400_000_000  # µs; no level, pressure or temperature counts for longer
INTERPOLATED_US = LONGEST_AGE_US  # µs; a value after a close is joined to the one before it within the age


def begins(taken_at: int, quantities: Iterable[str], holds_from: int | None, *, revised: bool) -> int:
    """From when a reading may count: a sample's may stand from before it was drawn.

    Where one is corrected, it may have stood from any instant that a sample may stand from.
    """
    if revised and not LABORATORY.isdisjoint(quantities):
        return taken_at - LATEST_US
    return taken_at if holds_from is None else min(taken_at, holds_from)


def readings(writing: Writing, kept: Iterable[tuple[int, Iterable[str]]]) -> None:
    """Nights that kept readings could change: instants from when they count, and the quantities of each.

    It is generous: a night that is closed anew from the same inputs stands as it is.
    """
    newest = books.newest_closing(writing.connection, writing.site_id)
    if newest is None:
        return
    first, last = ALL_TIME, -ALL_TIME
    for taken_at, quantities in kept:
        if taken_at - INTERPOLATED_US > newest:
            continue
        lasting = not LABORATORY.isdisjoint(quantities)
        first = min(first, taken_at if lasting else taken_at - INTERPOLATED_US)
        last = max(last, ALL_TIME if lasting else taken_at + LONGEST_AGE_US)
    if first <= last:
        due.mark_touched(writing, first, last, "late or corrected readings")


def period(writing: Writing, first: int, last: int, cause: str) -> None:
    """Nights between two instants, by a transfer or a definition."""
    if books.newest_closing(writing.connection, writing.site_id) is not None:
        due.mark_touched(writing, first, last, cause)
