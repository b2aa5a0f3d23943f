"""From a sample to a density: the key found once for each run of equal samples, and the slopes that follow."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
import pytest

from models.liquid.point import LiquidPoint
from models.liquid.state import Conditions, state_of


@dataclass
class Doubled:
    """A liquid of ρ = x² (1 − 1e-3 t) (1 + 1e-9 P): a key that the density does not follow in proportion."""

    solved: list[int] = field(default_factory=list)

    def key(self, density, sample, row):
        self.solved.append(len(density))
        return np.sqrt(density / self._factor(sample.temperature, sample.pressure))

    def point(self, key, conditions, row):
        t, p = conditions.temperature, conditions.pressure
        density = key**2 * self._factor(t, p)
        whole = np.ones(np.shape(density))
        return LiquidPoint(
            density, 1e-3 / (1.0 - 1e-3 * t) * whole, 1e-9 / (1.0 + 1e-9 * p) * whole, np.full(np.shape(density), 2.0)
        )

    def error(self, here, sample, ratio, row):
        return 0.1 * ratio

    @staticmethod
    def _factor(t, p):
        return (1.0 - 1e-3 * t) * (1.0 + 1e-9 * p)


def at(temperature, pressure=1e5, atmosphere=1e5):
    return Conditions(*(np.atleast_1d(np.asarray(one, dtype=float)) for one in (temperature, pressure, atmosphere)))


def test_a_density_is_carried_from_its_sample_to_the_vessel_and_to_the_standard_state():
    found = state_of(Doubled(), np.array([800.0]), at(300.0), at(350.0), at(288.0), 0)
    assert found.density[0] == pytest.approx(800.0 * 0.65 / 0.7, rel=1e-14)
    assert found.density_standard[0] == pytest.approx(800.0 * 0.712 / 0.7, rel=1e-14)
    assert found.expansivity[0] == pytest.approx(1e-3 / 0.65, rel=1e-14)
    assert found.by_sample[0] == found.standard_by_sample[0] == 1.0
    assert found.by_sample_temperature[0] == pytest.approx(1e-3 / 0.7, rel=1e-14)
    assert found.method_error[0] == pytest.approx(0.1 * np.log(0.65 / 0.7), rel=1e-12)


def test_a_run_of_equal_samples_is_solved_once():
    method, density = Doubled(), np.repeat([800.0, 801.0, 800.0], [50, 30, 20])
    found = state_of(method, density, at(300.0), at(np.linspace(290.0, 310.0, 100)), at(288.0), 0)
    assert method.solved == [3]
    one = state_of(Doubled(), density[60:61], at(300.0), at(np.linspace(290.0, 310.0, 100)[60]), at(288.0), 0)
    assert found.density[60] == one.density[0]
    assert found.density_standard[60] == one.density_standard[0]


def test_samples_that_all_differ_are_solved_together():
    method = Doubled()
    found = state_of(method, np.linspace(800.0, 810.0, 9), at(300.0), at(300.0), at(288.0), 0)
    assert method.solved == [9]
    assert found.density == pytest.approx(np.linspace(800.0, 810.0, 9), rel=1e-14)


def test_a_change_of_any_part_of_a_sample_or_of_the_liquid_begins_a_run():
    base = {"density": np.full(8, 800.0), "t": np.full(8, 300.0), "p": np.full(8, 1e5), "row": np.zeros(8, dtype=int)}
    for name in base:
        changed = {key: value.copy() for key, value in base.items()}
        changed[name][5:] = changed[name][5:] * 1.01 + 1
        method = Doubled()
        state_of(method, changed["density"], at(changed["t"], changed["p"]), at(300.0), at(288.0), changed["row"])
        assert method.solved == [2], name


def test_a_gauge_pressure_counts_from_the_atmosphere():
    assert at(300.0, 2.5e5, 0.8e5).gauge.tolist() == [1.7e5]
    taken = at([300.0, 301.0, 302.0], 1e5).take(np.array([2, 0]))
    assert taken.temperature.tolist() == [302.0, 300.0]
    assert taken.pressure.tolist() == [1e5]
