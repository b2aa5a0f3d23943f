"""Local days of a site, as integer microseconds UTC."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import UTC, date, datetime, time, timedelta
from zoneinfo import ZoneInfo

from app.errors import FieldError, Unprocessable
from app.schemas.types import FIRST_YEAR, LAST_YEAR
from models.errors import DefinitionError

EPOCH = datetime(1970, 1, 1, tzinfo=UTC)


def micros(moment: datetime) -> int:
    """Microseconds UTC of an aware moment, exactly."""
    return (moment - EPOCH) // timedelta(microseconds=1)


def day_edge(day: date, starts_at: str, zone: str) -> int:
    """The instant at which a site's day begins.

    An hour that does not exist moves to the first instant after the gap, one that occurs twice is the first.
    """
    hour, minute = starts_at.split(":")[:2]
    local = datetime.combine(day, time(int(hour), int(minute)), tzinfo=ZoneInfo(zone))
    there = local.astimezone(UTC)
    if there.astimezone(ZoneInfo(zone)).replace(tzinfo=None) == local.replace(tzinfo=None):
        return micros(there)
    # In the gap the two folds lie on either side of it: before it runs the old offset, after it the new one.
    return micros(_end_of_gap(local))


def _end_of_gap(local: datetime) -> datetime:
    """First instant after the gap in which a local time does not exist, found by bisection."""
    zone = local.tzinfo
    low = local.replace(fold=1).astimezone(UTC) - timedelta(hours=3)
    high = low + timedelta(hours=6)
    before = low.astimezone(zone).utcoffset()
    while high - low > timedelta(microseconds=1):
        middle = low + (high - low) / 2
        if middle.astimezone(zone).utcoffset() == before:
            low = middle
        else:
            high = middle
    return high


def day_bounds(day: date, starts_at: str, zone: str) -> tuple[int, int]:
    """Opening and closing of the day that begins on a local date: 23, 24 or 25 hours."""
    return day_edge(day, starts_at, zone), day_edge(day + timedelta(days=1), starts_at, zone)


def basic(instant: int) -> str:
    """An instant in basic UTC to the second, as in the ids of periods: 20260301T050000Z."""
    return (EPOCH + timedelta(microseconds=instant)).strftime("%Y%m%dT%H%M%SZ")


def check_zone(name: str) -> None:
    """Refuse a time zone that the tz database does not know."""
    try:
        ZoneInfo(name)
    except (KeyError, ValueError, OSError):
        raise DefinitionError(
            "time_zone is no name of the IANA time zone database; Europe/Oslo is one", field=None
        ) from None


@dataclass(frozen=True)
class Period:
    """A half-open period of a site; a day of it where ``day`` is given."""

    opening: int
    closing: int
    day: str | None = None

    @property
    def label(self) -> str:
        """The period's id without its revision."""
        return self.day or f"{basic(self.opening)}--{basic(self.closing)}"


def in_order(bounds: tuple[int, int]) -> None:
    """Refuse bounds of a listing or a course that end before they begin."""
    if bounds[1] <= bounds[0]:
        raise Unprocessable(
            "to is after from", code="impossible", errors=[FieldError("/query/to", "impossible", "to is after from")]
        )


def parse_basic(text: str) -> int:
    """The instant of a basic UTC text such as 20260301T050000Z."""
    return micros(datetime.strptime(text, "%Y%m%dT%H%M%SZ").replace(tzinfo=UTC))


def parse_label(text: str) -> Period | date:
    """A period's id without its revision: two instants, or a local date."""
    try:
        if "--" in text:
            opening, closing = (parse_basic(part) for part in text.split("--"))
            return Period(opening, closing)
        day = date.fromisoformat(text)
    except ValueError:
        raise _no_such(
            "The id of a period is a date, or two instants in basic UTC; there is no such date or time"
        ) from None
    if not FIRST_YEAR <= day.year <= LAST_YEAR:
        raise _no_such(f"A day lies in the years {FIRST_YEAR} to {LAST_YEAR}")
    return day


def _no_such(detail: str) -> Unprocessable:
    return Unprocessable(detail, code="not_a_period")
