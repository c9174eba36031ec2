"""Columns of text cells to numbers, with a reason for every cell that is none.

Rules: a number is decimal digits with one decimal mark and an exponent, nothing else: no hexadecimal, no words, no
thousands separators, nothing that overflows to infinity.
"""

from __future__ import annotations

import re
from typing import Any, Final, Literal

import numpy as np
import numpy.typing as npt
import pyarrow as pa
import pyarrow.compute as pc

from archive.intake.dialect import DETAILED

__all__ = ["as_mask", "is_absent", "number_fault", "numbers", "parsed_number"]

_NUMBER: Final = r"^[+-]?(?:[0-9]+(?:{mark}[0-9]*)?|{mark}[0-9]+)(?:[eE][+-]?[0-9]+)?$"
_POINT: Final = re.compile(_NUMBER.format(mark=r"\."))
_COMMA: Final = re.compile(_NUMBER.format(mark=","))
_NAN: Final = r"(?i)^[+-]?nan$"

# Why a cell is no number, tried in this order; the last resort stands in `number_fault`.
_REASONS: Final = (
    (re.compile(r"^[+-]?0[xX][0-9a-fA-F]+$"), "is hexadecimal"),
    (
        re.compile(r"^[+-]?(inf|infinity)$", re.IGNORECASE),
        "is infinite; name it as a sentinel if it means `no value`",
    ),
    (re.compile(r"^[+-]?[0-9]*[.,]?[0-9]*[dD][+-]?[0-9]+$"), "has a Fortran exponent; write e instead of d"),
    (
        re.compile(r"^[+-]?[0-9]{1,3}([,.'’  _ ][0-9]{3})+([.,][0-9]*)?$"),
        "looks like a number with thousands separators, which are not read because they may be decimals",
    ),
)


def numbers(
    texts: pa.StringArray, *, decimal: Literal[".", ","], known: npt.NDArray[np.bool_] | None = None
) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.bool_], dict[int, str]]:
    """Return the numbers in text cells, which cells are empty or NaN, and why the others are none.

    Parameters
    ----------
    texts : pyarrow.StringArray
        Cells without nulls; blanks around a number are ignored.
    decimal : {".", ","}
        Decimal mark.
    known : numpy.ndarray of bool, optional
        Cells that are explained already (sentinels); they are not among the faults.

    Returns
    -------
    values : numpy.ndarray of float64
        The nearest double, NaN where there is no number.
    absent : numpy.ndarray of bool
        Cells that are empty or `NaN`; they are not among the faults.
    faults : dict of int to str
        Reason per index of every other cell that is not a finite number; the first ten thousand are looked at closely.

    Examples
    --------
    >>> values, absent, faults = numbers(pa.array(["+1,5", "", "0x10"]), decimal=",")
    >>> values.tolist(), absent.tolist(), faults
    ([1.5, nan, nan], [False, True, False], {2: 'is hexadecimal'})
    """
    pattern = _COMMA if decimal == "," else _POINT
    bare = pc.utf8_trim_whitespace(texts)
    good = pc.match_substring_regex(bare, pattern.pattern)
    pointed = pc.replace_substring(bare, ",", ".") if decimal == "," else bare
    cast = pc.cast(pc.if_else(good, pointed, pa.scalar(None, pa.string())), pa.float64())
    values = np.array(cast.to_numpy(zero_copy_only=False), dtype=np.float64)
    is_number = as_mask(good)
    absent = np.zeros(len(texts), dtype=np.bool_)
    others = np.flatnonzero(~is_number)
    if len(others):
        absent[others] = is_absent(bare.take(pa.array(others)))
    wrong = ~(is_number & np.isfinite(values)) & ~absent
    bad = np.flatnonzero(wrong if known is None else wrong & ~known)
    # Only so many bad cells are ever told in detail; a column that is bad throughout need not be looked at for long.
    faults = {int(i): number_fault(texts[int(i)].as_py(), decimal=decimal) for i in bad[:DETAILED]}
    faults |= dict.fromkeys(bad[DETAILED:].tolist(), "is not a number")
    values[wrong] = np.nan
    return values, absent, faults


def number_fault(text: str, *, decimal: Literal[".", ","]) -> str:
    """Return why `text` is not a finite number, as the end of a sentence."""
    bare = text.strip()
    if (_COMMA if decimal == "," else _POINT).match(bare):
        return "is too large for a double (it would become infinite)"
    if decimal == "." and _COMMA.match(bare):
        return "has a decimal comma, or a comma between thousands; the dialect says decimal point"
    if decimal == "," and _POINT.match(bare):
        return "has a decimal point, or a point between thousands; the dialect says decimal comma"
    for pattern, why in _REASONS:
        if pattern.match(bare[:100]):
            return why
    return "is not a number" if bare else "is empty"


def parsed_number(text: str, *, decimal: Literal[".", ","]) -> float | None:
    """Return the finite number a sentinel stands for, in the table's decimals or with a point; else None.

    Examples
    --------
    >>> parsed_number("9.9E37", decimal=","), parsed_number("OVLD", decimal=".")
    (9.9e+37, None)
    """
    bare = text.strip()
    if decimal == "," and _COMMA.match(bare):
        bare = bare.replace(",", ".")
    if not _POINT.match(bare):
        return None
    value = float(bare)
    return value if np.isfinite(value) else None


def is_absent(bare: pa.StringArray) -> npt.NDArray[np.bool_]:
    """Return which cells, without blanks around them, are empty or NaN."""
    return as_mask(pc.or_(pc.equal(bare, ""), pc.match_substring_regex(bare, _NAN)))


def as_mask(array: Any) -> npt.NDArray[np.bool_]:
    """Return an Arrow array of booleans without nulls as a mask."""
    return np.array(array.to_numpy(zero_copy_only=False), dtype=np.bool_)
