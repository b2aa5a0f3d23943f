"""Whatever the order in which the facts of a few days arrive, the books end the same; and nights add up.

Historians deliver late, laboratories later, jetties send a ticket twice. A fact here is one thing that somebody
posts; a chain is a fact with what later corrects it, which cannot come before it. Everything else may come in any
order, alone or in batches, again and again, with nights being closed in between by what was known then.
"""

from __future__ import annotations

import math

import pytest
from hypothesis import HealthCheck, Phase, given, settings
from hypothesis import strategies as st

NIGHTS = ("2026-03-13", "2026-03-14", "2026-03-15")
MORNINGS = (*(f"{day}T06:00:00Z" for day in NIGHTS), "2026-03-16T06:00:00Z")
OF_THE_CLOSE = ("id", "revision", "known_at", "site")  # when it was closed, not what it says
# The same examples in every run, a few of them, not shrunk: each is a site of its own on a real database.
FEW = settings(
    max_examples=5, derandomize=True, deadline=None, database=None, phases=[Phase.generate],
    suppress_health_check=[HealthCheck.function_scoped_fixture, HealthCheck.too_slow],
)  # fmt: skip


def read(vessel, at, **values):
    return ("reading", {"vessel": vessel, "taken_at": at, **values})


def lab(vessel, at, density, **values):
    return read(vessel, at, source="lab", observed_density_kg_m3=density, observed_density_temperature_c=15.0, **values)


def ticket(name, from_, to, started, ended, **said):
    return ("ticket", {"id": name, "from": from_, "to": to, "by": "statement", "mass_uncertainty_kg": 10.0,
                       "started_at": started, "ended_at": ended, **said})  # fmt: skip


# --- the facts of three days -----------------------------------------------------------------------

RECEIPT = ("ship", "boundary:jetty", "tk-1", "2026-03-13T20:00:00Z", "2026-03-14T10:00:00Z")
SLIP = ("slip", "tk-2", "boundary:road", "2026-03-14T14:00:00Z", "2026-03-14T15:00:00Z")
LONGER = {"kind": "box", "length_m": 10.02, "width_m": 10.0, "height_m": 20.0}
CHAINS = (
    [read("tk-1", MORNINGS[0], level_m=2.0)],
    [read("tk-1", MORNINGS[1], level_m=5.5), read("tk-1", MORNINGS[1], level_m=5.55)],  # corrected
    [read("tk-1", MORNINGS[2], level_m=7.0), read("tk-1", MORNINGS[2], level_m=7.0, quality="bad")],  # withdrawn
    [read("tk-1", "2026-03-15T05:40:00Z", source="hand", level_m=6.99)],
    [read("tk-1", MORNINGS[3], level_m=7.0)],
    [read("tk-2", MORNINGS[0], level_m=9.0), read("tk-2", MORNINGS[1], level_m=9.0)],
    [read("tk-2", MORNINGS[2], level_m=8.6), read("tk-2", MORNINGS[3], level_m=8.6)],
    [read("tk-2", "2026-03-14T12:00:00Z", free_water_level_m=0.05)],
    [lab("tk-1", "2026-03-01T09:00:00Z", 800.0)],
    [lab("tk-1", "2026-03-14T12:00:00Z", 803.0, sample_holds_from="2026-03-14T10:00:00Z")],
    [ticket(*RECEIPT[:4], None, mass_kg=280_000.0, progress=[{"at": MORNINGS[1], "mass_kg": 280_000.0}]),
     ticket(*RECEIPT, mass_kg=400_000.0, progress=[{"at": MORNINGS[1], "mass_kg": 280_000.0}])],
    [ticket("road", "tk-2", "boundary:road", "2026-03-14T08:00:00Z", "2026-03-14T09:00:00Z", mass_kg=32_000.0)],
    [ticket(*SLIP, mass_kg=32_000.0), ticket(*SLIP, mass_kg=32_000.0, void=True)],
    [ticket("volume", "tk-1", "tk-2", "2026-03-15T01:00:00Z", "2026-03-15T02:00:00Z", standard_volume_m3=1.0)],
    [("table", {"shape": LONGER, "effective_from": MORNINGS[1]})],  # recalibrated from the 14th on
)  # fmt: skip
IN_TURN = [fact for chain in CHAINS for fact in chain]


class Depot:
    """Two tanks, and what was posted about them."""

    def __init__(self, site):
        self.site = site
        site.liquid("oil", 800.0, density_uncertainty_kg_m3=1.0)
        for name in ("tk-1", "tk-2"):
            self.tank(name)

    def tank(self, name, **said):
        """A tank whose gauge counts before a dip by hand."""
        self.site.tank(name, "oil", systematic_m=0.002, sources=[{"source": ""}, {"source": "hand"}], **said)

    def post(self, facts):
        """Facts of one kind in one request."""
        kind, bodies = facts[0][0], [body for _, body in facts]
        if kind == "table":
            self.tank("tk-2", **bodies[0])
            return
        bodies = [{name: value for name, value in body.items() if value is not None} for body in bodies]
        answer = self.site.post(f"/{TABLES[kind]}", {TABLES[kind]: bodies})
        assert answer["rejected"] == 0, answer["errors"]

    def books(self):
        """Every night closed again, in order, and the whole; what they say."""
        closed = [self.site.closes(day) for day in NIGHTS]
        closed.append(self.site.closes(opening=MORNINGS[0], closing=MORNINGS[-1]))
        return [{key: value for key, value in one.items() if key not in OF_THE_CLOSE} for one in closed]


TABLES = {"reading": "readings", "ticket": "transfers"}
MANY = settings(FEW, max_examples=200, derandomize=False, print_blob=True)  # on demand


@st.composite
def arrivals(draw):
    """The facts in some order that keeps chains, some sent again, cut into requests; nights closed after some."""
    order = draw(st.permutations([number for number, chain in enumerate(CHAINS) for _ in chain]))
    place = dict.fromkeys(range(len(CHAINS)), 0)
    requests: list[list] = []
    for number in order:
        fact = CHAINS[number][place[number]]
        place[number] += 1
        joins = requests and requests[-1] and requests[-1][0][0] == fact[0] != "table" and draw(st.booleans())
        if joins:
            requests[-1].append(fact)
        else:
            requests.append([fact])
        if draw(st.integers(0, 4)) == 0:  # sent again at once, or, where it is a reading, the first of its chain
            requests.append([CHAINS[number][0] if fact[0] == "reading" else fact])
    closes = draw(st.lists(st.tuples(st.integers(0, len(requests)), st.integers(0, 3)), max_size=5))
    return requests, closes


@FEW
@given(arrival=arrivals())
def test_the_books_end_the_same(new_site, in_turn, arrival):
    """All but what they are called and when they were made: masses, errors, verdicts, warnings, digests."""
    requests, closes = arrival
    depot = Depot(new_site())
    for number, facts in enumerate(requests):
        for when, night in closes:
            if when == number:
                if night < len(NIGHTS):
                    depot.site.closes(NIGHTS[night])
                else:
                    depot.site.closes(opening=MORNINGS[0], closing=MORNINGS[-1])
        depot.post(facts)
    assert depot.books() == in_turn


@pytest.mark.long
@MANY
@given(arrival=arrivals())
def test_the_books_end_the_same_in_many_orders(new_site, in_turn, arrival):
    test_the_books_end_the_same.hypothesis.inner_test(new_site, in_turn, arrival)


@pytest.fixture
def in_turn(new_site):
    """The books of a depot to which everything was told once and in turn, before any night was closed."""
    depot = Depot(new_site())
    for fact in IN_TURN:
        depot.post([fact])
    books = depot.books()
    # By hand: 280 t by the ship's total, the dip of 5.550 m (444 t) less 2.000 m (160 t): 4 t more than the book.
    (first,) = (one for one in books[0]["vessels"] if one["vessel"] == "tk-1")
    assert first["received_kg"] == pytest.approx(280_000.0)
    assert first["imbalance_kg"] == pytest.approx(4_000.0, abs=0.5)
    return books


# --- nights add up ---------------------------------------------------------------------------------

LEVELS = st.lists(st.floats(1.0, 19.0), min_size=4, max_size=4)
QUANTITIES = st.sampled_from(["mass_kg", "standard_volume_m3", "weight_in_air_kg"])
ENDS = st.sampled_from([("boundary:jetty", "tk-1"), ("tk-1", "tk-2"), ("tk-2", "boundary:rack"), ("tk-2", "tk-1")])
HOURS = st.integers(-10, 80)  # from the first opening on; the nights are 0 to 72


def hour(number):
    day, of_day = divmod(6 + number, 24)
    return f"2026-03-{13 + day:02}T{of_day:02}:00:00Z"


MONTHS = {
    "levels": st.tuples(LEVELS, LEVELS),
    "moves": st.lists(st.tuples(ENDS, HOURS, st.integers(0, 40), QUANTITIES, st.floats(1.0, 1e5)), max_size=6),
    "samples": st.lists(st.tuples(st.sampled_from(["tk-1", "tk-2"]), HOURS, st.floats(700.0, 900.0)), max_size=3),
}


@FEW
@given(**MONTHS)
def test_the_imbalances_of_nights_add_up_to_that_of_the_whole(new_site, levels, moves, samples):
    """Whatever is divided at six o'clock is divided once: what one night has not, the next one has."""
    depot = Depot(new_site())
    depot.post([
        read(tank, at, level_m=level)
        for tank, several in zip(("tk-1", "tk-2"), levels, strict=True)
        for at, level in zip(MORNINGS, several, strict=True)
    ])  # fmt: skip
    for tank, at, density in samples:
        depot.post([lab(tank, hour(at), density)])
    for number, ((source, target), start, lasts, kind, quantity) in enumerate(moves):
        said = {kind: quantity / (1000.0 if kind == "standard_volume_m3" else 1.0)}
        depot.post([ticket(f"t-{number}", source, target, hour(start), hour(start + lasts), **said)])
    *nights, whole = depot.books()
    for block, key in (("vessels", "vessel"), ("totals", "substance")):
        for entry in whole[block]:
            name = entry[key]
            parts = [one["imbalance_kg"] for night in nights for one in night[block] if one[key] == name]
            assert len(parts) == len(NIGHTS)
            assert math.fsum(parts) == pytest.approx(entry["imbalance_kg"], abs=1e-6), (block, name)


@pytest.mark.long
@MANY
@given(**MONTHS)
def test_the_imbalances_of_many_nights_add_up(new_site, levels, moves, samples):
    test_the_imbalances_of_nights_add_up_to_that_of_the_whole.hypothesis.inner_test(new_site, levels, moves, samples)
