"""Inventories and nights of many vessels through the services: by the store's size, and by the site's."""

from __future__ import annotations

import math
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from functools import partial
from typing import Any

import pytest

from app.services import carry, close, take_stock
from app.store.engine import Store
from tests.benchmarks import many_vessels
from tests.benchmarks.conftest import Ratio
from tests.benchmarks.many_vessels import CLOSING, DAY, STEP, VALUES, AfterAll

VESSELS, SOME = 1_000, 300
FEW, MANY = 100_000, 10_000_000  # values in the store
AT = CLOSING + STEP // 5  # between two readings: level, pressure and temperatures are interpolated
POINTS = 10_000


@contextmanager
def split(patch: pytest.MonkeyPatch) -> Iterator[dict[str, float]]:
    """Seconds spent on definitions, queries, chain and answer while the block lasts."""
    spent = dict.fromkeys(("definitions", "query", "chain", "answer"), 0.0)
    inner: list[float] = []

    def timed(part: str, act: Callable[..., Any]) -> Callable[..., Any]:
        def acting(*given: Any, **named: Any) -> Any:
            inner.append(0.0)
            started = time.perf_counter()
            try:
                return act(*given, **named)
            finally:
                whole = time.perf_counter() - started
                spent[part] += whole - inner.pop()
                if inner:
                    inner[-1] += whole

        return acting

    with patch.context() as within:
        for module, name, part in (
            (take_stock, "site_in_force", "definitions"), (take_stock, "measure_at", "chain"),
            (take_stock, "answers", "answer"), (take_stock, "mass_estimate", "answer"),
            (take_stock, "totals", "answer"), (carry, "collect", "query"), (carry, "_moves", "query"),
        ):  # fmt: skip
            within.setattr(module, name, timed(part, getattr(module, name)))
        yield spent


@pytest.fixture(scope="module")
def filled(store: Store) -> dict[int, str]:
    """Sites of 1,000 vessels by the number of their values; one store, so that they share its tables."""
    found = {}
    for size in (FEW, MANY):
        started = time.perf_counter()
        found[size] = f"many-{size}"
        many_vessels.make(store, found[size], VESSELS, size // VESSELS // VALUES)
        print(f"\n{store.dialect}: {size:,} values in {time.perf_counter() - started:.0f} s")
    return found


def inventory(store: Store, site: str) -> dict[str, Any]:
    return take_stock.site_inventory(store, site, AT, None)


def test_the_inventory_does_not_grow_with_what_is_kept(
    ratio: Ratio, store: Store, filled: dict[int, str], monkeypatch: pytest.MonkeyPatch
) -> None:
    few, many = (partial(inventory, store, filled[size]) for size in (FEW, MANY))
    for answer in (few(), many()):
        assert {one["status"] for one in answer["vessels"]} == {"measured"}
        assert len(answer["vessels"]) == VESSELS
    for size, work in ((FEW, few), (MANY, many)):
        with split(monkeypatch) as spent:
            work()
        parts = ", ".join(f"{part} {1e3 * seconds:.0f} ms" for part, seconds in spent.items())
        print(f"\n{store.dialect}, 1,000 vessels, {size:,} values: {parts}")
    what = f"inventory of 1,000 vessels, 1e7 values to 1e5, {store.dialect}"
    ratio(what, many, few, target="<= 2", units=VESSELS)


def test_a_course_of_ten_thousand_points(ratio: Ratio, store: Store, filled: dict[int, str]) -> None:
    def course(points: int) -> list[dict[str, Any]]:
        last = CLOSING + points * STEP // 20  # fifteen seconds from point to point
        found = take_stock.course(store, filled[MANY], many_vessels.name_of(0), CLOSING, last, STEP // 20, None)
        items: list[dict[str, Any]] = found["items"]
        return items

    found = course(POINTS)
    assert len(found) == POINTS
    assert {one["status"] for one in found} == {"measured"}
    what = f"a course of 10,000 points to one of 1,000, {store.dialect}"
    ratio(what, partial(course, POINTS), partial(course, POINTS // 10), target="<= 10", units=POINTS, rounds=2)


@pytest.mark.parametrize("by", ["mass_kg", "standard_volume_m3"])
def test_growth_of_a_night_with_the_site(ratio: Ratio, store: Store, by: str) -> None:
    sites = {size: f"night-{size}-{by}" for size in (SOME, VESSELS)}
    for size, site in sites.items():
        many_vessels.make(store, site, size, 24)
        assert many_vessels.move_all(store, site, size, by) == 3 * size

    def night(size: int) -> dict[str, Any]:
        label = time.strftime("%Y-%m-%d", time.gmtime((CLOSING - DAY) / 1e6))
        return close.close(store, AfterAll(), sites[size], label)[0]

    books = night(VESSELS)
    assert len(books["vessels"]) == VESSELS
    assert len(books["transfers"]) == 3 * VESSELS
    night(SOME)
    what = f"a night of 1,000 vessels and 3,000 transfers in {by} to one of 300, {store.dialect}"
    grown = ratio(what, partial(night, VESSELS), partial(night, SOME), units=VESSELS, rounds=3)
    print(f"\n{what}: exponent {math.log(grown) / math.log(VESSELS / SOME):.2f}")
