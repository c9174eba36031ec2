"""Columns of a sweep or a reduction: a mapping of names to plain arrays, and with one more word their units.

Rules: `view["period"]` is the array as stored and stays one; everything else is beside it. A view holds what it shows, so
that it outlives the archive it came from.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator, Mapping, Sequence
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray
from typing_extensions import override

from archive.errors import UnknownAddress
from archive.lab.views.choice import hours, pair
from archive.lab.views.column import Column
from archive.lab.views.frames import as_dataframe, as_dataset
from archive.lab.views.html import fragment, grid
from archive.lab.views.pint_units import pint_quantity
from archive.lab.views.result import Result

if TYPE_CHECKING:
    import pandas as pd
    import pint
    import xarray as xr

__all__ = ["ArrayView", "ReductionView", "SweepView"]


class ArrayView(Mapping[str, NDArray[np.float64]]):
    """Columns of equal length, by name.

    Parameters
    ----------
    address : str
        What they belong to.
    kind : str
        Kind of the sweep.
    columns : sequence of Column
    marks : sequence of str
        What was said of it later: withdrawn, amended, superseded.

    Examples
    --------
    >>> T = Column("temperature", "K", "temperature", np.array([0.1, 0.2]), scale="PLTS-2000")
    >>> P = Column("period", "us", "period", np.array([1000.5, 1000.25]))
    >>> view = SweepView("2026-03/s017", "temperature-sweep", [T, P])
    >>> view["period"].tolist(), view.units
    ([1000.5, 1000.25], {'temperature': 'K', 'period': 'us'})
    >>> print(view.quantity("period").to("ms"))
    [1.0005 1.00025] millisecond
    """

    what = "columns"

    def __init__(self, address: str, kind: str, columns: Sequence[Column], marks: Sequence[str] = ()) -> None:
        self.address = address
        self.kind = kind
        self.columns: dict[str, Column] = {column.name: column for column in columns}
        self.marks = tuple(marks)

    @override
    def __getitem__(self, name: str) -> NDArray[np.float64]:
        return self.columns[name].values

    @override
    def __iter__(self) -> Iterator[str]:
        return iter(self.columns)

    @override
    def __len__(self) -> int:
        return len(self.columns)

    def column(self, name: str) -> Column:
        """Column with all that stands beside it.

        Raises
        ------
        UnknownAddress
            If there is none of that name; the message lists those there are.
        """
        try:
            return self.columns[name]
        except KeyError:
            raise UnknownAddress(
                f"{self.address} has no column {name}", expected=f"one of: {', '.join(self.columns)}"
            ) from None

    @property
    def units(self) -> dict[str, str]:
        """Unit of each column."""
        return {name: column.unit for name, column in self.columns.items()}

    @property
    def rows(self) -> int:
        """Number of rows; where a reduction holds columns of several lengths, that of most of them."""
        sizes = Counter(column.values.size for column in self.columns.values())
        return sizes.most_common(1)[0][0] if sizes else 0

    def quantity(self, name: str) -> pint.Quantity[NDArray[np.float64]]:
        """Column as a quantity of pint, e.g. `view.quantity("period").to("ms")`."""
        column = self.column(name)
        return pint_quantity(column.values, column.unit)

    def uncertainty(self, name: str) -> NDArray[np.float64] | None:
        """Combined standard uncertainty of a column in its unit, or None if none is stored with it."""
        return self.column(name).uncertainty

    def to_pandas(self, *, units_in_names: bool = False) -> pd.DataFrame:
        """Table of pandas, uncertainties in columns `NAME_uncertainty`, instants as UTC times.

        A column that has other rows than most, such as a fitted curve, is not in it; take it by its name.

        Parameters
        ----------
        units_in_names : bool
            Headings such as `period/us`, which survive what loses `DataFrame.attrs["units"]`, such as writing CSV.

        Raises
        ------
        BadRequest
            If pandas is not installed.
        """
        columns = list(self.columns.values())
        same = [column for column in columns if column.values.size == self.rows]
        return as_dataframe(same, units_in_names=units_in_names, about=self._about)

    def to_xarray(self) -> xr.Dataset:
        """Data set of xarray along `row`, with units as attributes; time and temperature are its coordinates.

        A column that has other rows than most lies along a dimension of its own, such as `row_200`.

        Raises
        ------
        BadRequest
            If xarray is not installed.
        """
        columns = list(self.columns.values())
        along = [each.name for each in columns if each.kind in ("instant", "temperature")]
        return as_dataset(columns, rows=self.rows, coordinates=along, about=self._about)

    @property
    def _about(self) -> dict[str, str]:
        told = {"address": self.address, "kind": self.kind}
        return {**told, "marks": "; ".join(self.marks)} if self.marks else told

    @override
    def __repr__(self) -> str:
        names = ", ".join(column.label for column in self.columns.values())
        told = f" [{'; '.join(self.marks)}]" if self.marks else ""
        return f"<{self.what} {self.address}, {self.kind}, {self.rows} rows: {names}>{told}"

    def _repr_html_(self) -> str:
        title = f"{self.what} {self.address}: {self.kind}, {self.rows} rows"
        return fragment(title, self._table(), self._picture(), marks=self.marks)

    def _table(self) -> str:
        heads = ("column", "unit", "kind", "from", "to", "missing")
        return grid(heads, [_line(column) for column in self.columns.values()])

    def _picture(self) -> str:
        chosen = pair(self.kind, self.columns)
        if chosen is None:
            return ""
        x, y = hours(chosen[0]), chosen[1]
        from archive.reports.svg import Series, axis_of, plot  # as below

        (X, across_name), (Y, up_name) = _on_axis(x), _on_axis(y)
        across, up = axis_of(across_name, [X]), axis_of(up_name, [Y])
        if across is None or up is None:
            return ""
        label = f"{y.label} against {x.label} of {self.address}"
        drawn = plot(across, up, [Series(X, Y, marks=True)], label=label, width=110.0, height=64.0)
        # The ink of the page around it: black would not be seen on a dark one.
        return drawn.replace('"#000"', '"currentColor"').replace("<svg ", '<svg fill="currentColor" ', 1)


def _on_axis(column: Column) -> tuple[NDArray[np.float64], str]:
    """Values as a small plot writes them, less a round offset where they hardly differ, and the name of the axis."""
    from archive.reports.axis_units import (
        axis_unit,
    )  # what draws takes longer to import than a search to answer
    from schemas.kinds import KINDS

    ends = _ends(column.values[np.isfinite(column.values)])
    if column.kind not in KINDS or column.kind == "time" or not ends:
        return column.values, column.label
    unit = axis_unit(ends[0], ends[1], column.kind, column.unit)
    return (column.values - unit.offset) * unit.factor, unit.name


def _line(column: Column) -> tuple[str, ...]:
    known = column.values[np.isfinite(column.values)]
    missing = str(column.values.size - known.size) if known.size < column.values.size else ""
    if column.kind == "instant":
        ends = [str(np.datetime64(round(float(each)), "s")) + "Z" for each in _ends(known)]
    else:
        ends = [f"{each:.6g}" for each in _ends(known)]
    scale = f" on {column.scale}" if column.scale else ""
    low, high = ends or ("", "")
    return column.name, column.unit, column.kind.replace("_", " ") + scale, low, high, missing


def _ends(known: NDArray[np.float64]) -> list[float]:
    return [float(known.min()), float(known.max())] if known.size else []


class SweepView(ArrayView):
    """Channels of a sweep as stored, in the units of its file; see `ArrayView`."""

    what = "sweep"


class ReductionView(ArrayView):
    """Arrays of a reduction with their uncertainties, in SI units, and its scalar results; see `ArrayView`.

    Parameters
    ----------
    results : sequence of Result
    """

    what = "reduction"

    def __init__(
        self,
        address: str,
        kind: str,
        columns: Sequence[Column],
        marks: Sequence[str] = (),
        *,
        results: Sequence[Result] = (),
    ) -> None:
        super().__init__(address, kind, columns, marks)
        self.results: dict[str, Result] = {result.name: result for result in results}

    @override
    def _table(self) -> str:
        from archive.reports.numbers import (
            shown_output,
        )  # what draws takes longer to import than a search to answer

        rows = [
            (each.name, shown_output(each.entry).text, each.description) for each in self.results.values()
        ]
        found = grid(("result", "value", "what"), rows) if rows else ""
        return found + (super()._table() if self.columns else "")

    @override
    def __repr__(self) -> str:
        return f"{super().__repr__()[:-1]}; results: {', '.join(self.results) or 'none'}>"
