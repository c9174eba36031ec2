"""Columns as a table of pandas or a data set of xarray, with units beside every number.

Rules: neither is needed for anything else; whoever lacks one is told what to install. Uncertainties stand in columns of
their own; instants become UTC times.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import asdict
from importlib import import_module
from typing import TYPE_CHECKING, Any

from archive.errors import BadRequest
from archive.lab.views.column import Column, instants

if TYPE_CHECKING:
    import pandas as pd
    import xarray as xr

__all__ = ["UNCERTAINTY", "as_dataframe", "as_dataset", "rows_as_dataframe"]

UNCERTAINTY = "_uncertainty"
"""What is put behind a column's name for its standard uncertainty."""


def _library(name: str) -> Any:
    try:
        return import_module(name)
    except ImportError:
        raise BadRequest(
            f"this needs {name}, which is not installed here",
            remedy=f'install it with: pip install "stillroom[{name}]"',
        ) from None


def as_dataframe(
    columns: Sequence[Column], *, units_in_names: bool, about: Mapping[str, str]
) -> pd.DataFrame:
    """Table with a row for each row of the columns.

    Parameters
    ----------
    columns : sequence of Column
        Of equal length.
    units_in_names : bool
        Whether a heading is `period/us` instead of `period`.
    about : mapping of str to str
        What is put into `attrs` beside `units`.

    Raises
    ------
    BadRequest
        If pandas is not installed.
    """
    pandas = _library("pandas")
    held: dict[str, Any] = {}
    units: dict[str, str] = {}
    for column in columns:
        name = column.label if units_in_names else column.name
        if column.kind == "instant":
            held[name] = pandas.to_datetime(instants(column.values), utc=True)
            continue
        held[name] = column.values
        units[name] = column.unit
        if column.uncertainty is not None:
            beside = Column(column.name + UNCERTAINTY, column.unit, column.kind, column.values)
            name = beside.label if units_in_names else beside.name
            held[name], units[name] = column.uncertainty, column.unit
    table: pd.DataFrame = pandas.DataFrame(held)
    table.index.name = "row"
    table.attrs = {**about, "units": units}
    return table


def as_dataset(
    columns: Sequence[Column], *, rows: int, coordinates: Sequence[str], about: Mapping[str, str]
) -> xr.Dataset:
    """Data set along the dimension `row`, with units as attributes.

    Parameters
    ----------
    columns : sequence of Column
    rows : int
        Length of `row`; columns of n other rows lie along `row_n`.
    coordinates : sequence of str
        Names of columns that become coordinates along `row`.
    about : mapping of str to str
        Attributes of the data set.

    Raises
    ------
    BadRequest
        If xarray is not installed.

    References
    ----------
    NetCDF Climate and Forecast Metadata Conventions 1.11, 3.1 (units), 3.2 (long_name), 3.4 (ancillary_variables).
    """
    xarray = _library("xarray")
    held: dict[str, Any] = {}
    for column in columns:
        along_it = "row" if column.values.size == rows else f"row_{column.values.size}"
        described = {"long_name": column.description or column.name, "quantity": column.kind}
        if column.kind == "instant":
            held[column.name] = (along_it, instants(column.values), {**described, "time_zone": "UTC"})
            continue
        described["units"] = column.unit
        if column.scale:
            described["temperature_scale"] = column.scale
        if column.uncertainty is not None:
            beside = column.name + UNCERTAINTY
            told = {"long_name": f"standard uncertainty of {column.name}", "units": column.unit}
            held[beside] = (along_it, column.uncertainty, told)
            described["ancillary_variables"] = beside
        held[column.name] = (along_it, column.values, described)
    along = {name: held.pop(name) for name in coordinates if name in held}
    data: xr.Dataset = xarray.Dataset(held, coords=along, attrs=dict(about))
    return data


def rows_as_dataframe(rows: Sequence[Any]) -> pd.DataFrame:
    """Table with a row for each answer of the index; what each column's unit is, `archive.index.answers` says.

    Raises
    ------
    BadRequest
        If pandas is not installed.
    """
    pandas = _library("pandas")
    table: pd.DataFrame = pandas.DataFrame([asdict(row) for row in rows])
    return table
