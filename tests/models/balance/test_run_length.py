"""Mean run lengths of control charts, to the digits to which the integral equation was solved elsewhere."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.stats import norm

from models.balance.run_length import ewma, page_one_sided, page_two_sided, shewhart

SHIFTS = [0.0, 0.25, 0.5, 0.75, 1.0, 1.5, 2.0, 3.0, 4.0]

# Worked out from the integral equation with 80 Gauss nodes by a program of its own. The first two rows agree with
# the tables of Lucas & Crosier, Technometrics 24 (1982) 199, the fifth with any table of the normal law, the
# others with Lucas & Saccucci, Technometrics 32 (1990) 1 (all from memory).
TWO_SIDED_4 = [167.7, 74.2, 26.6, 13.3, 8.38, 4.75, 3.34, 2.19, 1.71]
TWO_SIDED_5 = [465.4, 139.5, 38.0, 17.0, 10.4, 5.75, 4.01, 2.57, 2.01]
HEAD_START_4 = [148.7, 62.7, 20.1, 8.97, 5.29, 2.86, 2.01, 1.33, 1.07]
HEAD_START_5 = [430.4, 121.7, 28.7, 11.2, 6.35, 3.37, 2.36, 1.54, 1.16]
SHEWHART_3 = [370.4, 281.2, 155.2, 81.2, 43.9, 15.0, 6.30, 2.00, 1.19]
EWMA = {
    (0.1, 2.814): [499.6, 106.3, 31.3, 15.85, 10.3, 6.08, 4.36, 2.87, 2.19],
    (0.2, 2.962): [499.7, 150.2, 41.8, 18.15, 10.5, 5.50, 3.74, 2.38, 1.86],
    (0.05, 2.615): [499.9, 84.0, 28.8, 16.4, 11.4, 7.11, 5.22, 3.50, 2.69],
    (0.4, 3.054): [500.0, 223.7, 71.2, 28.4, 14.3, 5.87, 3.52, 2.02, 1.44],
}


def printed(length: float, table: float) -> bool:
    """Whether a run length rounds to what the table prints; of figures below 10 it prints two decimals."""
    return abs(length - table) <= (0.0051 if table < 10.0 else 0.051)


@pytest.mark.parametrize(
    ("limit", "start", "table"),
    [(4.0, 0.0, TWO_SIDED_4), (5.0, 0.0, TWO_SIDED_5), (4.0, 2.0, HEAD_START_4), (5.0, 2.5, HEAD_START_5)],
)
def test_two_sums_of_page(limit: float, start: float, table: list[float]) -> None:
    for shift, expected in zip(SHIFTS, table, strict=True):
        assert printed(page_two_sided(0.5, limit, shift=shift, start=start), expected), shift
        assert page_two_sided(0.5, limit, shift=-shift, start=start) == pytest.approx(
            page_two_sided(0.5, limit, shift=shift, start=start), rel=1e-12
        )


def test_one_sum_of_page_without_a_shift() -> None:
    assert page_one_sided(0.5, 4.0) == pytest.approx(335.4, abs=0.05)
    assert page_one_sided(0.5, 5.0) == pytest.approx(930.9, abs=0.05)


def test_the_first_sum_is_one_step_of_the_normal_law() -> None:
    assert page_one_sided(0.5, 0.0, shift=0.2) == pytest.approx(1.0 / norm.sf(0.3), rel=1e-12)
    assert page_one_sided(0.5, 1e-9, shift=0.2) == pytest.approx(1.0 / norm.sf(0.3), rel=1e-8)


@pytest.mark.parametrize(("allowance", "limit", "shift", "start"), [(0.25, 6.0, 0.0, 0.0), (1.0, 2.5, 0.4, 1.0)])
def test_one_sum_of_page_equals_a_chain_of_small_steps(
    allowance: float, limit: float, shift: float, start: float
) -> None:
    # D. Brook & D. A. Evans, Biometrika 59 (1972) 539-549: the sum in cells of width w, at their middles, the
    # first one half as wide. The error falls with w², so that two widths give the limit.
    lengths = []
    for cells in (200, 400):
        width = limit / (cells - 0.5)
        middle = width * np.arange(cells)
        edge = middle + 0.5 * width - shift + allowance
        reached = norm.cdf(edge - middle[:, None])
        step = np.diff(reached, axis=1, prepend=0.0)
        lengths.append(np.interp(start, middle, np.linalg.solve(np.eye(cells) - step, np.ones(cells))))
    assert page_one_sided(allowance, limit, shift=shift, start=start) == pytest.approx(
        (4.0 * lengths[1] - lengths[0]) / 3.0, rel=1e-4
    )


def test_single_scores() -> None:
    for shift, expected in zip(SHIFTS, SHEWHART_3, strict=True):
        assert printed(shewhart(3.0, shift=shift), expected), shift


@pytest.mark.parametrize(("weight", "limit"), list(EWMA))
def test_weighted_means(weight: float, limit: float) -> None:
    for shift, expected in zip(SHIFTS, EWMA[weight, limit], strict=True):
        assert printed(ewma(weight, limit, shift=shift), expected), shift


@pytest.mark.parametrize(("weight", "limit"), [(0.05, 2.490), (0.1, 2.7015), (0.2, 2.859)])
def test_weighted_means_designed_for_the_run_length_of_three_sigma(weight: float, limit: float) -> None:
    # Limits worked out from the integral equation; a thousandth more of the limit is 0.3 % more nights.
    assert ewma(weight, limit) == pytest.approx(370.4, rel=2e-3)


def test_a_weight_of_one_is_single_scores() -> None:
    assert ewma(1.0, 3.0, shift=0.5) == pytest.approx(155.2242, abs=1e-4)


def test_long_runs_keep_their_digits() -> None:
    # Twice the limit squares the odds: against the exact rate of Wiener's process the sum needs 1.166 more (Siegmund).
    for limit in (15.0, 25.0):
        reach = limit + 1.166
        siegmund = (np.expm1(0.5 * reach) - 0.5 * reach) / 0.125
        assert page_one_sided(0.25, limit) == pytest.approx(siegmund, rel=0.01)
