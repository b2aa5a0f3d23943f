"""Closed nights that new facts touch become due, in the transaction that brings the facts."""

from __future__ import annotations

from collections.abc import Iterable

from app.services.find import ALL_TIME
from app.store import books, due
from app.store.engine import Writing
from app.store.tables import LABORATORY

LONGEST_AGE_US = 35 * 86_400_000_000  # µs; no level, pressure or temperature counts for longer
INTERPOLATED_US = LONGEST_AGE_US  # µs; a value after a close is joined to the one before it within the age


def readings(writing: Writing, kept: Iterable[tuple[int, Iterable[str]]]) -> None:
    """Nights that kept readings could change: instants, and the quantities that each brought.

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
