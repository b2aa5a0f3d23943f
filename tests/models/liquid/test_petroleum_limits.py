"""What is said where the petroleum correction does not reach."""

import numpy as np
import pytest

from models.liquid.petroleum import density_60f, point
from models.liquid.petroleum_groups import COMMODITIES
from models.liquid.petroleum_limits import why_outside

CRUDE, REFINED, LUBRICATING, SPECIAL = (COMMODITIES[n] for n in ("crude", "refined", "lubricating", "special"))


@pytest.mark.parametrize(
    ("case", "words"),
    [
        ((850.0, 463.15, 0.0, CRUDE, np.nan), ("temperature is 190 °C", "from -50 to 150 °C", "density_table")),
        ((850.0, 213.15, 0.0, CRUDE, np.nan), ("temperature is -60 °C", "from -50 to 150 °C")),
        ((850.0, 300.0, 1.1e7, CRUDE, np.nan), ("pressure is 110 bar", "0 to 103.4 bar (1500 psig)")),
        ((850.0, 300.0, 0.0, SPECIAL, 1e-3), ("alpha60_per_f is 0.001", "230e-6 to 930e-6 per °F")),
        ((850.0, 300.0, 0.0, SPECIAL, np.nan), ("alpha60_per_f is nan", "230e-6 to 930e-6 per °F")),
        ((600.0, 300.0, 0.0, REFINED, np.nan), ("at 60 °F is 600 kg/m³", "refined", "610.6 to 1163.5 kg/m³")),
        ((790.0, 300.0, 0.0, LUBRICATING, np.nan), ("is 790 kg/m³", "a lubricating oil is", "800.9 to 1163.5 kg/m³")),
        ((850.0, 300.0, 0.0, 9, np.nan), ("code is 9", "0 (crude)", "3 (special)")),
    ],
)
def test_the_limit_is_named(case: tuple[float, float, float, int, float], words: tuple[str, ...]) -> None:
    text = why_outside(*case)
    assert all(word in text for word in words), text
    assert np.isnan(point(*case).density)


def test_the_cold_has_no_hint_for_the_hot() -> None:
    assert "density_table" not in why_outside(850.0, 213.15, 0.0, CRUDE)


def test_nothing_is_said_inside() -> None:
    for commodity, alpha in ((CRUDE, np.nan), (REFINED, np.nan), (LUBRICATING, np.nan), (SPECIAL, 5e-4)):
        for t in (223.15, 423.15):
            for p in (-1e5, 0.0, 1500.0 * 6894.757293168):
                assert why_outside(900.0, t, p, commodity, alpha) == ""


# Published entry limits of the observed density (crude; the others from memory), kg/m3.
@pytest.mark.parametrize(
    ("commodity", "low", "high"), [(CRUDE, 470.5, 1201.8), (REFINED, 470.4, 1209.5), (LUBRICATING, 714.3, 1208.3)]
)
def test_entry_limits_follow_from_those_at_60_f(commodity: int, low: float, high: float) -> None:
    hot, cold, full = 423.15, 223.15, 1500.0 * 6894.757
    lightest = float(point(610.6 if commodity != LUBRICATING else 800.9, hot, 0.0, commodity).density)
    heaviest = float(point(1163.5, cold, full, commodity).density)
    assert lightest == pytest.approx(low, abs=0.15) and heaviest == pytest.approx(high, abs=0.15)
    assert np.isnan(density_60f([lightest - 0.1, heaviest + 0.1], [hot, cold], [0.0, full], commodity)).all()
    assert f"from {lightest:.1f} to" in why_outside(lightest - 0.1, hot, 0.0, commodity, observed=True)
    assert f"to {heaviest:.1f} kg/m³" in why_outside(heaviest + 0.1, cold, full, commodity, observed=True)
    assert "at -50 °C" in why_outside(heaviest + 0.1, cold, full, commodity, observed=True)
    assert why_outside(lightest + 1e-3, hot, 0.0, commodity, observed=True) == ""


def test_words_and_columns_agree() -> None:
    rng = np.random.default_rng(4)
    for _ in range(300):
        rho, t, p = rng.uniform(450.0, 1250.0), rng.uniform(215.0, 430.0), rng.uniform(-1e5, 1.1e7)
        commodity, alpha = int(rng.integers(0, 4)), rng.uniform(2e-4, 1e-3)
        assert (why_outside(rho, t, p, commodity, alpha) == "") == bool(
            np.isfinite(point(rho, t, p, commodity, alpha).density)
        )
        assert (why_outside(rho, t, p, commodity, alpha, observed=True) == "") == bool(
            np.isfinite(density_60f(rho, t, p, commodity, alpha))
        )
