"""What was moved in the month, in truth: ships, trains, trucks, the plant, and one move that nobody wrote down."""

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
    comes from outside; a density of 0 means that of the vessel. ``recorded`` is false where no ticket was written.
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
            yield _out(f"rack1-03{day:02d}-{label}", tank, "road", day, start, end, 1.3e5 * _vary(rng), meter="m-rack-1")
        yield _out(f"rack2-03{day:02d}", "tk-21", "road", day, "07:00", "17:00", 1.1e5 * _vary(rng), meter="m-rack-2")
    for day in _days(1, 3):
        quantity = 4.0e5 * _vary(rng)
        yield _out(f"rail-g-03{day:02d}", "tk-22", "rail", day, "08:00", "15:00", quantity, weighed=250.0)
    ships = (
        ("tk-12", 4, "08:00", 4, "22:00", 2.4e6, 841.3, 13.6), ("tk-21", 6, "19:00", 7, "04:00", 1.5e6, 746.3, 13.8),
        ("tk-11", 12, "07:00", 12, "21:00", 2.4e6, 838.6, 14.1), ("tk-22", 13, "18:30", 14, "04:20", 1.8e6, 744.6, 13.9),
        ("tk-12", 19, "20:00", 20, "10:00", 2.4e6, 0.0, 14.4), ("tk-21", 21, "19:00", 22, "04:00", 1.3e6, 745.4, 14.2),
        ("tk-12", 26, "07:30", 26, "14:00", 1.0e6, 840.1, 14.6), ("tk-22", 28, "19:00", 29, "00:30", 0.9e6, 745.5, 14.4),
    )  # fmt: skip
    for tank, day, start, last, end, quantity, density, warmth in ships:
        yield Movement(
            f"ship-03{day:02d}", "boundary:jetty-1", tank, instant(day, start), instant(last, end), round(quantity * _vary(rng)),
            "meter", "volume", "m-jetty", cargo_density=density, cargo_c=warmth,
            progress_s=instant(20, "06:00") if day == 19 else 0,
        )  # fmt: skip
    yield Movement("line-0316", "tk-21", "tk-22", instant(16, "19:00"), instant(16, "22:00"), 3.0e5, "meter", "volume", "m-line")
    yield Movement("line-0324", "tk-12", "tk-11", instant(24, "19:00"), instant(24, "21:30"), 2.2e5, "meter", "volume", "m-line")
    yield Movement("line-0330", "tk-12", "tk-11", instant(30, "20:00"), instant(30, "23:00"), 3.1e5, "gauging", "unmetered")


def _chemicals(rng: np.random.Generator) -> Iterator[Movement]:
    """Kerosene, toluene, ethanol, glycol and the yard's diesel."""
    for day in (3, 10, 17, 25):
        yield _in(f"rail-k-03{day:02d}", "tk-31", "rail", day, "19:00", "23:30", 4.2e5 * _vary(rng), 250.0, 798.6 + rng.uniform(0, 1.4))
    for day in _days(0, 1, 2, 3, 4):
        for number, start, end in ((1, "07:30", "08:10"), (2, "10:15", "10:55"), (3, "14:00", "14:40")):
            yield _out(f"road-k-03{day:02d}-{number}", "tk-31", "road", day, start, end, 2.4e4 * _vary(rng), weighed=20.0)
        yield _out(f"plant-g-03{day:02d}", "bx-95", "plant", day, "08:00", "16:00", 1.1e3 * _vary(rng), meter="m-plant-2", form="mass")
    for day in _days(1, 4):
        yield _in(f"road-t-03{day:02d}", "tk-41", "road", day, "06:15", "07:00", 2.5e4 * _vary(rng), 20.0, 871.3 + rng.uniform(-0.3, 0.3))
    for day in range(FIRST_DAY, LAST_DAY + 1):
        yield _out(f"plant-t-03{day:02d}", "tk-41", "plant", day, "07:30", "19:00", 7.4e3 * _vary(rng), meter="m-plant-1", form="mass")
    for day in _days(2):
        yield _in(f"road-e-03{day:02d}-1", "tk-51", "road", day, "06:15", "06:50", 2.45e4 * _vary(rng), 20.0, 793.7 + rng.uniform(-0.3, 0.3))
    for day in _days(0, 3):
        yield _out(f"road-e-03{day:02d}", "tk-51", "road", day, "10:00", "10:45", 2.4e4 * _vary(rng), weighed=20.0)
    for day in _days(0):
        yield _in(f"road-d-03{day:02d}", "u-91", "road", day, "06:15", "06:50", 8.0e3 * _vary(rng), 15.0, 840.2 + rng.uniform(-0.5, 0.5))
    for day in _days(0, 1, 2, 3, 4, 5):
        yield _out(f"pump-03{day:02d}", "u-91", "road", day, "07:10", "17:30", 1.3e3 * _vary(rng), meter="m-pump")
    for day in (9, 23):
        yield _in(f"road-g-03{day:02d}", "bx-95", "road", day, "06:15", "07:10", 1.2e4, 15.0, 1116.4 + rng.uniform(-0.3, 0.3))


def _gases(rng: np.random.Generator) -> Iterator[Movement]:
    """Propane, butane, nitrogen, hydrogen: weighed, metered, or stated by the supplier."""
    for day in _days(0, 2, 4):
        yield _in(f"road-p-03{day:02d}", "b-61", "road", day, "19:00", "20:30", 1.95e4 * _vary(rng), 15.0, 0.0)
        yield _in(f"plant-n-03{day:02d}", "r-81", "plant", day, "06:30", "09:30", 215.0 * _vary(rng), 0.0, 0.0, meter="m-gas-1")
    for day in _days(0, 1, 2, 3, 4):
        for number, start, end in ((1, "08:00", "08:50"), (2, "13:30", "14:20")):
            yield _out(f"road-p-03{day:02d}-{number}", "b-61", "road", day, start, end, 5.8e3 * _vary(rng), weighed=15.0)
        yield _out(f"rail-b-03{day:02d}", "s-71", "rail", day, "09:00", "12:30", 3.0e4 * _vary(rng), weighed=30.0)
    for day in (11, 25):
        yield Movement(f"ship-b-03{day:02d}", "boundary:jetty-2", "s-71", instant(day, "14:00"), instant(day, "23:00"),
                       round(3.3e5 * _vary(rng)), "ship", mass_uncertainty_kg=500.0)  # fmt: skip
    for day in range(FIRST_DAY, LAST_DAY + 1):
        yield _out(f"plant-n2-03{day:02d}", "r-81", "plant", day, "07:00", "19:00", 90.0 * _vary(rng), meter="m-gas-1", form="mass")
        yield _out(f"plant-h2-03{day:02d}", "r-82", "plant", day, "07:00", "19:00", 31.0 * _vary(rng), meter="m-gas-2", form="mass")
    for day in _days(1, 4):
        yield _in(f"trailer-03{day:02d}", "r-82", "road", day, "09:00", "11:30", 110.0 * _vary(rng), 0.8, 0.0, by="statement")


def _vary(rng: np.random.Generator) -> float:
    return 1.0 + rng.uniform(-0.06, 0.06)


def _out(
    key: str, tank: str, end_of: str, day: int, start: str, end: str, mass: float,
    *, meter: str = "", weighed: float = 0.0, form: str = "volume",
) -> Movement:  # fmt: skip
    return Movement(
        key, tank, f"boundary:{end_of}", instant(day, start), instant(day, end), round(mass, 1),
        "meter" if meter else "weighbridge", form if meter else "mass", meter, weighed,
    )  # fmt: skip


def _in(
    key: str, tank: str, end_of: str, day: int, start: str, end: str, mass: float, weighed: float, density: float,
    *, meter: str = "", by: str = "",
) -> Movement:  # fmt: skip
    return Movement(
        key, f"boundary:{end_of}", tank, instant(day, start), instant(day, end), round(mass, 1),
        by or ("meter" if meter else "weighbridge"), "mass", meter, weighed, cargo_density=round(density, 2),
    )  # fmt: skip


UNRECORDED_KG = 26000.0


def movements(seed: int) -> list[Movement]:
    """All movements of the month in the order of their starts, the unrecorded one among them."""
    rng = np.random.default_rng([seed, 1])
    found = [*_fuel(rng), *_chemicals(rng), *_gases(rng)]
    hidden = Movement(
        "not-written-down", "tk-11", "tk-12", instant(17, "22:30"), instant(17, "23:40"), UNRECORDED_KG, "gauging", "unmetered",
    )  # fmt: skip
    return sorted([*found, replace(hidden, recorded=False)], key=lambda one: (one.start_s, one.id))
