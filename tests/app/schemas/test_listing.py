"""Envelopes: a page, a definition as stored, and what became of one that was sent."""

import pytest
from pydantic import ValidationError

from app.schemas.listing import LARGEST_LIMIT, LIMIT, Defined, Page, Written
from app.schemas.site import Site


def test_a_page_holds_a_thousand_unless_said_and_ten_thousand_at_most():
    assert (LIMIT, LARGEST_LIMIT) == (1_000, 10_000)


def test_a_page_says_what_it_knows_where_it_knows_it():
    page = Page[str](items=("a", "b"), next=None, known_at=1_773_468_000_000_000)
    assert page.model_dump(mode="json") == {"items": ["a", "b"], "next": None, "known_at": "2026-03-14T06:00:00Z"}
    assert "known_at" not in Page[str](items=(), next="c").model_dump(mode="json")


def test_a_definition_that_always_held_has_no_beginning():
    site = Site.model_validate({"name": "s", "time_zone": "Europe/Oslo"})
    one = Defined[Site](id="s", effective_from=None, revision=1, recorded_at=0, definition=site)
    said = one.model_dump(mode="json", exclude_unset=True)
    assert said["effective_from"] is None and said["definition"] == {"name": "s", "time_zone": "Europe/Oslo"}


def test_an_outcome_is_one_of_three_words():
    with pytest.raises(ValidationError):
        Written(id="s", outcome="replaced", known_at=None)
