"""The reviewed list of publications, and the part of it that a text cites."""

from __future__ import annotations

import re
from collections.abc import Iterable
from functools import cache
from importlib.resources import files

from archive.errors import BadRequest

__all__ = ["bibliography_of", "known_keys"]


@cache
def _entries() -> dict[str, str]:
    source = files("templates").joinpath("methods.bib").read_text(encoding="utf-8")
    parts = re.split(r"(?m)^(?=@)", source)
    found = {}
    for part in parts:
        head = re.match(r"@\w+\{([^,\s]+),", part)
        if head:
            found[head[1]] = part.strip()
    return found


def known_keys() -> tuple[str, ...]:
    """Return the keys of the reviewed list."""
    return tuple(_entries())


def bibliography_of(keys: Iterable[str]) -> str:
    """Return the entries of some keys, in the order of the reviewed list.

    Raises
    ------
    BadRequest
        A key is not in the list.
    """
    wanted = set(keys)
    missing = sorted(wanted - set(_entries()))
    if missing:
        raise BadRequest(
            f"no publication is known as {', '.join(missing)}",
            remedy="add it to templates/methods.bib, reviewed",
        )
    return "\n\n".join(entry for key, entry in _entries().items() if key in wanted) + ("\n" if wanted else "")
