"""A site's window parts into groups that nothing but movements ties."""

from __future__ import annotations

from models.balance.window import Check, Merged, Stock, Ticket, Window, plausible, split
from models.estimate import Estimate


def test_groups_are_tied_by_movements_alone_and_a_check_of_a_meter_goes_where_it_serves() -> None:
    window = Window(
        (1.0,), [Stock(v, k, Estimate(1.0), {}) for v in "abcd" for k in (0, 1)],
        [
            Ticket("t", 1, "a", "c", None), Ticket("u", 1, None, "b", Estimate(1.0), "M"),
            Ticket("w", 1, None, None, None),
        ],
        [Check("M", 1, Estimate(0.0), "meter", 1.0), Check("d", 1, Estimate(0.0), "level", 1.0)],
    )  # fmt: skip
    parts = split(window)
    assert [part.vessels for part in parts] == [("a", "c"), ("b",), ("d",)]
    assert [len(part.window.checks) for part in parts] == [0, 1, 1]
    assert [[ticket.name for ticket in part.window.tickets] for part in parts] == [["t"], ["u"], []]


def test_joined_sets_have_one_name_and_others_their_own() -> None:
    merged = Merged()
    for one, other in (("a", "b"), ("c", "d"), ("b", "d")):
        merged.join(one, other)
    assert len({merged.find(name) for name in "abcd"}) == 1
    assert merged.find("e") == "e"


def test_a_millimetre_is_the_mean_of_those_known() -> None:
    assert plausible([0.0, 2.0, 4.0], 9.0) == 3.0
    assert plausible([0.0], 9.0) == 9.0
