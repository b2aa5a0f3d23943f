"""How the time of a night's books grows from 1,000 to 10,000 vessels with three transfers each, in one group."""

from __future__ import annotations

import math
from functools import partial

import numpy as np

from models.balance.night import Movement, Night, night
from models.estimate import Estimate
from tests.benchmarks.conftest import Ratio

FEW, MANY, TRANSFERS = 1_000, 10_000, 3
ALARM = 0.5 / 30.44


def site(vessels: int) -> tuple[dict[str, Estimate | None], dict[str, Estimate | None], list[Movement]]:
    """Masses with errors of their own and of laboratories, meters that six transfers share, 2 % unmetered."""
    rng = np.random.default_rng(vessels)

    def held(number: int, when: str) -> Estimate:
        parts = {f"r:{number}:{when}": 3.0, f"level:{number}": 10.0, f"capacity:{number}": 20.0}
        return Estimate(1e5 + float(rng.normal(0, 4)), parts | {f"density:{number % 5}": 5.0})

    movements = []
    for at in range(TRANSFERS * vessels):
        source, target = at % vessels, at % vessels + int(rng.integers(1, 9))
        mass = None if rng.random() < 0.02 else Estimate(0.0, {f"t:{at}": 5.0, f"meter:{at // 6}": 2.0})
        movements.append(Movement(f"t{at}", f"v{source}", f"v{target}" if target < vessels else None, mass))
    numbers = range(vessels)
    return {f"v{one}": held(one, "o") for one in numbers}, {f"v{one}": held(one, "c") for one in numbers}, movements


def closed(vessels: int) -> Night:
    return night(*site(vessels), ALARM)


def test_growth_with_the_site(ratio: Ratio) -> None:
    assert len(closed(MANY).rows) > 9 * len(closed(FEW).rows) > 0
    many, few = site(MANY), site(FEW)
    what = "night's books, 10,000 to 1,000 vessels in one group"
    grown = ratio(what, partial(night, *many, ALARM), partial(night, *few, ALARM), units=MANY, rounds=2)
    print(f"\n{what}: exponent {math.log10(grown):.2f}")
