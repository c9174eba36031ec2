"""One column of text cells to values by the rules of its request.

Rules: first the sentinels, then NaN and empty cells as the request says, and every other cell is a value or a fault.
"""

from __future__ import annotations

from typing import Any, Literal

import numpy as np
import numpy.typing as npt
import pyarrow as pa
import pyarrow.compute as pc

from archive.intake.cells import as_mask, is_absent, numbers, parsed_number
from archive.intake.dialect import ColumnRequest
from archive.intake.timestamps import TimeStamps

__all__ = ["checked_column", "stands_as_read"]

Mask = npt.NDArray[np.bool_]


def checked_column(
    request: ColumnRequest, cells: Any, *, decimal: Literal[".", ","], stamps: TimeStamps | None
) -> tuple[npt.NDArray[Any], Mask, dict[int, str]]:
    """Return the values of a column, which of them are sentinels, and why a cell is no value.

    Parameters
    ----------
    request : ColumnRequest
        What the column is.
    cells : pyarrow.Array
        Text without nulls, or doubles of which `stands_as_read` holds.
    decimal : {".", ","}
        Decimal mark of the table.
    stamps : TimeStamps or None
        Reader of time stamps; needed for a column of times.

    Returns
    -------
    values : numpy.ndarray
        Numbers or POSIX seconds, NaN where there is none; an object array of `str` for text.
    mask : numpy.ndarray of bool
        Sentinels.
    faults : dict of int to str
        Reason per index.
    """
    if pa.types.is_floating(cells.type):
        values = np.array(cells.to_numpy(zero_copy_only=False), dtype=np.float64)
        mask = _equals_sentinel(request, values, decimal)
        values[mask] = np.nan
        return values, mask, {}
    bare = pc.utf8_trim_whitespace(cells)
    mask = as_mask(pc.is_in(bare, pa.array([text.strip() for text in request.sentinels], pa.string())))
    if request.kind == "text":
        words = np.array(cells.to_pylist(), dtype=object)
        words[mask] = ""
        return words, mask, {}
    if request.kind == "time" and stamps is not None:
        absent = is_absent(bare)
        values, faults = stamps.seconds(cells, mask)
        if stamps.epoch:
            mask |= _equals_sentinel(request, values, decimal)
    else:
        values, absent, faults = numbers(cells, decimal=decimal, known=mask)
        mask |= _equals_sentinel(request, values, decimal)
    if request.nan == "error":
        empty = as_mask(pc.equal(bare, ""))
        faults |= {i: "is empty" if empty[i] else "is NaN" for i in np.flatnonzero(absent).tolist()}
    else:
        faults = {index: why for index, why in faults.items() if not absent[index]}
    values[mask] = np.nan
    return values, mask, {index: why for index, why in faults.items() if not mask[index]}


def stands_as_read(request: ColumnRequest, column: Any) -> bool:
    """Whether numbers that Arrow read itself need no second look: all finite, or NaN that is to be kept."""
    if not pa.types.is_floating(column.type):
        return True
    names_nan = any(text.strip().lower().lstrip("+-") == "nan" for text in request.sentinels)
    allowed = pc.is_nan(column) if request.nan == "keep" and not names_nan else False
    return bool(pc.all(pc.or_(pc.is_finite(column), allowed), min_count=0).as_py())


def _equals_sentinel(
    request: ColumnRequest, values: npt.NDArray[np.float64], decimal: Literal[".", ","]
) -> Mask:
    stated = [parsed_number(text, decimal=decimal) for text in request.sentinels]
    return np.isin(values, [value for value in stated if value is not None])
