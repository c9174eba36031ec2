"""Addresses that are near one that does not exist."""

from __future__ import annotations

from collections.abc import Iterable
from difflib import get_close_matches

from archive.errors import ArchiveError
from archive.lab import Archive
from archive.web.links import address_at

__all__ = ["near"]

_MOST = 6
_CUTOFF = 0.5


def near(lab: Archive, path: str) -> list[str]:
    """Return addresses of things that are spelt much like what a path behind `/at/` asks for, the likeliest first.

    Parameters
    ----------
    lab : Archive
    path : str
        An empty one has nothing near.
    """
    address = address_at(path[:300]).partition("#")[0]
    if not address:
        return []
    try:
        head, _, item = address.partition("/")
        names = {*lab.cooldown_names(), *(row.name for row in lab.records())}
        if not item or head not in names:
            records = [row.address for row in lab.records()] if "." in head else []
            return _close(head, [*names, *records])
        reductions = [row.address for row in lab.reductions(cooldown=head)] if "@" in item else []
        return _close(address, [*(row.address for row in lab.sweeps(head)), *reductions])
    except ArchiveError:
        # Whoever tells of one fault does not stumble over the next.
        return []


def _close(word: str, known: Iterable[str]) -> list[str]:
    every = sorted(set(known))
    folded = {each.lower(): each for each in every}
    return [folded[each] for each in get_close_matches(word.lower(), folded, n=_MOST, cutoff=_CUTOFF)]
