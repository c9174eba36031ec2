"""Ranges and times as a person types them: `20:35 umol/m^2`, `0.4:0.8 K`, `T_KT=0.4:0.6 K`, `2026-03-01`."""

from __future__ import annotations

import re
from collections.abc import Callable
from datetime import UTC, datetime, time, timedelta

__all__ = ["Bounds", "named_range", "point_in_time", "si_bounds"]

Bounds = tuple[float | None, float | None]

_END = re.compile(
    # Possessive, and matched without blanks around: a long text that is no range must not take minutes.
    r"(?P<number>[+-]?(?:[0-9]++\.?[0-9]*+|\.[0-9]++)(?:[eE][+-]?[0-9]++)?+)?+\s*+(?P<unit>.*)$"
)
_NAMED = re.compile(r"(?P<name>[A-Za-z][A-Za-z0-9_]{0,63})\s*+(?:=\s*+(?P<range>.*\S))?$")
_DAY = re.compile(r"[0-9]{4}-[0-9]{2}-[0-9]{2}$")
_EXAMPLE = "a range such as 20:35 umol/m^2; one end may be left open, as in 20: umol/m^2"


def si_bounds(text: str, to_si: Callable[[str, str], float]) -> Bounds:
    """Bounds that a text states, in SI.

    Parameters
    ----------
    text : str
        Such as `20:35 umol/m^2`, `400 mK:0.8 K`, `:0.8 K`; a unit at one end counts for both.
    to_si : callable
        SI value of a number, as it is written, and its unit ("" if none is written); raises ValueError with a sentence.

    Raises
    ------
    ValueError
        If the text is no range, or its ends are the wrong way round.

    Examples
    --------
    >>> si_bounds("400:800 mK", lambda number, unit: float(number) * {"mK": 1e-3}[unit])
    (0.4, 0.8)
    """
    ends = [_END.match(part.strip()) for part in text.split(":", 2)]
    if len(ends) != 2 or ends[0] is None or ends[1] is None:
        raise ValueError(f"found {text!r}; expected {_EXAMPLE}")
    units = [end["unit"] for end in ends if end is not None]
    low, high = (
        None
        if end is None or end["number"] is None
        else to_si(end["number"], end["unit"] or units[1 - index])
        for index, end in enumerate(ends)
    )
    if low is None and high is None:
        raise ValueError(f"found {text!r} without a number; expected {_EXAMPLE}")
    if low is not None and high is not None and low > high:
        raise ValueError(f"found {text!r}, which ends below its beginning; write the lower end first")
    return low, high


def named_range(text: str) -> tuple[str, str | None]:
    """Name of a result and the range behind it, None where the result must only be there.

    Raises
    ------
    ValueError
        If the text has no such form.

    Examples
    --------
    >>> named_range("T_KT=0.4:0.6 K"), named_range("T_KT")
    (('T_KT', '0.4:0.6 K'), ('T_KT', None))
    """
    found = _NAMED.match(text.strip())
    if found is None:
        raise ValueError(f"found {text!r}; expected the name of a result and a range, such as T_KT=0.4:0.6 K")
    return found["name"], found["range"]


def point_in_time(text: str, *, end_of_day: bool = False) -> datetime:
    """Instant that a text names: RFC 3339 with its offset, or a date alone, which counts from midnight UTC.

    Parameters
    ----------
    text : str
        Such as `2026-03-02T09:10:00+02:00` or `2026-03-02`.
    end_of_day : bool
        Take the last instant of a date alone.

    Raises
    ------
    ValueError
        If the text is no time, or has no offset.

    Examples
    --------
    >>> point_in_time("2026-03-02", end_of_day=True).isoformat()
    '2026-03-02T23:59:59.999999+00:00'
    """
    expected = "a date such as 2026-03-02, or a time with its offset such as 2026-03-02T09:10:00+02:00"
    try:
        moment = datetime.fromisoformat(text.strip())
    except ValueError:
        raise ValueError(f"found {text!r}; expected {expected}") from None
    if _DAY.match(text.strip()):
        day = datetime.combine(moment.date(), time(), UTC)
        return day + timedelta(days=1, microseconds=-1) if end_of_day else day
    if moment.tzinfo is None:
        raise ValueError(f"found {text!r}, a time without its offset from UTC; expected {expected}")
    return moment
