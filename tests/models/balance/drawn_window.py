"""Windows drawn at random, with shared and own errors, for the tests of the balance over many nights."""

from __future__ import annotations

import numpy as np

from models.balance.window import Stock, Ticket, Window
from models.estimate import Estimate

AREA = 200.0  # m²
DENSITY = 800.0  # kg/m³


def draw(
    rng: np.random.Generator, vessels: int = 3, nights: int = 6, tickets: int = 4, quiet: bool = False
) -> Window:  # fmt: skip
    """A site without faults: every measured value is the truth plus the errors that it names.

    A gauge zero, a table error by level, a sample per vessel and three nights, a meter with a factor, and errors
    of each reading's own; ``quiet`` leaves the truth as it is.
    """
    latent: dict[str, float] = {}

    def measured(truth: float, parts: dict[str, float]) -> Estimate:
        drawn = sum(part * latent.setdefault(name, rng.standard_normal()) for name, part in parts.items())
        return Estimate(truth + (0.0 if quiet else drawn), parts)

    names = [f"tk-{v}" for v in range(vessels)]
    content = np.array([rng.uniform(3.0, 9.0) * AREA * DENSITY for _ in names])
    stocks: list[Stock] = []
    moved: list[Ticket] = []
    for close in range(nights + 1):
        if close:
            for number in range(tickets):
                mass = rng.uniform(20e3, 90e3)
                one, other = rng.choice(vessels + 1, 2, replace=False)
                source, target = (None if end == vessels else names[end] for end in (one, other))
                content[: vessels] -= mass * (np.arange(vessels) == one)
                content[: vessels] += mass * (np.arange(vessels) == other)
                name = f"t-{close}-{number}"
                parts = {f"t:{name}": 4e-4 * mass, "meter:M": 8e-4 * mass}
                moved.append(Ticket(name, close, source, target, measured(mass, parts), "M"))
        for v, name in enumerate(names):
            level = content[v] / (AREA * DENSITY)
            sample = f"sample:{name}:{close // 3}"
            parts = {
                f"level:{name}": 2e-3 * AREA * DENSITY, f"r:{name}:{close}": 1e-3 * AREA * DENSITY,
                f"capacity:{name}": 2e-4 * content[v] * np.sin(level), sample: 6e-4 * content[v],
                "density:lab": 2e-4 * content[v],
            }  # fmt: skip
            slopes = {
                "level": AREA * DENSITY * (1.0 + 0.02 * level), "temperature": -1e-3 * content[v],
                "density": content[v] / DENSITY,
            }  # fmt: skip
            read = measured(content[v], parts)
            stocks.append(Stock(name, close, read, slopes, (sample, "density:lab"), per_mm=AREA * DENSITY / 1e3))
    return Window((1.0,) * nights, stocks, moved)


def masses_of(window: Window) -> list[Estimate]:
    """What was measured: stocks, then movements."""
    stocks = [stock.mass for stock in window.stocks if stock.mass is not None]
    return stocks + [ticket.mass for ticket in window.tickets if ticket.mass is not None]
