"""Checks of what is handed to a writer, the same for every store.

A value is stored as it was given or refused; nothing is rounded, wrapped or cut to fit.
"""

from __future__ import annotations

import hashlib
from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from archive.errors import BadRequest
from archive.store.interface import Column
from archive.store.names import checked_path

__all__ = [
    "ATTRIBUTE_LIMIT",
    "checked_array",
    "checked_attributes",
    "checked_block",
    "checked_columns",
    "checked_text",
    "column_attributes",
    "encoded_text",
    "sha256_of",
]

# HDF5 object header messages are limited to 64 kB; half of it leaves room for names and headers.
ATTRIBUTE_LIMIT = 32_768
# Explicit byte order, so that the same numbers give the same bytes on every machine.
_STORED = {"float64": np.dtype("<f8"), "int64": np.dtype("<i8")}


def sha256_of(data: bytes) -> str:
    """Return the SHA-256 of `data` as 64 hexadecimal digits."""
    return hashlib.sha256(data).hexdigest()


def checked_text(text: str, *, field: str) -> bytes:
    """Return `text` in UTF-8, or raise BadRequest when a fixed-length HDF5 string cannot hold it."""
    try:
        encoded = text.encode("utf-8")
    except UnicodeEncodeError as error:
        raise BadRequest("the text is not valid Unicode", field=field, found=str(error)) from error
    if b"\x00" in encoded:  # HDF5 pads text with NUL, so one at the end would be lost
        raise BadRequest("the text holds a NUL character", field=field, expected="text without NUL")
    return encoded


def encoded_text(values: NDArray[Any], *, field: str) -> NDArray[np.bytes_]:
    """Return text as NUL-padded UTF-8 of the least width that holds every value, at least one byte."""
    encoded = [checked_text(_text(value, field=field), field=field) for value in values.ravel().tolist()]
    width = max(1, max(map(len, encoded), default=1))
    return np.array(encoded, dtype=f"S{width}").reshape(values.shape)


def _text(value: object, *, field: str) -> str:
    if not isinstance(value, str):
        raise BadRequest(
            "a text column holds something else", field=field, expected="text", found=type(value).__name__
        )
    return value


def checked_columns(group: str, columns: Sequence[Column], *, index: str | None) -> tuple[Column, ...]:
    """Return the columns of a table, or raise BadRequest naming the one that cannot be."""
    checked_path(group)
    names = [column.name for column in columns]
    problem = None
    if not names:
        problem = "a table needs a column"
    elif len(set(names)) < len(names):
        problem = "two columns of a table have one name"
    elif index is not None and index not in names:
        problem = f"the index {index!r} is not a column"
    if problem:
        raise BadRequest(problem, field=group, found=", ".join(names) or "none")
    for column in columns:
        checked_path(f"{group}/{column.name}")
        if "/" in column.name or column.dtype not in ("float64", "int64", "str"):
            raise BadRequest(
                "a column cannot be declared like this",
                field=f"{group}/{column.name}",
                expected="a name without / and float64, int64 or str",
                found=f"{column.name!r}, {column.dtype}",
            )
        if column.uncertainty_of is not None and column.uncertainty_of not in names:
            raise BadRequest(
                "an uncertainty belongs to a column that is not in the table",
                field=f"{group}/{column.name}",
                expected=", ".join(names),
                found=column.uncertainty_of,
            )
        checked_attributes(f"{group}/{column.name}", column_attributes(column, columns))
    return tuple(columns)


def column_attributes(column: Column, columns: Sequence[Column]) -> dict[str, str]:
    """Return the attributes that make a column readable without anything else.

    Notes
    -----
    `long_name` repeats `description` because plotting tools look for it under that name (CF Metadata Conventions,
    section 3.2). A quantity and its uncertainty name each other.
    """
    attributes = {
        "units": column.unit,
        "ucum": column.ucum,
        "quantity": column.quantity,
        "description": column.description,
        "long_name": column.description,
    }
    if column.uncertainty_of is not None:
        attributes["uncertainty_of"] = column.uncertainty_of
    for other in columns:
        if other.uncertainty_of == column.name:
            attributes["uncertainty"] = other.name
    return attributes


def checked_attributes(
    path: str, attributes: Mapping[str, str | float | int]
) -> dict[str, str | float | int]:
    """Return attributes that HDF5 can hold, or raise BadRequest naming the one it cannot."""
    for name, value in attributes.items():
        if not isinstance(value, str | int | float) or isinstance(value, bool):
            raise BadRequest(
                "an attribute is neither text nor a number",
                field=f"{path}:{name}",
                found=type(value).__name__,
            )
        size = len(checked_text(value, field=f"{path}:{name}")) if isinstance(value, str) else 8
        if size > ATTRIBUTE_LIMIT:
            raise BadRequest(
                "an attribute is too large; long text belongs in the document",
                field=f"{path}:{name}",
                expected=f"at most {ATTRIBUTE_LIMIT} bytes",
                found=f"{size} bytes",
            )
        if isinstance(value, int) and not -(2**63) <= value < 2**63:
            raise BadRequest("an attribute does not fit 64 bits", field=f"{path}:{name}", found=str(value))
    # Plain numbers: a NumPy scalar is an int or float too, but of a width that depends on its maker.
    return {
        name: value if isinstance(value, str) else (int(value) if isinstance(value, int) else float(value))
        for name, value in attributes.items()
    }


def checked_block(
    group: str, columns: Sequence[Column], block: Mapping[str, NDArray[Any]]
) -> dict[str, NDArray[Any]]:
    """Return a block of rows in stored form, or raise BadRequest; text becomes NUL-padded UTF-8."""
    names = [column.name for column in columns]
    if set(block) != set(names):
        raise BadRequest(
            "a block of rows has other columns than its table",
            field=group,
            expected=", ".join(names),
            found=", ".join(block),
        )
    arrays = {name: np.asarray(block[name]) for name in names}
    shapes = {name: array.shape for name, array in arrays.items()}
    if any(len(shape) != 1 for shape in shapes.values()) or len(set(shapes.values())) != 1:
        raise BadRequest(
            "the columns of a block are not of one length",
            field=group,
            expected="one-dimensional arrays of equal length",
            found=", ".join(f"{name} {shape}" for name, shape in shapes.items()),
        )
    return {
        column.name: _stored(f"{group}/{column.name}", column.dtype, arrays[column.name])
        for column in columns
    }


def _stored(path: str, dtype: str, values: NDArray[Any]) -> NDArray[Any]:
    if dtype == "str":
        if values.size == 0:
            return np.empty(0, dtype="S1")
        return encoded_text(values, field=path)
    stored = _STORED[dtype]
    # NumPy's "safe" lets int64 become float64, which rounds above 2**53; such numbers are refused below.
    if values.size and (values.dtype.kind not in "fiu" or not np.can_cast(values.dtype, stored, "safe")):
        raise BadRequest(
            "a column holds numbers of another kind", field=path, expected=dtype, found=str(values.dtype)
        )
    converted = values.astype(stored)
    if values.dtype.kind in "iu" and stored.kind == "f" and np.any(converted.astype(values.dtype) != values):
        raise BadRequest("an integer is too large for float64", field=path, expected="at most 2**53")
    return converted


def checked_array(path: str, data: NDArray[Any]) -> NDArray[Any]:
    """Return an array in stored form (little-endian, C order; text as UTF-8), or raise BadRequest."""
    checked_path(path)
    values = np.asarray(data)
    if values.dtype.kind in "UT" or (values.dtype.kind == "O" and values.size):
        return encoded_text(values, field=path)
    # bool and complex would be an HDF5 enumeration and a compound, which other tools read in other ways.
    if values.dtype.kind not in "fiu" or values.dtype.itemsize > 8 or values.dtype == np.float16:
        raise BadRequest(
            "an array of this kind is not kept",
            field=path,
            expected="integers, float32, float64 or text (a complex array as its real and imaginary parts)",
            found=str(values.dtype),
        )
    return np.array(values, dtype=values.dtype.newbyteorder("<"), order="C")
