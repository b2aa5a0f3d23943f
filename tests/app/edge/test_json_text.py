"""What parses and still cannot be taken is named."""

from __future__ import annotations

import pytest

from app.edge.json_text import check
from app.errors import Unprocessable


@pytest.mark.parametrize(
    ("text", "pointer", "code"),
    [
        ('{"a": 1, "a": 1}', "", "duplicate_key"),
        ('{"rows": [{"a": 1}, {"a": 1, "b": 2, "a": 3}]}', "/rows/1", "duplicate_key"),
        ('{"rows": {"<b>": {"a": 1, "a": 3}}}', "/rows", "duplicate_key"),
        (r'{"a": 1, "\u0061": 1}', "", "duplicate_key"),
        ('{"a": [NaN]}', "", "not_finite"),
        ('{"a": -Infinity}', "", "not_finite"),
        (r'{"a": "x\u0000"}', "", "control_character"),
    ],
)
def test_it_is_refused_with_its_place(text: str, pointer: str, code: str) -> None:
    with pytest.raises(Unprocessable) as refused:
        check(text.encode())
    assert [(error.pointer, error.code) for error in refused.value.errors] == [(pointer, code)]


def test_one_key_in_many_objects_is_no_duplicate() -> None:
    check(b'{"rows": [{"a": 1}, {"a": 1}], "a": {"a": {"a": null}}}')
