"""Order of sources, ages and interpolation, on columns small enough to work out by hand."""

import numpy as np
import pytest

from app.services.choose import ALWAYS, Candidates, choose

MINUTE = 60_000_000
HOUR = 60 * MINUTE


def candidates(*sources, max_age=HOUR):
    """One row; each source is (rank, before_at, before, after_at, after, quality)."""
    c = Candidates.empty(1, len(sources))
    for k, (rank, before_at, before, after_at, after, quality) in enumerate(sources):
        c.rank[0, k] = rank
        if before_at is not None:
            c.before_at[0, k] = c.before_taken[0, k] = before_at
            c.before[0, k], c.before_quality[0, k] = before, quality
        if after_at is not None:
            c.after_at[0, k], c.after[0, k], c.after_quality[0, k] = after_at, after, quality
    c.max_age[:] = max_age
    return c


def at(instant):
    return np.array([instant], dtype=np.int64)


def test_the_first_named_source_wins_though_another_is_newer():
    chosen = choose(
        candidates((0, 10 * MINUTE, 5.0, None, None, 0), (1, 50 * MINUTE, 6.0, None, None, 0)),
        at(HOUR),
        interpolates=False,
    )
    assert chosen.source[0] == 0 and chosen.value[0] == 5.0 and chosen.age_us[0] == 50 * MINUTE


def test_a_source_too_old_leaves_the_place_to_the_next():
    chosen = choose(
        candidates((0, 10 * MINUTE, 5.0, None, None, 0), (1, 50 * MINUTE, 6.0, None, None, 1)),
        at(HOUR + 11 * MINUTE),
        interpolates=False,
    )
    assert chosen.source[0] == 1 and chosen.value[0] == 6.0 and chosen.quality[0] == 1


def test_without_an_order_the_newest_wins_and_both_contend():
    chosen = choose(
        candidates((0, 10 * MINUTE, 5.0, None, None, 0), (0, 50 * MINUTE, 6.0, None, None, 0)),
        at(HOUR),
        interpolates=False,
    )
    assert chosen.value[0] == 6.0 and chosen.contenders[0] == 2


def test_between_two_values_the_line_counts():
    # 20 minutes of 30 after the first: 5 + (8 − 5)·2/3 = 7.
    chosen = choose(candidates((0, 0, 5.0, 30 * MINUTE, 8.0, 0)), at(20 * MINUTE), interpolates=True)
    assert chosen.value[0] == pytest.approx(7.0, abs=1e-12)
    assert chosen.share[0] == pytest.approx(2 / 3) and chosen.age_us[0] == 0


def test_values_further_apart_than_the_age_are_not_joined():
    chosen = choose(candidates((0, 0, 5.0, 61 * MINUTE, 8.0, 0)), at(20 * MINUTE), interpolates=True)
    assert chosen.value[0] == 5.0 and chosen.share[0] == 0.0 and chosen.age_us[0] == 20 * MINUTE


def test_samples_are_never_interpolated():
    chosen = choose(candidates((0, 0, 840.0, 30 * MINUTE, 850.0, 0)), at(20 * MINUTE), interpolates=False)
    assert chosen.value[0] == 840.0


def test_a_value_exactly_at_the_instant_is_taken_as_it_is():
    chosen = choose(candidates((0, 20 * MINUTE, 5.0, 30 * MINUTE, 8.0, 0)), at(20 * MINUTE), interpolates=True)
    assert chosen.value[0] == 5.0 and chosen.after_at[0] < 0


def test_nothing_usable_is_no_value_and_never_zero():
    chosen = choose(candidates((0, 0, 5.0, None, None, 0)), at(2 * HOUR), interpolates=True)
    assert chosen.source[0] == -1 and np.isnan(chosen.value[0]) and not chosen.usable[0]


def test_until_replaced_holds_for_years():
    chosen = choose(
        candidates((0, 0, 840.0, None, None, 0), max_age=ALWAYS), at(20 * 365 * 24 * HOUR), interpolates=False
    )
    assert chosen.value[0] == 840.0


def test_a_close_takes_the_first_value_after_it_where_there_is_none_before():
    def ahead(reach):
        return choose(
            candidates((0, None, None, 70 * MINUTE, 8.0, 1)), at(HOUR), interpolates=True, ahead=np.array([reach])
        )

    chosen = ahead(HOUR)
    assert chosen.value[0] == 8.0 and chosen.taken_at[0] == 70 * MINUTE and chosen.age_us[0] == -10 * MINUTE
    assert chosen.quality[0] == 1 and chosen.share[0] == 0.0 and chosen.after_at[0] < 0
    assert not ahead(9 * MINUTE).usable[0]


def test_a_value_before_the_close_goes_before_one_after_it():
    chosen = choose(
        candidates((0, None, None, 61 * MINUTE, 8.0, 0), (0, 30 * MINUTE, 5.0, None, None, 0)),
        at(HOUR), interpolates=True, ahead=np.array([HOUR]),
    )  # fmt: skip
    assert chosen.value[0] == 5.0 and chosen.source[0] == 1


def test_what_a_sample_counts_from_may_differ_from_when_it_was_drawn():
    c = candidates((0, 20 * MINUTE, 840.0, None, None, 0), max_age=ALWAYS)
    c.before_taken[0, 0] = 90 * MINUTE
    chosen = choose(c, at(HOUR), interpolates=False)
    assert chosen.begins[0] == 20 * MINUTE and chosen.taken_at[0] == 90 * MINUTE and chosen.age_us[0] == -30 * MINUTE
