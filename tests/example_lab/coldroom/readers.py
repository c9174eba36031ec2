"""Reader of the group's resistance bridge, which writes binary records.

A file is the four bytes `BRG1`, then records of three little-endian doubles: POSIX time in s, excitation in V, resistance
in ohm.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from archive.intake.own_readers import Reader

__all__ = ["BRIDGE", "bridge_columns"]

_MAGIC = b"BRG1"
_RECORD = np.dtype([("time", "<f8"), ("excitation", "<f8"), ("resistance", "<f8")])


def bridge_columns(path: Path) -> dict[str, NDArray[np.float64]]:
    """Return time (POSIX s), excitation (V) and resistance (ohm) of one file.

    Raises
    ------
    ValueError
        If it is no file of the bridge, or was cut off.
    """
    content = path.read_bytes()
    if not content.startswith(_MAGIC):
        raise ValueError("it does not begin with BRG1, so the bridge has not written it")
    rest = len(content) - len(_MAGIC)
    if rest % _RECORD.itemsize:
        raise ValueError(f"it ends in the middle of record {rest // _RECORD.itemsize + 1}")
    records = np.frombuffer(content, dtype=_RECORD, offset=len(_MAGIC))
    return {str(name): records[name].astype(np.float64) for name in records.dtype.names or ()}


BRIDGE = Reader(name="coldroom-bridge", version=1, suffixes=(".brg",), function=bridge_columns)
