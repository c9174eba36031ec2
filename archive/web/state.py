"""The state of the archive: how much it holds, when it was last read whole, what is stale, what the checks found."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable
from datetime import datetime

from starlette.requests import Request
from starlette.responses import Response

from archive.intake.checks import CHECKS
from archive.lab import Archive, Stale
from archive.reports.moments import full_time
from archive.store.journal import Entry
from archive.web.page import page
from archive.web.site import lab_of

__all__ = ["state"]

_MOST_LOOKED_AT = 300
"""Reductions: to know whether one is stale, its document is read; of more than these the terminal tells."""

_LAST = 8
_UNITS = ("bytes", "kB", "MB", "GB", "TB")


def state(request: Request) -> Response:
    """Answer with the state of the archive."""
    lab = lab_of(request)
    counts = lab.statistics()
    entries = lab.journal()
    return page(
        request,
        "state.html.j2",
        counts=counts,
        sealed=_size(counts["sealed_bytes"]),
        raw=_size(counts["raw_bytes"]),
        when=_when,
        fixity=_last(entries, "fixity"),
        last=list(reversed(entries[-_LAST:])),
        stale=_stale(lab, counts["reductions"]),
        findings=_by_kind(lab.finding_counts()),
        titles={check.code: check.title for check in CHECKS},
        withdrawals=lab.withdrawals(),
    )


def _when(text: str) -> str:
    """Return the time of an entry as other pages have times; an entry that somebody wrote by hand as it stands."""
    try:
        return full_time(datetime.fromisoformat(text), "UTC")
    except ValueError:
        return text


def _last(entries: Iterable[Entry], act: str) -> Entry | None:
    return next((each for each in reversed(list(entries)) if each.act.act == act), None)


def _stale(lab: Archive, reductions: int) -> list[Stale] | None:
    """Return what is stale, or None where finding out takes longer than a page may."""
    return lab.stale() if reductions <= _MOST_LOOKED_AT else None


def _by_kind(counts: Iterable[tuple[str, str, bool, int]]) -> list[tuple[str, str, int, int]]:
    """Return severity and code with how many are open and how many waived, the gravest first."""
    found: dict[tuple[str, str], list[int]] = defaultdict(lambda: [0, 0])
    for severity, code, waived, count in counts:
        found[severity, code][waived] += count
    order = {"error": 0, "warning": 1, "note": 2}
    return sorted(
        ((severity, code, some[0], some[1]) for (severity, code), some in found.items()),
        key=lambda row: (order.get(row[0], 3), -row[2], row[1]),
    )


def _size(count: int) -> str:
    r"""Return a number of bytes in the largest unit that leaves at least one, powers of 1000.

    Examples
    --------
    >>> _size(999), _size(7_988_363)
    ('999\xa0bytes', '7.99\xa0MB')
    """
    value, place = float(count), 0
    while value >= 999.5 and place < len(_UNITS) - 1:
        value, place = value / 1000, place + 1
    return f"{value:.3g}\u00a0{_UNITS[place]}"
