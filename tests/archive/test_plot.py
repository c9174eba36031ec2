"""Axes of matplotlib from views: labels, points, uncertainties, what cannot be drawn."""

from __future__ import annotations

import numpy as np
import pytest
from matplotlib.container import ErrorbarContainer

from archive import plot
from archive.errors import BadRequest, UnknownAddress
from archive.lab.views import Column, SweepView

T = Column("temperature", "K", "temperature", np.array([0.1, 0.2, 0.3]))
P = Column("period", "us", "period", np.array([1000.5, 1000.25, np.nan]), np.full(3, 0.1))
Q = Column("amplitude", "mV", "amplitude", np.array([1.0, 2.0, 3.0]))
W = Column("time", "s", "instant", np.array([0.0, 3600.0, 7200.0]))
VIEW = SweepView("2026-03/s017", "temperature-sweep", [W, T, P, Q])


def test_stored_uncertainties_are_drawn() -> None:
    axes = plot.columns(VIEW)
    assert (axes.get_xlabel(), axes.get_ylabel()) == ("temperature/K", "period/us")
    assert [type(each) for each in axes.containers] == [ErrorbarContainer]


def test_what_is_asked_for_is_drawn_on_the_axes_that_are_given() -> None:
    axes = plot.columns(VIEW, "amplitude", against="time")
    np.testing.assert_array_equal(axes.lines[0].get_xydata(), [[0, 1], [1, 2], [2, 3]])
    assert axes.get_xlabel() == "time/h"
    assert plot.columns(VIEW, "period", axes=axes) is axes
    assert [text.get_text() for text in axes.legend().get_texts()] == ["2026-03/s017"] * 2


def test_what_cannot_be_drawn_is_refused() -> None:
    with pytest.raises(UnknownAddress, match="one of: time, temperature"):
        plot.columns(VIEW, "pressure")
    with pytest.raises(BadRequest, match="no two columns"):
        plot.columns(SweepView("2026-03/s018", "log", [W]))
    curve = Column("curve", "us", "period", np.arange(9.0))
    with pytest.raises(BadRequest, match="no two columns"):
        plot.columns(SweepView("a/b", "log", [W, T, curve]), "curve", against="temperature")
