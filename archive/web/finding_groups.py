"""Findings of a cooldown for its page: what one check says of many sweeps is one entry."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any

from archive.reports.front_page import finding_line
from schemas.finding import Finding

__all__ = ["FindingGroup", "finding_groups"]


@dataclass(frozen=True)
class FindingGroup:
    """What one check has to say, with one waiver or none.

    Attributes
    ----------
    first : dict
        The first finding, as reports print it.
    others : tuple of dict
        The rest, in their order.
    """

    first: dict[str, Any]
    others: tuple[dict[str, Any], ...]

    @property
    def places(self) -> list[str]:
        """Every place once, in the order of the findings."""
        return list(dict.fromkeys(str(each["place"]) for each in (self.first, *self.others)))


def finding_groups(findings: Iterable[Finding]) -> list[FindingGroup]:
    """Return findings put together by check, by what is to be done and by the reason of their waiver.

    Parameters
    ----------
    findings : iterable of Finding

    Returns
    -------
    list of FindingGroup
        In the order in which the first of each came.
    """
    found: dict[tuple[object, ...], list[Finding]] = defaultdict(list)
    for each in findings:
        waiver = each.waived
        accepted = (waiver.date, waiver.role, waiver.reason) if waiver else None
        found[each.severity, each.code, each.remedy, accepted].append(each)
    lines = ([finding_line("", each) for each in group] for group in found.values())
    return [FindingGroup(first, tuple(others)) for first, *others in lines]
