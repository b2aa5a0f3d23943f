"""A vapour that cannot be is refused when it is built, by name."""

import pytest

from models.components import given_component
from models.errors import DefinitionError
from models.vapour.definition import VapourMixture

OURS = given_component(
    "ours", critical_temperature=400.0, critical_pressure=4e6, acentric_factor=0.1, molar_mass=0.05
)


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        ({"components": ()}, "one for each"),
        ({"components": ("propane", "ethane")}, "one for each"),
        ({"components": ("propane", "propane"), "mole_fractions": (0.5, 0.5)}, "named twice"),
        ({"components": ("propane", "ethane"), "mole_fractions": (0.5, 0.4)}, "sum to 0.9"),
        ({"components": ("propane", "ethane"), "mole_fractions": (1.5, -0.5)}, "propane is 1.5"),
        ({"components": ("propane",), "mole_fractions": (float("nan"),)}, "is nan"),
        ({"components": ("propane",), "form": "cubic"}, "'cubic'"),
        ({"components": ("propane",), "terms": 4}, "4 terms"),
        ({"components": ("propane",), "coefficients": "guessed"}, "'guessed'.*fitted, correlation, measured"),
        ({"components": ("propane",), "second_virial": "x"}, "second_virial is 'x'"),
        ({"components": ("propane",), "third_virial": "x"}, "third_virial is 'x'"),
        ({"components": ("propane",), "coefficients": "measured"}, "no second virial coefficient"),
        ({"components": ("propane",), "measured_second": -390.0}, "another unit"),
        ({"components": ("propane",), "measured_second": float("nan")}, "another unit"),
        ({"components": ("propane",), "measured_second": -4e-4, "measured_third": 2e-2}, "another unit"),
        ({"components": ("propane",), "measured_second": -0.0201}, "more than 0.02 m3/mol"),
        ({"components": ("propane",), "measured_second": -4e-4, "measured_third": 1.01e-4}, "more than 0.0001 m6/mol2"),
        ({"components": ("propane",), "measured_second": ((300.0, -4e-4),)}, "two rows"),
        ({"components": ("propane",), "measured_second": ((300.0, -4e-4), (300.0, -3e-4))}, "they rise"),
        ({"components": ("propane",), "measured_second": ((-3.0, -4e-4), (300.0, -3e-4))}, "-3.0 K"),
        ({"components": (OURS,), "coefficients": "fitted"}, "ours has no fit"),
        ({"components": ("benzene",), "coefficients": "fitted"}, "benzene has no fit"),
    ],
)
def test_what_cannot_be_is_named(arguments: dict[str, object], words: str) -> None:
    with pytest.raises(DefinitionError, match=words):
        VapourMixture(**arguments)  # type: ignore[arg-type]


def test_the_largest_coefficients_that_are_no_other_unit_are_taken() -> None:
    mixture = VapourMixture(("propane",), measured_second=-0.0199, measured_third=0.99e-4)
    assert (mixture.measured_second, mixture.measured_third) == (-0.0199, 0.99e-4)


def test_the_source_is_measured_then_fitted_then_the_correlation() -> None:
    assert VapourMixture(("propane",)).source == "fitted"
    assert VapourMixture(("propane",), measured_second=-4e-4).source == "measured"
    assert VapourMixture(("propane", "benzene"), (0.9, 0.1)).source == "correlation"
    assert (
        VapourMixture(("propane",), coefficients="correlation", measured_second=-4e-4).source == "correlation"
    )


def test_absent_components_do_not_count() -> None:
    mixture = VapourMixture(("propane", "benzene"), (1.0, 0.0))
    assert mixture.source == "fitted"
    assert [c.id for c in mixture.substances] == ["propane"]
    assert mixture.molar_mass == pytest.approx(0.04409562)
    half = VapourMixture(("nitrogen", OURS), (0.25, 0.75))
    assert half.molar_mass == pytest.approx(0.25 * 0.0280134 + 0.75 * 0.05)
