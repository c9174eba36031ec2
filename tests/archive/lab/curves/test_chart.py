"""A chart draws what is stored, lays over only what is comparable, and says the rest in words."""

from __future__ import annotations

import math

import numpy as np
import pytest

from archive import Archive
from archive.errors import BadRequest, UnknownAddress
from archive.lab.curves.chart import Asked, Chart


def _restored(chart: Chart, name: str, number: int = 0) -> tuple[np.ndarray, np.ndarray]:
    """Abscissa and ordinate of a curve in the units stored by the first."""
    panel = next(each for each in chart.panels if each.name == name)
    curve = panel.curves[number]
    x = curve.x / chart.across.factor + chart.across.offset
    return x, curve.y / panel.axis.factor + panel.axis.offset


def test_a_chart_shows_the_stored_numbers_in_units_that_read_well(lab: Archive) -> None:
    chart = lab.chart(Asked("2026-03/s002", columns=("period",)))
    stored = lab.sweep("2026-03/s002")
    assert (chart.against, chart.across.name, chart.scale) == ("temperature", "T / mK", "ITS-90")
    x, y = _restored(chart, "period")
    np.testing.assert_allclose(x, stored["temperature"], rtol=1e-14)
    np.testing.assert_allclose(y, stored["period"], rtol=1e-14)
    panel = chart.panels[0]
    assert panel.axis.name.startswith("(P \u2212 1.000008 ms) / ")
    assert panel.curves[0].u is not None
    # 2 ps, as the sheet says, on an axis of whatever prefix.
    np.testing.assert_allclose(panel.curves[0].u / panel.axis.factor, 2e-9, rtol=1e-12)
    assert (chart.told, panel.curves[0].thinned, panel.curves[0].line) == ((), False, True)


def test_a_view_holds_what_lies_between_its_ends_and_the_next_point_beside(lab: Archive) -> None:
    chart = lab.chart(Asked("2026-03/s002", columns=("period",), low=300.0, high=400.0))
    T = lab.sweep("2026-03/s002")["temperature"]
    inside = np.flatnonzero((T >= 0.3) & (T <= 0.4))
    np.testing.assert_allclose(_restored(chart, "period")[0], T[inside[0] - 1 : inside[-1] + 2], rtol=1e-14)
    whole = lab.chart(Asked("2026-03/s002", columns=("period",)))
    assert (chart.panels[0].low, chart.panels[0].axis) == (whole.panels[0].low, whole.panels[0].axis)
    with pytest.raises(BadRequest, match="is empty"):
        lab.chart(Asked("2026-03/s002", low=2.0, high=1.0))


def test_time_runs_from_the_first_row_of_each(lab: Archive) -> None:
    chart = lab.chart(Asked("2026-03/s001", against="time", columns=("period",), over=("2026-04/s001",)))
    assert chart.across.name == "t / min"
    assert [curve.x[0] for curve in chart.panels[0].curves] == [0.0, 0.0]
    assert chart.panels[0].curves[1].x[1] == pytest.approx(2.0)
    begins = [since for _, since in chart.since]
    assert begins == [lab.sweep(f"2026-0{month}/s001")["time"][0] for month in (3, 4)]


def test_another_unit_is_converted_and_another_scale_told(lab: Archive) -> None:
    chart = lab.chart(Asked("2026-03/s002", columns=("period",), over=("2026-04/s002",)))
    assert [curve.owner for curve in chart.panels[0].curves] == ["2026-03/s002", "2026-04/s002"]
    first, second = (_restored(chart, "period", number)[1] for number in (0, 1))
    np.testing.assert_allclose(first, second, rtol=1e-12)
    assert "2026-04/s002#period is stored in us and drawn in ms." in chart.told
    assert any("on PLTS-2000" in each and "on ITS-90: drawn as recorded" in each for each in chart.told)


@pytest.mark.parametrize(
    ("address", "columns", "over", "said"),
    [
        ("2026-03/s002", ("period",), "2026-05/s002", "has nothing that answers to period"),
        ("2026-03/s002", ("signal",), "2026-04/s002", "signal is peak, 2026-03/s002#signal rms"),
        ("2026-03/s002", ("period",), "2026-03/s099", "2026-03/s099 is not laid over"),
        ("2026-03/s002", ("period",), "bob.r1", "bob.r1 is not laid over"),
        ("2026-03/s002", ("period",), "\u202e<b>", "is no address"),
    ],
    ids=["no such quantity", "rms and peak", "no such sweep", "a cell", "no address"],
)
def test_what_is_not_comparable_is_refused_in_words(
    lab: Archive, address: str, columns: tuple[str, ...], over: str, said: str
) -> None:
    chart = lab.chart(Asked(address, columns=columns, over=(over,)))
    assert len(chart.panels[0].curves) == 1
    assert any(said in each for each in chart.told), chart.told


def test_the_same_name_with_another_quantity_is_not_laid_over(lab: Archive) -> None:
    """Against the row number, so that nothing but the quantity kind differs."""
    chart = lab.chart(Asked("2026-05/s002", against="row", columns=("frequency",), over=("2026-03/s002",)))
    assert [curve.owner for curve in chart.panels[0].curves] == ["2026-05/s002"]
    assert chart.owners == ("2026-05/s002", "2026-03/s002")


def test_what_is_not_there_is_named_with_what_is(lab: Archive) -> None:
    with pytest.raises(UnknownAddress, match="one of: time, temperature, period, signal, row"):
        lab.chart(Asked("2026-03/s002", columns=("pressure",)))
    with pytest.raises(UnknownAddress, match="has no curves"):
        lab.chart(Asked("bob.r1"))
    with pytest.raises(BadRequest, match="at most 12"):
        lab.chart(Asked("2026-03/s002", over=tuple(f"2026-03/s{n:03d}" for n in range(100, 113))))


def test_nothing_more_than_asked_is_given(lab: Archive) -> None:
    chart = lab.chart(Asked("2026-03/s002#period", most=14))
    assert [panel.name for panel in chart.panels] == ["period"]
    curve = chart.panels[0].curves[0]
    assert curve.x.size <= 14
    assert curve.thinned
    stored = lab.sweep("2026-03/s002")["period"]
    y = _restored(chart, "period")[1]
    assert math.isclose(y.min(), stored.min(), rel_tol=1e-15)
    assert math.isclose(y.max(), stored.max(), rel_tol=1e-15)
