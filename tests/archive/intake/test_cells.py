"""Text cells to numbers, against Python's own reading."""

from __future__ import annotations

import math

import pyarrow as pa
import pytest
from hypothesis import given
from hypothesis import strategies as st

from archive.intake.cells import numbers, parsed_number

SENTINELS = {
    "point": ("-9999.0", ".", -9999.0),
    "comma": ("9,9E37", ",", 9.9e37),
    "point in a comma table": ("9.9E37", ",", 9.9e37),
    "blanks": (" 5 ", ".", 5.0),
    "word": ("OVLD", ".", None),
    "infinite": ("1e999", ".", None),
    "NaN": ("nan", ".", None),
}


@pytest.mark.parametrize(("text", "decimal", "expected"), SENTINELS.values(), ids=SENTINELS.keys())
def test_numbers_that_sentinels_stand_for(text: str, decimal: str, expected: float | None) -> None:
    assert parsed_number(text, decimal=decimal) == expected  # type: ignore[arg-type]


@given(st.lists(st.text(alphabet="0123456789.,eE+-_xnaif ", max_size=10), max_size=10))
def test_every_cell_is_a_number_absent_or_a_fault(texts: list[str]) -> None:
    values, absent, faults = numbers(pa.array(texts, pa.string()), decimal=".")
    for index, text in enumerate(texts):
        if absent[index]:
            assert text.strip() == "" or math.isnan(float(text))
        elif index not in faults:
            assert values[index] == float(text)
        else:
            assert math.isnan(values[index])
