"""Text of files that anybody may have put there: plain files only, and no more of one than is reasonable."""

from __future__ import annotations

import os
from pathlib import Path

from archive.errors import BadRequest

__all__ = ["plain_text"]


def plain_text(path: Path, *, at_most: int) -> str:
    """Return the text of a file.

    Parameters
    ----------
    path : Path
    at_most : int
        Bytes that such a file may have.

    Raises
    ------
    BadRequest
        If it is a pipe, a device or a folder, which would be read without end or not at all, or is larger.
    OSError, UnicodeDecodeError
        If it cannot be read, or is no UTF-8.
    """
    if path.exists() and not path.is_file():
        raise BadRequest("this is not a plain file", file=str(path), remedy="name a plain text file")
    with path.open("rb") as stream:
        size = os.fstat(stream.fileno()).st_size
        # One byte more than there should be: the file may grow meanwhile.
        data = b"" if size > at_most else stream.read(size + 1)
    if max(size, len(data)) > at_most:
        raise BadRequest(
            "the file is larger than any of its kind", file=str(path), expected=f"at most {at_most} bytes"
        )
    return data.decode("utf-8")
