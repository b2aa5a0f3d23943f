"""The audit counts coefficients and not structure, and a nudge reaches the bytes that it means."""

from __future__ import annotations

from collections.abc import Callable, Iterator

import pytest

from tests.felt_audit import Number, csv_numbers, json_numbers, physical, python_numbers

TABLE = """
\"\"\"Ünïcode before the numbers: places are bytes.\"\"\"
ORDER = 3
POWERS = (1, 2, 8)
FACTOR: float = -0.1445  # κ
ROWS = {"methane": (190.56, 4599200, 0), "ethane": make("é", 305.32, [1, 2.5], wide=True)}
ZERO = 0.0

class Thing:
    share = 0.25

def f(x, reference=288.15):
    return x / 3.0 + 0.33 * x + 1e-3
"""


def values(numbers: list[Number]) -> list[float]:
    return [number.value for number in numbers]


def test_a_float_counts_and_an_integer_beside_one() -> None:
    found = list(python_numbers("models/x.py", TABLE.encode(), bodies=False))
    assert sorted(values(found)) == [0.1445, 0.25, 1.0, 2.5, 190.56, 305.32, 4599200.0]


def test_bodies_add_defaults_and_what_is_not_plain_arithmetic() -> None:
    found = list(python_numbers("models/x.py", TABLE.encode(), bodies=True))
    assert sorted(number.value for number in found if number.name == "f()") == [0.33, 288.15]


def test_a_number_is_named_by_its_row() -> None:
    found = python_numbers("models/x.py", TABLE.encode(), bodies=False)
    assert {number.value: number.name for number in found}[190.56] == "ROWS['methane']"


def test_json_counts_rows_that_hold_a_float() -> None:
    text = '{"year": 1975, "é": "5.5", "rows": [[300, 1.5e-3], [7, 8]], "pages": [1, 2]}'.encode()
    assert values(list(json_numbers("models/x.json", text))) == [300.0, 0.0015]


def test_csv_counts_rows_that_hold_a_float() -> None:
    text = b"name,t2,value\nwater-2,300,-1.5\nnone,4,5\n"
    assert values(list(csv_numbers("models/x.csv", text))) == [300.0, -1.5]


@pytest.mark.parametrize("reader", [json_numbers, csv_numbers])
def test_places_are_bytes(reader: Callable[[str, bytes], Iterator[Number]]) -> None:
    text = '["é", 12.5, 3]\n'.encode() if reader is json_numbers else "é,12.5,3\n".encode()
    assert [text[number.start : number.end] for number in reader("models/x", text)] == [b"12.5", b"3"]


def test_places_in_python_are_bytes() -> None:
    text = TABLE.encode()
    for number in python_numbers("models/x.py", text, bodies=True):
        assert float(text[number.start : number.end]) == number.value


def test_a_number_of_the_method_is_left_out() -> None:
    kept, left = (
        Number("models/x.py", 0, 1, 1, name, 1e-9) for name in ("TOLERANCE_OF_GAUGE", "ROOT_TOLERANCE")
    )
    assert physical(kept) and not physical(left)


@pytest.mark.parametrize("name", ["_PRINTED_ROWS", "FREEZING_POINTS", "DENSITY_KNOTS"])
def test_a_table_of_floats_is_data_whatever_it_is_called(name: str) -> None:
    text = f"{name} = ((273.15, 999.84), (283.15, 999.7))\nBLOCK_ROWS = 16_384\n".encode()
    found = [number for number in python_numbers("models/x.py", text, bodies=False) if physical(number)]
    assert values(found) == [273.15, 999.84, 283.15, 999.7]
