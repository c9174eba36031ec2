"""What differs between two contents, and what does not."""

from __future__ import annotations

from typing import Any

import pytest

from schemas.differences import differences


def quantity(value: float, unit: str, kind: str = "length", **more: Any) -> dict[str, Any]:
    """Return a quantity as a record dumps it."""
    return {"value": value, "unit": unit, "kind": kind, "uncertainty": None, **more}


def told(before: Any, after: Any) -> list[tuple[str, str | None, str | None]]:
    """Return differences as tuples."""
    return [(each.field, each.before, each.after) for each in differences(before, after)]


@pytest.mark.parametrize(
    ("before", "after"),
    [
        ({"gap": quantity(0.1, "mm")}, {"gap": quantity(100, "um")}),
        ({"gap": quantity(0.1, "mm", uncertainty=0.01)}, {"gap": quantity(100, "um", uncertainty=10)}),
        ({"T": quantity(0.5, "K", "temperature")}, {"T": quantity(500, "mK", "temperature")}),
        ({"a": None, "b": [], "c": ""}, {}),
        ({"n": 1}, {"n": 1.0}),
        ({"dose": [{"name": "d1", "x": 1}, {"name": "d2", "x": 2}]}, {"dose": [{"name": "d2", "x": 2}, {"name": "d1", "x": 1}]}),
    ],
    ids=["unit", "unit and uncertainty", "prefix", "nothing", "whole number", "order of named things"],
)  # fmt: skip
def test_what_means_the_same_is_no_difference(before: Any, after: Any) -> None:
    assert told(before, after) == []
    assert told(after, before) == []


@pytest.mark.parametrize(
    ("before", "after", "expected"),
    [
        ({"gap": quantity(0.1, "mm")}, {"gap": quantity(0.101, "mm")}, [("gap", "0.1 mm", "0.101 mm")]),
        (
            {"gap": quantity(0.1, "mm", text="0.10(1) mm", uncertainty=0.01)},
            {"gap": quantity(0.1, "mm", text="0.10(2) mm", uncertainty=0.02)},
            [("gap", "0.10(1) mm", "0.10(2) mm")],
        ),
        (
            {"T": quantity(0.5, "K", "temperature", scale="ITS-90", text="0.5 K on ITS-90")},
            {"T": quantity(0.5, "K", "temperature", scale="PLTS-2000", text="0.5 K on PLTS-2000")},
            [("T", "0.5 K on ITS-90", "0.5 K on PLTS-2000")],
        ),
        ({"a": {"b": [1.0, 2.0]}}, {"a": {"b": [1.0, 3.0, 4.0]}}, [("a.b[2]", "2.0", "3.0"), ("a.b[3]", None, "4.0")]),
        ({"dose": [{"name": "d1", "x": 1}]}, {"dose": [{"name": "d2", "x": 1}]},
         [("dose.d1", "name d1, x 1", None), ("dose.d2", None, "name d2, x 1")]),
        ({"closed": True}, {"closed": 1}, [("closed", "true", "1")]),
        ({"seal": "indium"}, {}, [("seal", "indium", None)]),
    ],
    ids=["value", "uncertainty", "scale", "list", "named things", "flag and number", "taken away"],
)  # fmt: skip
def test_what_differs_is_told_with_its_field(
    before: Any, after: Any, expected: list[tuple[str, str | None, str | None]]
) -> None:
    assert told(before, after) == expected


def test_fields_at_the_top_can_be_left_out() -> None:
    assert differences({"name": "a", "x": 1}, {"name": "b", "x": 1}, leave_out=("name",)) == []
