"""Tickets in parts, tickets with twins, and those that belong to a night beyond the window."""

from __future__ import annotations

from models.balance.faults import candidates
from models.balance.rows import assemble
from models.balance.ticket_faults import twin_names, ways
from models.balance.window import Part, Stock, Ticket, Window
from models.estimate import Estimate
from tests.models.balance.test_faults import column


def test_a_split_ticket_is_one_subject_and_a_twin_is_of_one_mass_and_way() -> None:
    halves = [Ticket("t", 1, None, "a", Estimate(30.0)), Ticket("t", 2, None, "a", Estimate(10.0))]
    other = [Ticket("u", 2, None, "a", Estimate(10.0)), Ticket("v", 1, "a", None, Estimate(10.0))]
    full = [Stock("a", k, Estimate(100.0, {f"{k}": 1.0}), {}, per_mm=2.0) for k in (0, 1, 2)]
    found = candidates(assemble(Part(("a",), Window((1.0, 1.0), full, halves + other))))
    assert found.columns[:, [column(found, "wrong_transfer", ("t",), 1)]].toarray()[:, 0].tolist() == [-0.75, -0.25]
    assert found.columns[:, [column(found, "duplicated_transfer", ("t",), 1)]].toarray()[:, 0].tolist() == [-30, -10]
    assert twin_names([*halves, *other]) == {"t", "u"}
    assert found.prior[column(found, "duplicated_transfer", ("u",))] == 50.0
    assert found.prior[column(found, "duplicated_transfer", ("v",))] == 1.0


def test_the_last_nights_ticket_may_be_still_to_come_and_the_first_nights_has_no_night_before() -> None:
    full = [Stock("a", k, Estimate(100.0, {f"{k}": 1.0}), {}, per_mm=2.0) for k in (0, 1, 2)]
    tickets = [Ticket("t", 1, None, "a", Estimate(30.0)), Ticket("u", 2, "a", None, Estimate(10.0))]
    found = candidates(assemble(Part(("a",), Window((1.0, 1.0), full, tickets))))
    late = {found.subjects[at] for at, kind in zip(found.subject, found.kind, strict=True) if kind == 9}
    assert late == {("t", "next"), ("u", "next"), ("u", "previous")}
    assert found.columns[:, [column(found, "late_transfer", ("u", "next"))]].toarray()[:, 0].tolist() == [0.0, 10.0]
    assert found.columns[:, [column(found, "late_transfer", ("t", "next"))]].toarray()[:, 0].tolist() == [-30.0, 30.0]
    assert found.scale[column(found, "wrong_transfer", ("u",))] == 40.0  # 20 mm of 2 kg


def test_in_a_large_group_a_movement_may_only_join_what_some_ticket_joins() -> None:
    def subjects(count: int, kind: int) -> set[tuple[str, ...]]:
        names = [f"v{at:02}" for at in range(count)]
        full = [Stock(v, k, Estimate(100.0, {f"{v}:{k}": 1.0}), {}, per_mm=2.0) for v in names for k in (0, 1)]
        chain = [Ticket(f"t{a}", 1, a, b, Estimate(5.0)) for a, b in zip(names, names[1:], strict=False)]
        rows = assemble(Part(tuple(names), Window((1.0,), full, chain)))
        assert ways(rows) >= {(0, 1), (1, 0)}
        found = candidates(rows)
        return {found.subjects[at] for at, own in zip(found.subject, found.kind, strict=True) if own == kind}

    assert len(subjects(16, 7)) == 16 * 15 // 2 + 16  # every pair, and every vessel with what is beyond
    assert len(subjects(17, 7)) == 16 + 17
    assert {one for one in subjects(17, 11) if one[0] == "tv01"} == {("tv01", "v02", "v00"), ("tv01", "v01", "v03")}
