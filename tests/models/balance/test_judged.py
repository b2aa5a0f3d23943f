"""A night is flagged by a fresh signal or by a sum that alarms, not by what stands since before."""

from __future__ import annotations

from dataclasses import replace

import pytest

from models.balance.health import Health
from models.balance.judged import GroupJudged, Judgement, Settings, Signal, VesselJudged

GROUP = GroupJudged(("a",), 1.0, 1, 0.3, 0.3, 0.3, 3.0, (), (), ())
VESSEL = VesselJudged(
    "a", (), 0, 1.0, 1.0, 1.0, 0.3, 5.0, False, 1.0, 0.5, 4.0, False, (), 1.0, 1.0, Health(0, None, None, "too_few")
)


@pytest.mark.parametrize(
    ("signals", "drifting", "flagged"),
    [
        ((), False, False),
        ((), True, True),
        ((Signal((), 4.0, standing=True),), False, False),
        ((Signal((), 4.0, standing=True), Signal((), 4.0, standing=False)), False, True),
    ],
)
def test_what_flags_a_night(signals: tuple[Signal, ...], drifting: bool, flagged: bool) -> None:
    judged = Judgement((replace(GROUP, signals=signals),), (replace(VESSEL, drifting=drifting),))
    assert judged.flagged is flagged


def test_a_quiet_site_is_flagged_once_in_two_months_unless_told_otherwise() -> None:
    settings = Settings()
    assert settings.false_alarms_per_month == 0.5
    assert (settings.standing, settings.picks, settings.twin_gain) == (0.02, 6, 3.0)
