"""Ratios measured in one run, printed in one table: never a time that a test could miss.

``ratio`` times a piece of work and its yardstick in turn, so that whatever else the machine does
falls on both, and takes the best of each. It asserts nothing about time; run with ``-m benchmark``.
"""

from __future__ import annotations

import time
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, Protocol

import pytest

ROUNDS = 5


@dataclass(frozen=True)
class Line:
    """One line of the table."""

    what: str
    target: str
    seconds: float
    yardstick_seconds: float
    units: int

    @property
    def ratio(self) -> float:
        return self.seconds / self.yardstick_seconds


class Ratio(Protocol):
    """Time ``work`` against ``yardstick``, note the line, return the ratio of their best times."""

    def __call__(
        self,
        what: str,
        work: Callable[[], Any],
        yardstick: Callable[[], Any],
        *,
        target: str = "",
        units: int = 1,
        rounds: int = ROUNDS,
    ) -> float: ...


LINES: list[Line] = []


def seconds(work: Callable[[], Any]) -> float:
    started = time.perf_counter()
    work()
    return time.perf_counter() - started


@pytest.fixture
def ratio() -> Ratio:
    """Ratio of the best times of two pieces of work, each done ``rounds`` times in turn.

    ``units`` is how many readings, vessels or rows one call of ``work`` does: the table then
    shows the time of each.
    """

    def measure(
        what: str,
        work: Callable[[], Any],
        yardstick: Callable[[], Any],
        *,
        target: str = "",
        units: int = 1,
        rounds: int = ROUNDS,
    ) -> float:
        pairs = [(seconds(work), seconds(yardstick)) for _ in range(rounds)]
        best, best_yardstick = (min(column) for column in zip(*pairs, strict=True))
        line = Line(what, target, best, best_yardstick, units)
        LINES.append(line)
        return line.ratio

    return measure


def pytest_collection_modifyitems(items: list[pytest.Item]) -> None:
    """Everything in this folder is a benchmark, marked or not."""
    for item in items:
        if item.path.parent.name == "benchmarks":
            item.add_marker(pytest.mark.benchmark)


def pytest_terminal_summary(terminalreporter: pytest.TerminalReporter) -> None:
    if not LINES:
        return
    terminalreporter.section("ratios of this run")
    width = max(len(line.what) for line in LINES)
    heads = f"{'ratio':>10}  {'target':>12}  {'µs a unit':>10}  {'yardstick s':>11}"
    terminalreporter.write_line(f"{'':{width}}  {heads}")
    for line in LINES:
        each = f"{1e6 * line.seconds / line.units:10.3g}  {line.yardstick_seconds:11.4g}"
        terminalreporter.write_line(f"{line.what:{width}}  {line.ratio:10.4g}  {line.target:>12}  {each}")
