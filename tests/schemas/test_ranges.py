"""Ranges and times as a person types them."""

from __future__ import annotations

import pytest

from schemas.ranges import named_range, point_in_time, si_bounds


def _si(number: str, unit: str) -> float:
    if unit not in ("K", "mK"):
        raise ValueError(f"found unit {unit}")
    return float(number) * {"K": 1.0, "mK": 1e-3}[unit]


@pytest.mark.parametrize(
    ("text", "bounds"),
    [
        pytest.param("0.4:0.8 K", (0.4, 0.8), id="unit-behind"),
        pytest.param("0.4 K : 0.8 K", (0.4, 0.8), id="unit-twice"),
        pytest.param("400 mK:0.8 K", (0.4, 0.8), id="two-units"),
        pytest.param("0.4 K:0.8", (0.4, 0.8), id="unit-in-front"),
        pytest.param("0.4: K", (0.4, None), id="open-above"),
        pytest.param("0.4 K:", (0.4, None), id="open-above-unit-in-front"),
        pytest.param(":0.8 K", (None, 0.8), id="open-below"),
        pytest.param("-1e-1:.5 K", (-0.1, 0.5), id="signs-and-powers"),
    ],
)
def test_ranges(text: str, bounds: tuple[float | None, float | None]) -> None:
    assert si_bounds(text, _si) == bounds


@pytest.mark.parametrize(
    ("text", "sentence"),
    [
        pytest.param("0.4 K", "expected a range", id="no-colon"),
        pytest.param("1:2:3 K", "expected a range", id="two-colons"),
        pytest.param(": K", "without a number", id="no-number"),
        pytest.param("0.8:0.4 K", "lower end first", id="turned-round"),
        pytest.param("0.4:0.8 Q", "found unit Q", id="wrong-unit"),
    ],
)
def test_ranges_that_are_none(text: str, sentence: str) -> None:
    with pytest.raises(ValueError, match=sentence):
        si_bounds(text, _si)


def test_names_of_results() -> None:
    assert named_range(" T_KT = 0.4:0.6 K ") == ("T_KT", "0.4:0.6 K")
    with pytest.raises(ValueError, match="name of a result"):
        named_range("=0.4:0.6 K")


@pytest.mark.parametrize(
    ("text", "end", "instant"),
    [
        pytest.param("2026-03-02", False, "2026-03-02T00:00:00+00:00", id="day-begins"),
        pytest.param("2026-03-02", True, "2026-03-02T23:59:59.999999+00:00", id="day-ends"),
        pytest.param("2026-03-02T09:10:00+02:00", True, "2026-03-02T09:10:00+02:00", id="rfc-3339"),
        pytest.param("2026-03-02T09:10:00Z", False, "2026-03-02T09:10:00+00:00", id="zulu"),
    ],
)
def test_times(*, text: str, end: bool, instant: str) -> None:
    assert point_in_time(text, end_of_day=end).isoformat() == instant


@pytest.mark.parametrize(
    ("text", "sentence"), [("2026-03-02T09:10", "without its offset"), ("02.03.2026", "expected a date")]
)
def test_times_that_are_none(text: str, sentence: str) -> None:
    with pytest.raises(ValueError, match=sentence):
        point_in_time(text)
