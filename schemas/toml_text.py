"""Tables of a TOML text that anybody may have written: all that can go wrong is one kind of fault, with its place.

Rules: a text is looked over before it is parsed, because the parser's time and memory grow with the square of the number
of parts of a dotted key; whatever stops the parser comes back as a sentence.
"""

from __future__ import annotations

import re
import tomllib
from typing import Any, Final

__all__ = ["TomlFault", "tables_of"]

MOST_PARTS: Final = 64
"""Parts of a dotted key; a sheet has at most six. Twenty thousand parts in 40 kB took 13 s and 1.5 GB."""

_PART: Final = r"""(?:[A-Za-z0-9_-]++|"[^"\n]*+"|'[^'\n]*+')"""
# Possessive, and without a word on what follows, so that the search takes time in proportion to the text whatever it holds.
_DOTTED: Final = re.compile(rf"(?<![A-Za-z0-9_-])(?:{_PART}[ \t]*+\.[ \t]*+)++{_PART}?+[ \t]*+")
_PLACE: Final = re.compile(r"\(at line (\d+), column (\d+)\)")
_AT: Final = re.compile(r" \(at [^()]*\)$")


class TomlFault(ValueError):
    """The text is no TOML that can be read.

    Attributes
    ----------
    line, column : int
        Where, from 1; where only the whole text can be blamed, its last line, and no column.
    """

    def __init__(self, what: str, line: int, column: int | None = None) -> None:
        super().__init__(what)
        self.line = line
        self.column = column


def tables_of(text: str) -> dict[str, Any]:
    """Tables that a TOML text holds.

    Parameters
    ----------
    text : str
        The text.

    Raises
    ------
    TomlFault
        If it is no valid TOML, or nests or numbers things beyond what can be read.

    Examples
    --------
    >>> tables_of('a.b = "c"')
    {'a': {'b': 'c'}}
    >>> tables_of("a =")
    Traceback (most recent call last):
    ...
    schemas.toml_text.TomlFault: Invalid value
    """
    for dotted in _DOTTED.finditer(text):
        # What is no key is text in a string.
        if dotted[0].count(".") >= MOST_PARTS and text[dotted.end() : dotted.end() + 1] in ("=", "]"):
            line = text.count("\n", 0, dotted.start()) + 1
            raise TomlFault(f"tables nested too deeply (a name of more than {MOST_PARTS} parts)", line)
    last = max(1, len(text.splitlines()))
    try:
        return tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        said = str(error)
        place = _PLACE.search(said)
        line, column = (int(place[1]), int(place[2])) if place else (last, None)
        raise TomlFault(_AT.sub("", said), line, column) from None
    except RecursionError:
        raise TomlFault("tables nested too deeply", last) from None
    except ValueError:
        # Python refuses to make an integer of more than 4300 digits (sys.get_int_max_str_digits).
        raise TomlFault("an integer of thousands of digits", _long_number(text) or last) from None


def _long_number(text: str) -> int | None:
    found = re.search(r"(?<![0-9_])[0-9_]{4300}", text)
    return None if found is None else text.count("\n", 0, found.start()) + 1
