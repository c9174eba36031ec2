"""Formats of time stamps as regular expressions, one named group for every part of the date.

Rules: a format must name year and day, and no part twice. What it means does not depend on the machine's language.
"""

from __future__ import annotations

import re
from typing import Final

from archive.errors import BadRequest

__all__ = ["time_pattern"]

_ISO: Final = (
    r"^(?P<Y>[0-9]{4})-(?P<m>[0-9]{2})-(?P<d>[0-9]{2})[Tt ](?P<H>[0-9]{2}):(?P<M>[0-9]{2})"
    r"(?::(?P<S>[0-9]{2})(?:[.,](?P<f>[0-9]{1,9}))?)?(?: ?(?P<z>[Zz]|[+-][0-9]{2}(?::?[0-9]{2})?))?$"
)
# Directives of POSIX strptime (The Open Group Base Specifications, issue 8) with Python's %f and %z.
_DIRECTIVES: Final = {
    "Y": r"(?P<Y>[0-9]{4})",
    "y": r"(?P<y>[0-9]{2})",
    "m": r"(?P<m>[0-9]{1,2})",
    "b": r"(?P<b>[A-Za-z]{3,9})\.?",
    "B": r"(?P<b>[A-Za-z]{3,9})\.?",
    "d": r"(?P<d>[0-9]{1,2})",
    "j": r"(?P<j>[0-9]{1,3})",
    "H": r"(?P<H>[0-9]{1,2})",
    "I": r"(?P<I>[0-9]{1,2})",
    "M": r"(?P<M>[0-9]{1,2})",
    "S": r"(?P<S>[0-9]{1,2})",
    "f": r"(?P<f>[0-9]{1,9})",
    "p": r"(?P<p>[AaPp][Mm])",
    "z": r"(?P<z>[Zz]|[+-][0-9]{2}(?::?[0-9]{2})?)",
    "a": r"[A-Za-z]{2,9}\.?",
    "A": r"[A-Za-z]{2,9}\.?",
    "%": "%",
}
_LONG: Final = {"%T": "%H:%M:%S", "%R": "%H:%M", "%F": "%Y-%m-%d"}


def time_pattern(time_format: str) -> str:
    """Return the regular expression of a time format, understood alike by `re` and RE2.

    Parameters
    ----------
    time_format : str
        `iso8601`, or a strptime pattern of the directives above.

    Raises
    ------
    BadRequest
        If the format names no day, or a part of it twice, or has an unknown directive.

    Examples
    --------
    >>> re.match(time_pattern("%d.%m.%Y"), "2.3.2026").groupdict()
    {'d': '2', 'm': '3', 'Y': '2026'}
    """
    if time_format == "iso8601":
        return _ISO
    spelled = time_format
    for short, long in _LONG.items():
        spelled = spelled.replace(short, long)
    pieces: list[str] = []
    used: list[str] = []
    for directive, blank, literal in re.findall(r"%(.?)|(\s+)|([^%\s]+)", spelled):
        if blank:
            pieces.append(r"\s+")
        elif literal:
            pieces.append(re.escape(literal))
        elif directive not in _DIRECTIVES:
            raise _unreadable(time_format, f"%{directive} is not a directive that is read here")
        else:
            used.append("b" if directive == "B" else directive)
            pieces.append(_DIRECTIVES[directive])
    twice = sorted({name for name in used if used.count(name) > 1 and name not in "%aA"})
    if twice:
        raise _unreadable(time_format, f"%{twice[0]} stands twice")
    has = set(used)
    day = "j" in has or ("d" in has and bool(has & {"m", "b"}))
    if not day or not has & {"Y", "y"}:
        raise _unreadable(time_format, "it names no year and day, and the day is never guessed from the file")
    for clash in ({"Y", "y"}, {"m", "b"}, {"j", "d"}, {"H", "I"}):
        if clash <= has:
            raise _unreadable(
                time_format, f"{' and '.join('%' + name for name in sorted(clash))} say the same twice"
            )
    if ("I" in has) != ("p" in has):
        raise _unreadable(time_format, "%I (twelve hours) and %p (am or pm) belong together")
    return "^" + "".join(pieces) + "$"


def _unreadable(time_format: str, why: str) -> BadRequest:
    return BadRequest(
        f"this time format cannot be used: {why}",
        field="dialect.time_format",
        found=time_format,
        expected="`iso8601`, `epoch`, or a pattern such as `%d.%m.%Y %H:%M:%S`",
    )
