"""Digests of arrays and plans.

The digest of an array is the SHA-256 of its little-endian float64 values, the same that a sealed file keeps beside
the array, so that either can be checked against the other.
"""

from __future__ import annotations

import hashlib
import json
from dataclasses import fields, is_dataclass

import numpy as np
import numpy.typing as npt
from pydantic import BaseModel

__all__ = ["array_digest", "record_digest", "value_digest"]


def array_digest(values: npt.ArrayLike) -> str:
    """Return the SHA-256 of the values as little-endian float64.

    Examples
    --------
    >>> array_digest([1.0, 2.0])[:12]
    'dc91ce9a50dd'
    """
    array = np.ascontiguousarray(np.asarray(values, dtype=np.float64).astype("<f8"))
    return hashlib.sha256(array.tobytes()).hexdigest()


def record_digest(record: BaseModel) -> str:
    """Return the SHA-256 of a record as JSON with sorted keys and no white space.

    Notes
    -----
    What has its default value is left out, so that a field which a later version adds, with a default, as every new field
    must have, changes no digest that was written before.

    Examples
    --------
    >>> class Old(BaseModel):
    ...     name: str
    >>> class New(Old):
    ...     note: str | None = None
    >>> record_digest(Old(name="TO-4")) == record_digest(New(name="TO-4"))
    True
    """
    text = json.dumps(
        record.model_dump(mode="json", exclude_defaults=True),
        sort_keys=True, separators=(",", ":"), ensure_ascii=False,
    )  # fmt: skip
    return hashlib.sha256(text.encode()).hexdigest()


def value_digest(value: object) -> str:
    """Return the SHA-256 of what a sheet says in one place: a record, a group of records, a word or a number.

    Examples
    --------
    >>> value_digest("up") == value_digest("up"), value_digest("up") == value_digest("down")
    (True, False)
    """
    text = json.dumps(_plain(value), sort_keys=True, separators=(",", ":"), ensure_ascii=False)
    return hashlib.sha256(text.encode()).hexdigest()


def _plain(value: object) -> object:
    if isinstance(value, BaseModel):
        return value.model_dump(mode="json")
    if is_dataclass(value) and not isinstance(value, type):
        return {each.name: _plain(getattr(value, each.name)) for each in fields(value)}
    if isinstance(value, tuple | list):
        return [_plain(each) for each in value]
    return value
