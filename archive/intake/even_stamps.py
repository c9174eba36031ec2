"""Parts of time stamps that are all written alike, without a regular expression for each.

A logger writes one form of stamp from first to last: as many characters, digits and separators in the same places. Then the
first stamp tells where each part stands in all of them. Whatever is not alike is left to the reader of single stamps.
"""

from __future__ import annotations

import re
from typing import Any

import numpy as np
import numpy.typing as npt
import pyarrow as pa

__all__ = ["even_parts"]

_NUMBERS = frozenset("YymdjHIMSf")


def even_parts(texts: pa.StringArray, pattern: re.Pattern[str]) -> tuple[dict[str, Any], int] | None:
    """Return the parts of time stamps that are written alike, and how many digits a fraction of a second has.

    Parameters
    ----------
    texts : pyarrow.StringArray
        Time stamps without nulls.
    pattern : re.Pattern
        Of their format, with named groups; a group of digits takes any digits.

    Returns
    -------
    parts : dict of str to numpy.ndarray of int64 or pyarrow.StringArray
        By the names of the groups that are there: numbers of every stamp; a word, which all share, once.
    digits : int
    None
        If they are not alike, or the first does not match.

    Examples
    --------
    >>> pattern = re.compile("^(?P<H>[0-9]{1,2}):(?P<M>[0-9]{2})$")
    >>> even_parts(pa.array(["10:30", "11:45"]), pattern)[0]["H"].tolist()
    [10, 11]
    >>> even_parts(pa.array(["9:30", "11:45"]), pattern) is None
    True
    """
    table = _even_bytes(texts)
    if table is None or (found := pattern.match(bytes(table[0]).decode("latin-1"))) is None:
        return None
    named = {name: found.span(name) for name, text in found.groupdict().items() if text is not None}
    numeric = np.zeros(table.shape[1], dtype=np.bool_)
    for name, (begin, end) in named.items():
        numeric[begin:end] = name in _NUMBERS
    # The pattern asks of these characters only whether they are digits, of all others what they are: so it matches all
    # stamps as it matched the first, if these are digits everywhere and the others the same.
    digits = table[:, numeric] - np.uint8(ord("0"))
    if (digits > 9).any() or (table[:, ~numeric] != table[0, ~numeric]).any():
        return None
    parts: dict[str, Any] = {}
    place = np.cumsum(numeric) - 1
    for name, (begin, end) in named.items():
        if name in _NUMBERS:
            value = np.zeros(len(table), dtype=np.int64)
            for column in place[begin:end].tolist():
                value = 10 * value + digits[:, column]
            parts[name] = value
        else:
            parts[name] = pa.array([found[name]], pa.string())
    width = named["f"][1] - named["f"][0] if "f" in named else 0
    return parts, width


def _even_bytes(texts: pa.StringArray) -> npt.NDArray[np.uint8] | None:
    """Return texts of one length as a table of bytes, one row each."""
    if not len(texts) or not pa.types.is_string(texts.type):
        return None
    _, offsets, data = texts.buffers()
    ends = np.frombuffer(offsets, dtype=np.int32)[texts.offset : texts.offset + len(texts) + 1]
    width = int(ends[1] - ends[0])
    if not width or (np.diff(ends) != width).any():
        return None
    return np.frombuffer(data, dtype=np.uint8)[ends[0] : ends[-1]].reshape(-1, width)
