"""Stillroom: the archive of a low-temperature physics laboratory.

`from archive import Archive` opens the one door; everything else is reached through it. The import is lazy, so that
naming the package costs nothing.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from archive.lab import Archive

__all__ = ["Archive", "__version__"]

__version__ = "0.1.0"


def __getattr__(name: str) -> object:
    if name == "Archive":
        return import_module("archive.lab").Archive
    raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
