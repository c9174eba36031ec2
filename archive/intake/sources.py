"""Array sources (`.npy`, `.npz`, HDF5) as one block of columns, by the same rules as text tables.

Rules: what a source is, its first bytes say, and its name must agree. A source that is not to be trusted is refused
whole: no rows, and a bad cell on line 0 that says why.
"""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import Any, Final

import numpy as np
import numpy.typing as npt
import pyarrow as pa

from archive.intake.cells import parsed_number
from archive.intake.dialect import BadCells, Block, ColumnRequest
from archive.intake.hdf5_source import LARGEST, Columns, RefusalError, hdf5_columns, weight
from archive.intake.numpy_source import numpy_columns
from archive.intake.own_readers import own_reader
from archive.intake.timestamps import EARLIEST, LATEST, TimeStamps

__all__ = ["is_array_source", "read_array_source"]

_SUFFIXES: Final = {
    "hdf5": frozenset({".h5", ".hdf5", ".hdf", ".he5", ".nxs"}),
    "npy": frozenset({".npy"}),
    "npz": frozenset({".npz"}),
}
# Signatures: HDF5 file format specification, section II.A; NumPy Enhancement Proposal 1; PKWARE's APPNOTE 4.3.7.
_SIGNATURES: Final = {"hdf5": b"\x89HDF\r\n\x1a\n", "npy": b"\x93NUMPY", "npz": b"PK\x03\x04"}


def is_array_source(file: str) -> bool:
    """Whether a file of this name is read by `read_array_source` (otherwise it is a text table).

    So are the formats for which the laboratory has a reader of its own.

    Examples
    --------
    >>> is_array_source("raw/s017.h5"), is_array_source("raw/s017.csv.gz")
    (True, False)
    """
    suffix = Path(file).suffix.lower()
    return any(suffix in suffixes for suffixes in _SUFFIXES.values()) or own_reader(file) is not None


def read_array_source(path: Path, file: str, columns: Sequence[ColumnRequest]) -> Block:
    """Return the asked columns of a NumPy or HDF5 file as one block.

    Parameters
    ----------
    path : pathlib.Path
        The file.
    file : str
        Name for messages.
    columns : sequence of ColumnRequest
        `column` is a number from 1, a field name, the path of a data set, or path and number or field
        (`run/table/3`), or path and row (`run/table/row/3`) of a table that lies on its side. Times are numbers of POSIX seconds, or ISO 8601 text with an offset.

    Returns
    -------
    Block
        `lines` counts rows from 1. `bad_cells` and `bad_cell_count` are filled; a bad cell on line 0 concerns a
        whole column, or the whole source if its column is empty.

    Notes
    -----
    A column that cannot be read is NaN (text: empty), like one that is shorter than the others from its end on.
    One number without dimensions, such as a rate or a temperature that was written beside the columns, holds for every
    row. Integers must be exact in a double. `datetime64` is refused, because it does not say in which zone it is.
    """
    bad = BadCells(file)
    arrays: Columns = {}
    try:
        arrays, faults = _own_columns(path, file, columns) or _columns(path, columns)
        _require_room(arrays)
    except RefusalError as refusal:
        arrays, faults = {}, {}
        bad.add(0, 0, "", path.name, f"this source is refused: {refusal}")
    for number, request in enumerate(columns, start=1):
        if request.name in faults:
            bad.add(0, number, str(request.column), str(request.column), faults[request.name])
    rows = max((len(array) for array in arrays.values() if array.ndim), default=1 if arrays else 0)
    arrays = {name: array if array.ndim else np.full(rows, array) for name, array in arrays.items()}
    block = Block(first_line=1, columns={}, lines=np.arange(1, rows + 1, dtype=np.int64), sentinel={})
    for number, request in enumerate(columns, start=1):
        values, mask = _checked(request, arrays.get(request.name), number, bad)
        length = len(arrays.get(request.name, block.lines))
        if length < rows:
            why = f"is missing: the column ends after {length} rows, another has {rows}"
            bad.add(length + 1, number, str(request.column), "", why)
        missing = rows - len(values)
        blank: Any = "" if request.kind == "text" else np.nan
        block.columns[request.name] = np.concatenate((values, np.full(missing, blank, dtype=values.dtype)))
        block.sentinel[request.name] = np.concatenate((mask, np.zeros(missing, dtype=np.bool_)))
    if arrays and not rows:
        bad.add(0, 0, "", path.name, "holds no row of data")
    bad.settle()
    block.bad_cells, block.bad_cell_count = bad.detailed, bad.count
    return block


def _require_room(arrays: Columns) -> None:
    """Refuse columns that fit one by one but not together: one may be asked for many times, and one value fills all rows."""
    rows = max((len(array) for array in arrays.values() if array.ndim), default=1)
    needed = sum(rows * weight(array.dtype) for array in arrays.values())
    if needed > LARGEST:
        raise RefusalError(
            f"its columns come to {needed} bytes over {rows} rows; more than {LARGEST} are not read"
        )


def _columns(path: Path, columns: Sequence[ColumnRequest]) -> tuple[Columns, dict[str, str]]:
    return (hdf5_columns if _kind(path) == "hdf5" else numpy_columns)(path, columns)


def _own_columns(
    path: Path, file: str, columns: Sequence[ColumnRequest]
) -> tuple[Columns, dict[str, str]] | None:
    """Return what the laboratory's reader for such a file gives, and why a column is none; None without a reader."""
    reader = own_reader(file)
    if reader is None:
        return None
    try:
        given = reader.columns(path)
    except ValueError as error:
        raise RefusalError(str(error)) from None
    names = ", ".join(given) or "none"
    arrays: Columns = {}
    faults: dict[str, str] = {}
    for request in columns:
        number = request.column if isinstance(request.column, int) else None
        name = list(given)[number - 1] if number is not None and 0 < number <= len(given) else request.column
        if name not in given:
            faults[request.name] = f"the reader {reader.name} gives no such column; it gives: {names}"
        elif given[str(name)].ndim > 1:
            faults[request.name] = (
                f"the reader {reader.name} gives {given[str(name)].ndim} dimensions, not a column"
            )
        else:
            arrays[request.name] = given[str(name)]
    return arrays, faults


def _kind(path: Path) -> str:
    with path.open("rb") as stream:
        begin = stream.read(8)
    kinds = [kind for kind, signature in _SIGNATURES.items() if begin.startswith(signature)]
    if not kinds:
        raise RefusalError("it is neither HDF5 nor a NumPy file by its first bytes")
    if path.suffix.lower() not in _SUFFIXES[kinds[0]]:
        raise RefusalError(f"it is a file of kind {kinds[0]} by its first bytes, but not by its name")
    return kinds[0]


def _checked(
    request: ColumnRequest, array: npt.NDArray[Any] | None, number: int, bad: BadCells
) -> tuple[npt.NDArray[Any], npt.NDArray[np.bool_]]:
    """Return values and sentinel mask of one column; what is wrong goes to `bad`."""
    empty: npt.NDArray[Any] = np.zeros(0, dtype=object if request.kind == "text" else np.float64)
    if array is None:
        return empty, np.zeros(0, dtype=np.bool_)
    column = str(request.column)
    try:
        if request.kind == "text":
            return _text(request, array)
        values, mask, faults = _numbers(request, array)
    except RefusalError as refusal:
        bad.add(0, number, column, str(array.dtype), str(refusal))
        return empty, np.zeros(0, dtype=np.bool_)
    for index, why in faults.items():
        if not mask[index]:
            bad.add(index + 1, number, column, str(array[index]), why)
            values[index] = np.nan
    values[mask] = np.nan
    return values, mask


def _strings(array: npt.NDArray[Any]) -> npt.NDArray[np.str_]:
    if array.dtype.kind == "S":
        try:
            return np.char.decode(array, "utf-8")
        except UnicodeDecodeError:
            raise RefusalError("its text is not UTF-8") from None
    return array


def _text(request: ColumnRequest, array: npt.NDArray[Any]) -> tuple[npt.NDArray[Any], npt.NDArray[np.bool_]]:
    if array.dtype.kind not in "SU":
        raise RefusalError("it does not hold text")
    text = _strings(array).astype(object)
    sentinels = {sentinel.strip() for sentinel in request.sentinels}
    mask = np.array([cell.strip() in sentinels for cell in text], dtype=np.bool_)
    text[mask] = ""
    return text, mask


def _numbers(
    request: ColumnRequest, array: npt.NDArray[Any]
) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.bool_], dict[int, str]]:
    if array.dtype.kind == "M":
        raise RefusalError(
            "it is datetime64, which names no zone; write seconds since 1970 UTC, or text with an offset"
        )
    if array.dtype.kind in "SU":
        if request.kind != "time":
            raise RefusalError("it holds text, not numbers")
        text = _strings(array)
        mask = np.isin(np.char.strip(text), [sentinel.strip() for sentinel in request.sentinels])
        values, faults = TimeStamps(time_format="iso8601").seconds(pa.array(text.tolist(), pa.string()))
        if request.nan == "keep":
            faults = {index: why for index, why in faults.items() if text[index].strip()}
        return values, mask, faults
    if array.dtype.kind not in "biuf" or array.dtype.itemsize > 8:
        raise RefusalError("it does not hold numbers that fit a double")
    values = array.astype(np.float64)
    stated = [parsed_number(sentinel, decimal=".") for sentinel in request.sentinels]
    mask = np.isin(values, [value for value in stated if value is not None])
    faults = {}
    if array.dtype.kind in "iu" and array.dtype.itemsize == 8:
        # Beyond 2**53 not every integer is a double; compared in Python, where neither is rounded.
        for index in np.flatnonzero(np.abs(values) >= 2.0**53).tolist():
            if int(values[index]) != int(array[index]):
                faults[index] = "is an integer that a double cannot hold"
    names_nan = any(sentinel.strip().lower() == "nan" for sentinel in request.sentinels)
    nan = np.isnan(values)
    if names_nan:
        mask |= nan
    elif request.nan == "error":
        faults |= dict.fromkeys(np.flatnonzero(nan).tolist(), "is NaN")
    faults |= dict.fromkeys(np.flatnonzero(np.isinf(values)).tolist(), "is infinite")
    if request.kind == "time":
        with np.errstate(invalid="ignore"):
            far = np.isfinite(values) & ((values < EARLIEST) | (values >= LATEST))
        faults |= dict.fromkeys(
            np.flatnonzero(far).tolist(), "is no number of seconds since 1970 (outside the years 1 to 9999)"
        )
    return values, mask, faults
