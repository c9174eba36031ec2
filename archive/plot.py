"""Plots of what the archive hands out, as axes of matplotlib that a script or notebook goes on with.

Rules: axes are named as quantity over unit; stored uncertainties are drawn; nothing is shown or saved here, and no state
of matplotlib is changed.

    from archive import Archive, plot
    with Archive.open() as lab:
        axes = plot.columns(lab.sweep("2026-03/s017"), "period")
"""

from __future__ import annotations

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from archive.errors import BadRequest
from archive.lab.views import ArrayView
from archive.lab.views.choice import hours, pair

__all__ = ["columns"]


def columns(
    view: ArrayView, name: str | None = None, *, against: str | None = None, axes: Axes | None = None
) -> Axes:
    """Axes with one column of a sweep or reduction against another, with its standard uncertainty where it is stored.

    Parameters
    ----------
    view : ArrayView
        From `Archive.sweep` or `Archive.reduction`.
    name : str, optional
        What is drawn; else what is usual for such a sweep.
    against : str, optional
        The abscissa; else what is usual for such a sweep. Instants are drawn as hours since the first.
    axes : Axes, optional
        Where it is drawn; else on a new figure, to be had as `axes.figure`.

    Returns
    -------
    Axes
        With labels such as `period/us`.

    Raises
    ------
    UnknownAddress
        If there is no column of that name.
    BadRequest
        If there are no two columns of equal length with numbers.

    Examples
    --------
    >>> from archive.lab.views import Column, SweepView
    >>> T = Column("temperature", "K", "temperature", np.array([0.1, 0.2]))
    >>> P = Column("period", "us", "period", np.array([1000.5, 1000.25]))
    >>> axes = columns(SweepView("2026-03/s017", "temperature-sweep", [T, P]))
    >>> axes.get_xlabel(), axes.get_ylabel()
    ('temperature/K', 'period/us')
    """
    asked = None if name is None else view.column(name)
    chosen = None if asked is not None and against is not None else pair(view.kind, view.columns, name)
    x = view.column(against) if against is not None else chosen and chosen[0]
    y = asked if asked is not None else chosen and chosen[1]
    if not x or not y or x.values.size != y.values.size:
        raise BadRequest(
            f"{view.address} has no two columns of equal length to plot",
            expected="name and against of equal length",
        )
    x = hours(x)
    drawn = Figure(layout="constrained").subplots() if axes is None else axes
    if y.uncertainty is not None and np.any(y.uncertainty > 0):
        drawn.errorbar(
            x.values, y.values, yerr=y.uncertainty, fmt=".", markersize=3, elinewidth=0.6, label=view.address
        )
    else:
        drawn.plot(x.values, y.values, ".", markersize=3, label=view.address)
    drawn.set_xlabel(x.label)
    drawn.set_ylabel(y.label)
    return drawn
