"""What the models refuse keeps its sentence, its place and a stable word."""

import pytest

from models import errors


@pytest.mark.parametrize(
    ("kind", "code", "base"),
    [
        (errors.DefinitionError, "impossible_definition", errors.ModelError),
        (errors.OutsideRange, "outside_method", errors.ModelError),
        (errors.OutsideVessel, "outside_vessel", errors.OutsideRange),
        (errors.OutsideTable, "outside_table", errors.OutsideVessel),
        (errors.NoVapourRoot, "no_vapour_root", errors.ModelError),
    ],
)
def test_each_kind_has_its_word_and_its_place_in_the_tree(kind, code, base):
    raised = kind("level is 9 m", field="level", index=3)
    assert isinstance(raised, base)
    assert (raised.code, raised.detail, raised.field, raised.index) == (code, "level is 9 m", "level", 3)
    assert str(raised) == "level is 9 m"


def test_a_place_is_said_only_where_there_is_one():
    assert errors.at_index(3) == " at index 3"
    assert errors.at_index(None) == ""
