"""A unit that stands as a word of its own on the command line, joined to the range before it."""

from __future__ import annotations

import re
from collections.abc import Callable

__all__ = ["joined_units"]

_BARE = re.compile(r"[-+0-9.eE ]*:[-+0-9.eE ]*")


def joined_units(arguments: list[str], options: frozenset[str], is_unit: Callable[[str], bool]) -> list[str]:
    """Arguments in which a unit that stands as a word of its own is joined to the range before it.

    Parameters
    ----------
    arguments : list of str
        Words as the shell gives them, e.g. `--coverage 20:35 umol/m^2` without quotes.
    options : frozenset of str
        Options whose value is a range.
    is_unit : callable
        Whether a word is a unit.

    Examples
    --------
    >>> joined_units(["--coverage", "20:35", "umol/m^2", "film"], frozenset({"--coverage"}), "umol/m^2".__eq__)
    ['--coverage', '20:35 umol/m^2', 'film']
    """
    joined: list[str] = []
    words = iter(range(len(arguments)))
    for place in words:
        word = arguments[place]
        option, equals, value = word.partition("=")
        if word == "--":
            return joined + arguments[place:]
        if option in options and not equals and place + 1 < len(arguments):
            joined.append(word)
            place = next(words)
            word = value = arguments[place]
        elif option not in options:
            joined.append(word)
            continue
        follows = arguments[place + 1] if place + 1 < len(arguments) else ""
        if _BARE.fullmatch(value.partition("=")[2] or value) and follows and is_unit(follows):
            word = f"{word} {follows}"
            next(words)
        joined.append(word)
    return joined
