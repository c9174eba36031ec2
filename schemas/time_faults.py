"""What is wrong with a written date or time, in a person's words, instead of a parser's."""

from __future__ import annotations

__all__ = ["time_fault"]

_WITH_OFFSET = "write it with its offset, e.g. 2026-03-02T09:10:00+02:00"
_TIMES = {"datetime_type", "datetime_parsing", "datetime_from_date_parsing", "datetime_object_invalid"}
_DAYS = {"date_type", "date_parsing", "date_from_datetime_parsing", "date_from_datetime_inexact"}


def time_fault(kind: str) -> tuple[str, str] | None:
    """Sentence on what is wrong, and what to do, for one of pydantic's kinds of error; None if it is about no time.

    Examples
    --------
    >>> time_fault("timezone_aware")
    ('this time has no offset from UTC', 'write it with its offset, e.g. 2026-03-02T09:10:00+02:00')
    >>> time_fault("missing")
    """
    if kind == "timezone_aware":
        return "this time has no offset from UTC", _WITH_OFFSET
    if kind in _TIMES:
        return "this is not a date with a time of day", _WITH_OFFSET
    if kind in _DAYS:
        return "this is not a date", "write year, month and day, e.g. 2026-03-02"
    return None
