"""Refusals name the argument and the index."""

from __future__ import annotations

import pytest

from archive.physics.arrays import series


@pytest.mark.parametrize(
    ("values", "options", "message"),
    [
        ([[1.0]], {}, "2 dimensions"),
        ([1.0], {"least": 2}, "found 1 points"),
        ([1.0, float("nan")], {}, r"x\[1\]: found nan, expected a finite number"),
        ([1.0, 2.0, 0.0], {"positive": True}, r"x\[2\]: found 0.0, expected a positive"),
    ],
    ids=["dimensions", "few", "nan", "zero"],
)
def test_refused(values, options, message):
    with pytest.raises(ValueError, match=message):
        series("x", values, **options)
