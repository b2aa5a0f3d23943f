"""A night in words: what is said, in which order, and how numbers are rounded."""

from app.services import report

VESSEL = {
    "vessel": "tk-12", "status": "measured", "flagged": True, "imbalance_kg": -24852.4,
    "imbalance_uncertainty_kg": 895.0, "score": -27.77, "judged_with": [], "closing_mass_kg": 5196987.2,
    "detectable_imbalance_kg": 4584.0, "verdict": "fail",
}  # fmt: skip
UNREAD = VESSEL | {
    "vessel": "tk-13", "flagged": False, "imbalance_kg": None, "imbalance_uncertainty_kg": None, "score": None,
    "status": "unmeasured", "verdict": "inconclusive", "closing_mass_kg": None, "detectable_imbalance_kg": None,
}  # fmt: skip
NIGHT = {
    "site": "s", "id": "2026-03-17.1", "status": "imbalanced", "opening": 1773727200000000,
    "closing": 1773813600000000, "vessels": [VESSEL, UNREAD],
}  # fmt: skip


def test_a_loss_is_preceded_by_the_emergency_procedure():
    lines = list(report.night(NIGHT))
    assert lines[0] == "s 2026-03-17.1: imbalanced, from 2026-03-17T06:00:00Z to 2026-03-18T06:00:00Z"
    assert "emergency procedure comes first" in lines[1]
    # 1.96 × 895 = 1754.2
    assert lines[2].strip() == (
        "tk-12: 24,852 kg short of book ± 1,754 kg (95 %), 27.8 times its standard uncertainty"
    )
    assert lines[3].strip() == "incomplete: no balance for tk-13"


def test_a_gain_needs_no_such_word():
    gain = NIGHT | {"vessels": [VESSEL | {"imbalance_kg": 10.0, "score": 4.0, "judged_with": ["tk-14"]}]}
    lines = list(report.night(gain))
    assert len(lines) == 2 and lines[1].strip().startswith("tk-12 with tk-14: 10 kg over book")


def test_the_table_has_a_line_a_vessel_and_says_what_is_unknown():
    lines = list(report.table(NIGHT))
    assert len(lines) == 3
    assert lines[1].split() == ["tk-12", "5,196,987", "-24,852", "895", "4,584", "fail"]
    assert lines[2].split() == ["tk-13", "–", "–", "–", "–", "inconclusive"]
