"""What substances are made of: fractions of one, constants of the client's own, analyses."""

from __future__ import annotations

import pytest

from app.schemas.liquid import LightHydrocarbonLiquid
from app.schemas.substance import Substance
from app.services.compositions import analysed_fractions, boiling_pressure, fractions_of, mixture_of
from models.errors import DefinitionError

OWN = {"id": "house-gas", "mole_fraction": 0.1, "critical_temperature_k": 400.0, "critical_pressure_kpa_abs": 4000.0,
       "acentric_factor": 0.2, "molar_mass_g_mol": 60.0}  # fmt: skip
LPG = Substance.model_validate(
    {"name": "x", "vapour": {"model": "virial", "components": [{"id": "propane", "mole_fraction": 0.895}, OWN]}}
)


def test_fractions_are_normalised_and_a_component_in_full_keeps_its_constants() -> None:
    assert LPG.vapour is not None
    propane, own = fractions_of(LPG.vapour.components)
    assert propane[1] + own[1] == pytest.approx(1.0, rel=1e-15)
    assert (own[0].critical_temperature, own[0].critical_pressure, own[0].molar_mass) == (400.0, 4e6, 0.060)
    assert own[0].costald_estimated
    measured = OWN | {"characteristic_volume_cm3_mol": 250.0, "srk_acentric_factor": 0.21}
    body = {"name": "x", "liquid": {"model": "light_hydrocarbon", "components": [measured | {"mole_fraction": 1.0}]}}
    liquid = Substance.model_validate(body).liquid
    assert isinstance(liquid, LightHydrocarbonLiquid) and liquid.components is not None
    given = fractions_of(liquid.components)[0][0]
    assert given.costald == (pytest.approx(2.5e-4), 0.21)
    assert mixture_of(LPG.vapour).components[1] == own[0]


def test_an_analysis_takes_the_clients_own_component_and_leaves_out_what_is_absent() -> None:
    found = analysed_fractions(LPG, {"propane": 0.5, "house-gas": 0.25, "n-butane": 0.25, "ethane": 0.0})
    assert [one.id for one, _ in found] == ["house-gas", "n-butane", "propane"]
    assert [fraction for _, fraction in found] == [0.25, 0.25, 0.5]
    with pytest.raises(DefinitionError, match="unobtainium"):
        analysed_fractions(LPG, {"unobtainium": 1.0})


def test_a_substance_of_which_nothing_is_known_does_not_boil() -> None:
    assert boiling_pressure(None, 288.15) == 0.0
