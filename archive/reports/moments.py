"""Instants and spans of time as they are printed, in the zone of the laboratory."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from datetime import datetime, timedelta
from zoneinfo import ZoneInfo, ZoneInfoNotFoundError

__all__ = ["clock_lines", "full_time", "in_zone", "span_text"]


def in_zone(at: datetime, zone: str) -> datetime:
    """Return an instant in a zone; in its own offset where the zone is not known here."""
    try:
        return at.astimezone(ZoneInfo(zone))
    except (ZoneInfoNotFoundError, ValueError):
        return at


def full_time(at: datetime | None, zone: str) -> str:
    """Return date, clock and offset, as ``2025-03-10 09:00 +11``."""
    if at is None:
        return "[nr]"
    local = in_zone(at, zone)
    return f"{local:%Y-%m-%d %H:%M} {_offset(local)}"


def clock_lines(moments: Iterable[datetime | None], zone: str) -> Iterator[str]:
    """Yield each instant: date, clock and offset on the first line of a day, the clock alone after that."""
    day = ""
    for at in moments:
        if at is None:
            yield "[nr]"
            continue
        local = in_zone(at, zone)
        head = f"{local:%Y-%m-%d}{_offset(local)}"
        yield f"{local:%H:%M}" if head == day else f"{local:%Y-%m-%d %H:%M} {_offset(local)}"
        day = head


def _offset(local: datetime) -> str:
    offset = local.utcoffset() or timedelta(0)
    minutes = round(offset.total_seconds() / 60)
    sign = "\u2212" if minutes < 0 else "+"
    return f"{sign}{abs(minutes) // 60:02d}" + (f":{abs(minutes) % 60:02d}" if minutes % 60 else "")


def span_text(begin: datetime | None, end: datetime | None) -> str:
    """Return the time between two instants, as ``13.4 h``."""
    if begin is None or end is None:
        return "[nr]"
    seconds = (end - begin).total_seconds()
    for unit, size in (("d", 86400.0), ("h", 3600.0), ("min", 60.0)):
        if seconds >= 2 * size or (unit == "min" and seconds >= size):
            return f"{seconds / size:.3g}\u00a0{unit}"
    return f"{seconds:.3g}\u00a0s"
