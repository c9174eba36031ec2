"""Which names the store takes; checked going in, and again when a folder is listed.

A key becomes a path on disk and must mean the same on every file system an archive may be copied to. A raw file's name
is the laboratory's own and is kept as it is, as long as HDF5 can hold it.
"""

from __future__ import annotations

import re

from archive.errors import BadRequest

__all__ = ["checked_key", "checked_path", "checked_raw_name", "is_key"]

# ASCII: file systems disagree on how accents are spelled in bytes. No leading dot or hyphen: hidden files, options.
# No space, quote or colon: shells and Windows. `~` is left out because staging names use it as a separator.
_SEGMENT = re.compile(r"[A-Za-z0-9](?:[A-Za-z0-9._@+-]*[A-Za-z0-9_+-])?")
# 255 bytes is the limit of the usual file systems; the rest is room for the suffix and the staging mark.
_SEGMENT_LIMIT = 200
# Windows keeps these names for devices, whatever the suffix ("Naming Files, Paths, and Namespaces", Microsoft).
_DEVICES = {"con", "prn", "aux", "nul", *(f"{port}{n}" for port in ("com", "lpt") for n in range(10))}
_PATH_SEGMENT = re.compile(r"[A-Za-z0-9_][A-Za-z0-9_.@+-]*")


def is_key(key: str) -> bool:
    """Return whether `key` may name a sealed file.

    Examples
    --------
    >>> is_key("2026-03/s017@film-transition.2"), is_key("../2026-03.a1"), is_key("2026-03/nul.1")
    (True, False, False)
    """
    segments = key.split("/")
    return (
        len(segments) == 2
        and not key.lower().endswith(".h5")  # "x.h5" would lie on disk as "x.h5.h5"
        and all(
            _SEGMENT.fullmatch(segment) is not None
            and len(segment) <= _SEGMENT_LIMIT
            and segment.split(".")[0].lower() not in _DEVICES
            for segment in segments
        )
    )


def checked_key(key: str) -> str:
    """Return `key` unchanged, or raise BadRequest when it may not name a sealed file."""
    if not is_key(key):
        raise BadRequest(
            "a sealed file cannot have this name",
            field="key",
            expected="folder/name of letters, digits and . _ @ + -, without suffix, such as 2026-03/2026-03.a1",
            found=repr(key),
        )
    return key


def checked_path(path: str) -> str:
    """Return the path of a table or array inside a file unchanged, or raise BadRequest.

    Examples
    --------
    >>> checked_path("sweeps/s017/period")
    'sweeps/s017/period'
    """
    segments = path.split("/")
    reserved = segments[0] == "raw" or path == "document"
    if reserved or not all(_PATH_SEGMENT.fullmatch(segment) for segment in segments):
        raise BadRequest(
            "a table or array cannot have this path",
            field="path",
            expected="names of letters, digits and _ . @ + - joined by /, not below raw and not document",
            found=repr(path),
        )
    return path


def checked_raw_name(name: str) -> str:
    """Return a raw file's name unchanged, or raise BadRequest when it cannot be kept.

    Notes
    -----
    A name may hold spaces and letters of any alphabet, and folders joined by ``/``. It may not climb (``..``), be
    absolute, hold control characters, or hold bytes that are not UTF-8.

    Examples
    --------
    >>> checked_raw_name("log/Lock-in Übersicht.csv")
    'log/Lock-in Übersicht.csv'
    """
    try:
        name.encode("utf-8")
        well_encoded = True
    except UnicodeEncodeError:
        well_encoded = False
    segments = name.split("/")
    if (
        not well_encoded
        or any(segment in ("", ".", "..") for segment in segments)
        or any(ord(letter) < 32 or ord(letter) == 127 or letter == "\\" for letter in name)
        or any(len(segment.encode("utf-8")) > 255 for segment in segments)
    ):
        raise BadRequest(
            "a raw file with this name cannot be kept",
            field="name",
            expected="a relative path in UTF-8, parts joined by /, without .. and control characters",
            found=repr(name),
            remedy="rename the file and try again",
        )
    return name
