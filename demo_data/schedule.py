"""What moved in the month, in truth: ships, trains, trucks, the plant, and a move that nobody wrote down."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace
from datetime import datetime, timedelta
from zoneinfo import ZoneInfo

import numpy as np

from demo_data.terminal import ZONE

LOCAL = ZoneInfo(ZONE)
FIRST_DAY, LAST_DAY = 1, 31  # of March 2026: the days that are closed; each ends at 06:00 of the next


def instant(day: int, clock: str) -> int:
    """Seconds since 1970 of a local time of March 2026; day 0 is 28 February, 32 is 1 April."""
    date = datetime(2026, 3, 1) + timedelta(days=day - 1)
    return int(datetime.fromisoformat(f"{date:%Y-%m-%d}T{clock}:00").replace(tzinfo=LOCAL).timestamp())


def local_text(seconds: int) -> str:
    """The instant as people on the quay write it, with the offset then in force."""
    return datetime.fromtimestamp(seconds, LOCAL).isoformat(timespec="seconds")


@dataclass(frozen=True)
class Movement:
    """Substance that moved, in truth.

    ``form`` says how the ticket states it: ``mass``, ``volume`` (standard, with a density), or
    ``unmetered``. ``cargo_density`` and ``cargo_c`` are the standard density and temperature of what
    comes from outside; a density of 0 is that of the vessel. Without ``recorded`` there is no ticket.
    """

    id: str
    source: str
    target: str
    start_s: int
    end_s: int
    mass_kg: float
    by: str
    form: str = "mass"
    meter: str = ""
    mass_uncertainty_kg: float = 0.0
    cargo_density: float = 0.0
    cargo_c: float = 15.0
    progress_s: int = 0
    recorded: bool = True

    def share(self, at_s: object) -> np.ndarray[tuple[int, ...], np.dtype[np.float64]]:
        """How much of it had moved at some instants, 0 to 1."""
        elapsed = np.asarray(at_s, dtype=float) - self.start_s
        return np.asarray(np.clip(elapsed / (self.end_s - self.start_s), 0.0, 1.0))


def weekday(day: int) -> int:
    """0 for Monday; 1 March 2026 is a Sunday."""
    return (day + 5) % 7


def _days(*weekdays: int) -> Iterator[int]:
    return (day for day in range(FIRST_DAY, LAST_DAY + 1) if weekday(day) in weekdays)


def _fuel(rng: np.random.Generator) -> Iterator[Movement]:
    """Gas oil and gasoline: ships in by the jetty's meter, trucks out by the rack's, trains by weight."""
    for day in _days(0, 1, 2, 3, 4, 5):
        tank = "tk-12" if 12 <= day <= 18 else "tk-11"
        for label, start, end in (("am", "07:00", "12:00"), ("pm", "13:00", "17:30")):
            key, quantity = f"rack1-03{day:02d}-{label}", 1.3e5 * _vary(rng)
            yield _out(key, tank, "road", day, start, end, quantity, meter="m-rack-1")
        quantity = 1.1e5 * _vary(rng)
        yield _out(f"rack2-03{day:02d}", "tk-21", "road", day, "07:00", "17:00", quantity, meter="m-rack-2")
    for day in _days(1, 3):
        quantity = 4.0e5 * _vary(rng)
        yield _out(f"rail-g-03{day:02d}", "tk-22", "rail", day, "08:00", "15:00", quantity, weighed=250.0)
    for ship in SHIPS:
        yield _ship(*ship, _vary(rng))
    yield _line("line-0316", "tk-21", "tk-22", 16, "19:00", "22:00", 3.0e5)
    yield _line("line-0324", "tk-12", "tk-11", 24, "19:00", "21:30", 2.2e5)
    unknown = _line("line-0330", "tk-12", "tk-11", 30, "20:00", "23:00", 3.1e5)
    yield replace(unknown, by="gauging", form="unmetered", meter="")


def _line(key: str, source: str, target: str, day: int, start: str, end: str, mass: float) -> Movement:
    """From tank to tank, by the line's meter."""
    return Movement(key, source, target, instant(day, start), instant(day, end), mass, "meter", "volume", "m-line")


# tank, first day and hour, last day and hour, kg, density at 15 °C (0: as the tank's), °C
SHIPS = (
    ("tk-12", 4, "08:00", 4, "22:00", 2.4e6, 841.3, 13.6),
    ("tk-21", 6, "19:00", 7, "04:00", 1.5e6, 746.3, 13.8),
    ("tk-11", 12, "07:00", 12, "21:00", 2.4e6, 838.6, 14.1),
    ("tk-22", 13, "18:30", 14, "04:20", 1.8e6, 744.6, 13.9),
    ("tk-12", 19, "20:00", 20, "10:00", 2.4e6, 0.0, 14.4),
    ("tk-21", 21, "19:00", 22, "04:00", 1.3e6, 745.4, 14.2),
    ("tk-12", 26, "07:30", 26, "14:00", 1.0e6, 840.1, 14.6),
    ("tk-22", 28, "19:00", 29, "00:30", 0.9e6, 745.5, 14.4),
)


def _ship(
    tank: str,
    day: int,
    start: str,
    last: int,
    end: str,
    mass: float,
    density: float,
    warmth: float,
    varied: float,
) -> Movement:
    """A ship's cargo by the jetty's meter; one that spans a close has its running quantity there."""
    close = instant(day + 1, "06:00")
    start_s, end_s = instant(day, start), instant(last, end)
    return Movement(
        f"ship-03{day:02d}",
        "boundary:jetty-1",
        tank,
        start_s,
        end_s,
        round(mass * varied),
        "meter",
        "volume",
        "m-jetty",
        cargo_density=density,
        cargo_c=warmth,
        progress_s=close if end_s > close else 0,
    )


def _chemicals(rng: np.random.Generator) -> Iterator[Movement]:
    """Kerosene, toluene, ethanol and glycol: trucks and trains by weight, the plant by meter."""

    def density(middle: float, width: float) -> float:
        return middle + rng.uniform(-width, width)

    for day in (3, 10, 17, 25):
        quantity = 4.2e5 * _vary(rng)
        yield _in(
            f"rail-k-03{day:02d}",
            "tk-31",
            "rail",
            day,
            "19:00",
            "23:30",
            quantity,
            250.0,
            density(799.3, 0.7),
        )
    for day in _days(0, 1, 2, 3, 4):
        for number, start, end in ((1, "07:30", "08:10"), (2, "10:15", "10:55"), (3, "14:00", "14:40")):
            key, quantity = f"road-k-03{day:02d}-{number}", 2.4e4 * _vary(rng)
            yield _out(key, "tk-31", "road", day, start, end, quantity, weighed=20.0)
        yield _drawn(f"plant-g-03{day:02d}", "bx-95", day, "08:00", "16:00", 1.1e3 * _vary(rng), "m-plant-2")
    for day in _days(1, 4):
        quantity = 2.5e4 * _vary(rng)
        yield _in(f"road-t-03{day:02d}", "tk-41", "road", day, "06:15", "07:00", quantity, 20.0, density(871.3, 0.3))
    for day in range(FIRST_DAY, LAST_DAY + 1):
        yield _drawn(f"plant-t-03{day:02d}", "tk-41", day, "07:30", "19:00", 7.4e3 * _vary(rng), "m-plant-1")
    for day in _days(2):
        quantity = 4.9e4 * _vary(rng)
        yield _in(f"rail-e-03{day:02d}", "tk-51", "rail", day, "06:15", "07:40", quantity, 30.0, density(793.7, 0.3))
    for day in _days(0, 3):
        quantity = 2.4e4 * _vary(rng)
        yield _out(f"road-e-03{day:02d}", "tk-51", "road", day, "10:00", "10:45", quantity, weighed=20.0)
    for day in (9, 23):
        yield _in(f"road-g-03{day:02d}", "bx-95", "road", day, "06:15", "07:10", 1.2e4, 15.0, density(1116.4, 0.3))


def _yard(rng: np.random.Generator) -> Iterator[Movement]:
    """The yard's own diesel."""
    for day in _days(0):
        quantity, density = 8.0e3 * _vary(rng), 840.2 + rng.uniform(-0.5, 0.5)
        yield _in(f"road-d-03{day:02d}", "u-91", "road", day, "06:15", "06:50", quantity, 15.0, density)
    for day in _days(0, 1, 2, 3, 4, 5):
        quantity = 1.3e3 * _vary(rng)
        yield _out(f"pump-03{day:02d}", "u-91", "road", day, "07:10", "17:30", quantity, meter="m-pump")


def _gases(rng: np.random.Generator) -> Iterator[Movement]:
    """Propane, butane, nitrogen, hydrogen: weighed, metered, or stated by the supplier."""
    for day in _days(0, 2, 4):
        quantity = 1.95e4 * _vary(rng)
        yield _in(f"road-p-03{day:02d}", "b-61", "road", day, "19:00", "20:30", quantity, 15.0, 0.0)
        quantity = 215.0 * _vary(rng)
        yield Movement(
            f"plant-n-03{day:02d}",
            "boundary:plant",
            "r-81",
            instant(day, "06:30"),
            instant(day, "09:30"),
            round(quantity, 1),
            "meter",
            meter="m-gas-1",
        )
    for day in _days(0, 1, 2, 3, 4):
        for number, start, end in ((1, "08:00", "08:50"), (2, "13:30", "14:20")):
            key, quantity = f"road-p-03{day:02d}-{number}", 5.8e3 * _vary(rng)
            yield _out(key, "b-61", "road", day, start, end, quantity, weighed=15.0)
        quantity = 3.0e4 * _vary(rng)
        yield _out(f"rail-b-03{day:02d}", "s-71", "rail", day, "09:00", "12:30", quantity, weighed=30.0)
    for day in (11, 25):
        yield Movement(
            f"ship-b-03{day:02d}",
            "boundary:jetty-2",
            "s-71",
            instant(day, "14:00"),
            instant(day, "23:00"),
            round(3.3e5 * _vary(rng)),
            "ship",
            mass_uncertainty_kg=500.0,
        )
    for day in range(FIRST_DAY, LAST_DAY + 1):
        yield _drawn(f"plant-n2-03{day:02d}", "r-81", day, "07:00", "19:00", 90.0 * _vary(rng), "m-gas-1")
        yield _drawn(f"plant-h2-03{day:02d}", "r-82", day, "07:00", "19:00", 31.0 * _vary(rng), "m-gas-2")
    for day in _days(1, 4):
        yield Movement(
            f"trailer-03{day:02d}",
            "boundary:road",
            "r-82",
            instant(day, "09:00"),
            instant(day, "11:30"),
            round(110.0 * _vary(rng), 1),
            "statement",
            mass_uncertainty_kg=0.8,
        )


def _vary(rng: np.random.Generator) -> float:
    return 1.0 + rng.uniform(-0.06, 0.06)


def _out(
    key: str,
    tank: str,
    end_of: str,
    day: int,
    start: str,
    end: str,
    mass: float,
    *,
    meter: str = "",
    weighed: float = 0.0,
) -> Movement:
    """To a boundary, by a meter of volume or a weighbridge."""
    by, form = ("meter", "volume") if meter else ("weighbridge", "mass")
    start_s, end_s = instant(day, start), instant(day, end)
    return Movement(key, tank, f"boundary:{end_of}", start_s, end_s, round(mass, 1), by, form, meter, weighed)


def _drawn(key: str, tank: str, day: int, start: str, end: str, mass: float, meter: str) -> Movement:
    """To the plant, by a meter of mass."""
    start_s, end_s = instant(day, start), instant(day, end)
    return Movement(key, tank, "boundary:plant", start_s, end_s, round(mass, 1), "meter", "mass", meter)


def _in(
    key: str,
    tank: str,
    end_of: str,
    day: int,
    start: str,
    end: str,
    mass: float,
    weighed: float,
    density: float,
) -> Movement:
    """From a boundary, over the weighbridge."""
    return Movement(
        key,
        f"boundary:{end_of}",
        tank,
        instant(day, start),
        instant(day, end),
        round(mass, 1),
        "weighbridge",
        mass_uncertainty_kg=weighed,
        cargo_density=round(density, 2),
    )


UNRECORDED_KG = 26000.0


def movements(seed: int) -> list[Movement]:
    """All movements of the month in the order of their starts, the unrecorded one among them."""
    rng = np.random.default_rng([seed, 1])
    found = [*_fuel(rng), *_chemicals(rng), *_yard(rng), *_gases(rng)]
    hidden = replace(_line("not-written-down", "tk-11", "tk-12", 17, "22:30", "23:40", UNRECORDED_KG), recorded=False)
    return sorted([*found, hidden], key=lambda one: (one.start_s, one.id))
