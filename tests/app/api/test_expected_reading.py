"""What the instruments should show, over HTTP: the inverse of an inventory."""

from __future__ import annotations

import pytest

PATH = "/v1/calculations/expected-reading"
BOX = {"kind": "box", "length_m": 6.0, "width_m": 2.5, "height_m": 2.0}
OIL = {
    "name": "gas oil, house grade",
    "liquid": {"model": "expansivity", "density_kg_m3": 840.0, "expansivity_per_k": 8.3e-4},
}
REQUEST = {
    "vessel": {"shape": BOX, "shell": {"expansion_per_k": 0.0}}, "substance": OIL, "mass_kg": 15_120.0,
    "liquid_temperature_c": 15.0,
}  # fmt: skip


def expected(client, status=200, **change):
    body = {name: value for name, value in (REQUEST | change).items() if value is not None}
    answer = client.post(PATH, json=body)
    assert answer.status_code == status, answer.text
    return answer.json()


def test_a_box_stands_as_high_as_its_mass_by_its_area(client):
    found = expected(client)
    assert found["level_m"] == pytest.approx(15_120.0 / 840.0 / 15.0, rel=1e-12)
    assert (found["fill_pct"], found["liquid_volume_m3"]) == (pytest.approx(60.0), pytest.approx(18.0))
    assert "reason" not in found and "liquid_full_caution" not in found


def test_what_is_shown_put_back_is_the_mass(client):
    found = expected(client, liquid_temperature_c=24.0)
    body = {name: REQUEST[name] for name in ("vessel", "substance")}
    reading = {"level_m": found["level_m"], "liquid_temperature_c": 24.0}
    back = client.post("/v1/calculations/inventory", json=body | {"readings": [reading]}).json()["results"][0]
    assert back["mass_kg"] == pytest.approx(15_120.0, rel=1e-12)
    assert back["warnings"] == found["warnings"]


def test_more_than_full_is_answered_with_its_reason(client):
    found = expected(client, mass_kg=26_000.0)
    assert found["reason"]["code"] == "outside_vessel" and "25200 kg" in found["reason"]["detail"]
    assert found["level_m"] is None


@pytest.mark.parametrize(
    ("change", "pointer"),
    [
        ({"mass_kg": None}, "/mass_kg"),
        ({"mass_kg": -1.0}, "/mass_kg"),
        ({"liquid_temperature_c": None}, "/liquid_temperature_c"),
        ({"pressure_kpa": 0.0, "pressure_kpa_abs": 101.0}, "/pressure_kpa_abs"),
        ({"vessel": {"shape": BOX | {"height_m": 0}}}, "/vessel/shape/height_m"),
        ({"vessel": {"shape": BOX, "shell": {"courses": [[1, 0.01]]}}}, "/vessel/shell/courses"),
        ({"substance": {"name": "x", "vapour": {"model": "virial", "components": [
            {"id": "unobtainium", "mole_fraction": 1.0}]}}}, "/substance/vapour/components/0/id"),
        ({"site": {"base_temperature_c": 1e6}}, "/site/base_temperature_c"),
        ({"level_m": 1.2}, "/level_m"),
    ],
)  # fmt: skip
def test_what_cannot_be_is_named_with_its_place(client, change, pointer):
    answer = expected(client, 422, **change)
    assert pointer in [one["pointer"] for one in answer["errors"]]
    assert "unobtainium" not in str(answer)
