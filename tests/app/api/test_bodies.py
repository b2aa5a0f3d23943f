"""A refused body is told in sentences: the field, its limit, its unit, and nothing of what was sent."""

from __future__ import annotations

import pytest
from pydantic import ValidationError

from app.api.bodies import json_body
from app.schemas.site import Site

SITE = {"name": "a place", "time_zone": "UTC"}


@pytest.mark.parametrize(
    ("change", "said"),
    [
        ({"base_temperature_c": -99}, "base_temperature_c is at least -50 °C."),
        ({"base_temperature_c": "warm"}, "base_temperature_c is a number, in °C."),
        (
            {"day_starts_at": "6"},
            "day_starts_at is an hour and a minute of the day, from 00:00 to 23:59, such as 06:00.",
        ),
        ({"time_zone": "!"}, "time_zone is a name of the IANA data base, such as Europe/Oslo."),
        ({"time_zone": "X/Y"}, "time_zone is a name of the IANA data base, such as Europe/Oslo."),
        ({"window_nights": 2.5}, "window_nights is a whole number."),
        ({"colour": "blue"}, "colour is no field of this body."),
        ({"name": ""}, "name has at least 1 characters."),
    ],
)
def test_a_sentence_says_what_would_have_been_right(place, change, said):
    answer = place.put("", SITE | change, status=422)
    assert [one["detail"] for one in answer["errors"]] == [said]


def test_what_is_missing_is_named(place):
    answer = place.put("", {}, status=422)
    assert [one["detail"] for one in answer["errors"]] == ["name is missing.", "time_zone is missing."]
    assert answer["detail"] == "The body has 2 errors."


def test_the_sentences_are_those_of_the_schemas():
    with pytest.raises(ValidationError) as refused:
        Site.model_validate({"name": "a", "time_zone": "UTC", "elevation_m": 1e6})
    (error,) = refused.value.errors(include_url=False, include_input=False)
    say = json_body(Site).say
    assert say is not None and say(error, ["elevation_m"]) == "elevation_m is at most 6000 m."


def test_a_batch_that_is_none_is_told_so(site):
    for path, name in (("/readings", "readings"), ("/transfers", "transfers")):
        answer = site.post(path, {}, status=422)
        assert [(one["pointer"], one["detail"]) for one in answer["errors"]] == [(f"/{name}", f"{name} is missing.")]
        assert [one["detail"] for one in site.post(path, [], status=422)["errors"]] == ["The body is an object."]
